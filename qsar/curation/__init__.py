"""Measured constants from outside: which rows can be used, which cannot and why."""
