"""Measured steps beside what is predicted without their acids, by the model and by a count-fingerprint forest."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass
from typing import Protocol

import numpy as np
from numpy.typing import NDArray

from qsar.groups import CATIONIC, perceive
from qsar.model.library import Library
from qsar.model.model import Model
from qsar.structures import Acid, read_acid
from qsar.validation.forest import count_fingerprints, fit_forest
from qsar.validation.metrics import LEVELS, Coverage, Errors
from qsar.validation.without import Judge

Floats = NDArray[np.float64]
Flags = NDArray[np.bool_]

MONOBASIC, FIRST, SECOND = "neutral monobasic", "dibasic, first step", "dibasic, second step"
AMINO, HIGHER = "amino acids and peptides, COOH", "three or more COOH"
FAMILIES = (MONOBASIC, FIRST, SECOND, AMINO, HIGHER)


class MeasuredStep(Protocol):
    """A measured step of an acid."""

    @property
    def smiles(self) -> str:
        """Structure."""

    @property
    def step(self) -> int:
        """Carboxyl protons lost, counted from 1."""

    @property
    def pka(self) -> float:
        """Measured value."""


@dataclass(frozen=True, eq=False)
class Judged:
    """Measured steps with their predictions; all arrays have shape (n,) unless stated.

    Attributes
    ----------
    smiles : list of str
    acid : ndarray of int
        Number of the acid that a step belongs to.
    step, n_sites : ndarray of int
        Step, and number of COOH groups of the acid.
    measured, predicted, forest, expected : ndarray
        `forest` is the fingerprint forest's prediction, `expected` the model's expected error.
    low, high : ndarray, shape (n_levels, n)
        Ends of the intervals at :data:`qsar.validation.metrics.LEVELS`.
    verdict : ndarray of str
    family : ndarray of str
        One of `FAMILIES`.
    trained_on : ndarray of bool
        Whether the acid is in the training table.
    nearest : list of str
    """

    smiles: list[str]
    acid: NDArray[np.int64]
    step: NDArray[np.int64]
    n_sites: NDArray[np.int64]
    measured: Floats
    predicted: Floats
    forest: Floats
    expected: Floats
    low: Floats
    high: Floats
    verdict: NDArray[np.str_]
    family: NDArray[np.str_]
    trained_on: Flags
    nearest: list[str]

    @property
    def error(self) -> Floats:
        """Predicted - measured."""
        return self.predicted - self.measured

    def errors(self, rows: Flags, *, forest: bool = False) -> Errors:
        """Errors of some rows."""
        return Errors.of(self.measured[rows], (self.forest if forest else self.predicted)[rows])

    def coverage(self, level: float, rows: Flags) -> Coverage:
        """How many of some rows their intervals hold."""
        k = LEVELS.index(level)
        held = (self.low[k] <= self.measured) & (self.measured <= self.high[k])
        return Coverage.of(level, held[rows])

    def width(self, level: float) -> Floats:
        """Widths of the intervals."""
        k = LEVELS.index(level)
        result: Floats = self.high[k] - self.low[k]
        return result


def family_of(acid: Acid, step: int) -> str:
    """The family of `FAMILIES` that a step of an acid counts in."""
    if any(group.kind in CATIONIC for group in perceive(acid.graph)):
        return AMINO
    if len(acid.sites) == 1:
        return MONOBASIC
    if len(acid.sites) == 2:
        return FIRST if step == 1 else SECOND
    return HIGHER


def judge(model: Model, steps: Sequence[MeasuredStep], done: Callable[[int], object] = lambda _: None) -> Judged:
    """Predict measured steps without their acids.

    Parameters
    ----------
    model : Model
    steps : sequence of MeasuredStep
    done : callable
        Called with 1 after each of ``len(LEVELS) + 1`` parts.

    Returns
    -------
    Judged

    Raises
    ------
    UserError
        If the model withholds its structures.
    """
    position: dict[str, int] = {}
    for s in steps:
        position.setdefault(s.smiles, len(position))
    acids = [read_acid(smiles) for smiles in position]
    owner = np.array([position[s.smiles] for s in steps])
    number = np.array([s.step for s in steps])
    whole = Judge(model)
    low, high = np.empty((len(LEVELS), len(steps))), np.empty((len(LEVELS), len(steps)))
    for k, level in enumerate(LEVELS):
        predictions, trained_on = whole.predict(acids, level)
        at = [predictions[a].steps[s - 1] for a, s in zip(owner, number, strict=True)]
        low[k], high[k] = [p.low for p in at], [p.high for p in at]
        done(1)
    forest = _forest(whole, [acids[a] for a in owner], number)
    done(1)
    return Judged(
        [acids[a].smiles for a in owner],
        owner,
        number,
        np.array([len(acids[a].sites) for a in owner]),
        np.array([s.pka for s in steps]),
        np.array([p.pka for p in at]),
        forest,
        np.array([p.expected_error for p in at]),
        low,
        high,
        np.array([p.domain for p in at]),
        np.array([family_of(acids[a], int(s)) for a, s in zip(owner, number, strict=True)]),
        trained_on[owner],
        [p.nearest for p in at],
    )


def _forest(judge: Judge, acids: Sequence[Acid], step: NDArray[np.int64]) -> Floats:
    """A fingerprint forest trained on the same table in the same folds."""
    library, member = judge.model.library, judge.model.calibration.member
    x = count_fingerprints([read_acid(s) for s in library.smiles], library.step)
    query = count_fingerprints(acids, step)
    folds = np.array([-1 if f is None else f for f in (judge.fold_of(a) for a in acids)])
    result = np.empty(len(acids))
    for fold in np.unique(folds):
        kept, rows = member != fold, folds == fold
        result[rows] = fit_forest(x[kept], library.pka[kept]).predict(query[rows])
    return result


@dataclass(frozen=True)
class LibraryStep:
    """A measured step of the training table."""

    smiles: str
    step: int
    pka: float


def library_steps(library: Library) -> list[LibraryStep]:
    """The training table of a model as steps to be judged, in its order."""
    rows = zip(library.smiles, library.step, library.pka, strict=True)
    return [LibraryStep(smiles, int(step), float(pka)) for smiles, step, pka in rows]
