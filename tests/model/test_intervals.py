"""Prediction intervals: the CV+ definition on small cases, and coverage on exchangeable data.

Barber, Candes, Ramdas & Tibshirani, Ann. Stat. 2021, 49, 486, eq. 11: from the floor(alpha (n + 1))-th smallest of
f_k(i)(x) - R_i to the ceil((1 - alpha)(n + 1))-th smallest of f_k(i)(x) + R_i; at least 1 - 2 alpha is covered.
"""

from __future__ import annotations

from dataclasses import replace
from fractions import Fraction
from math import ceil, floor

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from qsar.model.intervals import CLASSES, EVIDENCE, Calibration, fit_scale


def calibration(
    scores: np.ndarray, member: np.ndarray, label: np.ndarray | None = None, strangers: np.ndarray | None = None
) -> Calibration:
    """Scores with their acid left out, and with its analogues left out too; alike where not given."""
    return Calibration(
        coefficients=np.zeros(len(EVIDENCE)),
        scores=scores,
        stranger_scores=scores if strangers is None else strangers,
        member=member,
        label=np.zeros(len(scores), dtype=np.int64) if label is None else label,
    )


def cv_plus(centre: np.ndarray, reach: np.ndarray, coverage: Fraction) -> tuple[float, float]:
    """The definition, in exact fractions."""
    n, alpha = len(centre), 1 - coverage
    low, high = floor(alpha * (n + 1)), ceil((1 - alpha) * (n + 1))
    return sorted(centre - reach)[low - 1], sorted(centre + reach)[high - 1]


def test_a_case_worked_by_hand() -> None:
    # Two members predict 4.0 and 4.2. Nine residuals, in turn of member 0 and 1: n + 1 = 10. At 80 % coverage
    # floor(2.0) = 2, the second smallest lower end, and ceil(8.0) = 8, the second largest upper end.
    residuals = np.array([0.1, 0.1, 0.2, 0.3, 0.4, 0.5, 0.6, 0.7, 0.8])
    member = np.arange(9) % 2
    # lower ends 3.9 4.1 3.8 3.9 3.6 3.7 3.4 3.5 3.2: 3.2 3.4
    # upper ends 4.1 4.3 4.2 4.5 4.4 4.7 4.6 4.9 4.8: 4.9 4.8
    low, high = calibration(residuals, member).interval(np.array([[4.0], [4.2]]), np.ones(1), np.zeros(1, int), 0.8)
    assert low[0] == pytest.approx(3.4, abs=1e-12)
    assert high[0] == pytest.approx(4.8, abs=1e-12)


@settings(max_examples=200, deadline=None, derandomize=True)
@given(st.integers(40, 400), st.sampled_from(["1/2", "4/5", "9/10", "19/20"]), st.integers(0, 10**6))
def test_the_definition(n: int, level: str, seed: int) -> None:
    coverage = Fraction(level)
    rng = np.random.default_rng(seed)
    scores, strangers = rng.exponential(0.2, n), rng.exponential(0.3, n)
    member = rng.integers(5, size=n)
    by_member = rng.normal(4.5, 0.1, (5, 3))
    scale = rng.uniform(0.5, 2.0, 3)
    c = calibration(scores, member, strangers=strangers)
    low, high = c.interval(by_member, scale, np.zeros(3, int), float(coverage))
    for j in range(3):
        of_each = [cv_plus(by_member[member, j], kind * scale[j], coverage) for kind in (scores, strangers)]
        assert low[j] == pytest.approx(min(a for a, _ in of_each), abs=1e-12)
        assert high[j] == pytest.approx(max(b for _, b in of_each), abs=1e-12)


@pytest.mark.parametrize("n", [42, 97])
@pytest.mark.parametrize("coverage", [0.5, 0.8, 0.9, 0.95])
def test_both_ends_of_a_symmetric_case_are_equally_far(n: int, coverage: float) -> None:
    # The ranks floor(alpha m) and ceil((1 - alpha) m) of m - 1 values mirror each other, in exact arithmetic.
    scores = np.linspace(0.01, 1.0, n)
    c = calibration(scores, np.zeros(n, int), strangers=scores + 0.003)
    low, high = c.interval(np.array([[4.0]]), np.ones(1), np.zeros(1, int), coverage)
    assert 4.0 - low[0] == pytest.approx(high[0] - 4.0, abs=1e-12)


def test_wider_for_more_coverage_and_for_harder_acids() -> None:
    rng = np.random.default_rng(1)
    c = calibration(rng.exponential(0.2, 300), rng.integers(5, size=300))
    by_member = np.full((5, 2), 4.5)
    widths = []
    for coverage in (0.5, 0.8, 0.9, 0.95, 0.99):
        low, high = c.interval(by_member, np.array([1.0, 2.0]), np.zeros(2, int), coverage)
        assert high[1] - low[1] == pytest.approx(2 * (high[0] - low[0]))
        widths.append(high[0] - low[0])
    assert widths == sorted(widths)


def test_each_class_has_its_own_scores() -> None:
    scores = np.concatenate([np.full(100, 0.1), np.full(100, 1.0)])
    label = np.repeat([0, 1], 100)
    c = calibration(scores, np.zeros(200, int), label)
    low, high = c.interval(np.full((1, 2), 4.0), np.ones(2), np.array([0, 1]), 0.9)
    assert high - low == pytest.approx([0.2, 2.0])


def test_a_class_with_too_few_scores_takes_all() -> None:
    scores = np.concatenate([np.full(195, 0.1), np.full(5, 3.0)])
    label = np.repeat([0, 3], [195, 5])
    c = calibration(scores, np.zeros(200, int), label)
    low, high = c.interval(np.full((1, 1), 4.0), np.ones(1), np.array([3]), 0.9)
    assert high - low == pytest.approx([0.2])


@pytest.mark.parametrize("coverage", [0.5, 0.8, 0.9, 0.95])
def test_coverage_of_exchangeable_data(coverage: float) -> None:
    # Ridge regressions on ten folds, heavy-tailed noise whose size depends on x; the scale knows it only roughly.
    rng = np.random.default_rng(int(coverage * 100))
    hits = total = 0
    for _ in range(30):
        x = rng.normal(size=(400, 4))
        size = 0.1 + np.abs(x[:, 0])
        y = x @ [1.0, -0.5, 0.2, 0.0] + size * rng.standard_t(3, 400)
        train, test = slice(0, 200), slice(200, 400)
        fold = rng.permutation(200) % 10
        weights = []
        for k in range(10):
            a, b = x[train][fold != k], y[train][fold != k]
            weights.append(np.linalg.solve(a.T @ a + np.eye(4), a.T @ b))
        predicted = np.array(weights) @ x.T
        scale = 0.3 + 0.7 * size
        residual = np.abs(y[train] - predicted[fold, np.arange(200)]) / scale[train]
        c = calibration(residual, fold)
        low, high = c.interval(predicted[:, test], scale[test], np.zeros(200, int), coverage)
        hits += int(np.sum((low <= y[test]) & (y[test] <= high)))
        total += 200
    share = hits / total
    assert share >= 1 - 2 * (1 - coverage)  # what is guaranteed
    # and what is seen in practice; the calibration sets' own scatter, sd sqrt(a(1-a)/200/30), is below 0.007
    assert share == pytest.approx(coverage, abs=0.03)


def test_expected_error_is_linear_in_the_evidence_with_a_floor() -> None:
    coefficients = np.zeros(len(EVIDENCE))
    coefficients[[0, 1]] = 0.05, 0.2
    evidence = np.zeros((3, len(EVIDENCE)))
    evidence[:, 0] = 1.0, 1.0, 0.0
    evidence[:, 1] = 0.0, 2.0, 0.0
    expected = replace(calibration(np.zeros(0), np.zeros(0, int)), coefficients=coefficients).expected_error(evidence)
    assert expected[:2] == pytest.approx([0.05, 0.45])
    assert expected[2] > 0.0


def test_fitted_scale_finds_what_makes_acids_hard() -> None:
    rng = np.random.default_rng(2)
    evidence = np.column_stack([np.ones(4000), rng.uniform(0, 1, 4000), rng.uniform(0, 1, 4000)])
    size = 0.1 + 0.4 * evidence[:, 1]
    error = np.abs(rng.normal(0, size))  # mean of a half-normal: sqrt(2/pi) of its sd
    found = fit_scale(evidence, error)
    assert np.all(found >= 0)
    assert found == pytest.approx(np.sqrt(2 / np.pi) * np.array([0.1, 0.4, 0.0]), abs=0.02)


def test_the_shipped_calibration_belongs_to_its_acids(model) -> None:  # type: ignore[no-untyped-def]
    c, library = model.calibration, model.library
    assert len(c.scores) == len(library.pka)
    assert set(np.unique(c.label)) <= set(range(len(CLASSES)))
    error = np.abs(library.pka - library.pka_without)
    assert c.scores == pytest.approx(error / library.expected_error, rel=1e-9)
