"""Feedback: its sign, whether there is any, and whether its resistors are of a sane size."""
