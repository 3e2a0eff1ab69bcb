"""Speciation curves against a library of thermodynamic data and against closed formulas."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from qsar.decisions.ionised import ionised_verdict, safe_ph
from qsar.decisions.speciation import (
    LogP,
    average_charge,
    conditional,
    fractions,
    log_d,
    log_p_of,
    ph_at_fraction,
    ph_band_at_fraction,
    speciation,
)
from qsar.decisions.steps import AcidSteps, at_temperature, given_steps


@pytest.mark.parametrize(
    ("states", "pka"),
    # Constants: Goldberg, Kishore & Lennen 2002 (succinic), CRC Handbook (malonic, acetic), from memory.
    [
        (("succinic acid", "H-succinate", "succinate-2"), (4.207, 5.636)),
        (("malonic acid", "H-malonate", "malonate-2"), (2.85, 5.70)),
        (("acetic acid", "acetate"), (4.756,)),
    ],
)
def test_curves_against_pychnosz(states: tuple[str, ...], pka: tuple[float, ...]) -> None:
    """Fractions from the energies of OBIGT by pychnosz, which knows nothing of our constants."""
    pychnosz = pytest.importorskip("pychnosz", reason="pychnosz (a test dependency) is not installed")
    pychnosz.basis("CHNOS+")
    pychnosz.species(list(states))
    activities = np.array(pychnosz.equilibrate(pychnosz.affinity(pH=[1, 9, 81]))["loga_equil"])
    reference = (10.0**activities / (10.0**activities).sum(axis=0)).T
    assert np.abs(fractions(np.linspace(1, 9, 81), pka) - reference).max() < 0.02


@given(
    pka=st.lists(st.floats(-2, 14), min_size=1, max_size=6).map(sorted),
    ph=st.floats(-2, 16),
    charge=st.integers(-1, 2),
)
def test_fractions_add_up_and_charge_is_their_mean(pka: list[float], ph: float, charge: int) -> None:
    share = fractions(ph, pka)
    assert float(share.sum()) == pytest.approx(1.0)
    assert (share >= 0.0).all()
    mean = sum(float(f) * (charge - k) for k, f in enumerate(share))
    assert float(average_charge(ph, pka, charge)) == pytest.approx(mean, abs=1e-12)


@given(pka=st.floats(0, 12), fraction=st.floats(0.001, 0.999))
def test_ph_at_fraction_is_henderson_hasselbalch_for_one_step(pka: float, fraction: float) -> None:
    # Henderson 1908, Hasselbalch 1916.
    expected = pka + np.log10(fraction / (1.0 - fraction))
    assert float(ph_at_fraction([pka], fraction)) == pytest.approx(expected, abs=1e-9)


@given(
    pka=st.lists(st.floats(1, 12), min_size=2, max_size=4).map(sorted),
    fraction=st.floats(0.01, 0.99),
    step=st.integers(1, 2),
)
def test_ph_at_fraction_gives_the_fraction_back(pka: list[float], fraction: float, step: int) -> None:
    ph = ph_at_fraction(pka, fraction, step)
    assert float(fractions(ph, pka)[step:].sum()) == pytest.approx(fraction, abs=1e-9)


def test_isoelectric_point_of_glycine() -> None:
    # CRC Handbook, "Properties of amino acids": pI 5.97 (from memory); constants 2.35 and 9.78 give 6.06 by
    # Goldberg et al. 2002, 2.34 and 9.60 those of the table with 5.97.
    assert float(average_charge(5.97, [2.34, 9.60], 1)) == pytest.approx(0.0, abs=1e-3)


def test_log_d_of_benzoic_acid_at_ph_7_4() -> None:
    # log P 1.87 and log D(7.4) -1.3 (Hansch & Leo; shake-flask values of -1.1 to -1.4; from memory).
    assert float(log_d(7.4, [4.20], 0, 1.87)) == pytest.approx(-1.3, abs=0.2)
    assert float(log_d(0.0, [4.20], 0, 1.87)) == pytest.approx(1.87, abs=1e-3)


def test_log_d_needs_a_form_without_charge() -> None:
    with pytest.raises(ValueError, match="without charge"):
        log_d(7.0, [2.0], 2, 1.0)


def test_log_p_is_labelled() -> None:
    benzoic = given_steps("benzoic acid", [4.20], smiles="OC(=O)c1ccccc1")
    assert log_p_of(benzoic, 1.87) == LogP(1.87, "log P as given")
    estimated = log_p_of(benzoic, None)
    assert estimated is not None and "Crippen" in estimated.label
    # Measured 1.87 (Hansch & Leo, from memory); Wildman & Crippen state a standard error of 0.68.
    assert estimated.value == pytest.approx(1.87, abs=0.68)
    glycine = given_steps("glycine", [2.35], charge_of_acid_form=1, smiles="NCC(=O)O")
    assert log_p_of(glycine, None) is None


def test_bands_hold_the_ends_of_the_interval() -> None:
    acid = AcidSteps("an acid", "", (4.2,), (3.9,), (4.6,), 0.9, 0)
    result = speciation(acid, [4.2], log_p=LogP(2.0, "log P as given"))
    half = 0.5 * (4.6 - 3.9)  # the interval is read as symmetric around the value
    ends = [float(fractions(4.2, [4.2 + d])[1]) for d in (half, -half)]
    assert float(result.fraction.low[0, 1]) == pytest.approx(ends[0], abs=0.002)
    assert float(result.fraction.high[0, 1]) == pytest.approx(ends[1], abs=0.002)
    value, low, high = ph_band_at_fraction(acid, 0.5)
    assert (value, low, high) == pytest.approx((4.2, 4.2 - half, 4.2 + half), abs=0.003)


def test_conditions_move_the_curve() -> None:
    # Acetic acid 4.756; mixed constant at 0.1 mol/L 4.65 (half-neutralised 0.1 mol/L acetate, Bates: pH
    # 4.652).
    moved = conditional(np.array([4.756]), 0, 0.1)
    assert float(moved[0]) == pytest.approx(4.65, abs=0.01)


def test_temperature_widens_where_the_enthalpy_is_not_given() -> None:
    acid = given_steps("an acid", [4.2], sd=0.01)
    assumed, known = at_temperature(acid, 40.0), at_temperature(acid, 40.0, [-0.41])
    assert assumed.high[0] - assumed.low[0] > known.high[0] - known.low[0]
    assert known.high[0] - known.low[0] == pytest.approx(acid.high[0] - acid.low[0])
    assert "assumed" in assumed.notes[-1] and "as given" in known.notes[-1]
    # Harned & Ehlers 1933: acetic acid 4.756 at 25 and 4.769 at 40 degC.
    assert at_temperature(given_steps("acetic acid", [4.756]), 40.0, [-0.41]).pka[0] == pytest.approx(
        4.769, abs=0.01
    )
    with pytest.raises(ValueError, match="2 enthalpies for 1 steps"):
        at_temperature(acid, 30.0, [1.0, 2.0])


def test_verdict_flips_where_the_fraction_is_met() -> None:
    acid = given_steps("an acid", [4.2], sd=0.2)
    sure = ionised_verdict(acid, 7.4, 0.99)
    assert sure.flips_at == pytest.approx((7.4 - np.log10(99.0),))
    assert "measuring changes nothing" in sure.sentence
    close = ionised_verdict(acid, 6.3, 0.99)
    assert close.probability_wrong == pytest.approx(
        0.31, abs=0.02
    )  # one-sided tail at half a standard deviation
    assert close.measure_to is not None and "measure to" in close.sentence


@given(
    pka=st.lists(st.floats(2, 10), min_size=1, max_size=3).map(sorted),
    ph=st.floats(3, 9),
    step=st.integers(1, 3),
    strength=st.floats(0, 0.5),
)
def test_flip_is_exact(pka: list[float], ph: float, step: int, strength: float) -> None:
    step = min(step, len(pka))
    acid = given_steps("an acid", pka)
    verdict = ionised_verdict(acid, ph, 0.9, step, strength)
    flipped = np.array(pka)
    flipped[step - 1] = verdict.flips_at[0]
    mixed = conditional(flipped, 0, strength)
    assert float(fractions(ph, mixed)[step:].sum()) == pytest.approx(0.9, abs=1e-9)


def test_safe_ph_is_safe() -> None:
    acid = given_steps("an acid", [4.2], sd=0.2)
    ph, verdict = safe_ph(acid, 0.99)
    # One-sided 95 % quantile of a normal: 1.645 standard deviations.
    assert ph == pytest.approx(4.2 + 1.645 * 0.2 + np.log10(99.0), abs=0.01)
    assert verdict.flips_at[0] == pytest.approx(4.2 + 1.645 * 0.2, abs=0.01)
