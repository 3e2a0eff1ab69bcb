r"""The trend: a linear free-energy relationship with a smooth correction for the scaffold.

.. math:: \mathrm{pKa}(x) = c - \sum_j w_j z_j + g(s), \qquad w_j \ge 0

``z`` are the columns along which the pKa may only fall (withdrawing groups on saturated carbon), ``s`` all other
descriptors, scaled, and ``g`` a Gaussian process with a linear and a Matern 3/2 kernel (Rasmussen & Williams,
Gaussian Processes for Machine Learning, 2006, ch. 2 and 4). The weights are the non-negative least-squares fit in
the metric of the process (Lawson & Hanson, 1974), so that the trend holds by construction: no edit of a withdrawing
group touches ``s``.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from qsar.model.inducing import MOST_EXACT, basis, features, fit, root_of

Floats = NDArray[np.float64]

LEAST_DEVIATION = 0.2
_OFFSET = 4.5  # pKa units; where the trend begins
_RIDGE = 0.05
CLIP = 15.0  # scaled descriptors beyond this many standard deviations are taken as that far out, no further


@dataclass(frozen=True)
class KernelSettings:
    """Settings of the trend.

    Attributes
    ----------
    length : float
        Length scale of the Matern kernel in scaled descriptor space.
    amplitude : float
        Standard deviation of the smooth correction, pKa units.
    linear : float
        Standard deviation of the weight of one scaled descriptor, pKa units.
    noise : float
        Standard deviation of the model error of one edge, pKa units.
    """

    length: float = 12.0
    amplitude: float = 0.8
    linear: float = 0.06
    noise: float = 0.07


@dataclass(frozen=True)
class Scaling:
    """Which descriptors are free (not constrained), and how they are scaled.

    Attributes
    ----------
    mean, scale : ndarray, shape (n_free,)
        A scaled value is ``(x - mean) * scale``; constant columns have scale 0.
    """

    mean: Floats
    scale: Floats

    @classmethod
    def of(cls, free: Floats) -> Scaling:
        """Scaling of the rows of `free`, shape (n, n_free)."""
        deviation = free.std(axis=0)
        # A descriptor that few acids show has a small deviation; the floor keeps it from ruling every distance.
        scale = np.divide(
            1.0, np.maximum(deviation, LEAST_DEVIATION), out=np.zeros_like(deviation), where=deviation > 1e-9
        )
        return cls(free.mean(axis=0), scale)

    def __call__(self, free: Floats) -> Floats:
        """Scaled rows of `free`, clipped; shape (n, n_free)."""
        scaled: Floats = np.clip((free - self.mean) * self.scale, -CLIP, CLIP)
        return scaled


def lengths(a: Floats) -> Floats:
    """Squared length of each row of `a` (n, d); shape (n,)."""
    result: Floats = np.einsum("ij,ij->i", a, a)
    return result


def covariance(a: Floats, b: Floats, settings: KernelSettings, lengths_of_b: Floats | None = None) -> Floats:
    """Prior covariance of the scaffold part between scaled rows `a` (n, d) and `b` (m, d); shape (n, m).

    Parameters
    ----------
    a, b : ndarray
    settings : KernelSettings
    lengths_of_b : ndarray, shape (m,), optional
        What `lengths` gives for `b`, where it is known already.
    """
    product = a @ b.T
    r: Floats = lengths(a)[:, None] + (lengths(b) if lengths_of_b is None else lengths_of_b)[None]
    # From here on in place: of large matrices, making new ones takes longer than reckoning.
    scratch = 2.0 * product
    r -= scratch  # squared distance
    np.maximum(r, 0.0, out=r)
    r *= 3.0
    np.sqrt(r, out=r)
    r /= settings.length
    np.negative(r, out=scratch)
    np.exp(scratch, out=scratch)
    r += 1.0
    r *= settings.amplitude**2
    r *= scratch  # Matern 3/2
    product *= settings.linear**2
    r += product
    r += 1.0
    return r


@dataclass(frozen=True)
class KernelTrend:
    """A fitted trend.

    Attributes
    ----------
    settings : KernelSettings
    scaling : Scaling
    points : ndarray, shape (n_train, n_free)
        Scaled free descriptors of the training edges.
    dual : ndarray, shape (n_train,)
        Weights of the training edges.
    slopes : ndarray, shape (n_lowers,)
        Non-negative weights of the constrained columns.
    offset : float
        pKa at zero.
    """

    settings: KernelSettings
    scaling: Scaling
    points: Floats
    dual: Floats
    slopes: Floats
    offset: float

    def predict(self, free: Floats, lowers: Floats) -> Floats:
        """Micro pKa of edges.

        Parameters
        ----------
        free : ndarray, shape (n, n_free)
        lowers : ndarray, shape (n, n_lowers)

        Returns
        -------
        ndarray, shape (n,)
        """
        k = covariance(self.scaling(free), self.points, self.settings)
        result: Floats = self.offset - lowers @ self.slopes + k @ self.dual
        return result


def basis_points(free: Floats, settings: KernelSettings, scaling: Scaling) -> Floats:
    """Scaled points that trends of these training edges are sums over; see :mod:`qsar.model.inducing`.

    Parameters
    ----------
    free : ndarray, shape (n, n_free)

    Returns
    -------
    ndarray, shape (m, n_free)
        All of them where there are few enough for an exact fit.
    """
    return basis(scaling(free), lambda a, b: covariance(a, b, settings))


def fit_trend(
    free: Floats,
    lowers: Floats,
    target: Floats,
    variance: Floats,
    settings: KernelSettings,
    scaling: Scaling,
    points: Floats | None = None,
) -> KernelTrend:
    """Fit a trend.

    Parameters
    ----------
    free, lowers : ndarray, shape (n, n_free) and (n, n_lowers)
    target : ndarray, shape (n,)
        Micro pKa.
    variance : ndarray, shape (n,)
        Variance of each target, pKa units squared.
    settings : KernelSettings
    scaling : Scaling
    points : ndarray, shape (m, n_free), optional
        From `basis_points`: the trend is fitted over these alone. Without them the fit is exact for up to
        `MOST_EXACT` edges, and beyond over points chosen among the edges.

    Returns
    -------
    KernelTrend
    """
    if points is None and len(free) > MOST_EXACT:
        points = basis_points(free, settings, scaling)
    if points is not None:
        root = root_of(covariance(points, points, settings))
        edges = features(root, covariance(scaling(free), points, settings))
        return fit_over(points, root, edges, lowers, target, variance, settings, scaling)
    from scipy.linalg import cho_solve, cholesky, solve_triangular
    from scipy.optimize import nnls

    points = scaling(free)
    lower = cholesky(covariance(points, points, settings) + np.diag(variance + settings.noise**2), lower=True)
    whitened = solve_triangular(lower, np.column_stack([-lowers, target - _OFFSET]), lower=True)
    # A very small ridge keeps the weights of nearly equal columns from hopping between folds.
    ridge = _RIDGE * np.eye(lowers.shape[1])
    slopes, _ = nnls(np.vstack([whitened[:, :-1], ridge]), np.append(whitened[:, -1], np.zeros(len(ridge))))
    dual = cho_solve((lower, True), target - _OFFSET + lowers @ slopes)
    return KernelTrend(settings, scaling, points, dual, slopes, _OFFSET)


def fit_over(
    points: Floats,
    root: Floats,
    edges: Floats,
    lowers: Floats,
    target: Floats,
    variance: Floats,
    settings: KernelSettings,
    scaling: Scaling,
) -> KernelTrend:
    """Fit a trend over `points` (m, n_free) with their `root` and the edges' features (n, m) from `inducing`."""
    from scipy.linalg import solve_triangular

    weights, slopes = fit(edges, lowers, target - _OFFSET, variance + settings.noise**2, _RIDGE)
    dual = solve_triangular(root, weights, lower=True, trans="T")
    return KernelTrend(settings, scaling, points, dual, slopes, _OFFSET)
