"""Structures from files as people make them; the files come from other programs: pandas, openpyxl, RDKit."""

from __future__ import annotations

import csv
import io
from collections.abc import Callable
from pathlib import Path

import openpyxl
import pandas as pd
import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st
from rdkit import Chem

from qsar.errors import UserError
from qsar.reading import MAX_SMILES, Record, count_records, is_file_name, read_sources

ACIDS = ["CC(=O)O", "OC(=O)CCl", "OC(=O)c1ccccc1"]


def read(*sources: object) -> list[Record]:
    return list(read_sources([str(source) for source in sources]))


def brief(records: list[Record]) -> list[tuple[str, str]]:
    return [(record.id, record.smiles) for record in records]


@pytest.fixture
def write(tmp_path: Path) -> Callable[[str, str | bytes], Path]:
    def _write(name: str, content: str | bytes) -> Path:
        path = tmp_path / name
        path.write_bytes(content.encode() if isinstance(content, str) else content)
        return path

    return _write


def refused(*sources: object) -> str:
    with pytest.raises(UserError) as caught:
        read(*sources)
    assert len(str(caught.value).splitlines()) == 1
    return str(caught.value)


# What is a file and what is a SMILES


@pytest.mark.parametrize(
    "smiles",
    [
        "CC(=O)O",
        "OC(=O)/C=C/C(=O)O",
        "OC(=O)\\C=C/C",
        "CC(=O)[O-].[Na+]",
        "CC(=O)O.Cl",
        "CC(=O)O.CCN",
        "[NH3+][C@@H](C)C(=O)[O-]",
        "OC(=O)C%10CC%10",
        "",
        "C" * 5000 + "(=O)O",
    ],
)
def test_smiles_is_not_taken_for_a_file(smiles: str) -> None:
    assert not is_file_name(smiles)


@pytest.mark.parametrize(
    "name",
    ["acids.csv", "ACIDS.XLSX", "sub/acids.smi", "./acids", "../acids", "/tmp/none", "C:\\a", "a.pdf"],
)
def test_missing_file_is_not_taken_for_a_smiles(name: str) -> None:
    assert is_file_name(name)
    assert "no such file" in refused(name)


def test_smiles_strings_are_numbered_by_position() -> None:
    assert brief(read("CC(=O)O", " CCC(=O)O ")) == [("1", "CC(=O)O"), ("2", "CCC(=O)O")]


# Text tables


def test_csv_of_pandas(tmp_path: Path) -> None:
    path = tmp_path / "acids.csv"
    pd.DataFrame({"id": ["a", "b,c", 'd"e'], "x": [1, 2, 3], "SMILES": ACIDS}).to_csv(path, index=False)
    assert brief(read(path)) == list(zip(["a", "b,c", 'd"e'], ACIDS, strict=True))


@pytest.mark.parametrize("delimiter", [",", ";", "\t", "|"])
@pytest.mark.parametrize("end", ["\n", "\r\n", "\r"])
@pytest.mark.parametrize("encoding", ["utf-8", "utf-8-sig", "utf-16", "utf-32", "latin-1"])
def test_dialects(write: Callable[..., Path], delimiter: str, end: str, encoding: str) -> None:
    text = "".join(
        delimiter.join(row) + end
        for row in [("Name", "Smiles", "pKa"), ("sävre", "CC(=O)O", "4,76" if delimiter == ";" else "4.76")]
    )
    assert brief(read(write("acids.csv", text.encode(encoding)))) == [("sävre", "CC(=O)O")]


def test_tsv_and_its_impostor(write: Callable[..., Path]) -> None:
    assert brief(read(write("a.tsv", "id\tsmiles\nx\tCC(=O)O\n"))) == [("x", "CC(=O)O")]
    assert brief(read(write("b.tsv", "id,smiles\nx,CC(=O)O\n"))) == [("x", "CC(=O)O")]


def test_latin_1_is_said(write: Callable[..., Path]) -> None:
    notes: list[str] = []
    path = write("acids.csv", "id,smiles\nAmeisensäure,OC=O\n".encode("latin-1"))
    records = list(read_sources([str(path)], on_note=notes.append))
    assert brief(records) == [("Ameisensäure", "OC=O")]
    assert len(notes) == 1
    assert "UTF-8" in notes[0]


def test_rows_are_numbered_as_a_spreadsheet_does(write: Callable[..., Path]) -> None:
    text = 'id,smiles\n"two\nlines",CC(=O)O\n\nb,\n,OC=O\n,\nc\n'
    records = read(write("acids.csv", text))
    assert brief(records) == [("two\nlines", "CC(=O)O"), ("b", ""), ("3", "OC=O"), ("c", "")]
    assert [record.where for record in records] == [f"acids.csv, row {n}" for n in (2, 4, 5, 7)]
    assert [record.error is None for record in records] == [True, False, True, False]
    assert "empty" in str(records[1].error)


@pytest.mark.parametrize(
    ("smiles", "word"),
    [
        ("OC(=O)C\u0421", "cyrillic capital letter es"),  # RDKit reads what stands before it: acetic acid
        ("OC(=O)C\u216d", "roman numeral"),
        ("OC(=O)\nCCl", "line break"),  # formic acid
        ("OC(=O)C[N+](=O)[O\u2212]", "minus sign"),
        ("OC(=O)\u200bCCl", "zero width space"),
    ],
)
def test_character_that_no_smiles_has_is_said(write: Callable[..., Path], smiles: str, word: str) -> None:
    path = write("acids.csv", f'id,smiles\na,"{smiles}"\nb,CC(=O)O\n')
    records = read(path)
    assert word in str(records[0].error)
    assert [record.error for record in records[1:]] == [None]
    assert word in str(read(smiles)[0].error)


def test_labels_between_bars_may_hold_any_character() -> None:
    assert read("OC(=O)CCl |$;;;;\u00e9$|")[0].error is None


def test_cells_that_have_moved_are_said_once(write: Callable[..., Path]) -> None:
    notes: list[str] = []
    path = write("acids.csv", "id,smiles\n1,2,3-triazole,OC(=O)c1c[nH]nn1\na,OC=O,,\nb,OC=O,x\n")
    records = list(read_sources([str(path)], on_note=notes.append))
    assert len(records) == 3
    assert len(notes) == 1
    assert "row 2 has 4 cells where the header has 2" in notes[0]


def test_quotation_mark_that_is_never_closed_costs_one_row(write: Callable[..., Path]) -> None:
    rows = [f"r{n},{smiles}" for n, smiles in enumerate(ACIDS * 40)]
    rows[2] = 'r2,"OC=O'
    records = read(write("acids.csv", "\n".join(["id,smiles", *rows]) + "\n"))
    assert len(records) == len(rows)
    assert [n for n, record in enumerate(records) if record.error] == [2]
    assert "quotation mark" in str(records[2].error)
    assert records[2].where == "acids.csv, row 4"
    assert records[-1].id == f"r{len(rows) - 1}"


def test_row_too_long_after_an_open_quotation_mark_is_still_said(write: Callable[..., Path]) -> None:
    records = read(write("acids.csv", f'id,smiles\na,"OC=O\nb,{"C" * 1_500_000}\nc,OC=O\n'))
    assert [bool(record.error) for record in records] == [True, True, False]


def test_inch_marks_are_no_quotes(write: Callable[..., Path]) -> None:
    records = read(write("acids.csv", 'id,smiles\n5" pipe,CC(=O)O\n6" pipe,OC=O\n7" pipe,OC=O\n'))
    assert brief(records) == [('5" pipe', "CC(=O)O"), ('6" pipe', "OC=O"), ('7" pipe', "OC=O")]


def test_hostile_rows_stop_nothing(write: Callable[..., Path]) -> None:
    long = "C" * 2_500_000
    text = (
        f"id,smiles\na,CC(=O)O\nb,{long}\nc,{'C' * (MAX_SMILES + 1)}\nd,{'C' * 200_000}\ne,O\0C=O\nf,OC=O\n"
    )
    records = read(write("acids.csv", text))
    assert [bool(record.error) for record in records] == [False, True, True, True, False, False]
    assert brief(records)[-1] == ("f", "OC=O")
    assert all(len(record.smiles) < 100 for record in records)


def test_separator_line_of_excel(write: Callable[..., Path]) -> None:
    records = read(write("acids.csv", "sep=;\nid;smiles\na;CC(=O)O\n"))
    assert brief(records) == [("a", "CC(=O)O")]
    assert records[0].where == "acids.csv, row 3"


@pytest.mark.parametrize(
    ("name", "content", "message"),
    [
        ("a.csv", "", "empty"),
        ("a.csv", "\n \n", "empty"),
        ("a.csv", "id,smiles\n", "0 rows"),
        ("a.csv", "id,smiles\n\n,\n", "0 rows"),
        ("a.csv", "id,structure\na,CC\n", "id, structure"),
        ("a.csv", "smiles,SMILES\nC,C\n", "two columns"),
        ("a.csv", 'id,"smiles\na,C\n', "row 1: a quotation mark"),
        ("a.csv", "x" * 200_000 + ",smiles\na,C\n", "row 1"),
        ("a.csv", "x" * 2_000_000 + ",smiles\na,C\n", "row 1"),
        ("a.csv", b"PK\x03\x04rest", "Excel"),
        ("a.csv", b"\xd0\xcf\x11\xe0\xa1\xb1\x1a\xe1", "save it as .xlsx"),
        ("a.csv", "id,smiles\na,CC(=O)O\n".encode("utf-16-le"), "UTF-16"),
        ("a.smi", "\n", "0 rows"),
        ("a.sdf", "", "0 rows"),
        ("a.xlsx", "id,smiles\na,C\n", "not an Excel workbook"),
        ("a.docx", "text", "not read"),
    ],
)
def test_what_cannot_be_read_is_one_line(
    write: Callable[..., Path], name: str, content: str | bytes, message: str
) -> None:
    path = write(name, content)
    line = refused(path)
    assert line.startswith(str(path))
    assert message in line


def test_folder_is_one_line(tmp_path: Path) -> None:
    assert "is a folder" in refused(tmp_path)


def test_other_sources_are_still_read(write: Callable[..., Path], tmp_path: Path) -> None:
    problems: list[UserError] = []
    sources = [str(tmp_path / "none.csv"), str(write("a.smi", "OC=O formic")), str(tmp_path), "CC(=O)O"]
    records = list(read_sources(sources, on_error=problems.append))
    assert brief(records) == [("formic", "OC=O"), ("4", "CC(=O)O")]
    assert len(problems) == 2


@settings(suppress_health_check=[HealthCheck.function_scoped_fixture], max_examples=60, deadline=None)
@given(st.lists(st.tuples(st.text(), st.sampled_from(ACIDS)), min_size=1, max_size=20))
def test_any_text_survives_pandas(tmp_path: Path, rows: list[tuple[str, str]]) -> None:
    path = tmp_path / "any.csv"
    table = pd.DataFrame(rows, columns=["id", "smiles"])
    table.to_csv(path, index=False, quoting=csv.QUOTE_ALL, encoding="utf-8", errors="ignore")
    expected = [name.encode("utf-8", "ignore").decode().strip() for name, _ in rows]
    assert brief(read(path)) == [
        (name or str(n), smiles) for n, (name, (_, smiles)) in enumerate(zip(expected, rows, strict=True), 1)
    ]


@settings(suppress_health_check=[HealthCheck.function_scoped_fixture], max_examples=100, deadline=None)
@given(st.binary(max_size=400), st.sampled_from(["csv", "tsv", "smi", "sdf", "xlsx", "mol"]))
def test_any_bytes_give_records_or_one_line(tmp_path: Path, content: bytes, extension: str) -> None:
    path = tmp_path / f"any.{extension}"
    path.write_bytes(content)
    try:
        records = read(path)
    except UserError as problem:
        assert len(str(problem).splitlines()) == 1
    else:
        assert records


@settings(suppress_health_check=[HealthCheck.function_scoped_fixture], max_examples=200, deadline=None)
@given(st.text(alphabet='",;\t\n\r aC=O', max_size=60))
def test_any_marks_leave_the_last_row_readable(tmp_path: Path, middle: str) -> None:
    path = tmp_path / "marks.csv"
    path.write_text(f"id,smiles\n{middle}\n" + "b,OC=O\n" * 60, encoding="utf-8", newline="")
    assert brief(read(path))[-1] == ("b", "OC=O")


# Workbooks


def test_workbook_of_openpyxl(tmp_path: Path) -> None:
    book = openpyxl.Workbook()
    book.active.append(["about", "this file"])
    sheet = book.create_sheet("data")
    sheet.append(["ID", "Smiles"])
    for row in [(7, "CC(=O)O"), (None, None), (8.0, "OC=O"), ("x", None)]:
        sheet.append(row)
    book.save(tmp_path / "acids.xlsx")
    records = read(tmp_path / "acids.xlsx")
    assert brief(records) == [("7", "CC(=O)O"), ("8", "OC=O"), ("x", "")]
    assert [record.where for record in records] == [f"acids.xlsx, row {n}" for n in (2, 4, 5)]


def test_empty_workbook_is_one_line(tmp_path: Path) -> None:
    openpyxl.Workbook().save(tmp_path / "acids.xlsx")
    assert "empty" in refused(tmp_path / "acids.xlsx")


# SMILES lists and SD files


def test_smiles_list(write: Callable[..., Path]) -> None:
    text = (
        "smiles name\nCC(=O)O acetic acid\n\nOC=O\tformic\nOC(=O)CCl\nF[C@](Cl)(Br)C(=O)O |&1:1| racemate\n"
    )
    records = read(write("acids.smi", text))
    assert brief(records) == [
        ("acetic acid", "CC(=O)O"),
        ("formic", "OC=O"),
        ("3", "OC(=O)CCl"),
        ("racemate", "F[C@](Cl)(Br)C(=O)O |&1:1|"),
    ]
    assert records[1].where == "acids.smi, line 4"


def test_standard_input(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr("sys.stdin", io.StringIO("CC(=O)O acetic\n"))
    assert brief(read("-")) == [("acetic", "CC(=O)O")]


def sd_entry(smiles: str, title: str = "", **items: str) -> str:
    mol = Chem.MolFromSmiles(smiles)
    mol.SetProp("_Name", title)
    text = Chem.MolToMolBlock(mol)
    return text + "".join(f">  <{name}>\n{value}\n\n" for name, value in items.items()) + "$$$$\n"


def test_sd_file_of_rdkit(tmp_path: Path) -> None:
    path = tmp_path / "acids.sdf"
    writer = Chem.SDWriter(str(path))
    for n, smiles in enumerate(ACIDS):
        mol = Chem.MolFromSmiles(smiles)
        mol.SetProp("_Name", f"title {n}")
        if n == 1:
            mol.SetProp("ID", "item")
        writer.write(mol)
    writer.close()
    records = read(path)
    canonical = [Chem.CanonSmiles(smiles) for smiles in ACIDS]
    assert brief(records) == list(zip(["title 0", "item", "title 2"], canonical, strict=True))
    assert all(record.mol is not None for record in records)


def test_broken_sd_entries_are_counted_and_said(write: Callable[..., Path]) -> None:
    five_bonds = sd_entry("CC(=O)O").replace("  2  3  2  0", "  2  3  3  0")
    no_atoms = "\n\n\n  0  0  0  0  0  0  0  0  0  0999 V2000\nM  END\n$$$$\n"
    text = sd_entry(ACIDS[0], "first") + "rubbish\n$$$$\n" + five_bonds + no_atoms + sd_entry(ACIDS[1]) + "\n"
    records = read(write("acids.sdf", text))
    assert [record.where for record in records] == [f"acids.sdf, entry {n}" for n in range(1, 6)]
    assert [record.error is None for record in records] == [True, False, False, False, True]
    assert "MOL block" in str(records[1].error)
    assert "valence" in str(records[2].error).lower()
    assert "no atoms" in str(records[3].error)
    assert records[4].id == "5"


def test_mol_file(write: Callable[..., Path]) -> None:
    records = read(write("acid.mol", Chem.MolToMolBlock(Chem.MolFromSmiles("CC(=O)O"))))
    assert brief(records) == [("1", "CC(=O)O")]


def test_records_are_counted_for_the_progress_bar(write: Callable[..., Path]) -> None:
    table = write("a.csv", "smiles\nC\nC\n")
    sdf = write("a.sdf", sd_entry("C") * 3)
    assert count_records([str(table), str(sdf), "CC(=O)O"]) == 6
    assert count_records(["-"]) is None


def test_open_rows_are_read(open_data_path: Path, open_data_rows: list[dict[str, str]]) -> None:
    records = read(open_data_path)
    assert [record.smiles for record in records] == [row["SMILES"].strip() for row in open_data_rows]
    assert not [record for record in records if record.error]


def test_sheets_that_are_left_aside_are_named(tmp_path: Path) -> None:
    """Of a workbook with two sheets of structures the first is read, and the other is not dropped in silence."""
    book = openpyxl.Workbook()
    book.active.title = "about"
    book.active.append(["made by hand"])
    for title, smiles in (("first", "CC(=O)O"), ("second", "CCC(=O)O")):
        sheet = book.create_sheet(title)
        sheet.append(["id", "smiles"])
        sheet.append([title, smiles])
    book.save(tmp_path / "two.xlsx")
    notes: list[str] = []
    records = list(read_sources([str(tmp_path / "two.xlsx")], on_note=notes.append))
    assert [record.smiles for record in records] == ["CC(=O)O"]
    assert len(notes) == 1 and "sheet 'first' is read; 'second' left aside" in notes[0]
