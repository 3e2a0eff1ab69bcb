"""Single fits: what a learner that has seen some measured steps says of all of them."""

from __future__ import annotations

from collections.abc import Callable, Iterable, Sequence
from dataclasses import dataclass, replace
from functools import cached_property

import numpy as np
from numpy.typing import NDArray

from qsar.descriptors import LOWERS
from qsar.errors import UserError
from qsar.model.kernel import Scaling, fit_trend
from qsar.model.library import Library
from qsar.model.members import START_NEUTRAL, Settings, fit_member, join_members
from qsar.model.training_set import TrainingSet, latent_targets, training_set
from qsar.structures import read_acid
from qsar.table import Measurement
from qsar.validation.cache import Cache
from qsar.validation.forest import count_fingerprints, fit_forest
from qsar.validation.lines import line_predictions

Floats = NDArray[np.float64]
Flags = NDArray[np.bool_]

#: Learners by name: one member of the ensemble, its trend without the booster, and the baselines.
LEARNERS = ("member", "trend", "forest", "lines", "mean")


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
    def fingerprints(self) -> Floats:
        """Count fingerprints of the measured steps, shape (n_steps, n_columns)."""
        return count_fingerprints([self.data.acids[a] for a in self.data.step_acid], self.data.step_number)


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
        return data.steps(_member(data, train, problem.settings))
    if fit.learner == "trend":
        return data.steps(_trend(data, train, problem.settings))
    if fit.learner == "forest":
        forest = fit_forest(problem.fingerprints[train], data.pka[train], problem.settings.seed)
        return np.asarray(forest.predict(problem.fingerprints), dtype=float)
    if fit.learner == "lines":
        return line_predictions([data.acids[a] for a in data.step_acid], data.step_number, data.pka, train)
    if fit.learner == "mean":
        return np.full(len(data.pka), data.pka[train].mean())
    raise ValueError(f"no learner {fit.learner!r}; there are {', '.join(LEARNERS)}")


def _scaling(data: TrainingSet, train: Flags) -> Scaling:
    """Scaling of the descriptors of the acids that may be seen."""
    seen = np.isin(data.owner, data.step_acid[train])
    return Scaling.of(data.x[seen][:, ~LOWERS])


def _member(data: TrainingSet, train: Flags, settings: Settings) -> Floats:
    scaling = _scaling(data, train)
    fitted = fit_member(data, scaling, train, settings, settings.seed)
    trend, boosted = join_members(data, scaling, [fitted], settings).predict(data.x)
    micro: Floats = trend[0] + boosted[0]
    return micro


def _trend(data: TrainingSet, train: Flags, settings: Settings) -> Floats:
    free, lowers, scaling = data.x[:, ~LOWERS], data.x[:, LOWERS], _scaling(data, train)
    micro = np.full(len(data.x), START_NEUTRAL)
    for _ in range(settings.rounds + 1):
        t = latent_targets(data, micro, train)
        trend = fit_trend(free[t.edge], lowers[t.edge], t.value, t.variance, settings.kernel, scaling)
        micro = trend.predict(free, lowers)
    return micro


def run(
    problem: Problem,
    fits: Sequence[Fit],
    cache: Cache | None = None,
    jobs: int = 1,
    done: Callable[[int], object] = lambda _: None,
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
    for fit, values in zip(left, _computed(problem, left, jobs), strict=True):
        found[fit.name] = values
        if cache:
            cache.put(fit.name, values)
        done(1)
    return found


def _computed(problem: Problem, fits: Sequence[Fit], jobs: int) -> Iterable[Floats]:
    if jobs == 1 or len(fits) < 2:
        return (predictions(problem, fit) for fit in fits)
    from joblib import Parallel, delayed

    if any(fit.learner == "forest" for fit in fits):
        problem.fingerprints  # noqa: B018 - computed once here, not once in each process
    parallel = Parallel(n_jobs=jobs, return_as="generator", inner_max_num_threads=1, backend="loky")
    results: Iterable[Floats] = parallel(delayed(predictions)(problem, fit) for fit in fits)
    return results
