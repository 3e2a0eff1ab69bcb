"""Checks on a table of measured acids: against open rows, published lines and itself."""
