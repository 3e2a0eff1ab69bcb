"""Is it worth measuring: where a choice flips, how likely it is wrong, which precision would settle it.

Two kinds of decision are told apart.  A *choice* between courses (this base or a stronger one) is right on
some range of the pKa; a measurement settles it when the choice made afterwards is wrong with no more than
the accepted risk.  A *setting* (the pH of a buffer) follows the measured value; a measurement settles it
when its own interval is within the tolerance.  Precisions are half widths of 95 % intervals.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from statistics import NormalDist

import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]
Ranges = Sequence[tuple[float, float]]

DEFAULT_RISK = 0.05
NEGLIGIBLE_RISK = 0.001
FINEST_MEASUREMENT = 0.02
"""95 % half width that a careful titration reaches (common practice, no source)."""

_ERF = np.vectorize(math.erf, otypes=[float])
_Z95 = NormalDist().inv_cdf(0.975)
_NODES = np.array([NormalDist().inv_cdf((i + 0.5) / 401) for i in range(401)])


def normal_cdf(x: Floats | float) -> Floats:
    """Distribution function of the standard normal, elementwise."""
    return np.asarray(0.5 * (1.0 + _ERF(np.asarray(x, dtype=float) / math.sqrt(2.0))))


def probability_in(ranges: Ranges, mean: float | Floats, sd: float) -> Floats:
    """Probability that a normal variable lies in the union of disjoint `ranges`, for each `mean`."""
    centre = np.asarray(mean, dtype=float)
    total = np.zeros_like(centre)
    for low, high in ranges:
        if sd > 0.0:
            total = total + normal_cdf((high - centre) / sd) - normal_cdf((low - centre) / sd)
        else:
            total = total + ((low <= centre) & (centre <= high))
    return total


def remaining_error(mean: float, sd: float, holds: Ranges, measurement_sd: float) -> float:
    """Expected probability of a wrong choice after a measurement that is still to be made.

    Parameters
    ----------
    mean, sd : float
        Present estimate of the pKa.
    holds : sequence of (low, high)
        Where the choice is right; its alternative is right elsewhere.
    measurement_sd : float
        Standard deviation of the measurement; infinite for none.

    Notes
    -----
    Pre-posterior analysis (Raiffa, H.; Schlaifer, R. *Applied Statistical Decision Theory*; Harvard, 1961):
    the mean after the measurement is normal with variance sd^4 / (sd^2 + u^2), what is left has variance
    sd^2 u^2 / (sd^2 + u^2).
    """
    if sd == 0.0 or not np.isfinite(measurement_sd):
        probability = float(probability_in(holds, mean, sd))
        return min(probability, 1.0 - probability)
    total = sd**2 + measurement_sd**2
    after = probability_in(
        holds, mean + _NODES * sd**2 / np.sqrt(total), sd * measurement_sd / np.sqrt(total)
    )
    return float(np.mean(np.minimum(after, 1.0 - after)))


def precision_needed(mean: float, sd: float, holds: Ranges, risk: float = DEFAULT_RISK) -> float | None:
    """95 % half width of the coarsest measurement that brings the error to `risk`; None if none is needed."""
    if remaining_error(mean, sd, holds, float("inf")) <= risk:
        return None
    low, high = 1e-4, 20.0 * sd
    for _ in range(60):
        middle = float(np.sqrt(low * high))
        if remaining_error(mean, sd, holds, middle) <= risk:
            low = middle
        else:
            high = middle
    return _Z95 * low


@dataclass(frozen=True)
class Verdict:
    """What is known about a choice, and whether a measurement would change it.

    Attributes
    ----------
    choice : str
        The course taken, as the subject of a sentence.
    step : int
        Step whose constant decides, from 1.
    pka, sd : float
        Present estimate of it.
    holds : tuple of (low, high)
        Where the choice is right, other steps at their estimates; infinite ends where nothing flips it.
    probability_wrong : float
        Given the intervals of all steps.
    measure_to : float or None
        95 % half width of a measurement that would settle it; None when none is needed.
    sentence : str
        The verdict for people.
    """

    choice: str
    step: int
    pka: float
    sd: float
    holds: tuple[tuple[float, float], ...]
    probability_wrong: float
    measure_to: float | None
    sentence: str

    @property
    def flips_at(self) -> tuple[float, ...]:
        """The pKa values at which the choice flips, ascending."""
        return tuple(sorted(end for low_high in self.holds for end in low_high if np.isfinite(end)))


def say_ranges(holds: Ranges) -> str:
    """Ranges of a pKa in words: 'any pKa below 5.20'."""
    if not holds:
        return "no pKa"
    words = []
    for low, high in holds:
        if np.isinf(low) and np.isinf(high):
            return "any pKa"
        if np.isinf(low):
            words.append(f"any pKa below {high:.2f}")
        elif np.isinf(high):
            words.append(f"any pKa above {low:.2f}")
        else:
            words.append(f"a pKa between {low:.2f} and {high:.2f}")
    return " or ".join(words)


def say_probability(p: float) -> str:
    """A probability in words, without false digits at the ends."""
    if p < NEGLIGIBLE_RISK:
        return f"below {NEGLIGIBLE_RISK:g}"
    if p > 1.0 - NEGLIGIBLE_RISK:
        return f"above {1.0 - NEGLIGIBLE_RISK:g}"
    return f"{p:.3f}" if p < 0.01 else f"{p:.2f}"


def choice_verdict(
    choice: str,
    pka: Sequence[float],
    sd: Sequence[float],
    holds_by_step: Sequence[Ranges],
    probability_wrong: float | None = None,
    risk: float = DEFAULT_RISK,
) -> Verdict:
    """Verdict on a choice between courses.

    Parameters
    ----------
    choice : str
        Subject of the sentence, for instance "sodium hydrogencarbonate".
    pka, sd : sequence of float
        Estimates of the steps.
    holds_by_step : sequence of ranges
        For each step, where the choice is right with the others at their estimates.
    probability_wrong : float, optional
        Probability over all steps together; left out, that of the deciding step.
    risk : float
        Accepted probability of a wrong choice.

    Notes
    -----
    The deciding step is the one whose interval alone makes the choice wrong most often.
    """
    alone = [1.0 - float(probability_in(h, m, s)) for h, m, s in zip(holds_by_step, pka, sd, strict=True)]
    step = int(np.argmax(alone)) if max(alone) > NEGLIGIBLE_RISK else _nearest_flip(pka, sd, holds_by_step)
    mean, spread, holds = float(pka[step]), float(sd[step]), tuple(holds_by_step[step])
    wrong = alone[step] if probability_wrong is None else probability_wrong
    needed = precision_needed(mean, spread, holds, risk) if wrong > risk else None
    which = f" (step {step + 1})" if len(pka) > 1 else ""
    head = f"{choice} holds for {say_ranges(holds)}{which}, now {mean:.2f} ± {_Z95 * spread:.2f} (95 %)"
    probability = f"the choice is wrong with probability {say_probability(wrong)}"
    if wrong <= NEGLIGIBLE_RISK:
        tail = "measuring changes nothing"
    elif wrong <= risk:
        tail = f"{probability}: no measurement is needed at an accepted risk of {risk:g}"
    elif needed is None:
        tail = f"{probability}: measuring step {step + 1} alone does not settle it, measure every step"
    elif needed < FINEST_MEASUREMENT:
        tail = (
            f"{probability}: it lies at the flip, not even ± {FINEST_MEASUREMENT:g} settles it; choose "
            "otherwise"
        )
    else:
        tail = f"{probability}: measure to ± {needed:.2f} before choosing"
    return Verdict(choice, step + 1, mean, spread, holds, wrong, needed, f"{head}; {tail}.")


def _nearest_flip(pka: Sequence[float], sd: Sequence[float], holds_by_step: Sequence[Ranges]) -> int:
    """The step with the fewest standard deviations to its flip."""

    def distance(k: int) -> float:
        ends = [end for low_high in holds_by_step[k] for end in low_high]
        return min((abs(end - pka[k]) / max(sd[k], 1e-9) for end in ends), default=float("inf"))

    return min(range(len(pka)), key=distance)


def setting_verdict(
    setting: str,
    pka: float,
    sd: float,
    holds: tuple[float, float],
    probability_wrong: float,
    step: int = 1,
    n_steps: int = 1,
    risk: float = DEFAULT_RISK,
) -> Verdict:
    """Verdict on a setting that would follow the measured value.

    `holds` is where the present setting is within tolerance, `setting` the beginning of the sentence.  The
    measurement that settles it has a 95 % interval no wider than `holds`; where that is open at one end, one that does
    not reach the other end from the present estimate.
    """
    needed = _settles(pka, holds) if probability_wrong > risk else None
    which = f" (step {step})" if n_steps > 1 else ""
    head = f"{setting} {say_ranges([holds])}{which}, now {pka:.2f} ± {_Z95 * sd:.2f} (95 %)"
    if probability_wrong <= NEGLIGIBLE_RISK:
        tail = "measuring changes nothing"
    elif needed is None:
        tail = (
            f"it is outside with probability {say_probability(probability_wrong)}: no measurement is needed"
        )
    elif needed < FINEST_MEASUREMENT:
        tail = (
            f"it is outside with probability {say_probability(probability_wrong)}: no ordinary measurement "
            f"of the pKa (± {FINEST_MEASUREMENT:g}) settles it, set the pH with a meter"
        )
    else:
        tail = (
            f"it is outside with probability {say_probability(probability_wrong)}: measure the pKa to "
            f"± {needed:.2f} first, or set the pH with a meter"
        )
    return Verdict(setting, step, pka, sd, (holds,), probability_wrong, needed, f"{head}; {tail}.")


def _settles(pka: float, holds: tuple[float, float]) -> float | None:
    ends = [end for end in holds if np.isfinite(end)]
    if len(ends) == 2:
        return 0.5 * (ends[1] - ends[0])
    return abs(ends[0] - pka) if ends else None


def ranges_where(grid: Floats, margin: Floats) -> tuple[tuple[float, float], ...]:
    """Ranges of `grid` where `margin` is positive, ends interpolated, infinite where the grid ends inside.

    Parameters
    ----------
    grid, margin : ndarray, shape (n,)
        Ascending scan of a pKa and a quantity that is positive where the choice is right.
    """
    right = margin >= 0.0
    edges = np.flatnonzero(right[1:] != right[:-1])
    with np.errstate(invalid="ignore"):
        crossings = [
            float(grid[i] + (grid[i + 1] - grid[i]) * margin[i] / (margin[i] - margin[i + 1])) for i in edges
        ]
    ends = ([-np.inf] if right[0] else []) + crossings + ([np.inf] if right[-1] else [])
    return tuple((float(a), float(b)) for a, b in zip(ends[0::2], ends[1::2], strict=True))


def elsewhere(ranges: Ranges) -> tuple[tuple[float, float], ...]:
    """Everything outside ascending, disjoint `ranges`."""
    ends = [-np.inf, *(end for pair in ranges for end in pair), np.inf]
    return tuple((float(a), float(b)) for a, b in zip(ends[0::2], ends[1::2], strict=True) if a < b)
