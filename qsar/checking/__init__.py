"""Checks on a table of measured acids: against open rows, against linear free-energy lines, against itself."""
