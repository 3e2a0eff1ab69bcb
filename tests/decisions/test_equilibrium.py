"""The charge balance against standard buffers, carbonated water and its own invariants."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from qsar.decisions.bases import ATMOSPHERE_BAR, co2_gas_to_water, henry_co2
from qsar.decisions.equilibrium import buffer_capacity, solute, solve

# Reference pH at 25 degC: Buck et al., Pure Appl. Chem. 2002, 74, 2169-2200 (IUPAC), and Bates, J. Res. NBS
# A 1962, 66, 179 (tetroxalate 1.679, acetate).  Constants: Goldberg, Kishore & Lennen, J. Phys. Chem. Ref.
# Data 2002, 31, 231 (phthalic, tartaric, citric, phosphoric, carbonic); oxalic acid as usually tabulated
# (1.25, 4.27).  From memory. Molalities are used as they stand; a saturated tartrate solution is 0.0341
# mol/kg.
PHTHALIC, TARTARIC = (2.950, 5.408), (3.036, 4.366)
CITRIC, OXALIC = (3.128, 4.761, 6.396), (1.25, 4.27)
PHOSPHORIC, CARBONIC, ACETIC = (2.148, 7.198, 12.35), (6.351, 10.329), (4.756,)

STANDARD_BUFFERS = [
    ("0.05 mol/kg potassium hydrogen phthalate", PHTHALIC, 0.05, 0.05, 4.005),
    ("saturated potassium hydrogen tartrate", TARTARIC, 0.0341, 0.0341, 3.557),
    ("0.05 mol/kg potassium dihydrogen citrate", CITRIC, 0.05, 0.05, 3.776),
    ("0.05 mol/kg potassium tetroxalate", OXALIC, 0.10, 0.05, 1.679),
    ("0.025 + 0.025 mol/kg phosphates", PHOSPHORIC, 0.05, 0.075, 6.865),
    ("0.025 + 0.025 mol/kg hydrogencarbonate and carbonate", CARBONIC, 0.05, 0.075, 10.012),
    ("0.1 + 0.1 mol/kg acetic acid and acetate", ACETIC, 0.2, 0.1, 4.652),
    ("0.01 + 0.01 mol/kg acetic acid and acetate", ACETIC, 0.02, 0.01, 4.718),
]


@pytest.mark.parametrize(("name", "pka", "acid", "cation", "reference"), STANDARD_BUFFERS)
def test_standard_buffers(
    name: str, pka: tuple[float, ...], acid: float, cation: float, reference: float
) -> None:
    solved = solve([solute("acid", acid, pka), solute("cation", cation, charge=1)])
    assert float(solved.ph[0]) == pytest.approx(reference, abs=0.02), name


def test_hydrochloric_acid() -> None:
    # Bates: 0.1 mol/kg HCl has pH 1.094 with the mean activity coefficient 0.796 of Robinson & Stokes (from
    # memory).
    solved = solve([solute("chloride", 0.1, charge=-1)])
    assert float(solved.ph[0]) == pytest.approx(1.094, abs=0.02)


def test_pure_water() -> None:
    assert float(solve([solute("nothing", 0.0, charge=-1)]).ph[0]) == pytest.approx(7.0, abs=0.01)


@pytest.mark.parametrize(
    ("pressure_bar", "ph"),
    # Stumm & Morgan, Aquatic Chemistry, 3rd ed., chapter 4: pure water under air (10^-3.4 bar of CO2) 5.6
    # to 5.7, under 1 bar of CO2 3.9 (from memory).
    [(10**-3.4, 5.65), (1.0, 3.92)],
)
def test_water_under_carbon_dioxide(pressure_bar: float, ph: float) -> None:
    carbon = solute("carbon", 10.0, CARBONIC, ceiling_m=henry_co2() * pressure_bar)
    assert float(solve([carbon]).ph[0]) == pytest.approx(ph, abs=0.05)


def test_solubility_of_carbon_dioxide() -> None:
    # CRC Handbook, "Solubility of carbon dioxide in water": 1.45 to 1.51 g/kg at 25 degC and 1 bar, 2.3
    # g/kg at 10 degC (from memory); Ostwald coefficient 0.83 at 25 degC (Wilhelm, Battino & Wilcock, Chem.
    # Rev. 1977, 77, 219).
    assert henry_co2(25.0) * 44.01 == pytest.approx(1.48, abs=0.04)
    assert henry_co2(10.0) * 44.01 == pytest.approx(2.3, abs=0.1)
    assert 1.0 / co2_gas_to_water(25.0) == pytest.approx(0.83, abs=0.01)
    assert ATMOSPHERE_BAR == 1.01325


@given(
    pka=st.lists(st.floats(0, 14), min_size=1, max_size=4).map(sorted),
    acid=st.floats(1e-4, 0.3),
    sodium=st.floats(0, 0.3),
    partition=st.floats(0, 100),
    temperature=st.floats(10, 40),
)
@settings(max_examples=60, deadline=None)
def test_charge_and_mass_are_balanced(
    pka: list[float], acid: float, sodium: float, partition: float, temperature: float
) -> None:
    mixture = [solute("acid", acid, pka, partition=partition), solute("sodium", sodium, charge=1)]
    solved = solve(mixture, temperature)
    states = solved.in_water["acid"][0]
    charges = -np.arange(len(pka) + 1)
    net = float(solved.hydrogen_m[0] - solved.hydroxide_m[0] + states @ charges + sodium)
    assert net == pytest.approx(0.0, abs=1e-8)
    assert float(states.sum() + partition * states[0]) == pytest.approx(acid, rel=1e-9)


def test_a_batch_is_its_single_cases() -> None:
    pka = np.array([[3.0], [4.756], [9.0]])
    batch = solve([solute("acid", 0.1, pka), solute("sodium", 0.05, charge=1)]).ph
    single = [float(solve([solute("acid", 0.1, row), solute("sodium", 0.05, charge=1)]).ph[0]) for row in pka]
    assert batch == pytest.approx(single, abs=1e-8)


def test_capacity_is_the_slope_of_a_titration() -> None:
    def at(sodium: float) -> tuple[float, float]:
        mixture = [solute("acid", 0.1, CITRIC), solute("sodium", sodium, charge=1)]
        solved = solve(mixture, ionic_strength_m=0.5)
        return float(solved.ph[0]), float(buffer_capacity(solved, mixture)[0])

    (below, _), (_, capacity), (above, _) = at(0.1199), at(0.12), at(0.1201)
    assert capacity == pytest.approx(0.0002 / (above - below), rel=1e-4)


def test_beyond_davies_is_told() -> None:
    assert bool(solve([solute("acid", 1.0, ACETIC), solute("sodium", 0.9, charge=1)]).beyond_davies[0])
    assert not bool(solve([solute("acid", 0.1, ACETIC), solute("sodium", 0.05, charge=1)]).beyond_davies[0])


def test_refusals() -> None:
    with pytest.raises(ValueError, match="zero or more"):
        solute("acid", -0.1, ACETIC)
    with pytest.raises(ValueError, match="share a name"):
        solve([solute("acid", 0.1, ACETIC), solute("acid", 0.1, ACETIC)])
    with pytest.raises(ValueError, match=r"0 to 0\.5 mol/L"):
        solve([solute("acid", 0.1, ACETIC)], ionic_strength_m=0.7)
