"""Conditions against published tables of water, activity coefficients and constants."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from qsar import conditions as cd

# Kell 1975 / CRC Handbook, "Properties of water", from memory [kg/L].
DENSITY = {10.0: 0.99970, 20.0: 0.99821, 25.0: 0.99705, 30.0: 0.99565, 40.0: 0.99222}
# CRC Handbook, "Ion product of water substance", 0.1 MPa, molal, from memory.
CRC_PKW = {10.0: 14.53, 20.0: 14.17, 25.0: 13.99, 30.0: 13.83, 40.0: 13.54}
# Harned & Owen, The Physical Chemistry of Electrolytic Solutions, 3rd ed., table 15-2-1A, from memory.
HARNED_PKW = {
    10.0: 14.5346,
    15.0: 14.3463,
    20.0: 14.1669,
    25.0: 13.9965,
    30.0: 13.8330,
    35.0: 13.6801,
    40.0: 13.5348,
}
# Buck et al., Pure Appl. Chem. 2002, 74, 2169, table of the Debye-Hueckel A, from memory.
SLOPE = {10.0: 0.4988, 15.0: 0.5026, 20.0: 0.5066, 25.0: 0.5108, 30.0: 0.5152, 40.0: 0.5242}
# Bates & Pinching, J. Res. NBS 1949, 42, 419 (ammonium); Harned & Ehlers, J. Am. Chem. Soc. 1933, 55, 652
# (acetic).
AMMONIUM = {10.0: 9.730, 15.0: 9.564, 20.0: 9.400, 30.0: 9.093, 35.0: 8.947, 40.0: 8.805}
ACETIC = {10.0: 4.762, 15.0: 4.758, 20.0: 4.756, 30.0: 4.757, 35.0: 4.762, 40.0: 4.769}


@pytest.mark.parametrize("temperature", DENSITY)
def test_water_density(temperature: float) -> None:
    assert cd.water_density(temperature) == pytest.approx(DENSITY[temperature], abs=2e-5)


@pytest.mark.parametrize("temperature", HARNED_PKW)
def test_water_ion_product(temperature: float) -> None:
    assert cd.water_pkw(temperature) == pytest.approx(HARNED_PKW[temperature], abs=0.01)
    if temperature in CRC_PKW:
        assert cd.water_pkw(temperature) == pytest.approx(CRC_PKW[temperature], abs=0.01)


def test_water_counts_as_14_and_never_as_15_74() -> None:
    assert round(cd.water_pkw(25.0), 1) == 14.0


@pytest.mark.parametrize("temperature", SLOPE)
def test_debye_huckel_slope(temperature: float) -> None:
    assert cd.debye_huckel_slope(temperature) == pytest.approx(SLOPE[temperature], abs=3e-4)


@pytest.mark.parametrize(
    ("strength", "sodium_chloride", "relative"),
    # Robinson & Stokes, Electrolyte Solutions, 2nd ed., appendix 8.10, NaCl, from memory; the tolerances
    # are those that Davies (1962) states for the equation, 3 % at 0.1 mol/L and 8 % at 0.5 mol/L.
    [(0.01, 0.903, 0.01), (0.1, 0.778, 0.03), (0.5, 0.681, 0.08)],
)
def test_davies_against_sodium_chloride(strength: float, sodium_chloride: float, relative: float) -> None:
    assert float(cd.activity_coefficient(1, strength)) == pytest.approx(sodium_chloride, rel=relative)


@pytest.mark.parametrize(
    ("name", "thermodynamic", "charge", "concentration_at_0_1"),
    # Martell & Smith, Critical Stability Constants, vol. 3 and 5, 25 degC, I = 0 and 0.1, from memory.
    [
        ("acetic acid", 4.757, 0, 4.56),
        ("citric acid, step 1", 3.128, 0, 2.90),
        ("citric acid, step 2", 4.761, -1, 4.35),
        ("citric acid, step 3", 6.396, -2, 5.70),
        ("ammonium", 9.244, 1, 9.29),
    ],
)
def test_constants_at_ionic_strength(
    name: str, thermodynamic: float, charge: int, concentration_at_0_1: float
) -> None:
    computed = float(cd.from_thermodynamic(thermodynamic, charge, 0.1, "concentration"))
    # 0.06: Davies near 3 % on each singly charged ion, nine-fold for the triply charged one.
    assert computed == pytest.approx(concentration_at_0_1, abs=0.06), name


@pytest.mark.parametrize("temperature", AMMONIUM)
def test_van_t_hoff_ammonium(temperature: float) -> None:
    # Enthalpy 51.95 kJ/mol: Goldberg, Kishore & Lennen 2002.
    assert float(cd.van_t_hoff(9.245, 51.95, temperature)) == pytest.approx(AMMONIUM[temperature], abs=0.01)


@pytest.mark.parametrize("temperature", ACETIC)
def test_van_t_hoff_acetic_acid(temperature: float) -> None:
    # Enthalpy -0.41 kJ/mol: Goldberg, Kishore & Lennen 2002; the neglected heat capacity costs 0.01 at both
    # ends.
    assert float(cd.van_t_hoff(4.756, -0.41, temperature)) == pytest.approx(ACETIC[temperature], abs=0.011)


def test_mixed_and_concentration_constants_differ_by_the_proton() -> None:
    difference = cd.pka_shift(-1, 0.1, "mixed") - cd.pka_shift(-1, 0.1, "concentration")
    assert float(difference) == pytest.approx(-np.log10(float(cd.activity_coefficient(1, 0.1))))


@given(
    pka=st.floats(-2, 14),
    charge=st.integers(-5, 2),
    strength=st.floats(0, 0.5),
    kind=st.sampled_from(cd.CONSTANT_KINDS),
    temperature=st.floats(10, 40),
)
def test_there_and_back(
    pka: float, charge: int, strength: float, kind: cd.Constant, temperature: float
) -> None:
    there = cd.from_thermodynamic(pka, charge, strength, kind, temperature)
    back = float(cd.to_thermodynamic(there, charge, strength, kind, temperature))
    assert back == pytest.approx(pka, abs=1e-12)


def test_refusals_say_the_range() -> None:
    with pytest.raises(ValueError, match=r"0 to 0\.5 mol/L"):
        cd.davies_term(0.6)
    with pytest.raises(ValueError, match=r"0 to 0\.5 mol/L"):
        cd.davies_term(float("nan"))
    with pytest.raises(ValueError, match="10 to 40 °C"):
        cd.van_t_hoff(4.76, 0.0, 5.0)
    with pytest.raises(ValueError, match="10 to 40 °C"):
        cd.water_pkw(60.0)
    with pytest.raises(ValueError, match="thermodynamic, mixed, concentration"):
        cd.pka_shift(0, 0.1, "apparent")  # type: ignore[arg-type]
