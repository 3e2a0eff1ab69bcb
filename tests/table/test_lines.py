"""The table against linear free-energy relations with published constants."""

from __future__ import annotations

import math

import pytest

from qsar.checking.lines import Line, chain_gaps, fit, hammett_points, left_out, taft_points
from qsar.checking.rows import TableRow

#: Benzoic acids further than 0.12 from Hammett's line.
HAMMETT_OUTLIERS = {
    "p-OC6H5": "the careful conductance value is kept; the tabulated constant rests on other reactions",
    "m-Si(CH3)3": "handbook value",
}
#: Acids further than 0.15 from Taft's line.
TAFT_OUTLIERS = {
    "CH2F": "stronger than the old constant of CH2F says",
    "CH2OCH3": "stronger than the old constant of CH2OCH3 says",
    "CH2CH2C6H5": "the old constant of CH2CH2C6H5 is too large for a group that far away",
    "CHF2": "strong acid, measured to 0.05 only",
}


@pytest.fixture(scope="module")
def hammett(rows: list[TableRow]) -> Line:
    return fit(hammett_points(rows))


@pytest.fixture(scope="module")
def taft(rows: list[TableRow]) -> Line:
    return fit(taft_points(rows))


def test_meta_and_para_benzoic_acids_follow_hammett(hammett: Line) -> None:
    """Rho is 1 by definition in water at 25 °C (Hammett, J. Am. Chem. Soc. 1937, 59, 96).

    Sigma constants: Hansch, Leo, Taft, Chem. Rev. 1991, 91, 165. Amino and ionic groups apart.
    """
    assert len(hammett.points) >= 40
    assert abs(-hammett.slope - 1) <= 0.05
    assert hammett.rms < 0.12
    assert hammett.intercept == pytest.approx(4.20, abs=0.03)
    assert {point.group for point, _ in hammett.beyond(0.12)} == HAMMETT_OUTLIERS.keys()


def test_unhindered_acids_follow_taft(taft: Line) -> None:
    """PKa = 4.66 - 1.62 sigma* (Perrin, Dempsey, Serjeant, pKa Prediction, 1981; form from memory).

    Sigma* of R: Taft 1956, as in the table of substituents.
    """
    assert len(taft.points) >= 20
    assert taft.slope == pytest.approx(-1.62, abs=0.1)
    assert taft.intercept == pytest.approx(4.66, abs=0.1)
    assert taft.rms < 0.15
    assert {point.group for point, _ in taft.beyond(0.15)} == TAFT_OUTLIERS.keys()


def test_steps_of_straight_chain_diacids_draw_near_the_statistical_limit(rows: list[TableRow]) -> None:
    """Two equal groups far apart differ by log10 4 (Adams, J. Am. Chem. Soc. 1916, 38, 1503; Bjerrum 1923).

    Sebacic acid (C10) breaks the steady fall: its two handbook steps lie 1.00 apart, and handbooks disagree
    on both by more than 0.1; the fall holds within the uncertainties that the table states.
    """
    gaps = chain_gaps(rows)
    assert set(range(2, 11)) <= gaps.keys()
    falling = [gaps[carbons] for carbons in range(2, 10)]
    assert falling == sorted(falling, reverse=True)
    assert all(gap > math.log10(4) for gap in gaps.values())
    assert all(0.7 <= gaps[carbons] <= 1.1 for carbons in (8, 9, 10))
    by_step = {(row.smiles, row.step): row for row in rows}
    spread = sum(
        by_step["O=C(O)" + "C" * (carbons - 2) + "C(=O)O", step].uncertainty ** 2
        for carbons in (9, 10)
        for step in (1, 2)
    )
    assert gaps[10] - gaps[9] < 2 * math.sqrt(spread)


def row(smiles: str, pka: float) -> TableRow:
    return TableRow(2, smiles, smiles, 1, pka, 25, 0, "thermodynamic", 0.02, "family", "SOURCE", "")


def test_a_line_through_points_on_a_line_has_no_residuals() -> None:
    """Worked by hand: pKa = 4.20 - sigma for four groups (constants of Hansch, Leo, Taft 1991)."""
    made = [
        row("O=C(O)c1ccccc1", 4.20),
        row("O=C(O)c1cccc(Cl)c1", 4.20 - 0.37),
        row("O=C(O)c1ccc(Cl)cc1", 4.20 - 0.23),
        row("O=C(O)c1ccc([N+](=O)[O-])cc1", 4.20 - 0.78),
        row("Nc1cccc(C(=O)O)c1", 3.07),
    ]
    points = hammett_points(made)
    assert {point.group for point in points} == {"H", "m-Cl", "p-Cl", "p-NO2"}
    line = fit(points)
    assert (line.slope, line.intercept) == (pytest.approx(-1), pytest.approx(4.20))
    assert line.rms == pytest.approx(0, abs=1e-9)
    assert left_out(points) == pytest.approx([0, 0, 0, 0], abs=1e-9)


def test_a_point_is_judged_by_the_line_of_the_others() -> None:
    made = [row("O=C(O)c1ccccc1", 4.20), row("O=C(O)c1cccc(Cl)c1", 3.83), row("O=C(O)c1ccc(Cl)cc1", 3.97)]
    wrong = row("O=C(O)c1ccc([N+](=O)[O-])cc1", 3.42 + 0.5)
    residuals = left_out(hammett_points([*made, wrong]))
    assert residuals[-1] == pytest.approx(0.5, abs=1e-9)


def test_too_few_points_make_no_line() -> None:
    with pytest.raises(ValueError, match="three different groups"):
        fit(hammett_points([row("O=C(O)c1ccccc1", 4.20)]))
