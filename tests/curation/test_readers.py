"""Reading somebody's table: wide tables, one column a step, against the same values one row a step.

Malonic acid 2.85 and 5.70, acetic acid 4.756 at 25 °C and I = 0: Robinson & Stokes, Electrolyte Solutions, 1959,
appendix 12.1, from memory. Rows as a spreadsheet counts them: common practice, no source.
"""

from __future__ import annotations

import copy
from pathlib import Path

import pytest

from qsar.cli import main
from qsar.curation.curate import curate
from qsar.curation.readers import StepCell, read_rows
from qsar.curation.rules import Defaults
from qsar.errors import UserError

WIDE = """id,smiles,{0},{1},Temp
malonic,OC(=O)CC(=O)O,2.85,5.70,25
acetic,CC(=O)O,4.756,,25
nothing,OC(=O)CCC(=O)O,,,25
text,OC(=O)CCCC(=O)O,foo,5.4,25
second proton of another kind,NCC(=O)O,2.35,9.78,25
"""


def table(folder: Path, text: str) -> Path:
    path = folder / "wide.csv"
    path.write_text(text, encoding="utf-8")
    return path


@pytest.mark.parametrize("headers", [("pKa1", "pKa2"), ("pK_a 1", "pK_a 2"), ("pKa", "pKa2"), ("pKa₁", "pKa₂")])
def test_a_wide_table_is_read_as_one_row_a_step(tmp_path: Path, headers: tuple[str, str]) -> None:
    notes: list[str] = []
    rows, columns = read_rows(table(tmp_path, WIDE.format(*headers)), note=notes.append)
    assert columns.steps == {1: headers[0], 2: headers[1]}
    assert any("step 2" in note for note in notes)
    result = curate(rows, Defaults(ionic_strength_m=0.0))
    kept = {(m.row.name, m.row.step): m.row.pka for m in result.kept}
    assert kept == {("malonic", 1): 2.85, ("malonic", 2): 5.70, ("acetic", 1): 4.756, ("text", 2): 5.4,
                    ("second proton of another kind", 1): 2.35}  # fmt: skip
    refused = {str(number): reason for number, reason in result.refused.items()}
    assert set(refused) == {"4:pKa1", "5:pKa1", "6:pKa2"}
    assert "1 COOH" in refused["6:pKa2"]
    assert result.balance.startswith("8 in = 5 kept + 0 merged + 3 refused")


def test_the_number_of_a_cell_names_row_and_step() -> None:
    cell = StepCell(12, 3)
    assert f"{cell}" == str(cell) == str(copy.deepcopy(cell)) == "12:pKa3"
    assert sorted([StepCell(3, 1), cell, StepCell(2, 6)])[-1] is cell
    assert len({cell, StepCell(12, 2), StepCell(12, 3)}) == 2


def test_wide_tables_of_ka_are_converted(tmp_path: Path) -> None:
    """Ka of malonic acid: 10^-2.85 and 10^-5.70, by the definition of pKa."""
    path = table(tmp_path, "smiles,Ka1,Ka2\nOC(=O)CC(=O)O,1.4125e-3,1.9953e-6\n")
    rows, columns = read_rows(path)
    assert columns.quantity == "ka"
    result = curate(rows, Defaults(25.0, 0.0, quantity=columns.quantity))
    assert [m.row.pka for m in result.kept] == pytest.approx([2.85, 5.70], abs=1e-3)


@pytest.mark.parametrize(
    ("header", "words"),
    [
        ("smiles,pKa1,pK1", "same step"),
        ("smiles,pKa1,Ka2", "mix pKa and Ka"),
        ("smiles,smiles,pKa", "two columns are called smiles (1 and 2)"),
        ("smiles,pKa,pKa", "two columns are called pKa (2 and 3)"),
        ("id,smiles,remark", "no column for pka"),
    ],
)
def test_headers_that_cannot_be_understood_are_refused(tmp_path: Path, header: str, words: str) -> None:
    with pytest.raises(UserError, match=words.replace("(", r"\(").replace(")", r"\)")):
        read_rows(table(tmp_path, f"{header}\nCC(=O)O,4.7,4.8\n"))


def test_one_column_can_be_chosen_from_a_wide_table(tmp_path: Path) -> None:
    rows, columns = read_rows(table(tmp_path, WIDE.format("pKa1", "pKa2")), {"pka": "pKa1"})
    assert not columns.steps
    assert [row.number for row in rows] == [2, 3, 4, 5, 6]


def test_the_command_names_row_and_column(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    monkeypatch.chdir(tmp_path)
    assert main(["curate", str(table(tmp_path, WIDE.format("pKa1", "pKa2"))), "--no-examination"]) == 3
    said = capsys.readouterr()
    assert "row 5:pKa1: value: 'foo' holds no number" in said.err
    assert "8 in = 5 kept" in said.out
    assert "6:pKa2,refused" in (tmp_path / "wide_left.csv").read_text(encoding="utf-8")
