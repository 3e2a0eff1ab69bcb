"""Single fits: what a learner that has seen some measured steps says of all of them."""

from __future__ import annotations

from collections.abc import Callable, Iterable, Sequence
from dataclasses import dataclass, replace
from functools import cached_property

import numpy as np
from numpy.typing import NDArray

from qsar.descriptors import LOWERS
from qsar.errors import UserError
from qsar.model.inducing import MOST_EXACT, POINTS, pivots
from qsar.model.kernel import Scaling, basis_points, covariance
from qsar.model.library import Library
from qsar.model.members import Settings, converged_trend, edges_of, fit_member, join_members
from qsar.model.training_set import TrainingSet, training_set
from qsar.structures import read_acid
from qsar.table import Measurement
from qsar.validation.cache import Cache
from qsar.validation.forest import Counts, count_fingerprints, fit_forest
from qsar.validation.lines import Place, line_predictions, places
from qsar.validation.pieces import in_pieces
from qsar.validation.splits import subset

Floats = NDArray[np.float64]
Ints = NDArray[np.int64]
Flags = NDArray[np.bool_]

#: Learners by name: one member of the ensemble, its trend without the booster, and the baselines.
LEARNERS = ("member", "trend", "forest", "lines", "mean")

_PIVOTS = POINTS * 27 // 20  # so many that four fifths of the acids hold `POINTS` of them


@dataclass(frozen=True, eq=False)
class Problem:
    """A table to learn from.

    Attributes
    ----------
    data : TrainingSet
    settings : Settings
        Of the model that is judged.
    """

    data: TrainingSet
    settings: Settings

    @cached_property
    def fingerprints(self) -> Counts:
        """Count fingerprints of the measured steps, shape (n_steps, n_columns)."""
        return count_fingerprints([self.data.acids[a] for a in self.data.step_acid], self.data.step_number)

    @cached_property
    def lines(self) -> list[Place]:
        """Place of each measured step on its line."""
        return places([self.data.acids[a] for a in self.data.step_acid], self.data.step_number)

    @property
    def is_large(self) -> bool:
        """Whether fits are made over chosen points, see :mod:`qsar.model.inducing`."""
        return len(self.data.x) > MOST_EXACT

    @cached_property
    def pivots(self) -> Ints:
        """Edges of a large table that points are taken from, the most telling first."""
        free = self.data.x[:, ~LOWERS]
        kernel = self.settings.kernel
        return pivots(Scaling.of(free)(free), lambda a, b: covariance(a, b, kernel), _PIVOTS)

    def prepare(self, learners: Iterable[str]) -> None:
        """Reckon here and once what the fits of these learners share, not again in every process."""
        for learner in set(learners):
            if learner == "forest":
                self.fingerprints  # noqa: B018 - kept from now on
            elif learner == "lines":
                self.lines  # noqa: B018
            elif learner in ("member", "trend") and self.is_large:
                self.pivots  # noqa: B018


@dataclass(frozen=True, eq=False)
class Fit:
    """One fit to be made.

    Attributes
    ----------
    name : str
        Unique among the fits of a validation; finished fits are found again by it.
    learner : str
        One of `LEARNERS`.
    train : ndarray of bool, shape (n_steps,)
        Measured steps that may be used.
    pka : ndarray or None, shape (n_steps,)
        Values to learn instead of the measured ones.
    """

    name: str
    learner: str
    train: Flags
    pka: Floats | None = None


def problem_of(library: Library, settings: Settings) -> Problem:
    """The training table as a model carries it, rows in the library's order.

    Raises
    ------
    UserError
        If the model withholds its structures.
    """
    if not all(library.smiles):
        raise UserError("the model withholds its structures, so that it cannot be fitted again to parts of its table")
    acids = {smiles: read_acid(smiles) for smiles in library.smiles}
    rows = zip(
        library.smiles,
        library.step,
        library.pka,
        library.uncertainty,
        library.name,
        library.family,
        library.source,
        strict=True,
    )
    measurements = [Measurement(acids[s], int(k), float(p), float(u), n, f, c) for s, k, p, u, n, f, c in rows]
    return Problem(training_set(measurements), settings)


def predictions(problem: Problem, fit: Fit) -> Floats:
    """What the fitted learner says of all measured steps, shape (n_steps,)."""
    from threadpoolctl import threadpool_limits

    with threadpool_limits(1):  # sums in one order, so that a number does not depend on the machine's threads
        return _predictions(problem, fit)


def _predictions(problem: Problem, fit: Fit) -> Floats:
    data = problem.data if fit.pka is None else replace(problem.data, pka=fit.pka)
    train = fit.train
    if fit.learner == "member":
        return data.steps(_member(problem, data, train))
    if fit.learner == "trend":
        return data.steps(_trend(problem, data, train))
    if fit.learner == "forest":
        forest = fit_forest(problem.fingerprints[train], data.pka[train], problem.settings.seed)
        return np.asarray(forest.predict(problem.fingerprints), dtype=float)
    if fit.learner == "lines":
        return line_predictions(problem.lines, data.pka, train)
    if fit.learner == "mean":
        return np.full(len(data.pka), data.pka[train].mean())
    raise ValueError(f"no learner {fit.learner!r}; there are {', '.join(LEARNERS)}")


def _member(problem: Problem, data: TrainingSet, train: Flags) -> Floats:
    settings = problem.settings
    part, wanted, scaling, points = _seen(problem, data, train)
    fitted = fit_member(part, scaling, wanted, settings, settings.seed, points)
    trend, boosted = join_members(part, scaling, [fitted], settings, points).predict(data.x)
    micro: Floats = trend[0] + boosted[0]
    return micro


def _trend(problem: Problem, data: TrainingSet, train: Flags) -> Floats:
    part, wanted, scaling, points = _seen(problem, data, train)
    edges = edges_of(part, scaling, problem.settings, points)
    trend, _ = converged_trend(part, edges, wanted, problem.settings.rounds)
    return trend.predict(data.x[:, ~LOWERS], data.x[:, LOWERS])


def _seen(problem: Problem, data: TrainingSet, train: Flags) -> tuple[TrainingSet, Flags, Scaling, Floats | None]:
    """The table that a fit works on, its steps that may be used, scaling and points; none of them from other acids.

    A small table is handed over whole, and the fit itself takes its part.
    """
    acids = np.unique(data.step_acid[train])
    free = data.x[np.isin(data.owner, acids)][:, ~LOWERS]
    scaling = Scaling.of(free)
    if not problem.is_large:
        return data, train, scaling, None
    part, wanted = subset(data, acids), train[np.isin(data.step_acid, acids)]
    if len(part.x) <= MOST_EXACT:
        return part, wanted, scaling, None
    own = problem.pivots[np.isin(data.owner[problem.pivots], acids)][:POINTS]
    if len(own) < POINTS:  # a small part of the acids has points of its own
        return part, wanted, scaling, basis_points(free, problem.settings.kernel, scaling)
    return part, wanted, scaling, scaling(data.x[np.sort(own)][:, ~LOWERS])


def run(
    problem: Problem,
    fits: Sequence[Fit],
    cache: Cache | None = None,
    jobs: int = 1,
    done: Callable[[int], object] = lambda _: None,
    cluster: str | None = None,
) -> dict[str, Floats]:
    """Make fits, those already in the cache excepted.

    Parameters
    ----------
    problem : Problem
    fits : sequence of Fit
    cache : Cache, optional
    jobs : int
        Processes.
    done : callable
        Called with 1 after each fit.
    cluster : str, optional
        Address of a Dask scheduler: the fits are made there, and `jobs` does not matter.

    Returns
    -------
    dict
        Predictions of all measured steps by the name of the fit.
    """
    n = len(problem.data.pka)
    found: dict[str, Floats] = {}
    for fit in fits:
        stored = cache.get(fit.name, n) if cache else None
        if stored is not None:
            found[fit.name] = stored
            done(1)
    left = [fit for fit in fits if fit.name not in found]
    problem.prepare(fit.learner for fit in left)
    for fit, values in zip(left, in_pieces(predictions, problem, left, jobs, cluster), strict=True):
        found[fit.name] = values
        if cache:
            cache.put(fit.name, values)
        done(1)
    return found
