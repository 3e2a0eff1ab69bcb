r"""How far a new edge is from the measured ones, in units of the pKa.

Distance weighs each descriptor by how strongly the fitted trend responds to it:

.. math:: d(x, y) = \sqrt{\sum_j w_j^2 (x_j - y_j)^2}

with :math:`w_j` the root mean square slope of the trend along descriptor j over the training edges. Two acids at a
distance of 0.4 so differ in ways that are worth about 0.4 pKa units in all.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property

import numpy as np
from numpy.typing import NDArray

from qsar.descriptors import LOWERS
from qsar.model.kernel import lengths
from qsar.model.members import Members

Floats = NDArray[np.float64]
Ints = NDArray[np.int64]
_TOO_CLOSE = 1e-6
_BLOCK = 32


def sensitivities(members: Members, free: Floats, lowers: Floats) -> Floats:
    """Root mean square slope of the mean trend along each scaled free and each raw constrained descriptor.

    Returns
    -------
    ndarray, shape (n_free + n_lowers,)
        pKa units per scaled unit (free), per unit (constrained).
    """
    s, points = members.settings.kernel, members.points
    scaled = members.scaling(free)
    dual = members.dual.mean(axis=0)
    squared = (
        np.einsum("ij,ij->i", scaled, scaled)[:, None]
        + np.einsum("ij,ij->i", points, points)[None]
        - 2.0 * scaled @ points.T
    )
    decay = np.exp(-np.sqrt(3.0 * np.maximum(squared, 0.0)) / s.length) * dual[None]
    gradient = -3.0 * s.amplitude**2 / s.length**2 * (decay.sum(axis=1)[:, None] * scaled - decay @ points)
    gradient += s.linear**2 * (dual @ points)[None]
    free_part: Floats = np.sqrt(np.mean(gradient**2, axis=0))
    return np.concatenate([free_part, members.slopes.mean(axis=0)])


@dataclass(frozen=True)
class Neighbours:
    """The measured steps as points in weighted descriptor space.

    Attributes
    ----------
    weights : ndarray, shape (n_free + n_lowers,)
    points : ndarray, shape (n_steps, n_free + n_lowers)
        Weighted coordinates of the dominant edge of each measured step.
    """

    weights: Floats
    points: Floats

    @classmethod
    def of(cls, members: Members, x: Floats) -> Neighbours:
        """Neighbours at the dominant edges `x`, shape (n_steps, n_descriptors)."""
        weights = sensitivities(members, x[:, ~LOWERS], x[:, LOWERS])
        return cls(weights, coordinates(members, weights, x))

    @cached_property
    def _lengths(self) -> Floats:
        return lengths(self.points)

    def distances(self, members: Members, x: Floats) -> Floats:
        """Distance of each row of `x` (n, n_descriptors) to each measured step; shape (n, n_steps)."""
        query = coordinates(members, self.weights, x)
        squared: Floats = lengths(query)[:, None] + self._lengths[None]
        squared -= 2.0 * query @ self.points.T
        # Where the difference of large numbers is all that is left, take the differences themselves.
        close = squared < _TOO_CLOSE
        if close.any():
            row, column = np.nonzero(close)
            squared[row, column] = np.sum((query[row] - self.points[column]) ** 2, axis=1)
        return np.sqrt(squared, out=squared)


def nearest(distances: Floats, count: int) -> Ints:
    """Columns of the smallest distances of each row, nearest first, of equal ones the first.

    Parameters
    ----------
    distances : ndarray, shape (n, n_steps)
    count : int

    Returns
    -------
    ndarray of int, shape (n, min(count, n_steps))
    """
    n, m = distances.shape
    blocks = m // _BLOCK
    if blocks <= count:
        return np.argsort(distances, axis=1, kind="stable")[:, :count]
    # No more than a few of a row are as small as the count-th smallest of the smallest of `blocks` blocks, which takes
    # far less time to find than the count-th smallest of all.
    smallest = distances[:, : _BLOCK * blocks].reshape(n, _BLOCK, blocks).min(axis=1)
    enough = np.partition(smallest, count - 1, axis=1)[:, count - 1]
    row, column = np.divmod(np.flatnonzero(distances <= enough[:, None]), m)
    order = np.lexsort((column, distances[row, column], row))
    first = np.searchsorted(row, np.arange(n))
    result: Ints = column[order[first[:, None] + np.arange(count)]]
    return result


def coordinates(members: Members, weights: Floats, x: Floats) -> Floats:
    """Weighted coordinates of edges, shape (n, n_free + n_lowers)."""
    free = members.scaling(x[:, ~LOWERS])
    result: Floats = np.hstack([free, x[:, LOWERS]]) * weights
    return result
