"""Checks of the weather room."""
