"""Calibration: from dyno runs of known stacks to a damper's own numbers, and how sure they are."""
