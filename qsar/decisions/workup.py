"""Which base pulls an acid from an organic layer into water, and how far.

Mass, charge and distribution balance of the acid, the base with its counter-ions and, for
(hydrogen)carbonate, the CO2 in water and in the gas above it.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field
from typing import Literal

import numpy as np
from numpy.typing import NDArray

from qsar.conditions import REFERENCE_C
from qsar.decisions.bases import ATMOSPHERE_BAR, BASES, Base, co2_gas_to_water, henry_co2
from qsar.decisions.equilibrium import Solute, solute, solve
from qsar.decisions.speciation import LogP
from qsar.decisions.steps import AcidSteps, UnusableAcid
from qsar.decisions.worth_measuring import DEFAULT_RISK, Verdict, choice_verdict, elsewhere, ranges_where

Floats = NDArray[np.float64]

_SCAN = np.arange(-2.0, 16.0 + 1e-9, 0.05)
_DRAWS = 1000


@dataclass(frozen=True)
class Extraction:
    """Amounts and conditions of one shake.

    Attributes
    ----------
    acid_mol : float
        Acid [mol].
    organic_l, water_l : float
        Volumes [L].
    base_mol : float
        Base, in formula units [mol].
    target : float
        Fraction wanted in the chosen layer.
    into : {"water", "organic"}
        Where the acid is wanted.
    co2 : {"kept", "vented"}
        Kept in a closed vessel, or let out.
    headspace_l : float
        Gas above the liquid [L], for CO2 kept in.
    vent_bar : float
        Partial pressure of CO2 that is left above the water after venting [bar]; one atmosphere by default,
        less after long shaking in air.
    temperature_c : float
        Temperature [degC].

    Raises
    ------
    ValueError
        For amounts or a target out of range.
    """

    acid_mol: float
    organic_l: float
    water_l: float
    base_mol: float
    target: float = 0.95
    into: Literal["water", "organic"] = "water"
    co2: Literal["kept", "vented"] = "vented"
    headspace_l: float = 0.05
    vent_bar: float = ATMOSPHERE_BAR
    temperature_c: float = REFERENCE_C

    def __post_init__(self) -> None:
        for label, value in (("acid", self.acid_mol), ("water", self.water_l)):
            if not (np.isfinite(value) and value > 0.0):
                raise ValueError(f"amount of {label}: a number above zero is expected, {value:g} was given")
        for label, value in (
            ("base", self.base_mol),
            ("organic layer", self.organic_l),
            ("gas", self.headspace_l),
        ):
            if not (np.isfinite(value) and value >= 0.0):
                raise ValueError(f"amount of {label}: zero or more is expected, {value:g} was given")
        if not self.vent_bar > 0.0:
            raise ValueError(f"pressure of CO2: a number above zero is expected, {self.vent_bar:g} was given")
        if not 0.0 < self.target < 1.0:
            raise ValueError(
                f"target {self.target:g}: a fraction between 0 and 1, both excluded, is expected"
            )
        if self.into not in ("water", "organic") or self.co2 not in ("kept", "vented"):
            raise ValueError(
                f"into {self.into!r}, co2 {self.co2!r}: water or organic, kept or vented are expected"
            )


@dataclass(frozen=True)
class BaseOutcome:
    """What one base does.

    Attributes
    ----------
    base : Base
    ph : float
        pH of the water after shaking.
    in_water, in_water_low, in_water_high : float
        Fraction of the acid in the water with the ends of its interval.
    deprotonated : float
        Fraction of the acid that has lost at least one proton.
    delta_pka : float
        Constant of the conjugate acid that takes the proton less that of the acid's first step; its power
        of ten is the equilibrium constant of the proton transfer in water.
    sufficient : bool
        The target is met at the central constants.
    probability_sufficient : float
        The target is met, given the intervals.
    co2_left_mol : float
        CO2 in the gas above the water, or vented [mol]; zero for other bases.
    co2_bar : float
        Pressure of CO2 in equilibrium with the water [bar].
    beyond_davies : bool
        Ionic strength above 0.5 mol/L, activity coefficients held at their values there.
    holds_by_step : tuple of ranges
        For each step of the acid, the constants for which the target is met, other steps at their estimates.
    """

    base: Base
    ph: float
    in_water: float
    in_water_low: float
    in_water_high: float
    deprotonated: float
    delta_pka: float
    sufficient: bool
    probability_sufficient: float
    co2_left_mol: float
    co2_bar: float
    beyond_davies: bool
    holds_by_step: tuple[tuple[tuple[float, float], ...], ...]


@dataclass(frozen=True)
class Workup:
    """Every base tried on one acid, and the choice with its verdict."""

    acid: AcidSteps
    log_p: LogP
    extraction: Extraction
    outcomes: tuple[BaseOutcome, ...]
    chosen: BaseOutcome | None
    safe: BaseOutcome | None
    verdict: Verdict
    notes: tuple[str, ...] = field(default=())


def check_partitions(acid: AcidSteps) -> None:
    """Refuse acids whose uncharged form is not the one that a log P describes.

    Raises
    ------
    UnusableAcid
        For zwitterions and for acids that carry a charge in every form.
    """
    if acid.charge_of_acid_form != 0:
        raise UnusableAcid(
            f"{acid.name}: it carries a charge of {acid.charge_of_acid_form:+d} beside its carboxyl "
            "groups, so it stays in the water at every pH near its pKa and a base does not decide; choose "
            "another separation"
        )


def _mixture(pka: Floats, log_p: float, base: Base, job: Extraction) -> list[Solute]:
    """Everything in the vessel, constants of the acid as (n_cases, n_steps)."""
    per_litre = 1.0 / job.water_l
    ratio = job.organic_l * per_litre
    mixture = [solute("acid", job.acid_mol * per_litre, pka, 0, 10.0**log_p * ratio)]
    if base.pka:
        partition, ceiling = 0.0, float("inf")
        if base.is_carbonate and job.co2 == "kept":
            partition = co2_gas_to_water(job.temperature_c) * job.headspace_l * per_litre
        elif base.is_carbonate:
            ceiling = henry_co2(job.temperature_c) * job.vent_bar
        elif base.log_p is not None:
            partition = 10.0**base.log_p * ratio
        constants = base.pka_at(job.temperature_c)
        mixture.append(solute("base", job.base_mol * per_litre, constants, base.charge, partition, ceiling))
    if base.sodium:
        mixture.append(solute("sodium", base.sodium * job.base_mol * per_litre, charge=1))
    return mixture


def in_water_fraction(pka: Floats, log_p: float, base: Base, job: Extraction) -> Floats:
    """Fraction of the acid in the water for each row of constants (n_cases, n_steps)."""
    solved = solve(_mixture(pka, log_p, base, job), job.temperature_c)
    return np.asarray(solved.in_water["acid"].sum(axis=1) / (job.acid_mol / job.water_l))


def try_base(acid: AcidSteps, log_p: float, base: Base, job: Extraction) -> BaseOutcome:
    """What one base does to one acid.

    Parameters
    ----------
    acid : AcidSteps
        Constants at the temperature of the job.
    log_p : float
        log10 of the partition coefficient of the uncharged acid between the organic layer and water.
    base : Base
    job : Extraction

    Raises
    ------
    UnusableAcid
        See `check_partitions`.
    """
    check_partitions(acid)
    centre = np.array(acid.pka)
    total = job.acid_mol / job.water_l
    mixture = _mixture(centre[None, :], log_p, base, job)
    solved = solve(mixture, job.temperature_c)
    states = solved.in_water["acid"][0]
    in_water = float(states.sum() / total)

    left, pressure = 0.0, 0.0
    if base.is_carbonate:
        carbon = solved.in_water["base"][0]
        left = float(job.base_mol - carbon.sum() * job.water_l)
        pressure = float(carbon[0] / henry_co2(job.temperature_c))

    def margin(fraction: Floats) -> Floats:
        sign = 1.0 if job.into == "water" else -1.0
        edge = job.target if job.into == "water" else 1.0 - job.target
        return sign * (fraction - edge)

    drawn = in_water_fraction(acid.draws(_DRAWS), log_p, base, job)
    low, high = np.quantile(drawn, [0.5 - acid.coverage / 2.0, 0.5 + acid.coverage / 2.0])
    holds = []
    for step in range(centre.size):
        scan = np.tile(centre, (_SCAN.size, 1))
        scan[:, step] = _SCAN
        holds.append(ranges_where(_SCAN, margin(in_water_fraction(scan, log_p, base, job))))
    acceptor = 14.0 if not base.pka else base.pka[0] if base.sodium < 2 else base.pka[-1]
    return BaseOutcome(
        base,
        float(solved.ph[0]),
        in_water,
        min(float(low), in_water),
        max(float(high), in_water),
        float(states[1:].sum() / total),
        acceptor - acid.pka[0],
        bool(margin(np.array(in_water)) >= 0.0),
        float(np.mean(margin(drawn) >= 0.0)),
        left if left > 1e-12 else 0.0,
        pressure,
        bool(solved.beyond_davies[0]),
        tuple(holds),
    )


def _none_verdict(acid: AcidSteps, best: BaseOutcome, job: Extraction, risk: float) -> Verdict:
    """Verdict on doing without, from the base of the list that goes furthest."""
    name = f"That not even {best.base.name} brings {100 * job.target:g} % into the {job.into} layer"
    holds = [elsewhere(ranges) for ranges in best.holds_by_step]
    return choice_verdict(name, acid.pka, acid.sd.tolist(), holds, best.probability_sufficient, risk)


def gentler_alternative(result: Workup) -> tuple[Base, float] | None:
    """The next gentler base and the constant of the deciding step below which it would do.

    Returns
    -------
    tuple of (Base, float) or None
        None where no base of the list is gentler, or none would do at any constant.
    """
    if result.chosen is None or result.extraction.into != "water":
        return None
    position = result.outcomes.index(result.chosen)
    for outcome in reversed(result.outcomes[:position]):
        ranges = outcome.holds_by_step[result.verdict.step - 1]
        if ranges and np.isfinite(ranges[-1][1]):
            return outcome.base, ranges[-1][1]
    return None


def plan_workup(
    acid: AcidSteps,
    log_p: LogP,
    job: Extraction,
    bases: Sequence[Base] = BASES,
    risk: float = DEFAULT_RISK,
) -> Workup:
    """Try each base and choose the gentlest that reaches the target.

    Parameters
    ----------
    acid : AcidSteps
        Constants at the temperature of the job.
    log_p : LogP
        Of the uncharged acid.
    job : Extraction
    bases : sequence of Base
    risk : float
        Accepted probability that the choice is wrong.

    Returns
    -------
    Workup
        Outcomes by rising pH.  `chosen` is the gentlest base (lowest pH) that meets the target at the central
        constants (for ``into="organic"``, the strongest that still leaves the acid there); `safe` is the
        same with a probability of at least ``1 - risk``.

    Raises
    ------
    UnusableAcid
        See `check_partitions`.
    """
    outcomes = sorted((try_base(acid, log_p.value, base, job) for base in bases), key=lambda o: o.ph)
    order = outcomes if job.into == "water" else outcomes[::-1]
    chosen = next((o for o in order if o.sufficient), None)
    safe = next((o for o in order if o.probability_sufficient >= 1.0 - risk), None)
    if chosen is not None:
        wrong = 1.0 - chosen.probability_sufficient
        verdict = choice_verdict(
            chosen.base.name, acid.pka, acid.sd.tolist(), chosen.holds_by_step, wrong, risk
        )
    else:
        verdict = _none_verdict(acid, order[-1], job, risk)
    notes = []
    if any(o.beyond_davies for o in outcomes):
        notes.append(
            "some solutions exceed the 0.5 mol/L of the Davies equation; their activity coefficients are "
            "those at 0.5 mol/L and the pH may be off by about 0.2"
        )
    if any(o.base.is_amine for o in outcomes):
        notes.append(
            "carboxylate drawn into the organic layer as an ion pair with an ammonium ion is not counted"
        )
    return Workup(acid, log_p, job, tuple(outcomes), chosen, safe, verdict, tuple(notes))
