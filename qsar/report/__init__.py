"""Plots and pages that show what the table and the model hold."""
