r"""Leverage of measured steps: how far each stands from the middle of the descriptors.

.. math:: h_i = x_i^T (X^T X)^{+} x_i

with the scaled descriptors of the dominant edges and a column of ones. A step with h above 3 p'/n, p' the rank of X,
pulls the fit towards itself (Williams plot; Gramatica, QSAR Comb. Sci. 2007, 26, 694).
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from qsar.model.kernel import Scaling
from qsar.model.model import Model
from qsar.model.training_set import TrainingSet

Floats = NDArray[np.float64]


@dataclass(frozen=True, eq=False)
class Leverage:
    """Leverages of the measured steps, shape (n_steps,), the warning level and the rank of the descriptors."""

    values: Floats
    warning: float
    rank: int


def leverage(x: Floats) -> Leverage:
    """Leverages of the rows of a descriptor matrix.

    Parameters
    ----------
    x : ndarray, shape (n, n_descriptors)

    Returns
    -------
    Leverage
        Values between 0 and 1 that add up to the rank.
    """
    matrix = np.column_stack([np.ones(len(x)), Scaling.of(x)(x)])
    left, singular, _ = np.linalg.svd(matrix, full_matrices=False)
    rank = int(np.sum(singular > singular[0] * 1e-8))
    values: Floats = np.sum(left[:, :rank] ** 2, axis=1)
    return Leverage(values, 3.0 * rank / len(x), rank)


def leverage_of(model: Model, data: TrainingSet) -> Leverage:
    """Leverages of the dominant edges of the measured steps."""
    return leverage(data.x[data.dominant_edges(model.micro(data.x).mean(axis=0))])
