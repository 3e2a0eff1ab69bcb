r"""Prediction intervals from out-of-fold errors.

CV+ (Barber, Candes, Ramdas & Tibshirani, Ann. Stat. 2021, 49, 486) with normalised residuals: for a new acid x the
interval at level :math:`1-\alpha` lies between the :math:`\alpha`-quantiles of

.. math:: \hat f_{-k(i)}(x) \pm r_i\, s(x), \qquad r_i = |y_i - \hat f_{-k(i)}(x_i)| / s(x_i)

over the measured steps i of the same class. A new acid is sometimes an analogue of measured ones and sometimes a
stranger, so every measured step gives two scores: one with its acid left out among others drawn at random, one with
all its near analogues left out too. Each kind of score gives an interval, and the one that is told holds both, so
that it is right for analogues and for strangers, not only for their mixture. The guarantee of each is marginal: at
least :math:`1 - 2\alpha` of exchangeable acids, in practice close to :math:`1-\alpha`. The scale s is the expected
error, a non-negative linear function of evidence of difficulty fitted to the out-of-fold errors, which makes intervals
differ between easy and hard acids.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]
Ints = NDArray[np.int64]

#: Classes whose scores are kept apart.
CLASSES = (
    "monobasic",
    "first of two",
    "second of two",
    "zwitterion",
    "first of three or more",
    "later of three or more",
)
#: Acids with three or more COOH are few and much alike, so they take the scores of dibasic acids too; not the reverse,
#: because the second step of a dibasic acid errs more than their later steps.
_BORROWS = {4: (1, 4), 5: (2, 5)}
EVIDENCE = (
    "constant",
    "nearest distance",
    "mean of three",
    "errors near by",
    "booster",
    "closure defect",
    "sparse groups",
)
_LEAST_OF_CLASS = 40


@dataclass(frozen=True)
class Calibration:
    """What turns evidence into an interval.

    Attributes
    ----------
    coefficients : ndarray, shape (n_evidence,)
        Expected absolute error per unit of evidence.
    scores : ndarray, shape (n_steps,)
        Normalised absolute out-of-fold residuals.
    stranger_scores : ndarray, shape (n_steps,)
        The same with the acid's near analogues left out too.
    member : ndarray of int, shape (n_steps,)
        Member that never saw the step's acid.
    label : ndarray of int, shape (n_steps,)
        Position in `CLASSES`.
    """

    coefficients: Floats
    scores: Floats
    stranger_scores: Floats
    member: Ints
    label: Ints

    def expected_error(self, evidence: Floats) -> Floats:
        """Expected absolute error of steps from their evidence (n, n_evidence); shape (n,)."""
        result: Floats = np.maximum(evidence @ self.coefficients, 0.02)
        return result

    def interval(self, by_member: Floats, scale: Floats, label: Ints, coverage: float) -> tuple[Floats, Floats]:
        """Lower and upper ends.

        Parameters
        ----------
        by_member : ndarray, shape (n_members, n)
            Each member's pKa.
        scale : ndarray, shape (n,)
            Expected error.
        label : ndarray of int, shape (n,)
        coverage : float
            In (0, 1).

        Returns
        -------
        low, high : ndarray, shape (n,)
        """
        low, high = np.empty(len(scale)), np.empty(len(scale))
        for value in np.unique(label):
            rows = np.flatnonzero(label == value)
            used = np.flatnonzero(np.isin(self.label, _BORROWS.get(int(value), (int(value),))))
            if len(used) < _LEAST_OF_CLASS:
                used = np.arange(len(self.scores))
            centre = by_member[:, rows].T[:, self.member[used]]
            low[rows], high[rows] = np.inf, -np.inf
            for scores in (self.scores, self.stranger_scores):
                reach = scale[rows][:, None] * scores[used]
                low[rows] = np.minimum(low[rows], _order_statistic(centre - reach, 1.0 - coverage, upper=False))
                high[rows] = np.maximum(high[rows], _order_statistic(centre + reach, coverage, upper=True))
        return low, high


def _order_statistic(values: Floats, fraction: float, *, upper: bool) -> Floats:
    """The order statistic that CV+ asks for, along the last axis; `values` are reordered."""
    n = values.shape[-1]
    rank = int(np.ceil(fraction * (n + 1) - 1e-9)) - 1 if upper else int(np.floor(fraction * (n + 1) + 1e-9)) - 1
    rank = min(max(rank, 0), n - 1)
    values.partition(rank, axis=-1)
    result: Floats = values[..., rank]
    return result


def fit_scale(evidence: Floats, error: Floats) -> Floats:
    """Non-negative coefficients of the expected error.

    Parameters
    ----------
    evidence : ndarray, shape (n, n_evidence)
    error : ndarray, shape (n,)
        Absolute out-of-fold errors.

    Returns
    -------
    ndarray, shape (n_evidence,)
        Fitted three times with rows weighted by the inverse of the expected error, so that large errors do not
        decide alone.
    """
    from scipy.optimize import nnls

    error = np.minimum(error, np.quantile(error, 0.99))
    expected = np.full(len(error), error.mean())
    coefficients = np.zeros(evidence.shape[1])
    for _ in range(3):
        coefficients, _ = nnls(evidence / expected[:, None], error / expected)
        expected = np.maximum(evidence @ coefficients, 0.03)
    return coefficients
