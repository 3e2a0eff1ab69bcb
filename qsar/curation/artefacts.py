"""What may lie behind a value that nobody expects, each with the experiment or look-up that would decide.

Every artefact says which value the row would have had without it. How often each happens (`prior`) is common
practice, no source; the ranges of other protons are those of Perrin, Dempsey & Serjeant, *pKa Prediction for Organic
Acids and Bases* (1981), from memory.
"""

from __future__ import annotations

import math
import re
from collections.abc import Callable, Iterator, Sequence
from dataclasses import dataclass
from itertools import pairwise

from rdkit import Chem

from qsar.conditions import CONSTANT_KINDS, pka_shift, water_pkw
from qsar.curation.rules import Usable

Floats = Sequence[float]


@dataclass(frozen=True)
class Case:
    """A row with what a model expects of it.

    Attributes
    ----------
    row : Usable
    expected : list of float
        Expected pKa of each carboxyl step, made without the row.
    isomers : list of float
        Expected pKa of this step for the other E/Z and cis/trans isomers.
    """

    row: Usable
    expected: Floats
    isomers: Floats = ()

    @property
    def step(self) -> int:
        """The step, which rows that reach here have."""
        assert self.row.step is not None
        return self.row.step


@dataclass(frozen=True)
class Suspicion:
    """One artefact applied to one row.

    Attributes
    ----------
    kind : str
        Short name.
    explanation : str
        What would have happened.
    residual : float
        Difference from expectation that would be left, pKa units.
    spread : float
        Standard deviation of what the artefact itself leaves open, pKa units.
    prior : float
        How often it happens, per row.
    decide : str
        What would decide.
    """

    kind: str
    explanation: str
    residual: float
    spread: float
    prior: float
    decide: str


def suspicions(case: Case) -> list[Suspicion]:
    """Every artefact that could apply to a row, and the absence of one."""
    return [s for source in SOURCES for s in source(case)]


NO_FAULT = "no fault found"


def _no_fault(case: Case) -> Iterator[Suspicion]:
    yield Suspicion(
        NO_FAULT,
        "the value is right and the model is wrong about this acid",
        case.row.pka - case.expected[case.step - 1],
        0.0,
        0.80,
        "measure again by another method (potentiometric against spectrophotometric or NMR); if it stands, it is the "
        "most instructive row of the table",
    )


def _ionic_strength(case: Case) -> Iterator[Suspicion]:
    row, z = case.row, case.row.charge - (case.step - 1)
    expected = case.expected[case.step - 1]
    corrected = abs(row.pka - row.measured) > 1e-9
    if corrected:
        value = row.measured
        explanation = (
            f"the value was already extrapolated to I = 0 and was corrected a second time by {row.pka - value:+.2f}"
        )
    else:
        value = row.measured - float(pka_shift(z, 0.15, "concentration"))
        explanation = (
            f"measured at an ionic strength near 0.15 mol/L that the row does not state ({value - row.pka:+.2f})"
        )
    yield Suspicion(
        "ionic-strength shift",
        explanation,
        value - expected,
        0.05,
        0.03,
        "look up the background electrolyte in the notebook; measure at two ionic strengths (0.02 and 0.15 mol/L)",
    )


def _mixed_constant(case: Case) -> Iterator[Suspicion]:
    row, z = case.row, case.row.charge - (case.step - 1)
    if not row.ionic_strength_m:
        return
    used = row.constant or "mixed"
    for kind in CONSTANT_KINDS[1:]:
        if kind == used:
            continue
        value = row.measured - float(pka_shift(z, row.ionic_strength_m, kind))
        yield Suspicion(
            "mixed constant",
            f"a {kind} constant that was taken for a {used} one ({value - row.pka:+.2f})",
            value - case.expected[case.step - 1],
            0.03,
            0.03,
            "look up how the electrode was calibrated: buffers give mixed constants, a strong-acid titration in the "
            "same medium gives concentration constants",
        )


def _ka_as_pka(case: Case) -> Iterator[Suspicion]:
    number, expected = case.row.measured, case.expected[case.step - 1]
    decide = "look up the original table: its header and the power of ten"
    if 0.0 < number < 1.0:
        yield Suspicion(
            "Ka typed as pKa",
            f"{number:g} is Ka; pKa would be {-math.log10(number):.2f}",
            -math.log10(number) - expected,
            0.0,
            0.02,
            decide,
        )
    if 1.0 <= number < 10.0:
        power = round(expected + math.log10(number))
        value = power - math.log10(number)
        yield Suspicion(
            "Ka typed as pKa",
            f"{number:g} is the mantissa of a Ka whose power of ten was lost; {number:g}e-{power} gives {value:.2f}",
            value - expected,
            0.0,
            0.001,  # of the few Ka that are typed as pKa, few lose their power of ten
            decide,
        )


def _pkb_as_pka(case: Case) -> Iterator[Suspicion]:
    row = case.row
    value = water_pkw(25.0 if row.temperature_c is None else row.temperature_c) - row.measured
    yield Suspicion(
        "pKb typed as pKa",
        f"{row.measured:g} is pKb of the conjugate base; pKa would be {value:.2f}",
        value - case.expected[case.step - 1],
        0.0,
        0.02,
        "look up the original table; titrate the salt with strong acid",
    )


def _swapped_step(case: Case) -> Iterator[Suspicion]:
    for step, value in enumerate(case.expected, start=1):
        if step != case.step:
            yield Suspicion(
                "swapped step",
                f"the value is that of step {step} (expected {value:.2f}), entered as step {case.step}",
                case.row.pka - value,
                0.0,
                0.04,
                "titrate over the whole pH range and count the protons (equivalents of base) before the step",
            )


#: Group, SMARTS, mean and standard deviation of the pKa of its proton.
OTHER_PROTONS: tuple[tuple[str, str, float, float], ...] = (
    ("an aliphatic NH⁺", "[NX3;!$(N-C=[O,S,N]);!$(N-[a]);!$(N-S=O);!$(N-[N,O])]([#6X4])", 9.8, 0.8),
    ("an anilinium NH⁺", "[NX3;!$(N-C=[O,S,N]);!$(N-S=O)]-[c]", 3.8, 1.3),
    ("a pyridinium NH⁺", "[nX2;r6]", 4.5, 1.5),
    ("an imidazolium NH⁺", "[nX2]1c[nX3]cc1", 6.5, 0.8),
    ("a guanidinium or amidinium NH⁺", "[NX3][CX3]=[NX2]", 12.3, 0.8),
    ("a phenol OH", "[OX2H]c", 9.3, 1.2),
    ("a thiol SH", "[SX2H]", 9.0, 1.2),
    ("an imide or sulfonamide NH", "[$([NX3;H1](C=O)C=O),$([NX3;H1,H2]S(=O)=O)]", 9.6, 0.9),
    ("the second proton of a phosphonic acid", "P(=O)([OX2H])[OX2H]", 7.3, 0.7),
)
_PATTERNS = [(label, Chem.MolFromSmarts(smarts), mean, sd) for label, smarts, mean, sd in OTHER_PROTONS]


def _other_proton(case: Case) -> Iterator[Suspicion]:
    for label, pattern, mean, sd in _PATTERNS:
        if case.row.acid.mol.HasSubstructMatch(pattern):
            yield Suspicion(
                "another proton",
                f"the value belongs to {label} (usually {mean - sd:.1f} to {mean + sd:.1f})",
                case.row.pka - mean,
                sd,
                0.04,
                "follow the titration by ¹³C or ¹H NMR or UV: see which group's signal moves",
            )


def _temperature(case: Case) -> Iterator[Suspicion]:
    yield Suspicion(
        "wrong temperature",
        "measured far from the temperature stated",
        case.row.pka - case.expected[case.step - 1],
        0.10,
        0.01,
        "look up the thermostat setting; measure at two temperatures",
    )


def _isomer(case: Case) -> Iterator[Suspicion]:
    if case.isomers:
        near = min(case.isomers, key=lambda value: abs(case.row.pka - value))
        yield Suspicion(
            "E/Z or cis/trans",
            f"the sample was the other isomer (expected {near:.2f})",
            case.row.pka - near,
            0.0,
            0.03,
            "¹H NMR of the sample: coupling across the double bond or an NOE across the ring",
        )


_MIXTURES = {
    "hydrate": "the keto form and its hydrate were in equilibrium",
    "hydrate_aldehyde": "the aldehyde and its hydrate were in equilibrium",
    "gamma_hydroxy": "part of the acid was its γ-lactone",
    "delta_hydroxy": "part of the acid was its δ-lactone",
    "lactol": "part of the acid was its cyclic lactol",
}


def _hydrate_or_lactone(case: Case) -> Iterator[Suspicion]:
    from qsar.advisories import advisories

    for advisory in advisories():
        if advisory.name in _MIXTURES and case.row.acid.mol.HasSubstructMatch(advisory.pattern):
            yield Suspicion(
                "hydrate or lactone",
                _MIXTURES[advisory.name],
                case.row.pka - case.expected[case.step - 1],
                0.8,
                0.05,
                "¹³C NMR in water: carbonyl, gem-diol and lactone carbons show the ratio; titrate at once",
            )


def _transposed_digits(case: Case) -> Iterator[Suspicion]:
    found = re.search(r"\d+[.,]\d+", case.row.as_given)
    if not found or not math.isclose(float(found[0].replace(",", ".")), case.row.measured):
        return
    text = found[0].replace(",", ".")
    places = [k for k, c in enumerate(text) if c.isdigit()]
    variants = set()
    for a, b in pairwise(places):
        swapped = list(text)
        swapped[a], swapped[b] = swapped[b], swapped[a]
        variants.add("".join(swapped))
    variants.discard(text)
    shift = case.row.pka - case.row.measured
    for variant in sorted(variants):
        yield Suspicion(
            "transposed digits",
            f"{variant} was typed as {text}",
            float(variant) + shift - case.expected[case.step - 1],
            0.0,
            0.02 / len(variants),
            "compare the cell with the original record",
        )


SOURCES: tuple[Callable[[Case], Iterator[Suspicion]], ...] = (
    _no_fault,
    _ionic_strength,
    _mixed_constant,
    _ka_as_pka,
    _pkb_as_pka,
    _swapped_step,
    _other_proton,
    _temperature,
    _isomer,
    _hydrate_or_lactone,
    _transposed_digits,
)
