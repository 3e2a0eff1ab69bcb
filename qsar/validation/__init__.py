"""Judging a model: splits, metrics, baselines, randomisation, and acids measured elsewhere."""
