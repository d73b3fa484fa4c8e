"""Timings, as ratios against a named peer in the same run.  Each module offers ``measure()``."""
