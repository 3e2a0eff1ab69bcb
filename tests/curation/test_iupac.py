"""Rules for the IUPAC Digitized pKa Dataset, on invented rows under its header and on the file itself.

The values of the small rows are made up. What a label of the dataset can mean is described in its own
documentation (Zheng, Lafontant-Joseph, doi:10.5281/zenodo.7236452).
"""

from __future__ import annotations

import csv
from pathlib import Path

import pytest

from qsar.curation.iupac import COLUMNS, OpenStep, in_standard_state, read_iupac, sort_iupac, sort_rows
from qsar.curation.iupac_rules import ionic_strength, kind_of_constant
from qsar.errors import UserError


def open_row(smiles: str, pka: str, label: str = "pKa1", **cells: str) -> dict[str, str]:
    row = dict.fromkeys(COLUMNS, "")
    row |= {"SMILES": smiles, "pka_value": pka, "pka_type": label, "T": "25", "assessment": "Approximate"}
    return row | cells


def reasons(*rows: dict[str, str]) -> list[str]:
    data = sort_rows(rows)
    assert not data.steps
    return [excluded.reason for excluded in data.excluded]


def only(*rows: dict[str, str]) -> OpenStep:
    (step,) = sort_rows(rows).steps
    return step


@pytest.mark.parametrize(
    ("row", "word"),
    [
        (open_row("CC(=O)O", "4.9", cosolvent="ethanol"), "cosolvent"),
        (open_row("CC(=O)O", "4.9", remarks="C=0.003, 5% ethanol"), "cosolvent"),
        (open_row("CC(=O)O", "4.9", remarks="C=0.003, 5%(v/v) ethanol"), "cosolvent"),
        (open_row("CC(=O)O", "4.9", "pKa1(half-ethanol)"), "cosolvent"),
        (open_row("CC(=O)O", "4.9", pressure="1000 (bar)"), "pressure"),
        (open_row("CC(=O)O", "5.2", "pKa1(D2O)"), "heavy water"),
        (open_row("CC(=O)O", "5.2", remarks="In D2O, I=0.11"), "heavy water"),
        (open_row("CC(=O)O", "4.7", "pKa(BH+ excited)"), "excited"),
        (open_row("CC(=O)O", "-6.1", "pKaH1", remarks="In aq. H2SO4 solutions"), "acidity function"),
        (open_row("CC(=O)O", "4.7", T="60"), "temperature outside"),
        (open_row("CC(=O)O", "4.7", T=""), "temperature not stated"),
        (open_row("CC(=O)O", "<2"), "no single value"),
        (open_row("CC(=O)O", "4.3", remarks="I=3.0(NaClO4)"), "ionic strength above"),
        (open_row("CC(=O)O", "4.7", assessment="Very uncertain"), "very uncertain"),
        (open_row("CC(=O)O", "4.7", remarks="[Oxidized] C=0.01"), "another species"),
        (open_row("CC(=O)O", "9.3", "pKb"), "not an acid constant"),
        (open_row("CC(=O)O", "4.7", "pKaH1"), "no base"),
        (open_row("O=C(O)c1ccccc1O", "13.0", "pKa(OH)"), "another site"),
        (open_row("O=C(O)c1ccccc1O", "13.0", "pKa2"), "another proton"),
        (open_row("O=C(O)c1ccccc1O", "9.0"), "too weak"),
        (open_row("O=C(O)CC(=O)O", "2.8", "pKa"), "which of several"),
        (open_row("O=C(O)CP(=O)(O)O", "1.9"), "phosphonic"),
        (open_row("O=C(O)c1ccc(S(=O)(=O)O)cc1", "1.2"), "sulfonic"),
        (open_row("CCCCCCCCCCCC(=O)O", "7.5"), "long chain"),
        (open_row("Nc1ccc(C(=O)O)cc1", "2.4"), "nitrogen"),
        (open_row("OC(=O)c1ccccn1", "5.4", "pKa2"), "nitrogen"),
        (open_row("OC(=O)CC", "4.7", "pKa1(cis)"), "does not settle"),
        (open_row("CCO", "15.9"), "structure"),
        (open_row("not a structure", "4.7"), "structure"),
    ],
)
def test_rows_that_measure_something_else_are_left_out(row: dict[str, str], word: str) -> None:
    (reason,) = reasons(row)
    assert word in reason


def test_one_percent_of_ethanol_is_let_through() -> None:
    assert only(open_row("CC(=O)O", "4.8", remarks="C=0.001, 1% ethanol")).pka == 4.8


def test_the_better_grade_goes_before_the_better_temperature() -> None:
    step = only(
        open_row("CC(=O)O", "4.5", assessment="Uncertain"),
        open_row("CC(=O)O", "4.7", T="20", assessment="Reliable"),
    )
    assert (step.pka, step.temperature_c, step.assessment) == (4.7, 20, "Reliable")


def test_within_a_grade_25_degrees_and_little_salt_go_first() -> None:
    step = only(
        open_row("CC(=O)O", "4.9", T="30"),
        open_row("CC(=O)O", "4.6", remarks="I=0.1(KCl), mixed constants"),
        open_row("CC(=O)O", "4.74"),
        open_row("CC(=O)O", "4.76", remarks="C=0.001"),
    )
    assert step.pka == pytest.approx(4.75)
    assert (step.n_rows, step.ionic_strength_m, step.note) == (2, None, "")


def test_conditions_of_the_rows_used_are_told() -> None:
    step = only(open_row("CC(=O)O", "4.6", remarks="C=0.01, I=0.1(KCl), mixed constants", T="24"))
    assert (step.temperature_c, step.ionic_strength_m, step.note) == (24, 0.1, "mixed constant")


def test_rows_that_disagree_are_told() -> None:
    step = only(open_row("CC(=O)O", "4.5"), open_row("CC(=O)O", "4.9"))
    assert step.pka == pytest.approx(4.7)
    assert step.note == "the rows used differ by 0.40"


def test_cis_and_trans_under_one_structure_are_told_apart() -> None:
    data = sort_rows(
        [
            open_row("O=C(O)/C=C/c1ccccc1", "4.4", "pKa(trans)"),
            open_row("O=C(O)/C=C/c1ccccc1", "3.9", "pKa(cis)"),
            open_row("O=C(O)C1CC1C(=O)O", "3.6", "pKa1(trans)"),
            open_row("O=C(O)C1CC1C(=O)O", "3.4", "pKa1(cis)"),
        ]
    )
    assert {step.smiles: step.pka for step in data.steps} == {
        "O=C(O)/C=C/c1ccccc1": 4.4,
        "O=C(O)/C=C\\c1ccccc1": 3.9,
        "O=C(O)[C@@H]1C[C@H]1C(=O)O": 3.6,
        "O=C(O)[C@H]1C[C@H]1C(=O)O": 3.4,
    }


def test_the_carboxyl_constant_of_an_amino_acid_is_known_by_its_value() -> None:
    """Base constants are counted from the amine in one book and from the carboxyl group in another."""
    from_the_amine = [open_row("NCC(=O)O", "9.7", "pKaH1"), open_row("NCC(=O)O", "2.3", "pKaH2")]
    from_the_acid = [open_row("NCC(=O)O", "2.4", "pKa1"), open_row("NCC(=O)O", "9.6", "pKa2")]
    assert only(*from_the_amine).pka == 2.3
    assert only(*from_the_acid).pka == 2.4


def test_carboxyl_steps_of_an_amino_acid_are_counted_from_the_strongest() -> None:
    aspartic = "NC(CC(=O)O)C(=O)O"
    data = sort_rows(
        [
            open_row(aspartic, "9.8", "pKaH1"),
            open_row(aspartic, "3.9", "pKaH2"),
            open_row(aspartic, "2.0", "pKaH3"),
        ]
    )
    assert [(step.step, step.pka) for step in data.steps] == [(1, 2.0), (2, 3.9)]


def test_an_amino_acid_with_a_missing_step_is_left_out() -> None:
    aspartic = "NC(CC(=O)O)C(=O)O"
    found = reasons(open_row(aspartic, "9.8", "pKaH1"), open_row(aspartic, "3.9", "pKaH2"))
    assert all("cannot be counted" in reason for reason in found)


def test_a_weak_second_amine_is_not_taken_for_a_carboxyl_group() -> None:
    """Piperazine-1,4-diacetic acid: one ring nitrogen is protonated near pH 5 only (as in piperazine itself)."""
    smiles = "OC(=O)CN1CCN(CC(=O)O)CC1"
    labels = {"pKa1": "2.2", "pKa2": "4.4", "pKa3": "8.7"}
    found = reasons(*(open_row(smiles, value, label) for label, value in labels.items()))
    assert all("cannot be counted" in reason for reason in found)


def test_laboratories_that_count_differently_are_not_mixed() -> None:
    glycine = "NCC(=O)O"
    step = only(
        open_row(glycine, "2.3", "pKaH1", ref="A1"),
        open_row(glycine, "9.7", "pKaH2", ref="A1"),
        open_row(glycine, "9.6", "pKaH1", ref="B2"),
        open_row(glycine, "2.5", "pKaH2", ref="B2"),
    )
    assert (step.pka, step.n_rows) == (pytest.approx(2.4), 2)


def test_steps_that_do_not_rise_are_left_out() -> None:
    found = reasons(open_row("OC(=O)CC(=O)O", "5.7", "pKa1"), open_row("OC(=O)CC(=O)O", "2.8", "pKa2"))
    assert found == ["the steps of this acid do not rise"] * 2


def test_mirror_images_are_one_acid() -> None:
    step = only(open_row("C[C@H](O)C(=O)O", "3.8"), open_row("C[C@@H](O)C(=O)O", "3.9"))
    assert (step.smiles, step.n_rows) == ("CC(O)C(=O)O", 2)


@pytest.mark.parametrize(
    ("remarks", "ionic", "kind"),
    [
        ("C=0.01, I=0.1(KNO3), concentration constants", 0.1, "concentration"),
        ('I = 0.15 (KCl), "mixed" constants', 0.15, "mixed"),
        ("(m) I=0.02 to 0.05", None, ""),
        ("I=mixed constant", None, "mixed"),
        ("C=0.001", None, ""),
    ],
)
def test_remarks_are_read(remarks: str, ionic: float | None, kind: str) -> None:
    assert (ionic_strength(remarks), kind_of_constant(remarks)) == (ionic, kind)


def test_a_file_is_read_and_its_lines_are_named(tmp_path: Path) -> None:
    path = tmp_path / "open.csv"
    with path.open("w", encoding="utf-8", newline="") as handle:
        writer = csv.DictWriter(handle, COLUMNS)
        writer.writeheader()
        writer.writerows([open_row("CC(=O)O", "4.8"), open_row("CCO", "15.9")])
    assert [step.smiles for step in read_iupac(path)] == ["CC(=O)O"]
    assert [excluded.line for excluded in sort_iupac(path).excluded] == [3]


def test_another_file_is_refused(tmp_path: Path) -> None:
    path = tmp_path / "other.csv"
    path.write_text("SMILES,pKa\nCC(=O)O,4.8\n", encoding="utf-8")
    with pytest.raises(UserError, match="no column pka_type"):
        read_iupac(path)
    with pytest.raises(UserError, match="cannot read"):
        read_iupac(tmp_path / "missing.csv")


def test_the_open_file_gives_one_value_a_step(open_data_path: Path) -> None:
    """2,882 rows of 815 acids by its documentation; a row is used, outranked or left out with a reason."""
    data = sort_iupac(open_data_path)
    keys = [(step.smiles, step.step) for step in data.steps]
    assert len(keys) == len(set(keys))
    assert len({smiles for smiles, _ in keys}) > 450
    assert all(excluded.reason for excluded in data.excluded)
    assert len({excluded.line for excluded in data.excluded}) == len(data.excluded)
    assert all(15 <= step.temperature_c <= 40 for step in data.steps)
    assert all(step.ionic_strength_m is None or step.ionic_strength_m <= 0.5 for step in data.steps)


def test_known_acids_of_the_open_file(open_data_path: Path) -> None:
    """Handbook values: Robinson and Stokes, Electrolyte Solutions, 1970, app. 12 (from memory)."""
    found = {(step.smiles, step.step): step.pka for step in read_iupac(open_data_path)}
    for key, expected in {
        ("O=CO", 1): 3.75,
        ("O=C(O)CCl", 1): 2.87,
        ("O=C(O)CI", 1): 3.18,
        ("O=C(O)CCCC(=O)O", 2): 5.42,
        ("NCC(=O)NCC(=O)O", 1): 3.14,
    }.items():
        assert found[key] == pytest.approx(expected, abs=0.05), key


@pytest.mark.parametrize(
    ("remarks", "wanted"),
    [
        ("I=0.1(KCl), concentration constant", 4.56 + 0.21),
        ("I=0.1(KCl), mixed constant", 4.56 + 0.11),
        ("I=0.1(KCl)", 4.56),
        ("C=0.003", 4.56),
        ("C=0.003, mixed constant", 4.56),
        ("thermodynamic", 4.56),
    ],
)
def test_a_stated_medium_is_taken_out_by_the_equation_of_davies(remarks: str, wanted: float) -> None:
    """Davies 1962 at 25 °C and 0.1 mol/L: minus log of the activity coefficient of a single charge is 0.107."""
    step = only(open_row("CC(=O)O", "4.56", remarks=remarks))
    (moved,) = in_standard_state([step])
    assert moved.pka == pytest.approx(wanted, abs=0.015)
    assert (moved.smiles, moved.step, moved.note) == (step.smiles, step.step, step.note)
