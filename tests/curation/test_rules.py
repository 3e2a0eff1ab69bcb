"""Rules on rows, checked against published constants.

Acetic acid: 4.756 at I = 0 (Harned & Ehlers 1933, as tabulated by Robinson & Stokes, Electrolyte Solutions, 1959,
appendix 12.1) and 4.56 as a concentration constant at I = 0.1 mol/L (Martell & Smith, Critical Stability Constants,
vol. 3, 1977). Citric acid at I = 0: 3.128, 4.761, 6.396 (Bates & Pinching 1949). Values from memory. Ka of acetic acid
1.75e-5 and Kb of acetate 5.7e-10: general chemistry tables, from memory.
"""

from __future__ import annotations

import math

import pytest

from qsar.curation.readers import RawRow
from qsar.curation.rules import Defaults, Refusal, Usable, apply_rules

ACETIC = "CC(=O)O"


def usable(defaults: Defaults | None = None, **cells: str) -> Usable:
    row = {"smiles": ACETIC, "pka": "4.756", "temperature_c": "25", "ionic_strength_m": "0"} | cells
    return apply_rules(RawRow(2, row, row), defaults or Defaults())


def refusal(defaults: Defaults | None = None, **cells: str) -> str:
    with pytest.raises(Refusal) as caught:
        usable(defaults, **cells)
    return str(caught.value)


def test_a_clean_row_is_kept_as_it_is() -> None:
    row = usable(uncertainty="0.02", constant="thermodynamic")
    assert (row.pka, row.step, row.changes) == (4.756, 1, ())
    assert row.uncertainty == pytest.approx(0.02)


def test_concentration_constant_of_acetic_acid_goes_to_zero_ionic_strength() -> None:
    row = usable(pka="4.56", ionic_strength_m="0.1", constant="concentration")
    assert row.pka == pytest.approx(4.756, abs=0.03)  # Davies is good to about 3 % of the activity coefficient
    assert "Davies" in row.changes[0]


def test_the_charge_decides_the_correction() -> None:
    """From one to two charges the shift is three times, to three charges five times that of a first step (mixed)."""
    citric = "OC(=O)CC(O)(C(=O)O)CC(=O)O"
    shifts = [
        usable(smiles=citric, pka="4.5", step=str(k), ionic_strength_m="0.1", constant="mixed").pka - 4.5
        for k in (1, 2, 3)
    ]
    assert shifts == pytest.approx([0.107, 3 * 0.107, 5 * 0.107], abs=0.01)
    glycine = usable(smiles="NCC(=O)O", pka="2.35", ionic_strength_m="0.1", constant="mixed").pka - 2.35
    assert glycine == pytest.approx(-0.107, abs=0.003)


def test_an_unknown_kind_is_said_and_widens_the_row() -> None:
    known = usable(pka="4.65", ionic_strength_m="0.1", constant="mixed")
    unknown = usable(pka="4.65", ionic_strength_m="0.1")
    assert unknown.pka == known.pka
    assert unknown.uncertainty > known.uncertainty + 0.03
    assert any("kind of constant not stated" in c for c in unknown.changes)
    assert not any("kind of constant" in c for c in usable(ionic_strength_m="0").changes)


def test_missing_conditions_widen_the_row() -> None:
    row = usable(temperature_c="", ionic_strength_m="")
    assert row.uncertainty > usable().uncertainty
    assert {c.split(" not stated")[0] for c in row.changes} == {"temperature", "ionic strength"}
    filled = usable(Defaults(temperature_c=25.0, ionic_strength_m=0.0), temperature_c="", ionic_strength_m="")
    assert filled.changes == ()


@pytest.mark.parametrize("text", ["1.75e-5", "1,75×10⁻⁵", "0.0000175", "Ka = 1.75e-5", "17.5 µM", "0.0175 mM"])
def test_ka_is_known_and_converted(text: str) -> None:
    row = usable(pka=text)
    assert row.pka == pytest.approx(4.757, abs=1e-3)
    assert any("converted to pKa" in c for c in row.changes)


def test_ka_by_header_and_by_cell() -> None:
    assert usable(Defaults(quantity="ka"), pka="0.18").pka == pytest.approx(-math.log10(0.18))
    assert usable(pka="0.18", quantity="Ka").pka == pytest.approx(-math.log10(0.18))
    assert "neither" in refusal(pka="0.004")


def test_pkb_is_converted_with_the_ion_product_of_water() -> None:
    pkb = -math.log10(5.7e-10)
    for row in (usable(pka=f"pKb {pkb:.3f}"), usable(Defaults(quantity="pkb"), pka=f"{pkb:.3f}")):
        assert row.pka == pytest.approx(4.756, abs=0.01)


def test_salts_are_stripped_and_said() -> None:
    row = usable(smiles="CC(=O)[O-].[Na+]")
    assert row.acid.smiles == ACETIC
    assert any("salt" in c for c in row.changes)


@pytest.mark.parametrize(
    ("cells", "reason"),
    [
        ({"smiles": ""}, "no structure"),
        ({"smiles": "C1CC"}, "not a SMILES"),
        ({"smiles": "CCO"}, "no carboxyl group"),
        ({"smiles": "CCCC(=O)O", "pka": ""}, "empty"),
        ({"pka": ">8"}, "limit"),
        ({"pka": "4.1-4.3"}, "range"),
        ({"pka": "2.85; 5.70"}, "2 values"),
        ({"pka": "47.6"}, "impossible"),
        ({"pka": "-4.76"}, "impossible"),
        ({"pka": "4.76 furlongs"}, "not understood"),
        ({"temperature_c": "60"}, "outside 15 to 40"),
        ({"temperature_c": "5 °C"}, "outside 15 to 40"),
        ({"temperature_c": "warm"}, "temperature"),
        ({"ionic_strength_m": "1.0"}, "outside 0 to 0.5"),
        ({"ionic_strength_m": "-0.1"}, "outside 0 to 0.5"),
        ({"ionic_strength_m": "5 %"}, "unit"),
        ({"constant": "fluffy"}, "none of"),
        ({"step": "2"}, "1 COOH"),
        ({"step": "first"}, "whole number"),
        ({"step": "1.5"}, "1 COOH"),
        ({"uncertainty": "a lot"}, "uncertainty"),
        ({"uncertainty": "20"}, "uncertainty"),
        ({"pka": "25", "temperature_c": "4.76"}, "exchanged"),
        ({"smiles": "4.76", "pka": "CC(=O)O"}, "each other's column"),
    ],
)
def test_refused_with_the_reason(cells: dict[str, str], reason: str) -> None:
    assert reason in refusal(**cells)


def test_units_in_cells_are_read_and_said() -> None:
    row = usable(temperature_c="298.15 K", ionic_strength_m="150 mM", constant="mixed", pka="4.64 pH units")
    assert row.temperature_c == pytest.approx(25.0)
    assert row.ionic_strength_m == pytest.approx(0.15)
    assert sum("read as" in c or "kelvin" in c or "left out" in c for c in row.changes) == 3


def test_a_temperature_that_can_only_be_kelvin_is_read_so() -> None:
    row = usable(temperature_c="298.15")
    assert row.temperature_c == pytest.approx(25.0)
    assert any("kelvin" in c for c in row.changes)


def test_conditions_in_the_cell_of_the_value_count() -> None:
    assert usable(pka="4.76 (20 °C)", temperature_c="").temperature_c == 20.0
    assert "outside" in refusal(pka="4.76 (60 °C)", temperature_c="")
