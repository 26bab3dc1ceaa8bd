"""Drives a procedure on a bench: limits, stop, mute, and what the screen is told."""
