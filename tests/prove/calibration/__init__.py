"""The calibration study: what the ranges promise, measured on homes whose truth is known."""
