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

MOST_EXACT = 3000
POINTS = 2000
_ROUNDING = 1e-8  # of the prior variance; keeps the decomposition of nearly equal points positive


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
    left = np.array([covariance(p[None], p[None])[0, 0] for p in points])  # variance not yet told
    least = _ROUNDING * left.max()
    factor = np.empty((POINTS, len(points)))
    chosen: list[int] = []
    while len(chosen) < POINTS and left.max() > least:
        pivot, k = int(left.argmax()), len(chosen)
        row = covariance(points[pivot : pivot + 1], points)[0] - factor[:k, pivot] @ factor[:k]
        factor[k] = row / np.sqrt(left[pivot])
        left = np.maximum(left - factor[k] ** 2, 0.0)
        left[pivot] = 0.0
        chosen.append(pivot)
    found: Floats = points[np.sort(chosen)]
    return found


def fit(
    cross: Floats, among: Floats, lowers: Floats, target: Floats, variance: Floats, ridge: float
) -> tuple[Floats, Floats]:
    """Fit the weights of the points and the non-negative slopes.

    Parameters
    ----------
    cross : ndarray, shape (n, m)
        Prior covariance between edges and points.
    among : ndarray, shape (m, m)
        Prior covariance among the points.
    lowers : ndarray, shape (n, n_lowers)
    target : ndarray, shape (n,)
        Micro pKa less the offset.
    variance : ndarray, shape (n,)
        Of each target, noise included.
    ridge : float
        Added to the fit of the slopes, as in the exact one.

    Returns
    -------
    dual : ndarray, shape (m,)
    slopes : ndarray, shape (n_lowers,)
    """
    from scipy.linalg import cho_factor, cho_solve
    from scipy.optimize import nnls

    weighted = cross / variance[:, None]
    system = among + weighted.T @ cross
    system[np.diag_indices_from(system)] += _ROUNDING * among.diagonal().max()
    solved = cho_factor(system, lower=True)
    both = np.column_stack([-lowers, target])
    # The metric of the process by Woodbury's identity: D^-1 - D^-1 K_su (K_uu + K_us D^-1 K_su)^-1 K_us D^-1.
    seen = weighted.T @ both
    gram = both.T @ (both / variance[:, None]) - seen.T @ cho_solve(solved, seen)
    root = _square_root((gram + gram.T) / 2.0)
    slopes, _ = nnls(
        np.vstack([root[:, :-1], ridge * np.eye(lowers.shape[1])]),
        np.append(root[:, -1], np.zeros(lowers.shape[1])),
    )
    dual: Floats = cho_solve(solved, weighted.T @ (target + lowers @ slopes))
    return dual, slopes


def _square_root(gram: Floats) -> Floats:
    """R with ``R.T @ R`` the given matrix; columns that are constant make it singular, which is no harm here."""
    values, vectors = np.linalg.eigh(gram)
    root: Floats = np.sqrt(np.maximum(values, 0.0))[:, None] * vectors.T
    return root
