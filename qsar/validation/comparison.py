"""Two models on the same acids: is one better, and for what, or is there not enough data to tell.

Errors are paired, step by step; acids are the unit that is resampled (Efron & Tibshirani, *An Introduction to the
Bootstrap*, 1993) and whose signs are flipped in the randomisation test (Fisher 1935; Good, *Permutation, Parametric and
Bootstrap Tests of Hypotheses*, 2005), so that several steps of one acid do not count as several acids.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from qsar.curation.families import family_of
from qsar.errors import UserError
from qsar.ionisation import edge_descriptors
from qsar.model import Model, Prediction
from qsar.sources import key_of
from qsar.structures import Acid, read_acid
from qsar.table import Measurement
from qsar.validation.metrics import bootstrap
from qsar.validation.without import Judge, constitution

Floats = NDArray[np.float64]

LEAST_ACIDS = 12
LEAST_OF_GROUP = 5
MATTERS = 0.02  # pKa units; a smaller difference of mean absolute errors makes no difference at the bench
CONFIDENCE = 0.95
_FLIPS = 9999
_SAME = 1e-9  # distance in descriptor space below which a withheld training acid counts as the same one
_AT_ONCE = 200


@dataclass(frozen=True)
class Pair:
    """One measured step with what both models say of it without having seen it.

    Attributes
    ----------
    smiles, name, family : str
    step : int
    measured : float
    pka, low, high : tuple of float
        Of the first and the second model.
    domain : tuple of str
        Verdicts of the first and the second model.
    """

    smiles: str
    name: str
    family: str
    step: int
    measured: float
    pka: tuple[float, float]
    low: tuple[float, float]
    high: tuple[float, float]
    domain: tuple[str, str]

    @property
    def errors(self) -> tuple[float, float]:
        """Absolute errors of both models."""
        return abs(self.pka[0] - self.measured), abs(self.pka[1] - self.measured)

    @property
    def change(self) -> float:
        """Absolute error of the second model minus that of the first."""
        return self.errors[1] - self.errors[0]

    def held(self, which: int) -> bool:
        """Whether the interval of a model (0 or 1) holds the measured value."""
        return self.low[which] <= self.measured <= self.high[which]


def leaked(model: Model, acids: Sequence[Acid]) -> NDArray[np.bool_]:
    """Which acids a model was trained on, whatever their configuration.

    Where structures are withheld, an acid with the descriptors of a training acid counts as one.

    Returns
    -------
    ndarray of bool, shape (n_acids,)
    """
    known = {constitution(read_acid(s)) for s in dict.fromkeys(model.library.smiles) if s}
    result = np.array([constitution(a) in known for a in acids], dtype=bool)
    if not all(model.library.smiles):
        for i, acid in enumerate(acids):
            if not result[i]:
                distances = model.neighbours.distances(model.members, edge_descriptors(acid))
                result[i] = bool(distances.min() < _SAME**0.5)  # rounding of a difference of squares
    return result


def held_out_pairs(
    a: Model,
    b: Model,
    measurements: Sequence[Measurement],
    coverage: float = 0.9,
    done: Callable[[int], object] = lambda _: None,
) -> tuple[list[Pair], list[Measurement]]:
    """Predictions of measured acids that neither model was trained on.

    Returns
    -------
    pairs : list of Pair
    left_out : list of Measurement
        Rows whose acid is in the training table of either model.
    """
    acids = [m.acid for m in measurements]
    seen = leaked(a, acids) | leaked(b, acids)
    fresh = [m for m, s in zip(measurements, seen, strict=True) if not s]
    pairs: list[Pair] = []
    for start in range(0, len(fresh), _AT_ONCE):
        block = fresh[start : start + _AT_ONCE]
        both = [model.predict([m.acid for m in block], coverage) for model in (a, b)]
        pairs += [_pair(m, x, y) for m, x, y in zip(block, *both, strict=True)]
        done(len(block))
    return pairs, [m for m, s in zip(measurements, seen, strict=True) if s]


def shared_fold_pairs(a: Model, b: Model, coverage: float = 0.9, source: str | None = None) -> list[Pair]:
    """Predictions of every acid that either model was trained on, made by the parts that never saw it.

    Parameters
    ----------
    a, b : Model
    coverage : float
    source : str, optional
        Take only rows of this source.

    Raises
    ------
    UserError
        If a model withholds its structures.
    """
    rows: dict[tuple[str, int, float], Measurement] = {}
    for model in (b, a):
        lib = model.library
        if not all(lib.smiles):
            raise UserError(f"{model.name}: structures are withheld, so its folds cannot be shared; give --data FILE")
        for k, smiles in enumerate(lib.smiles):
            key = (smiles, int(lib.step[k]), round(float(lib.pka[k]), 6))
            if key not in rows and source in (None, key_of(lib.source[k])):
                rows[key] = Measurement(
                    read_acid(smiles),
                    int(lib.step[k]),
                    float(lib.pka[k]),
                    float(lib.uncertainty[k]),
                    lib.name[k],
                    lib.family[k],
                    lib.source[k],
                )
    measurements = list(rows.values())
    acids = [m.acid for m in measurements]
    both = [Judge(model).predict(acids, coverage)[0] for model in (a, b)]
    return [_pair(m, x, y) for m, x, y in zip(measurements, *both, strict=True)]


def _pair(m: Measurement, x: Prediction, y: Prediction) -> Pair:
    steps = x.steps[m.step - 1], y.steps[m.step - 1]
    return Pair(
        m.acid.smiles,
        m.name,
        m.family or family_of(m.acid),
        m.step,
        m.pka,
        (steps[0].pka, steps[1].pka),
        (steps[0].low, steps[1].low),
        (steps[0].high, steps[1].high),
        (steps[0].domain, steps[1].domain),
    )


@dataclass(frozen=True)
class Difference:
    """How the mean absolute errors of two models differ over some steps.

    Attributes
    ----------
    label : str
    steps, acids : int
    errors : tuple of float
        Mean absolute errors of the first and the second model.
    low, high : float
        95 % interval of second minus first; NaN where there are too few acids.
    """

    label: str
    steps: int
    acids: int
    errors: tuple[float, float]
    low: float
    high: float

    @property
    def value(self) -> float:
        """Second minus first."""
        return self.errors[1] - self.errors[0]


@dataclass(frozen=True)
class Comparison:
    """The outcome.

    Attributes
    ----------
    names : tuple of str
    pairs : list of Pair
        From the greatest improvement to the greatest loss.
    overall : Difference
    chance : float
        How often flipped signs give a difference as large as the one found.
    by_family, by_verdict : list of Difference
        Verdicts are those of the second model.
    coverage : float
        Nominal.
    held : tuple of float
        Fraction of measured values that the intervals of each model hold.
    width : tuple of float
        Median width of the intervals of each model.
    """

    names: tuple[str, str]
    pairs: list[Pair]
    overall: Difference
    chance: float
    by_family: list[Difference]
    by_verdict: list[Difference]
    coverage: float
    held: tuple[float, float]
    width: tuple[float, float]

    @property
    def outcome(self) -> str:
        """Which is better: first, second, same (equally good) or unknown (not enough data)."""
        d = self.overall
        if d.acids < LEAST_ACIDS:
            return "unknown"
        clear = self.chance < 1.0 - CONFIDENCE
        if d.high < 0.0 and clear:
            return "second"
        if d.low > 0.0 and clear:
            return "first"
        return "same" if max(abs(d.low), abs(d.high)) <= MATTERS else "unknown"

    @property
    def sentence(self) -> str:
        """The verdict in one sentence."""
        d, (first, second) = self.overall, self.names
        over = f"over {_count(d.steps, 'step')} of {_count(d.acids, 'acid')}"
        if d.acids < LEAST_ACIDS:
            few = _count(d.acids, "acid")
            return f"not enough data to tell: {few} that neither model has seen, and at least {LEAST_ACIDS} are needed"
        figures = (
            f"mean absolute error {d.errors[1]:.3f} against {d.errors[0]:.3f} {over}, difference {d.value:+.3f} "
            f"(95 % interval {d.low:+.3f} to {d.high:+.3f})"
        )
        if self.outcome == "second":
            return f"{second} is better than {first} for these acids: {figures}"
        if self.outcome == "first":
            return f"{second} is worse than {first} for these acids: {figures}"
        if self.outcome == "same":
            return f"{second} and {first} are equally good for these acids: {figures}"
        return f"not enough data to tell whether {second} or {first} is better: {figures}"


def compare(
    pairs: Sequence[Pair], names: tuple[str, str], coverage: float = 0.9, seed: int = 0, repeats: int = 2000
) -> Comparison:
    """Compare two models.

    Parameters
    ----------
    pairs : sequence of Pair
        At least one.
    names : tuple of str
    coverage : float
        Nominal coverage of the intervals in `pairs`.
    seed, repeats : int
        Of the resampling.

    Raises
    ------
    UserError
        If there is no pair.
    """
    if not pairs:
        raise UserError("no acid to compare on: every row is in the training table of one of the models")
    held = tuple(float(np.mean([p.held(k) for p in pairs])) for k in (0, 1))
    width = tuple(float(np.median([p.high[k] - p.low[k] for p in pairs])) for k in (0, 1))

    def by(label: Callable[[Pair], str]) -> list[Difference]:
        groups: dict[str, list[Pair]] = {}
        for p in pairs:
            groups.setdefault(label(p), []).append(p)
        found = [difference(name, group, seed, repeats) for name, group in groups.items()]
        return sorted(found, key=lambda d: (-d.steps, d.label))

    return Comparison(
        names,
        sorted(pairs, key=lambda p: p.change),
        difference("all", pairs, seed, repeats),
        chance(pairs, seed),
        by(lambda p: p.family),
        by(lambda p: p.domain[1]),
        coverage,
        (held[0], held[1]),
        (width[0], width[1]),
    )


def difference(label: str, pairs: Sequence[Pair], seed: int = 0, repeats: int = 2000) -> Difference:
    """Mean absolute errors over some pairs, with the bootstrap interval of their difference."""
    errors = np.array([p.errors for p in pairs])
    change = errors[:, 1] - errors[:, 0]
    _, group = np.unique([p.smiles for p in pairs], return_inverse=True)
    acids = int(group.max()) + 1
    low = high = float("nan")
    if acids >= LEAST_OF_GROUP:
        values = bootstrap(lambda rows: float(change[rows].mean()), group.astype(np.int64), repeats, seed)
        low, high = (float(v) for v in np.quantile(values, [(1 - CONFIDENCE) / 2, (1 + CONFIDENCE) / 2]))
    first, second = errors.mean(axis=0)
    return Difference(label, len(pairs), acids, (float(first), float(second)), low, high)


def chance(pairs: Sequence[Pair], seed: int = 0) -> float:
    """Two-sided randomisation test of the paired errors, acids with their signs flipped at random."""
    change = np.array([p.change for p in pairs])
    _, group = np.unique([p.smiles for p in pairs], return_inverse=True)
    total = np.bincount(group, weights=change)
    signs = np.random.default_rng(seed).choice([-1.0, 1.0], size=(_FLIPS, len(total)))
    as_large = np.abs(signs @ total) >= abs(total.sum()) - 1e-12
    return float((as_large.sum() + 1) / (_FLIPS + 1))


def _count(number: int, noun: str) -> str:
    return f"{number:,} {noun}" + ("" if number == 1 else "s")
