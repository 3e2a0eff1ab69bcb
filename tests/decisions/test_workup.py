"""Extraction with bases: limits that can be worked by hand, and the behaviour of CO2."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from qsar.decisions.bases import BASES, CARBONIC_NOTE, WATER_NOTE, Base, base_named
from qsar.decisions.speciation import LogP
from qsar.decisions.steps import UnusableAcid, given_steps
from qsar.decisions.workup import (
    Extraction,
    gentler_alternative,
    in_water_fraction,
    plan_workup,
    try_base,
)

BENZOIC = given_steps("benzoic acid", [4.20], sd=0.05)
LOG_P = LogP(1.87, "log P as given")  # Hansch & Leo, from memory
JOB = Extraction(acid_mol=0.010, organic_l=0.050, water_l=0.050, base_mol=0.020)


def test_constants_of_the_bases() -> None:
    """Conjugate acids at 25 degC: CRC Handbook (from memory)."""
    crc = {
        "pyridine": 5.23,
        "ammonia": 9.25,
        "triethylamine": 10.75,
        "ethanolamine": 9.50,
        "triethanolamine": 7.76,
        "sodium hydrogencarbonate": 6.35,
    }
    for name, pka in crc.items():
        assert base_named(name).pka[0] == pytest.approx(pka, abs=0.05)
    # Bates & Pinching 1949: ammonium 9.730 at 10 degC, 8.805 at 40 degC.
    assert base_named("ammonia").pka_at(10.0)[0] == pytest.approx(9.730, abs=0.01)
    # Harned & Davis 1943: carbonic acid 6.464 at 10 degC, 6.298 at 40 degC (from memory; heat capacity
    # neglected).
    assert base_named("carbonate").pka_at(10.0)[0] == pytest.approx(6.464, abs=0.04)
    assert base_named("carbonate").pka_at(40.0)[0] == pytest.approx(6.298, abs=0.04)


def test_water_and_carbonic_acid_as_taught() -> None:
    assert "14.0" in WATER_NOTE and "15.74" in WATER_NOTE and "enters no calculation" in WATER_NOTE
    assert "6.35" in CARBONIC_NOTE and "6.4" in CARBONIC_NOTE
    assert all(p < 14.0 for base in BASES for p in base.pka)


def test_without_base_the_partition_coefficient_decides() -> None:
    # Nernst distribution: 1 / (1 + P V_org / V_water) where ionisation is suppressed (pKa far above the pH).
    in_water = in_water_fraction(
        np.array([[12.0]]), 1.0, base_named("ammonia"), Extraction(0.001, 0.02, 0.04, 0.0)
    )
    assert float(in_water[0]) == pytest.approx(1.0 / (1.0 + 10.0 * 0.5), rel=1e-3)


def test_hydroxide_takes_its_equivalent() -> None:
    """Half an equivalent of strong base ionises half of a weak acid."""
    outcome = try_base(BENZOIC, 3.0, base_named("hydroxide"), Extraction(0.010, 0.050, 0.050, 0.005))
    assert outcome.deprotonated == pytest.approx(0.5, abs=0.002)


def test_order_of_bases_follows_their_strength() -> None:
    result = plan_workup(BENZOIC, LOG_P, JOB)
    names = [outcome.base.name for outcome in result.outcomes]
    # Common practice, no source: hydrogencarbonate is gentler than carbonate, and hydroxide is the harshest.
    assert (
        names.index("sodium hydrogencarbonate")
        < names.index("sodium carbonate")
        < names.index("sodium hydroxide")
    )
    fractions = {outcome.base.name: outcome.in_water for outcome in result.outcomes}
    assert fractions["pyridine"] < 0.5 < fractions["sodium hydrogencarbonate"] < fractions["sodium hydroxide"]


def test_hydrogencarbonate_tells_acids_from_phenols() -> None:
    # Common practice, no source: carboxylic acids go into hydrogencarbonate, 2-naphthol does not but goes
    # into hydroxide (pKa 9.51 CRC Handbook, log P 2.70 Hansch & Leo, from memory).
    job = Extraction(0.010, 0.050, 0.050, 0.040, vent_bar=0.1)
    naphthol = given_steps("2-naphthol", [9.51])
    assert try_base(BENZOIC, 1.87, base_named("hydrogencarbonate"), job).sufficient
    assert try_base(naphthol, 2.70, base_named("hydrogencarbonate"), job).in_water < 0.01
    assert try_base(naphthol, 2.70, base_named("hydroxide"), job).sufficient


def test_kept_carbon_dioxide_holds_the_acid_back() -> None:
    base = base_named("hydrogencarbonate")
    vented = try_base(BENZOIC, 1.87, base, JOB)
    kept = try_base(BENZOIC, 1.87, base, Extraction(0.010, 0.050, 0.050, 0.020, co2="kept"))
    assert kept.in_water < vented.in_water
    assert kept.co2_bar > vented.co2_bar == pytest.approx(1.01325, rel=1e-6)
    # Stoichiometry: no more gas than acid that was neutralised.
    assert 0.0 < vented.co2_left_mol < 0.010
    # Ideal gas in the headspace agrees with the pressure: n = p V / (R T).
    gas = kept.co2_bar * 0.050 / (0.0831446 * 298.15)
    carbon_left = kept.co2_left_mol
    assert carbon_left == pytest.approx(gas, rel=1e-3)


@given(pka=st.floats(0, 12), shift=st.floats(0.1, 2), log_p=st.floats(-1, 5))
@settings(max_examples=25, deadline=None)
def test_weaker_acids_go_less_far(pka: float, shift: float, log_p: float) -> None:
    rows = np.array([[pka], [pka + shift]])
    for base in BASES:
        fractions = in_water_fraction(rows, log_p, base, JOB)
        assert fractions[1] <= fractions[0] + 1e-9


def test_verdict_names_the_flip_and_flips_there() -> None:
    result = plan_workup(BENZOIC, LOG_P, JOB)
    assert result.chosen is not None
    flip = result.verdict.flips_at[0]
    base = result.chosen.base
    either = in_water_fraction(np.array([[flip - 0.02], [flip + 0.02]]), 1.87, base, JOB)
    assert either[0] > JOB.target > either[1]
    gentler = gentler_alternative(result)
    assert gentler is not None and gentler[1] < 4.20
    assert f"any pKa below {flip:.2f}" in result.verdict.sentence


def test_uncertain_acid_is_to_be_measured() -> None:
    vague = given_steps("an acid", [4.60], sd=0.5)
    result = plan_workup(vague, LOG_P, JOB, [base_named("triethanolamine"), base_named("ammonia")])
    assert result.chosen is not None and result.chosen.base.name == "triethanolamine"
    assert result.verdict.probability_wrong > 0.05
    assert result.verdict.measure_to is not None and 0.02 < result.verdict.measure_to < 1.0
    assert result.safe is not None and result.safe.base.name == "ammonia"


def test_no_base_does() -> None:
    result = plan_workup(given_steps("an alcohol", [16.0]), LOG_P, JOB, [base_named("hydrogencarbonate")])
    assert result.chosen is None
    assert result.verdict.sentence.startswith("That not even sodium hydrogencarbonate")
    assert "measuring changes nothing" in result.verdict.sentence


def test_left_in_the_organic_layer() -> None:
    phenol = given_steps("a phenol", [9.9], sd=0.1)
    job = Extraction(0.010, 0.050, 0.050, 0.020, into="organic")
    result = plan_workup(phenol, LogP(2.5, "log P as given"), job)
    assert result.chosen is not None and result.chosen.in_water <= 0.05
    assert all(o.ph <= result.chosen.ph for o in result.outcomes if o.sufficient)
    assert "above" in result.verdict.sentence


def test_dibasic_acid() -> None:
    acid = given_steps("adipic acid", [4.43, 5.41])
    result = plan_workup(acid, LogP(0.08, "log P as given"), JOB, [base_named("carbonate")])
    assert len(result.outcomes[0].holds_by_step) == 2
    assert result.outcomes[0].in_water > 0.999


def test_zwitterions_are_refused() -> None:
    glycine = given_steps("glycine", [2.35], charge_of_acid_form=1)
    with pytest.raises(UnusableAcid, match=r"charge of \+1"):
        plan_workup(glycine, LOG_P, JOB)


def test_own_base_and_refusals() -> None:
    own = base_named("N-methylmorpholine:7.38")
    assert own == Base("N-methylmorpholine", (7.38,), 1, 0, (0.0,), None, "as given")
    with pytest.raises(ValueError, match="is not known; one of pyridine"):
        base_named("lye")
    with pytest.raises(ValueError, match="not a pKa"):
        base_named("amine:strong")
    with pytest.raises(ValueError, match="amount of acid"):
        Extraction(0.0, 0.05, 0.05, 0.02)
    with pytest.raises(ValueError, match="target 1"):
        Extraction(0.01, 0.05, 0.05, 0.02, target=1.0)
