"""Monotone gradient boosting from scikit-learn, kept as plain arrays.

Training uses :class:`sklearn.ensemble.HistGradientBoostingRegressor`; what is stored and evaluated are the nodes of
its trees, so that a bundle needs neither scikit-learn nor pickle.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from functools import cached_property
from typing import Any

import numpy as np
from numpy.typing import NDArray

from qsar.model.lookup import Lookup

Floats = NDArray[np.float64]
Ints = NDArray[np.int32]

_WORTH_TABLES = 100  # rows from which making the tables takes less time than it saves


@dataclass(frozen=True)
class BoostingSettings:
    """Settings of the booster; names as in scikit-learn."""

    max_iter: int = 150
    learning_rate: float = 0.03
    max_leaf_nodes: int = 5
    min_samples_leaf: int = 15
    l2_regularization: float = 5.0
    max_features: float = 0.3


@dataclass(frozen=True)
class Trees:
    """Several boosted ensembles as one flat array of nodes.

    Attributes
    ----------
    feature : ndarray of int, shape (n_nodes,)
        Column that a node splits on; -1 for a leaf.
    threshold : ndarray, shape (n_nodes,)
        Rows with a value at most this go left; for a leaf, its value.
    left, right : ndarray of int, shape (n_nodes,)
        Children, as positions in these arrays; a leaf points to itself.
    root : ndarray of int, shape (n_ensembles, n_trees)
    baseline : ndarray, shape (n_ensembles,)
    depth : int
        Splits on the longest path.
    """

    feature: Ints
    threshold: Floats
    left: Ints
    right: Ints
    root: Ints
    baseline: Floats
    depth: int

    def predict(self, x: Floats, rows_at_once: int = 64) -> Floats:
        """Predictions of each ensemble.

        Parameters
        ----------
        x : ndarray, shape (n, n_columns)
        rows_at_once : int
            Rows that are sent down the trees together; bounds the memory.

        Returns
        -------
        ndarray, shape (n_ensembles, n)
        """
        n_ensembles, n_trees = self.root.shape
        result = np.empty((n_ensembles, len(x)))
        lookup = self._lookup if len(x) >= _WORTH_TABLES else None
        for start in range(0, len(x), rows_at_once):
            block = x[start : start + rows_at_once]
            leaves = self._walk(block) if lookup is None else lookup.leaves(block)
            sums = leaves.reshape(len(block), n_ensembles, n_trees).sum(axis=2)
            result[:, start : start + rows_at_once] = sums.T + self.baseline[:, None]
        return result

    @cached_property
    def _lookup(self) -> Lookup | None:
        return Lookup.of(self)

    def _walk(self, x: Floats) -> Floats:
        """Value of each tree for each row of `x`, shape (n, n_trees)."""
        split_on = np.maximum(self.feature, 0)
        flat = x.ravel()
        offset = (np.arange(len(x)) * x.shape[1])[:, None]
        node = np.broadcast_to(self.root.ravel(), (len(x), self.root.size))
        for _ in range(self.depth):
            goes_left = flat[split_on[node] + offset] <= self.threshold[node]
            node = np.where(goes_left, self.left[node], self.right[node])
        leaves: Floats = self.threshold[node]
        return leaves


def fit_booster(
    x: Floats, y: Floats, weight: Floats, lowers: NDArray[np.bool_], settings: BoostingSettings, seed: int
) -> Any:
    """Fit one booster whose prediction never rises along the columns where `lowers` is true.

    Parameters
    ----------
    x : ndarray, shape (n, n_columns)
    y, weight : ndarray, shape (n,)
    lowers : ndarray of bool, shape (n_columns,)
    settings : BoostingSettings
    seed : int

    Returns
    -------
    sklearn.ensemble.HistGradientBoostingRegressor
    """
    from sklearn.ensemble import HistGradientBoostingRegressor

    return HistGradientBoostingRegressor(
        max_iter=settings.max_iter,
        learning_rate=settings.learning_rate,
        max_leaf_nodes=settings.max_leaf_nodes,
        min_samples_leaf=settings.min_samples_leaf,
        l2_regularization=settings.l2_regularization,
        max_features=settings.max_features,
        monotonic_cst=np.where(lowers, -1, 0),
        early_stopping=False,
        random_state=seed,
    ).fit(x, y, sample_weight=weight)


def trees_of(boosters: Sequence[Any]) -> Trees:
    """Copy the nodes of fitted boosters (all with the same number of iterations) into arrays."""
    feature, threshold, left, right, roots, depth = [], [], [], [], [], 0
    base = 0
    for booster in boosters:
        mine = []
        for (predictor,) in booster._predictors:
            nodes = predictor.nodes
            leaf = nodes["is_leaf"].astype(bool)
            own = np.arange(len(nodes))
            feature.append(np.where(leaf, -1, nodes["feature_idx"]))
            threshold.append(np.where(leaf, nodes["value"], nodes["num_threshold"]))
            left.append(np.where(leaf, own, nodes["left"]) + base)
            right.append(np.where(leaf, own, nodes["right"]) + base)
            mine.append(base)
            base += len(nodes)
            depth = max(depth, int(nodes["depth"].max()))
        roots.append(mine)
    return Trees(
        np.concatenate(feature).astype(np.int32),
        np.concatenate(threshold).astype(np.float64),
        np.concatenate(left).astype(np.int32),
        np.concatenate(right).astype(np.int32),
        np.array(roots, dtype=np.int32),
        np.array([float(np.ravel(b._baseline_prediction)[0]) for b in boosters]),
        depth,
    )
