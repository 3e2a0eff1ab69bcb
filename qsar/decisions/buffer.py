"""A buffer of an acid and its salt: pH from the full charge balance, capacity, range, and how sure it is."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from qsar.conditions import DAVIES_LIMIT_M, REFERENCE_C, davies_term, water_pkw
from qsar.decisions.equilibrium import Equilibrium, Solute, buffer_capacity, solute, solve
from qsar.decisions.speciation import conditional, fractions
from qsar.decisions.steps import AcidSteps
from qsar.decisions.worth_measuring import (
    DEFAULT_RISK,
    Verdict,
    choice_verdict,
    elsewhere,
    ranges_where,
    say_ranges,
    setting_verdict,
)

Floats = NDArray[np.float64]

_DRAWS = 1000
_SHARES, _ZOOMS = 65, 4  # a ratio to one part in ten million
_SCAN = np.arange(-2.0, 2.0 + 1e-9, 0.02)
RANGE_CAPACITY = float(np.log(10.0)) * 10.0 / 121.0
"""Capacity of a one-step buffer one unit from its pKa, per total concentration: where its use ends."""


@dataclass(frozen=True)
class Recipe:
    """What is dissolved.

    Attributes
    ----------
    acid_m : float
        Acid form [mol/L].
    salt_m : float
        Salt form [mol/L].
    step : int
        The salt has lost this many protons (1 for hydrogen phthalate, 2 for phthalate), the acid form one
        fewer.
    strong_base_m : float
        Strong base added [mol/L]; negative for strong acid.
    ionic_strength_m : float or None
        Held by an inert salt [mol/L], 0 to 0.5; None for the ions of the buffer alone.
    temperature_c : float
        Temperature [degC].
    """

    acid_m: float
    salt_m: float
    step: int = 1
    strong_base_m: float = 0.0
    ionic_strength_m: float | None = None
    temperature_c: float = REFERENCE_C

    @property
    def total_m(self) -> float:
        """Acid and salt together [mol/L]."""
        return self.acid_m + self.salt_m


@dataclass(frozen=True)
class BufferResult:
    """A buffer and what is known about it.

    Attributes
    ----------
    acid : AcidSteps
    recipe : Recipe
    ph, ph_low, ph_high : float
        pH with the ends of its interval.
    ionic_strength_m : float
        Of the solution [mol/L].
    capacity : float
        Buffer capacity at that pH [mol/(L pH)].
    useful : tuple of (low, high)
        pH ranges in which the acid's own capacity per total concentration is at least that of a one-step
        buffer one unit from its pKa.
    curve_ph, curve_capacity : ndarray, shape (n,)
        Capacity against pH at this total concentration and ionic strength.
    verdicts : tuple of Verdict
        On the pH that was made, and on the choice of this acid for the wanted pH.
    notes : tuple of str
    """

    acid: AcidSteps
    recipe: Recipe
    ph: float
    ph_low: float
    ph_high: float
    ionic_strength_m: float
    capacity: float
    useful: tuple[tuple[float, float], ...]
    curve_ph: Floats
    curve_capacity: Floats
    verdicts: tuple[Verdict, ...]
    notes: tuple[str, ...]


def check_recipe(acid: AcidSteps, recipe: Recipe) -> None:
    """Refuse amounts that make no buffer.

    Raises
    ------
    ValueError
        For negative or no concentrations, or a step that the acid does not have.
    """
    values = (recipe.acid_m, recipe.salt_m)
    if not all(np.isfinite(v) and v >= 0.0 for v in values) or recipe.total_m <= 0.0:
        raise ValueError(
            f"{acid.name}: concentrations of acid and salt must be zero or more and not both zero"
        )
    if not 1 <= recipe.step <= len(acid.pka):
        n = len(acid.pka)
        raise ValueError(f"{acid.name}: no step {recipe.step}; it has {n} step{'' if n == 1 else 's'}")


def _solutes(
    recipe: Recipe, acid_m: float | Floats, salt_m: float | Floats, pka: Floats, charge: int
) -> list[Solute]:
    """The acid, the counter-ions of acid and salt form, and the strong base or acid."""
    acid_form, salt_form = charge - (recipe.step - 1), charge - recipe.step
    forms = ((acid_form, acid_m), (salt_form, salt_m))
    # Cations beside anions rather than their difference, so that the ionic strength counts both.
    cations = max(recipe.strong_base_m, 0.0) + sum(max(-z, 0) * c for z, c in forms)
    anions = max(-recipe.strong_base_m, 0.0) + sum(max(z, 0) * c for z, c in forms)
    return [
        solute("acid", recipe.total_m, pka, charge),
        solute("cation", cations, charge=1),
        solute("anion", anions, charge=-1),
    ]


def solve_recipe(recipe: Recipe, pka: Floats, charge: int) -> tuple[Equilibrium, list[Solute]]:
    """Solve a recipe for a batch of constants, shape (n_cases, n_steps).

    Raises
    ------
    ValueError
        When the buffer's own ions exceed the prescribed ionic strength.
    """
    solutes = _solutes(recipe, recipe.acid_m, recipe.salt_m, pka, charge)
    solved = solve(solutes, recipe.temperature_c, recipe.ionic_strength_m)
    if recipe.ionic_strength_m is not None:
        own = float(solved.own_ionic_strength_m.max())
        if own > recipe.ionic_strength_m + 1e-9:
            raise ValueError(
                f"ionic strength {recipe.ionic_strength_m:g} mol/L: the buffer's own ions make {own:.3g} "
                "mol/L; give at least that, or leave the ionic strength out"
            )
    return solved, solutes


def _capacity_curve(acid: AcidSteps, recipe: Recipe, strength: float) -> tuple[Floats, Floats, Floats]:
    """pH, capacity, and capacity of the acid alone (without water's part), at constant ionic strength."""
    ph = np.arange(0.0, 14.0 + 1e-9, 0.02)
    # Constants in concentrations for the acid's part; the pH scale keeps the activity of H+.
    share = fractions(
        ph, conditional(np.array(acid.pka), acid.charge_of_acid_form, strength, recipe.temperature_c)
    )
    charges = np.asarray(acid.charges, dtype=float)
    own = np.log(10.0) * recipe.total_m * (share @ charges**2 - (share @ charges) ** 2)
    davies, pkw = float(davies_term(strength, recipe.temperature_c)), water_pkw(recipe.temperature_c)
    water = np.log(10.0) * (10.0 ** (davies - ph) + 10.0 ** (davies + ph - pkw))
    return ph, own + water, own


def make_buffer(
    acid: AcidSteps,
    recipe: Recipe,
    tolerance: float = 0.1,
    wanted_ph: float | None = None,
    risk: float = DEFAULT_RISK,
) -> BufferResult:
    """pH, capacity, useful range and verdicts for a recipe.

    Parameters
    ----------
    acid : AcidSteps
        Constants at the temperature of the recipe.
    recipe : Recipe
    tolerance : float
        By how much the pH may be off [pH].
    wanted_ph : float, optional
        The pH that is wanted; left out, the one computed.
    risk : float
        Accepted probability of being wrong.

    Raises
    ------
    ValueError
        See `check_recipe` and `solve_recipe`; also for a tolerance that is not above zero.
    """
    check_recipe(acid, recipe)
    if not tolerance > 0.0:
        raise ValueError(f"tolerance {tolerance:g}: a number above zero is expected")
    z = acid.charge_of_acid_form
    centre = np.array([acid.pka])
    solved, solutes = solve_recipe(recipe, centre, z)
    ph, strength = float(solved.ph[0]), float(solved.ionic_strength_m[0])
    drawn = solve_recipe(recipe, acid.draws(_DRAWS), z)[0].ph
    low, high = np.quantile(drawn, [0.5 - acid.coverage / 2.0, 0.5 + acid.coverage / 2.0])
    usable = min(strength, DAVIES_LIMIT_M)
    curve_ph, capacity, own = _capacity_curve(acid, recipe, usable)
    useful = ranges_where(curve_ph, own / recipe.total_m - RANGE_CAPACITY)

    goal = ph if wanted_ph is None else float(wanted_ph)
    verdicts = [_made_verdict(acid, recipe, ph, drawn, goal, tolerance, risk)]
    if wanted_ph is not None:
        verdicts.append(_suits_verdict(acid, recipe, usable, goal, risk))
    notes = []
    if strength > DAVIES_LIMIT_M:
        notes.append(
            f"ionic strength {strength:.2f} mol/L exceeds the {DAVIES_LIMIT_M:g} mol/L of the Davies "
            "equation; the activity coefficients are those at that limit and the pH may be off by about 0.2"
        )
    if not any(first <= ph <= last for first, last in useful):
        notes.append(
            f"this recipe makes pH {ph:.2f}, outside the useful range: it is no buffer of {acid.name}, whatever keeps "
            "its pH"
        )
    return BufferResult(
        acid, recipe, ph, min(float(low), ph), max(float(high), ph), strength,
        float(buffer_capacity(solved, solutes)[0]), useful, curve_ph, capacity, tuple(verdicts), tuple(notes),
    )  # fmt: skip


def _scan(acid: AcidSteps, step: int) -> tuple[Floats, Floats]:
    """Values of one step around its estimate, and rows of constants with the other steps kept."""
    values = acid.pka[step] + _SCAN
    rows = np.tile(np.array(acid.pka), (values.size, 1))
    rows[:, step] = values
    return values, rows


def _made_verdict(
    acid: AcidSteps, recipe: Recipe, ph: float, drawn: Floats, goal: float, tolerance: float, risk: float
) -> Verdict:
    """Is the pH that this recipe makes within the tolerance of the goal."""
    outside = float(np.mean(np.abs(drawn - goal) > tolerance))
    ranges_by_step = []
    for k in range(len(acid.pka)):
        values, rows = _scan(acid, k)
        made = solve_recipe(recipe, rows, acid.charge_of_acid_form)[0].ph
        ranges_by_step.append(ranges_where(values, tolerance - np.abs(made - goal)))
    name = f"The recipe keeps pH {goal:.2f} ± {tolerance:g} for"
    # The step whose tolerated range is narrowest in its own standard deviations decides.
    sd = np.maximum(acid.sd, 1e-9)
    widths = [(r[0][1] - r[0][0]) / s if r else 0.0 for r, s in zip(ranges_by_step, sd, strict=True)]
    step = int(np.argmin(widths)) if np.isfinite(min(widths)) else recipe.step - 1
    ranges = ranges_by_step[step]
    if not ranges:
        sentence = f"{name} no pKa near {acid.pka[step]:.2f}: take another acid."
        return Verdict(name, step + 1, acid.pka[step], float(acid.sd[step]), (), outside, None, sentence)
    if abs(ph - goal) > tolerance:
        sentence = (
            f"{name} {say_ranges(ranges)}, now {acid.pka[step]:.2f}, which makes pH {ph:.2f}: change the "
            "ratio of acid to salt before anything is measured."
        )
        held = tuple(ranges)
        return Verdict(name, step + 1, acid.pka[step], float(acid.sd[step]), held, outside, None, sentence)
    return setting_verdict(
        name, acid.pka[step], float(acid.sd[step]), ranges[0], outside, step + 1, len(acid.pka), risk
    )


def _suits_verdict(acid: AcidSteps, recipe: Recipe, strength: float, goal: float, risk: float) -> Verdict:
    """Does the goal lie in the useful range, so that this acid is the right one for it."""
    charges = np.asarray(acid.charges, dtype=float)

    def margin(rows: Floats) -> Floats:
        mixed = conditional(rows, acid.charge_of_acid_form, strength, recipe.temperature_c)
        share = fractions(np.full(rows.shape[0], goal), mixed)
        return np.asarray(np.log(10.0) * (share @ charges**2 - (share @ charges) ** 2) - RANGE_CAPACITY)

    holds = []
    for k in range(len(acid.pka)):
        values, rows = _scan(acid, k)
        holds.append(ranges_where(values, margin(rows)))
    suits = bool(margin(np.array([acid.pka]))[0] >= 0.0)
    share = float(np.mean(margin(acid.draws(_DRAWS)) >= 0.0))
    if suits:
        name, wrong = f"{acid.name} for a buffer at pH {goal:.2f}", 1.0 - share
    else:
        name, wrong = f"Leaving {acid.name} aside for a buffer at pH {goal:.2f}", share
        holds = [elsewhere(ranges) for ranges in holds]
    return choice_verdict(name, acid.pka, acid.sd.tolist(), holds, wrong, risk)


def salt_for(acid: AcidSteps, recipe: Recipe, wanted_ph: float) -> Recipe:
    """The same total concentration with the ratio of acid to salt that makes `wanted_ph`.

    Raises
    ------
    ValueError
        When no ratio of the two forms of this step makes that pH.
    """
    check_recipe(acid, recipe)
    total, pka = recipe.total_m, np.array([acid.pka])
    low, high = 0.0, 1.0
    for _ in range(_ZOOMS):
        share = np.linspace(low, high, _SHARES)
        solutes = _solutes(recipe, total * (1.0 - share), total * share, pka, acid.charge_of_acid_form)
        made = solve(solutes, recipe.temperature_c, recipe.ionic_strength_m).ph
        if high - low == 1.0 and not made[0] <= wanted_ph <= made[-1]:
            raise ValueError(
                f"{acid.name}: acid and salt of step {recipe.step} at {total:g} mol/L in all make pH "
                f"{made[0]:.2f} to {made[-1]:.2f}, not {wanted_ph:.2f}; take another step or another acid"
            )
        right = int(np.clip(np.searchsorted(made, wanted_ph), 1, _SHARES - 1))
        low, high = float(share[right - 1]), float(share[right])
    found = 0.5 * (low + high)
    return replace(recipe, acid_m=total * (1.0 - found), salt_m=total * found)
