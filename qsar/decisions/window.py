"""The pH window in which one acid is in the water and another stays in the organic layer.

The water is buffered at a given ionic strength; each acid distributes by itself.  For each acid the pH at
which it reaches its target is a random quantity through the interval of its pKa, so the window exists with
a probability.
"""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from qsar.conditions import REFERENCE_C
from qsar.decisions.speciation import LogP, conditional, fractions
from qsar.decisions.steps import AcidSteps
from qsar.decisions.workup import check_partitions
from qsar.decisions.worth_measuring import (
    DEFAULT_RISK,
    FINEST_MEASUREMENT,
    NEGLIGIBLE_RISK,
    normal_cdf,
    say_probability,
)

Floats = NDArray[np.float64]

_PH_LIMITS = (-3.0, 17.0)
_DRAWS = 2000
_Z95 = 1.959964
_USUAL_MEASUREMENT_SD = 0.05
_NODES = np.linspace(-3.5, 3.5, 71)
_WEIGHTS = np.exp(-0.5 * _NODES**2) / np.exp(-0.5 * _NODES**2).sum()


@dataclass(frozen=True)
class Layered:
    """An acid with the log P of its uncharged form."""

    acid: AcidSteps
    log_p: LogP


@dataclass(frozen=True)
class Threshold:
    """A pH edge: central value, interval, and its spread as a normal."""

    ph: float
    low: float
    high: float
    mean: float
    sd: float


@dataclass(frozen=True)
class Window:
    """Answer for two acids.

    Attributes
    ----------
    wet, dry : Layered
        The acid for the water and the one for the organic layer.
    target : float
        Fraction of each acid wanted in its layer.
    from_ph : Threshold
        Above it the wet acid is in the water.
    to_ph : Threshold
        Below it the dry acid is in the organic layer.
    exists : bool
        The window is open at the central constants.
    probability_exists : float
    best_ph : float
        Where both conditions are met most probably; halfway between the edges where the window is shut.
    probability_at_best : float
        Both conditions are met at `best_ph`.
    wet_in_water, dry_in_organic : float
        Fractions at `best_ph`, central constants.
    flips_when_difference_below : float
        First pKa of the dry acid less that of the wet one at which the window shuts.
    measure_first : str
        Name of the acid whose measurement lowers the risk most; empty when none is needed.
    probability_wrong : float
        Of the better of two courses: work at `best_ph`, or take it that there is no window.
    measure_to : float or None
        95 % half width needed for `measure_first` (or for both, see `measure_both`); None when none is
        needed.
    measure_both : bool
        Measuring one acid alone does not settle it.
    ph, wet_curve, dry_curve : ndarray, shape (n,), (3, n), (3, n)
        Fraction in water against pH: value, low, high.
    sentences : tuple of str
        The answer for people.
    """

    wet: Layered
    dry: Layered
    target: float
    from_ph: Threshold
    to_ph: Threshold
    exists: bool
    probability_exists: float
    best_ph: float
    probability_at_best: float
    wet_in_water: float
    dry_in_organic: float
    flips_when_difference_below: float
    measure_first: str
    probability_wrong: float
    measure_to: float | None
    measure_both: bool
    ph: Floats
    wet_curve: Floats
    dry_curve: Floats
    sentences: tuple[str, ...]


def fraction_in_water(ph: Floats | float, pka: Floats, log_p: float, volume_ratio: float) -> Floats:
    """Fraction of an acid in buffered water beside an organic layer.

    Parameters
    ----------
    ph : float or ndarray, shape (...)
    pka : ndarray, shape (..., n_steps)
        Constants of the medium; leading axes broadcast against `ph`.
    log_p : float
        Of the uncharged form.
    volume_ratio : float
        Organic volume over water volume.
    """
    uncharged = fractions(np.asarray(ph, dtype=float), pka)[..., 0]
    return np.asarray(1.0 / (1.0 + volume_ratio * 10.0**log_p * uncharged))


def ph_where(pka: Floats, log_p: float, volume_ratio: float, fraction: float) -> Floats:
    """The pH above which at least `fraction` is in the water, shape (n,) for constants (n, n_steps).

    Held to -3 to 17: the lower end means at any pH, the upper end at none.
    """
    low, high = (np.full(pka.shape[0], edge) for edge in _PH_LIMITS)
    for _ in range(50):
        middle = 0.5 * (low + high)
        below = fraction_in_water(middle, pka, log_p, volume_ratio) < fraction
        low, high = np.where(below, middle, low), np.where(below, high, middle)
    return np.asarray(0.5 * (low + high))


def _threshold(
    item: Layered, ratio: float, fraction: float, strength: float, celsius: float
) -> tuple[Threshold, Floats]:
    acid = item.acid
    centre = conditional(np.array([acid.pka]), 0, strength, celsius)
    draws = ph_where(conditional(acid.draws(_DRAWS), 0, strength, celsius), item.log_p.value, ratio, fraction)
    value = float(ph_where(centre, item.log_p.value, ratio, fraction)[0])
    low, high = np.quantile(draws, [0.5 - acid.coverage / 2.0, 0.5 + acid.coverage / 2.0])
    edge = Threshold(
        value, min(float(low), value), max(float(high), value), float(draws.mean()), float(draws.std())
    )
    return edge, np.sort(draws)


def _best(mean_a: Floats, sd_a: float, mean_b: Floats, sd_b: float) -> tuple[Floats, Floats]:
    """The pH that lies most probably above edge a and below edge b, with that probability."""
    grid = np.linspace(-0.5, 1.5, 81)
    spread = 3.0 * (sd_a + sd_b) + 1e-6
    start, width = mean_a - spread, (mean_b - mean_a) + 2.0 * spread
    ph = start[..., None] + np.where(width > 0, width, 2.0 * spread)[..., None] * (grid + 0.5) / 2.0
    above = normal_cdf((ph - mean_a[..., None]) / max(sd_a, 1e-9))
    below = normal_cdf((mean_b[..., None] - ph) / max(sd_b, 1e-9))
    chance = above * below
    best = chance.max(axis=-1)
    # Where the optimum is flat, its middle is the pH that bears most error.
    flat = chance >= best[..., None] - 1e-4
    return (ph * flat).sum(axis=-1) / flat.sum(axis=-1), best


def _error_after(a: Threshold, b: Threshold, u_a: float, u_b: float) -> float:
    """Expected probability of the wrong course after measurements with standard deviations `u_a` and `u_b`.

    The courses are to work at the best pH, or to take it that there is no window; see
    `worth_measuring.remaining_error` for the principle.
    """

    def split(sd: float, u: float) -> tuple[float, float]:
        if sd == 0.0 or np.isinf(u):
            return 0.0, sd
        return sd**2 / float(np.hypot(sd, u)), sd * u / float(np.hypot(sd, u))

    (move_a, left_a), (move_b, left_b) = split(a.sd, u_a), split(b.sd, u_b)
    mean_a = (a.mean + move_a * _NODES)[:, None] if move_a else np.array([[a.mean]])
    mean_b = (b.mean + move_b * _NODES)[None, :] if move_b else np.array([[b.mean]])
    weight = (_WEIGHTS[:, None] if move_a else np.ones((1, 1))) * (
        _WEIGHTS[None, :] if move_b else np.ones((1, 1))
    )
    mean_a, mean_b = np.broadcast_arrays(mean_a, mean_b)
    _, right = _best(mean_a, left_a, mean_b, left_b)
    no_window = normal_cdf((mean_a - mean_b) / max(float(np.hypot(left_a, left_b)), 1e-9))
    return float(((1.0 - np.maximum(right, no_window)) * weight).sum())


def _coarsest(a: Threshold, b: Threshold, which: str, risk: float) -> float | None:
    """Coarsest standard deviation of a measurement of `which` ("a", "b", "ab") that brings the risk down."""

    def error(u: float) -> float:
        return _error_after(a, b, u if "a" in which else float("inf"), u if "b" in which else float("inf"))

    finest = FINEST_MEASUREMENT / _Z95
    if error(finest) > risk:
        return None
    low, high = finest, 3.0
    for _ in range(14):
        middle = float(np.sqrt(low * high))
        low, high = (middle, high) if error(middle) <= risk else (low, middle)
    return low


def find_window(
    first: Layered,
    second: Layered,
    volume_ratio: float = 1.0,
    target: float = 0.95,
    ionic_strength_m: float = 0.1,
    temperature_c: float = REFERENCE_C,
    risk: float = DEFAULT_RISK,
) -> Window:
    """The window for two acids, the more probable of the two assignments.

    Parameters
    ----------
    first, second : Layered
        Constants at `temperature_c`.
    volume_ratio : float
        Organic volume over water volume.
    target : float
        Fraction of each acid wanted in its layer, between 0.5 and 1.
    ionic_strength_m : float
        Ionic strength of the water [mol/L], 0 to 0.5.
    temperature_c : float
        Temperature [degC].
    risk : float
        Accepted probability of the wrong course.

    Raises
    ------
    ValueError
        For a target, ratio or condition out of range.
    UnusableAcid
        For an acid whose uncharged form is a zwitterion or does not exist.
    """
    if not 0.5 < target < 1.0 or not volume_ratio > 0.0:
        raise ValueError(
            f"target {target:g}, volume ratio {volume_ratio:g}: between 0.5 and 1, and above zero"
        )
    for item in (first, second):
        check_partitions(item.acid)
    options = []
    for wet, dry in ((first, second), (second, first)):
        a, a_draws = _threshold(wet, volume_ratio, target, ionic_strength_m, temperature_c)
        b, b_draws = _threshold(dry, volume_ratio, 1.0 - target, ionic_strength_m, temperature_c)
        # Acids vary independently: every draw of one meets every draw of the other.
        exists = float(np.mean(np.searchsorted(a_draws, b_draws, side="left")) / a_draws.size)
        options.append((exists, b.ph - a.ph, wet, dry, a, b))
    exists, width, wet, dry, a, b = max(options, key=lambda option: option[:2])

    best, chance = (float(v) for v in _best(np.array(a.mean), a.sd, np.array(b.mean), b.sd))
    if width <= 0.0:
        best = 0.5 * (a.ph + b.ph)
        chance = float(
            normal_cdf((best - a.mean) / max(a.sd, 1e-9)) * normal_cdf((b.mean - best) / max(b.sd, 1e-9))
        )
    best = float(np.clip(best, 0.0, 14.0))
    wrong = _error_after(a, b, float("inf"), float("inf"))
    measure_to, measure_both, measure_first = _what_to_measure(a, b, wet, dry, wrong, risk)

    grid = np.arange(0.0, 14.01, 0.1)
    curves = [_curve(item, grid, volume_ratio, ionic_strength_m, temperature_c) for item in (wet, dry)]
    at_best = [
        float(
            fraction_in_water(
                best,
                conditional(np.array(item.acid.pka), 0, ionic_strength_m, temperature_c),
                item.log_p.value,
                volume_ratio,
            )
        )
        for item in (wet, dry)
    ]
    difference = dry.acid.pka[0] - wet.acid.pka[0] - width
    window = Window(
        wet, dry, target, a, b, width > 0.0, exists, best, chance, at_best[0], 1.0 - at_best[1], difference,
        measure_first, wrong, measure_to, measure_both, grid, curves[0], curves[1], (),
    )  # fmt: skip
    return replace(window, sentences=_sentences(window, risk))


def _curve(item: Layered, grid: Floats, ratio: float, strength: float, celsius: float) -> Floats:
    acid = item.acid
    centre = conditional(np.array(acid.pka), 0, strength, celsius)
    draws = conditional(acid.draws(500), 0, strength, celsius)[:, None, :]
    value = fraction_in_water(grid, centre, item.log_p.value, ratio)
    sample = fraction_in_water(grid, draws, item.log_p.value, ratio)
    low, high = np.quantile(sample, [0.5 - acid.coverage / 2.0, 0.5 + acid.coverage / 2.0], axis=0)
    return np.stack([value, np.minimum(low, value), np.maximum(high, value)])


def _what_to_measure(
    a: Threshold, b: Threshold, wet: Layered, dry: Layered, wrong: float, risk: float
) -> tuple[float | None, bool, str]:
    if wrong <= risk:
        return None, False, ""
    usual = _USUAL_MEASUREMENT_SD
    a_first = _error_after(a, b, usual, float("inf")) <= _error_after(a, b, float("inf"), usual)
    name = wet.acid.name if a_first else dry.acid.name
    alone = _coarsest(a, b, "a" if a_first else "b", risk)
    if alone is not None:
        return _Z95 * alone, False, name
    both = _coarsest(a, b, "ab", risk)
    return (None if both is None else _Z95 * both), True, name


def _sentences(w: Window, risk: float) -> tuple[str, ...]:
    wet, dry = w.wet.acid.name, w.dry.acid.name
    share = f"{100 * w.target:g} %"
    chance = f"it exists with probability {say_probability(w.probability_exists)}"
    if w.exists:
        first = (
            f"From pH {w.from_ph.ph:.2f} to {w.to_ph.ph:.2f}, {wet} is in the water and {dry} in the "
            f"organic layer (at least {share} each); {chance}. Best pH {w.best_ph:.2f}, right with "
            f"probability {say_probability(w.probability_at_best)}."
        )
    else:
        first = (
            f"There is no pH at which at least {share} of {wet} is in the water and {share} of {dry} in "
            f"the organic layer; such a window {chance.removeprefix('it ')}. At pH {w.best_ph:.2f}, "
            f"{100 * w.wet_in_water:.0f} % of {wet} is in the water and {100 * w.dry_in_organic:.0f} % of "
            f"{dry} in the organic layer."
        )
    now = w.dry.acid.pka[0] - w.wet.acid.pka[0]
    # All steps of an acid are moved together, so the limit is stated for the first ones.
    which = "first " if max(len(w.dry.acid.pka), len(w.wet.acid.pka)) > 1 else ""
    flip = (
        f"The window is open while the {which}pKa of {dry} exceeds that of {wet} by more than "
        f"{w.flips_when_difference_below:.2f}; now {now:.2f}."
    )
    course = "work at that pH" if w.exists else "take it that there is no window"
    wrong = f"the better course is wrong with probability {say_probability(w.probability_wrong)}"
    if w.probability_wrong <= NEGLIGIBLE_RISK:
        verdict = f"Measuring changes nothing: {course}."
    elif w.probability_wrong <= risk:
        verdict = f"No measurement is needed at an accepted risk of {risk:g}: {wrong}."
    elif w.measure_to is None:
        verdict = (
            f"Measure {w.measure_first} first, but {wrong} and no ordinary measurement settles it; "
            "separate otherwise."
        )
    elif w.measure_both:
        verdict = f"Measure both, {w.measure_first} first, to ± {w.measure_to:.2f} before choosing: {wrong}."
    else:
        verdict = f"Measure {w.measure_first} first, to ± {w.measure_to:.2f}, before choosing: {wrong}."
    return first, flip, verdict
