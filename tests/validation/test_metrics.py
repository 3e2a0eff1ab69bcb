"""Figures of merit against scikit-learn, scipy and worked cases."""

from __future__ import annotations

import numpy as np
import pytest
from sklearn.metrics import mean_absolute_error, r2_score, root_mean_squared_error

from qsar.validation.metrics import Coverage, Errors, binomial_band, bootstrap, ratio_of_means


def test_errors_are_those_of_scikit_learn() -> None:
    rng = np.random.default_rng(1)
    measured = rng.normal(4.0, 1.0, 50)
    predicted = measured + rng.normal(0.1, 0.3, 50)
    e = Errors.of(measured, predicted)
    assert e.n == 50
    assert e.mean_absolute == pytest.approx(mean_absolute_error(measured, predicted), abs=1e-12)
    assert e.root_mean_square == pytest.approx(root_mean_squared_error(measured, predicted), abs=1e-12)
    assert e.r2 == pytest.approx(r2_score(measured, predicted), abs=1e-12)
    assert e.bias == pytest.approx(float(np.mean(predicted) - np.mean(measured)), abs=1e-12)


def test_no_values_have_no_error() -> None:
    e = Errors.of(np.zeros(0), np.zeros(0))
    assert e.n == 0
    assert np.isnan(e.mean_absolute)


def test_binomial_band_by_adding_up_the_distribution() -> None:
    """N = 20, p = 0.9, worked by hand: P(X <= 14) = 0.011 and P(X <= 15) = 0.043, so the band is 15 to 20."""
    assert binomial_band(0.9, 20) == (15 / 20, 1.0)
    assert binomial_band(0.9, 0) == (0.0, 1.0)


def test_coverage_says_whether_chance_explains_it() -> None:
    held = np.array([True] * 15 + [False] * 5)
    assert Coverage.of(0.9, held).within
    assert Coverage.of(0.9, held).share == 0.75
    assert not Coverage.of(0.9, np.array([True] * 14 + [False] * 6)).within


def test_bootstrap_spread_of_a_mean_is_its_standard_error() -> None:
    """Efron & Tibshirani 1993, ch. 5: the spread over resamples is s / sqrt(n), here within sampling error."""
    values = np.random.default_rng(2).normal(size=200)
    drawn = bootstrap(lambda rows: float(values[rows].mean()), np.arange(200), repeats=4000)
    assert drawn.std() == pytest.approx(values.std() / np.sqrt(200), rel=0.05)


def test_bootstrap_keeps_groups_together() -> None:
    groups = np.repeat(np.arange(5), 3)
    sizes = bootstrap(lambda rows: float(len(rows)), groups, repeats=20)
    assert set(sizes) == {15.0}
    counts = bootstrap(lambda rows: float(np.bincount(groups[rows], minlength=5).max() % 3), groups, repeats=20)
    assert set(counts) == {0.0}


def test_ratio_of_means() -> None:
    error, above = np.array([0.1, -0.1, 0.4, -0.2]), np.array([False, False, True, True])
    assert ratio_of_means(error, above, np.arange(4)) == pytest.approx(3.0)
    assert np.isnan(ratio_of_means(error, above, np.arange(2)))
