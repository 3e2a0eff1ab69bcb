"""Leverage against the closed form for a straight line."""

from __future__ import annotations

import numpy as np
import pytest

from qsar.validation.leverage import leverage


def test_leverage_on_a_line() -> None:
    """Textbook (Draper & Smith, Applied Regression Analysis): h = 1/n + (x - mean)^2 / sum (x - mean)^2."""
    x = np.array([0.0, 1.0, 2.0, 3.0, 6.0])
    found = leverage(x[:, None])
    expected = 1 / 5 + (x - x.mean()) ** 2 / np.sum((x - x.mean()) ** 2)
    assert found.values == pytest.approx(expected, abs=1e-12)
    assert found.rank == 2
    assert found.warning == pytest.approx(3 * 2 / 5)


def test_columns_that_repeat_each_other_count_once() -> None:
    x = np.random.default_rng(0).normal(size=(30, 3))
    found = leverage(np.column_stack([x, x[:, 0] * 2.0, np.ones(30)]))
    assert found.rank == 4
    assert found.values.sum() == pytest.approx(4.0, abs=1e-9)
