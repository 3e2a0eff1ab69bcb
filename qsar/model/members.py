"""The ensemble: for each fold a trend and a booster that never saw the fold's acids.

One member a fold makes the ensemble, and each acid has exactly one member that was fitted without it, so that
out-of-fold predictions, CV+ intervals and the spread all come from the same fits.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass, field
from functools import cached_property

import numpy as np
from numpy.typing import NDArray

from qsar.descriptors import LOWERS
from qsar.model.boosting import BoostingSettings, Trees, fit_booster, trees_of
from qsar.model.edges import Edges
from qsar.model.inducing import MOST_EXACT
from qsar.model.kernel import KernelSettings, KernelTrend, Scaling, basis_points, covariance, lengths
from qsar.model.training_set import Targets, TrainingSet, latent_targets

Floats = NDArray[np.float64]
Ints = NDArray[np.int64]

START_NEUTRAL = 4.3  # where the latent micro constants begin; two rounds later nothing is left of it


@dataclass(frozen=True)
class Settings:
    """Everything that decides the outcome of a training besides the table.

    Attributes
    ----------
    folds : int
        Members of the ensemble; acids are dealt out to them by `seed`.
    inner_folds : int
        Folds within a member by which the booster sees honest residuals of the trend.
    rounds : int
        Rounds of the latent micro constants.
    largest_residual : float
        Residuals of the trend beyond this many pKa units are taken as that large, so that a few odd acids do not
        bend the booster.
    """

    folds: int = 10
    inner_folds: int = 6
    rounds: int = 3
    largest_residual: float = 0.4
    seed: int = 1
    kernel: KernelSettings = field(default_factory=KernelSettings)
    boosting: BoostingSettings = field(default_factory=BoostingSettings)


@dataclass(frozen=True)
class Members:
    """The fitted ensemble as arrays.

    Attributes
    ----------
    settings : Settings
    scaling : Scaling
    points : ndarray, shape (n_points, n_free)
        Scaled free descriptors of the training edges, of large tables a part of them.
    dual : ndarray, shape (n_members, n_points)
    slopes : ndarray, shape (n_members, n_lowers)
    offset : float
    trees : Trees
        One ensemble a member.
    """

    settings: Settings
    scaling: Scaling
    points: Floats
    dual: Floats
    slopes: Floats
    offset: float
    trees: Trees

    @cached_property
    def _lengths(self) -> Floats:
        return lengths(self.points)

    def predict(self, x: Floats) -> tuple[Floats, Floats]:
        """Micro pKa by each member.

        Parameters
        ----------
        x : ndarray, shape (n, n_descriptors)

        Returns
        -------
        trend, boosted : ndarray, shape (n_members, n)
            The trend alone and the booster's correction.
        """
        free, lowers = x[:, ~LOWERS], x[:, LOWERS]
        k = covariance(self.scaling(free), self.points, self.settings.kernel, self._lengths)
        trend = self.offset - self.slopes @ lowers.T + self.dual @ k.T
        return trend, self.trees.predict(x)


def fold_of_acids(n_acids: int, settings: Settings) -> Ints:
    """Fold of each acid, balanced and drawn from the seed; shape (n_acids,)."""
    order = np.random.default_rng(settings.seed).permutation(n_acids)
    fold = np.empty(n_acids, dtype=np.int64)
    fold[order] = np.arange(n_acids) % settings.folds
    return fold


@dataclass(frozen=True)
class Member:
    """One fitted member: weights of all training edges, slopes, offset and a scikit-learn booster."""

    dual: Floats
    slopes: Floats
    offset: float
    booster: object


def fit_member(
    data: TrainingSet,
    scaling: Scaling,
    wanted: NDArray[np.bool_],
    settings: Settings,
    seed: int,
    points: Floats | None = None,
) -> Member:
    """Fit trend and booster on the wanted measurements.

    Parameters
    ----------
    data : TrainingSet
    scaling : Scaling
    wanted : ndarray of bool, shape (n_steps,)
    settings : Settings
    seed : int
        For the booster and the inner folds.
    points : ndarray, shape (n_points, n_free), optional
        What `basis_points` finds, where it has been asked already; used for large tables only.
    """
    import scipy.linalg  # noqa: F401 - its threads are limited too, from the first fit on
    from threadpoolctl import threadpool_limits

    with threadpool_limits(1):  # sums in one order, so that the arrays do not depend on the number of threads
        return _fit_member(data, scaling, wanted, settings, seed, points)


def converged_trend(
    data: TrainingSet, edges: Edges, wanted: NDArray[np.bool_], rounds: int
) -> tuple[KernelTrend, Targets]:
    """Trend and latent micro constants after `rounds` rounds of each other."""
    micro = np.full(len(data.x), START_NEUTRAL)
    targets = latent_targets(data, micro, wanted)
    for _ in range(rounds):
        micro = edges.predict(edges.fit(targets.edge, targets.value, targets.variance))
        targets = latent_targets(data, micro, wanted)
    return edges.fit(targets.edge, targets.value, targets.variance), targets


def edges_of(data: TrainingSet, scaling: Scaling, settings: Settings, points: Floats | None) -> Edges:
    """The table's edges; its points are looked for where it has too many for an exact fit and they are not given."""
    if len(data.x) <= MOST_EXACT:
        return Edges(data.x, settings.kernel, scaling)
    if points is None:
        points = basis_points(data.x[:, ~LOWERS], settings.kernel, scaling)
    return Edges(data.x, settings.kernel, scaling, points)


def trend_without(data: TrainingSet, members: Members, wanted: NDArray[np.bool_]) -> Floats:
    """Micro pKa of all edges by a trend fitted to the wanted measurements alone, shape (n_edges,)."""
    import scipy.linalg  # noqa: F401 - its threads are limited too, from the first fit on
    from threadpoolctl import threadpool_limits

    with threadpool_limits(1):
        edges = edges_of(data, members.scaling, members.settings, members.points)
        trend, _ = converged_trend(data, edges, wanted, members.settings.rounds)
        return edges.predict(trend)


def _fit_member(
    data: TrainingSet,
    scaling: Scaling,
    wanted: NDArray[np.bool_],
    settings: Settings,
    seed: int,
    points: Floats | None,
) -> Member:
    edges = edges_of(data, scaling, settings, points)
    trend, targets = converged_trend(data, edges, wanted, settings.rounds)
    residual = np.empty(len(targets.edge))
    rng = np.random.default_rng(seed)
    inner = rng.integers(settings.inner_folds, size=len(data.acids))[data.owner[targets.edge]]
    for fold in range(settings.inner_folds):
        rest, held = targets.edge[inner != fold], inner == fold
        if not held.any() or not len(rest):
            residual[held] = 0.0
            continue
        other = edges.fit(rest, targets.value[~held], targets.variance[~held])
        residual[held] = targets.value[held] - edges.predict(other, targets.edge[held])
    residual = np.clip(residual, -settings.largest_residual, settings.largest_residual)
    booster = fit_booster(data.x[targets.edge], residual, targets.share, LOWERS, settings.boosting, seed)
    if edges.points is not None:
        return Member(trend.dual, trend.slopes, trend.offset, booster)
    dual = np.zeros(len(data.x))
    np.add.at(dual, targets.edge, trend.dual)
    return Member(dual, trend.slopes, trend.offset, booster)


def fit_members(
    data: TrainingSet,
    settings: Settings,
    done: Callable[[int], object] = lambda _: None,
    jobs: int = 1,
) -> tuple[Members, Ints]:
    """Fit the ensemble.

    Parameters
    ----------
    data : TrainingSet
    settings : Settings
    done : callable
        Called with 1 after each member, for progress.
    jobs : int
        Processes; the outcome does not depend on it.

    Returns
    -------
    members : Members
    fold : ndarray of int, shape (n_acids,)
        Member that never saw each acid.
    """
    from joblib import Parallel, delayed

    fold = fold_of_acids(len(data.acids), settings)
    scaling = Scaling.of(data.x[:, ~LOWERS])
    points = basis_points(data.x[:, ~LOWERS], settings.kernel, scaling)
    fitted = []
    tasks = (
        delayed(fit_member)(data, scaling, fold[data.step_acid] != k, settings, settings.seed + 1000 * k, points)
        for k in range(settings.folds)
    )
    for member in Parallel(n_jobs=jobs, return_as="generator")(tasks):
        fitted.append(member)
        done(1)
    return join_members(data, scaling, fitted, settings, points), fold


def join_members(
    data: TrainingSet, scaling: Scaling, fitted: Sequence[Member], settings: Settings, points: Floats | None = None
) -> Members:
    """Join fitted members, in the order of their folds, into arrays; `points` as in `fit_member`."""
    if points is None:
        points = basis_points(data.x[:, ~LOWERS], settings.kernel, scaling)
    return Members(
        settings,
        scaling,
        points,
        np.array([m.dual for m in fitted]),
        np.array([m.slopes for m in fitted]),
        fitted[0].offset,
        trees_of([m.booster for m in fitted]),
    )


def out_of_fold(data: TrainingSet, members: Members, fold: Ints) -> tuple[Floats, Floats]:
    """Micro pKa of the training edges by the member that never saw their acid, and its booster's part.

    Returns
    -------
    micro, boosted : ndarray, shape (n_edges,)
    """
    trend, boosted = members.predict(data.x)
    pick = fold[data.owner], np.arange(len(data.x))
    return trend[pick] + boosted[pick], boosted[pick]
