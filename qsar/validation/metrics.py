"""Figures of merit, each with the number of values behind it."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]
LEVELS = (0.5, 0.8, 0.9, 0.95)


@dataclass(frozen=True)
class Errors:
    """Errors of a set of predictions, pKa units.

    Attributes
    ----------
    n : int
    mean_absolute, median_absolute, root_mean_square, bias : float
        NaN where n is 0; `bias` is predicted - measured.
    r2 : float
        1 - sum of squared errors / sum of squares about the mean of the measured values.
    """

    n: int
    mean_absolute: float
    median_absolute: float
    root_mean_square: float
    bias: float
    r2: float

    @classmethod
    def of(cls, measured: Floats, predicted: Floats) -> Errors:
        """Errors of `predicted` against `measured`, both of shape (n,)."""
        n = len(measured)
        if n == 0:
            return cls(0, *[float("nan")] * 5)
        error = predicted - measured
        absolute = np.abs(error)
        spread = float(np.sum((measured - measured.mean()) ** 2))
        return cls(
            n,
            float(absolute.mean()),
            float(np.median(absolute)),
            float(np.sqrt(np.mean(error**2))),
            float(error.mean()),
            1.0 - float(np.sum(error**2)) / spread if spread > 0 else float("nan"),
        )


@dataclass(frozen=True)
class Coverage:
    """How many of n values their intervals hold, and what chance alone allows at that level."""

    level: float
    n: int
    held: int
    low: float
    high: float

    @property
    def share(self) -> float:
        """Fraction held; NaN for no values."""
        return self.held / self.n if self.n else float("nan")

    @property
    def within(self) -> bool:
        """Whether the fraction lies in the binomial 95 % band of its level."""
        return self.n > 0 and self.low <= self.share <= self.high

    @classmethod
    def of(cls, level: float, held: NDArray[np.bool_]) -> Coverage:
        """Coverage from flags, shape (n,)."""
        low, high = binomial_band(level, len(held))
        return cls(level, len(held), int(np.sum(held)), low, high)


def binomial_band(p: float, n: int, confidence: float = 0.95) -> tuple[float, float]:
    """Central band of the fraction of n independent trials that succeed with probability p.

    Returns
    -------
    low, high : float
        Fractions; 0 and 1 for n = 0.
    """
    from scipy.stats import binom

    if n == 0:
        return 0.0, 1.0
    low, high = binom.interval(confidence, n, p)
    return float(low) / n, float(high) / n


def bootstrap(
    statistic: Callable[[NDArray[np.int64]], float],
    groups: NDArray[np.int64],
    repeats: int = 2000,
    seed: int = 0,
) -> Floats:
    """Values of a statistic over resampled groups (Efron & Tibshirani 1993).

    Parameters
    ----------
    statistic : callable
        Takes row numbers, returns a number.
    groups : ndarray of int, shape (n,)
        Group (acid) of each row; a group is drawn whole, so that steps of one acid stay together.
    repeats, seed : int

    Returns
    -------
    ndarray, shape (repeats,)
        Sorted, without the repeats where the statistic is not a number.
    """
    rng = np.random.default_rng(seed)
    names, position = np.unique(groups, return_inverse=True)
    ordered = np.argsort(position, kind="stable")  # the rows group by group
    size = np.bincount(position, minlength=len(names))
    first = np.cumsum(size) - size
    values = np.empty(repeats)
    for r in range(repeats):
        drawn = rng.integers(len(names), size=len(names))
        end = np.cumsum(size[drawn])
        values[r] = statistic(ordered[np.arange(end[-1]) + np.repeat(first[drawn] - end + size[drawn], size[drawn])])
    return np.sort(values[np.isfinite(values)])


def ratio_of_means(error: Floats, above: NDArray[np.bool_], rows: NDArray[np.int64]) -> float:
    """Mean of the absolute errors where `above` over that where not, among `rows`; NaN if either is empty."""
    chosen, flags = np.abs(error[rows]), above[rows]
    if flags.all() or not flags.any():
        return float("nan")
    return float(chosen[flags].mean() / chosen[~flags].mean())
