"""Aqueous pKa of carboxylic acids from their structure."""

__version__ = "0.1.0"
