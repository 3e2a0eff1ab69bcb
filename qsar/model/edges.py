"""The edges of one table, for trends that are fitted to parts of them one after the other.

Small tables are fitted exactly. Of large ones (see :mod:`qsar.model.inducing`) what the points tell of all edges is
reckoned once, and every fit takes its rows of it.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property

import numpy as np
from numpy.typing import NDArray

from qsar.descriptors import LOWERS
from qsar.model.inducing import features, root_of
from qsar.model.kernel import KernelSettings, KernelTrend, Scaling, covariance, fit_over, fit_trend

Floats = NDArray[np.float64]
Ints = NDArray[np.int64]

_ROWS_AT_ONCE = 2000  # of the covariance, so that only one matrix of its size is held


@dataclass(frozen=True, eq=False)
class Edges:
    """Edges with the scaling and the points of all their trends.

    Attributes
    ----------
    x : ndarray, shape (n_edges, n_descriptors)
    settings : KernelSettings
    scaling : Scaling
    points : ndarray, shape (m, n_free), or None
        Scaled points that the trends are sums over; None for exact fits.
    """

    x: Floats
    settings: KernelSettings
    scaling: Scaling
    points: Floats | None = None

    @cached_property
    def _free(self) -> Floats:
        return self.x[:, ~LOWERS]

    @cached_property
    def _lowers(self) -> Floats:
        return self.x[:, LOWERS]

    @cached_property
    def _root(self) -> Floats:
        assert self.points is not None
        return root_of(covariance(self.points, self.points, self.settings))

    @cached_property
    def _features(self) -> Floats:
        """Features of all edges, shape (n_edges, m)."""
        assert self.points is not None
        cross = np.empty((len(self.x), len(self.points)))
        for start in range(0, len(cross), _ROWS_AT_ONCE):
            rows = slice(start, start + _ROWS_AT_ONCE)
            cross[rows] = covariance(self.scaling(self._free[rows]), self.points, self.settings)
        return features(self._root, cross)

    def fit(self, edge: Ints, value: Floats, variance: Floats) -> KernelTrend:
        """Fit a trend to some edges.

        Parameters
        ----------
        edge : ndarray of int, shape (n,)
            Positions among the edges; one may stand there more than once.
        value, variance : ndarray, shape (n,)
            Micro pKa and its variance.
        """
        lowers, settings, scaling = self._lowers[edge], self.settings, self.scaling
        if self.points is None:
            return fit_trend(self._free[edge], lowers, value, variance, settings, scaling)
        own = self._features[edge]
        return fit_over(self.points, self._root, own, lowers, value, variance, settings, scaling)

    def predict(self, trend: KernelTrend, edge: Ints | None = None) -> Floats:
        """Micro pKa of some edges, or of all, by a trend that `fit` made.

        Returns
        -------
        ndarray, shape (n,)
        """
        rows = slice(None) if edge is None else edge
        if self.points is None:
            return trend.predict(self._free[rows], self._lowers[rows])
        smooth = self._features[rows] @ (self._root.T @ trend.dual)
        found: Floats = trend.offset - self._lowers[rows] @ trend.slopes + smooth
        return found
