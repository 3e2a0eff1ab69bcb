r"""The trend of large tables, from well-chosen points instead of all.

The exact Gaussian process takes time in proportion to the cube of the number of edges. Beyond :data:`MOST_EXACT` the
smooth correction is a sum over m points u only (subset of regressors; Rasmussen & Williams, Gaussian Processes for
Machine Learning, 2006, section 8.3.1):

.. math:: g(s) = \sum_j a_j k(s, u_j), \qquad a = (K_{uu} + K_{us} D^{-1} K_{su})^{-1} K_{us} D^{-1} r

with D the variances and r what the constrained columns leave. The points are those that a Cholesky decomposition of
the covariance with the largest pivot first takes (Fine & Scheinberg, J. Mach. Learn. Res. 2001, 2, 243): each is the
edge that the points before it tell least about. They depend on the descriptors alone, not on what was measured. The
weights of the constrained columns stay the non-negative least-squares fit in the metric of the (approximate) process,
so that the trend holds by construction here too.
"""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

if TYPE_CHECKING:
    from collections.abc import Callable

Floats = NDArray[np.float64]
Ints = NDArray[np.int64]

MOST_EXACT = 3000
POINTS = 2000
_ROUNDING = 1e-8  # of the prior variance; a point that adds less repeats others
_JITTER = 1e-10  # of the prior variance; keeps the factor of nearly equal points positive
_ROWS_AT_ONCE = 2000  # edges that are weighted together; bounds the memory beside the covariance itself


def basis(points: Floats, covariance: Callable[[Floats, Floats], Floats]) -> Floats:
    """The points that the trend is a sum over: all of them, or `POINTS` of more than `MOST_EXACT`.

    Parameters
    ----------
    points : ndarray, shape (n, d)
        Scaled free descriptors of all training edges.
    covariance : callable
        Prior covariance between the rows of two such arrays.

    Returns
    -------
    ndarray, shape (m, d)
    """
    if len(points) <= MOST_EXACT:
        return points
    found: Floats = points[np.sort(pivots(points, covariance, POINTS))]
    return found


def pivots(points: Floats, covariance: Callable[[Floats, Floats], Floats], most: int) -> Ints:
    """Rows that a Cholesky decomposition of the covariance takes, each the one that those before it tell least about.

    Parameters
    ----------
    points : ndarray, shape (n, d)
    covariance : callable
        As in `basis`.
    most : int
        How many are wanted.

    Returns
    -------
    ndarray of int, shape (m,)
        In the order taken; fewer than `most` where the rest repeats what is there already.

    Raises
    ------
    ValueError
        If a descriptor is not a finite number.
    """
    wrong = np.flatnonzero(~np.isfinite(points).all(axis=1))
    if len(wrong):
        raise ValueError(f"row {wrong[0]} holds a descriptor that is not a finite number")
    left = np.array([covariance(p[None], p[None])[0, 0] for p in points])  # variance not yet told
    least = _ROUNDING * left.max()
    most = min(most, len(points))
    factor = np.empty((most, len(points)))
    chosen: list[int] = []
    while len(chosen) < most and left.max() > least:
        pivot, k = int(left.argmax()), len(chosen)
        row = covariance(points[pivot : pivot + 1], points)[0] - factor[:k, pivot] @ factor[:k]
        factor[k] = row / np.sqrt(left[pivot])
        left = np.maximum(left - factor[k] ** 2, 0.0)
        left[pivot] = 0.0
        chosen.append(pivot)
    return np.array(chosen, dtype=np.int64)


def root_of(among: Floats) -> Floats:
    """Lower Cholesky factor of the prior covariance among the points, shape (m, m).

    Raises
    ------
    numpy.linalg.LinAlgError
        If a point repeats others; those of `basis` never do.
    """
    from scipy.linalg import cholesky

    raised = among.copy()
    raised[np.diag_indices_from(raised)] += _JITTER * among.diagonal().max()
    root: Floats = cholesky(raised, lower=True, overwrite_a=True)
    return root


def features(root: Floats, cross: Floats) -> Floats:
    """Edges as features in which the prior is a sum with independent weights of variance 1.

    Parameters
    ----------
    root : ndarray, shape (m, m)
        From `root_of`.
    cross : ndarray, shape (n, m)
        Prior covariance between edges and points; its memory is used for the result.

    Returns
    -------
    ndarray, shape (n, m)
    """
    from scipy.linalg import solve_triangular

    found: Floats = solve_triangular(root, cross.T, lower=True, overwrite_b=True).T
    return found


def fit(edges: Floats, lowers: Floats, target: Floats, variance: Floats, ridge: float) -> tuple[Floats, Floats]:
    """Fit the weights of the features and the non-negative slopes.

    Parameters
    ----------
    edges : ndarray, shape (n, m)
        From `features`.
    lowers : ndarray, shape (n, n_lowers)
    target : ndarray, shape (n,)
        Micro pKa less the offset.
    variance : ndarray, shape (n,)
        Of each target, noise included.
    ridge : float
        Added to the fit of the slopes, as in the exact one.

    Returns
    -------
    weights : ndarray, shape (m,)
    slopes : ndarray, shape (n_lowers,)

    Raises
    ------
    ValueError
        If a variance is not positive.
    """
    wrong = np.flatnonzero(~(variance > 0.0))
    if len(wrong):
        raise ValueError(f"variance of target {wrong[0]} is {variance[wrong[0]]:g}, not positive")
    from scipy.linalg import cho_factor, cho_solve
    from scipy.optimize import nnls

    both = np.column_stack([-lowers, target])
    system, seen = np.eye(edges.shape[1]), np.zeros((edges.shape[1], both.shape[1]))
    for start in range(0, len(edges), _ROWS_AT_ONCE):
        rows = slice(start, start + _ROWS_AT_ONCE)
        half = edges[rows] / np.sqrt(variance[rows])[:, None]
        system += half.T @ half  # a matrix times itself: half the work of two
        seen += half.T @ (both[rows] / np.sqrt(variance[rows])[:, None])
    solved = cho_factor(system, lower=True, overwrite_a=True)
    # The metric of the process by Woodbury's identity, with V the features: D^-1 - D^-1 V (1 + V' D^-1 V)^-1 V' D^-1.
    gram = both.T @ (both / variance[:, None]) - seen.T @ cho_solve(solved, seen)
    root = _square_root((gram + gram.T) / 2.0)
    slopes, _ = nnls(
        np.vstack([root[:, :-1], ridge * np.eye(lowers.shape[1])]),
        np.append(root[:, -1], np.zeros(lowers.shape[1])),
    )
    weights: Floats = cho_solve(solved, seen[:, -1] - seen[:, :-1] @ slopes)
    return weights, slopes


def _square_root(gram: Floats) -> Floats:
    """R with ``R.T @ R`` the given matrix; columns that are constant make it singular, which is no harm here."""
    values, vectors = np.linalg.eigh(gram)
    root: Floats = np.sqrt(np.maximum(values, 0.0))[:, None] * vectors.T
    return root
