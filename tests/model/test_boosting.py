"""Stored trees against scikit-learn's own prediction, and the constraint."""

from __future__ import annotations

import numpy as np
import pytest

from qsar.model.boosting import BoostingSettings, fit_booster, trees_of

SETTINGS = BoostingSettings(max_iter=25, max_leaf_nodes=6, min_samples_leaf=5)
LOWERS = np.array([True, True, False, False, False])


def data(n: int, seed: int) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    rng = np.random.default_rng(seed)
    x = rng.normal(size=(n, len(LOWERS)))
    x[:, 3] = np.round(x[:, 3])  # ties, as counts have
    y = -x[:, 0] + np.sin(2 * x[:, 2]) + 0.5 * x[:, 3] + 0.2 * rng.normal(size=n)
    return x, y, rng.uniform(0.1, 1.0, n)


@pytest.fixture(scope="module")
def boosters() -> list:  # type: ignore[type-arg]
    return [fit_booster(*data(300, s), LOWERS, SETTINGS, s) for s in (1, 2, 3)]


def test_arrays_predict_what_scikit_learn_predicts(boosters: list) -> None:  # type: ignore[type-arg]
    trees = trees_of(boosters)
    new = np.vstack([data(500, 9)[0], 10 * data(50, 10)[0], data(300, 1)[0]])  # also far out, and on thresholds
    expected = np.array([b.predict(new) for b in boosters])
    assert np.abs(trees.predict(new) - expected).max() <= 1e-9


@pytest.mark.parametrize("rows_at_once", [1, 7, 64, 10_000])
def test_rows_do_not_depend_on_their_block(boosters: list, rows_at_once: int) -> None:  # type: ignore[type-arg]
    trees = trees_of(boosters)
    new = data(130, 11)[0]
    assert np.array_equal(trees.predict(new, rows_at_once), trees.predict(new))
    assert np.array_equal(trees.predict(new[:1]), trees.predict(new)[:, :1])


def test_nothing_to_predict(boosters: list) -> None:  # type: ignore[type-arg]
    assert trees_of(boosters).predict(np.empty((0, len(LOWERS)))).shape == (3, 0)


def test_prediction_never_rises_along_constrained_columns(boosters: list) -> None:  # type: ignore[type-arg]
    trees = trees_of(boosters)
    low = data(400, 12)[0]
    high = low.copy()
    high[:, LOWERS] += np.random.default_rng(13).uniform(0, 4, (400, int(LOWERS.sum())))
    assert np.all(trees.predict(high) <= trees.predict(low) + 1e-9)


def test_the_same_seed_gives_the_same_trees() -> None:
    first, second, other = (trees_of([fit_booster(*data(300, 1), LOWERS, SETTINGS, s)]) for s in (5, 5, 6))
    for name in ("feature", "threshold", "left", "right", "root", "baseline"):
        assert np.array_equal(getattr(first, name), getattr(second, name))
    assert not (first.threshold.shape == other.threshold.shape and np.array_equal(first.threshold, other.threshold))


def test_nodes_point_to_nodes_of_their_own_ensemble(boosters: list) -> None:  # type: ignore[type-arg]
    trees = trees_of(boosters)
    leaf = trees.feature < 0
    nodes = np.arange(len(trees.feature))
    assert np.array_equal(trees.left[leaf], nodes[leaf])
    assert np.array_equal(trees.right[leaf], nodes[leaf])
    assert trees.feature.max() < len(LOWERS)
    bounds = np.append(trees.root[:, 0], len(nodes))
    for k in range(3):
        own = slice(bounds[k], bounds[k + 1])
        for child in (trees.left[own], trees.right[own]):
            assert child.min() >= bounds[k] and child.max() < bounds[k + 1]


def test_the_shipped_model_s_trees_are_constrained(model) -> None:  # type: ignore[no-untyped-def]
    from qsar.descriptors import LOWERS as columns

    trees = model.members.trees
    rng = np.random.default_rng(0)
    low = np.abs(rng.normal(size=(200, len(columns))))
    high = low.copy()
    high[:, columns] += rng.uniform(0, 2, (200, int(columns.sum())))
    assert np.all(trees.predict(high) <= trees.predict(low) + 1e-9)
    assert np.all(model.members.slopes >= 0.0)
