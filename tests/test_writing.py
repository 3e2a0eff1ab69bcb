"""The table of predictions in each format, read back with other programs: pandas, openpyxl, RDKit, json."""

from __future__ import annotations

import json
import math
import re
from pathlib import Path

import openpyxl
import pandas as pd
import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st
from rdkit import Chem
from stand_in_model import Prediction, Step

from qsar.errors import UserError
from qsar.reading import Record
from qsar.screen import ScreenTable
from qsar.writing import COLUMNS, CsvWriter, Row, disarmed, rows_of, unusable, writer_for

# The agreed columns of the table, in their order: outside programs rely on them.
AGREED = [
    *("id", "smiles", "structure", "step", "pka", "low", "high", "coverage", "domain", "reasons"),
    *("nearest", "nearest_pka", "nearest_distance", "measured", "pka_without", "model"),
]

RECORD = Record("an id", "[O-]C(=O)CCl", "acids.csv, row 2")
STEP = Step(
    1,
    2.8612345678901234,
    0.1 + 0.2,
    math.pi,
    0.9,
    "borderline",
    ("salt stripped", "rare group"),
    measured=2.87,
)
ROWS = [
    *rows_of(RECORD, Prediction("O=C(O)CCl", [STEP])),
    unusable(Record("=1+1", "@x\x07", "acids.csv, row 3"), "cannot\nbe read"),
    *rows_of(Record("two", "OC(=O)C(=O)O"), Prediction("O=C(O)C(=O)O", [STEP, Step(2, 4.2, 4.0, 4.4, 0.9)])),
]
NUMBERS = ("pka", "low", "high", "coverage", "nearest_pka", "nearest_distance", "measured", "pka_without")


def write(path: Path, rows: list[Row] = ROWS) -> Path:
    with writer_for(path)(path) as writer:
        for row in rows:
            writer.write([row])
    return path


def same_numbers(found: dict[str, object], row: Row, relative: float = 0.0) -> bool:
    """Whether all digits of all numbers came through, and nothing stands where there is none."""
    for name in NUMBERS:
        wanted, value = getattr(row, name), found[name]
        if wanted is None and not (value is None or value == "" or pd.isna(value)):
            return False
        if wanted is not None and not math.isclose(float(str(value)), wanted, rel_tol=relative):
            return False
    return True


def test_columns_are_the_agreed_ones() -> None:
    assert list(COLUMNS) == AGREED


def test_csv_reads_back_in_pandas(tmp_path: Path) -> None:
    table = pd.read_csv(write(tmp_path / "out.csv"), keep_default_na=False)
    assert list(table.columns) == AGREED
    assert list(table["id"]) == ["an id", "'=1+1", "two", "two"]
    assert list(table["step"].astype(str)) == ["1", "", "1", "2"]
    assert list(table["domain"]) == ["borderline", "unusable", "borderline", "inside"]
    assert list(table["reasons"])[:2] == ["salt stripped; rare group", "cannot be read"]
    assert all(same_numbers(found, row) for found, row in zip(table.to_dict("records"), ROWS, strict=True))


def test_json_reads_back(tmp_path: Path) -> None:
    found = json.loads(write(tmp_path / "out.json").read_text(encoding="utf-8"))
    assert [tuple(item.values()) for item in found] == [tuple(row) for row in ROWS]
    assert all(list(item) == AGREED for item in found)
    assert json.loads(write(tmp_path / "empty.json", []).read_text()) == []


def test_workbook_reads_back_in_openpyxl(tmp_path: Path) -> None:
    sheet = openpyxl.load_workbook(write(tmp_path / "out.xlsx")).active
    header, *found = sheet.iter_rows()
    assert [cell.value for cell in header] == AGREED
    assert [row[0].value for row in found] == ["an id", "=1+1", "two", "two"]
    assert {cell.data_type for row in found for cell in row if isinstance(cell.value, str)} == {"s"}
    for cells, row in zip(found, ROWS, strict=True):
        assert same_numbers(dict(zip(AGREED, (cell.value for cell in cells), strict=True)), row, 1e-15)


def test_sd_file_reads_back_in_rdkit(tmp_path: Path) -> None:
    found = list(Chem.SDMolSupplier(str(write(tmp_path / "out.sdf"))))
    assert [mol.GetProp("_Name") for mol in found] == ["an id", "=1+1", "two", "two"]
    assert [Chem.MolToSmiles(mol) for mol in found] == [
        Chem.CanonSmiles(r.structure) if r.structure else "" for r in ROWS
    ]
    for mol, row in zip(found, ROWS, strict=True):
        items = mol.GetPropsAsDict(autoConvertStrings=False)
        assert same_numbers({name: items.get(name, "") for name in AGREED}, row)
        assert items["domain"] == row.domain
    assert all(conformer.Is3D() is False for mol in found[:1] for conformer in mol.GetConformers())
    spread = found[0].GetConformer().GetPositions().std(axis=0)
    assert spread[:2].min() > 0.1  # drawn, not all atoms in one place


@pytest.mark.parametrize("text", ["=1+1", "+x", "-x", "@SUM(A1)", "\tx", "\r=1", "--1", "-1+cmd|' /C'!A0"])
def test_formulas_are_disarmed_in_csv(text: str) -> None:
    assert disarmed(text) == "'" + text


@pytest.mark.parametrize("text", ["", "x", "-12", "+3", "-1.5e3", "1-2", "acid=1", "[NH3+]CC(=O)[O-]", "'x"])
def test_what_is_no_formula_stays(text: str) -> None:
    assert disarmed(text) == text


@settings(suppress_health_check=[HealthCheck.function_scoped_fixture], max_examples=60, deadline=None)
@given(identity=st.text(max_size=30), extension=st.sampled_from([".csv", ".xlsx", ".json", ".sdf"]))
def test_any_id_can_be_written(tmp_path: Path, identity: str, extension: str) -> None:
    identity = identity.encode("utf-8", "ignore").decode()
    rows = [Row(identity, "OC=O", "O=CO", 1, 3.75, 3.5, 4.0, 0.9, "inside"), *ROWS[1:2]]
    path = write(tmp_path / f"any{extension}", rows)
    if extension == ".csv":
        table = pd.read_csv(path, keep_default_na=False, dtype=str, lineterminator=None)
        assert list(table["pka"]) == ["3.75", ""]
    elif extension == ".xlsx":
        assert [row[4] for row in openpyxl.load_workbook(path).active.iter_rows(values_only=True)] == [
            "pka",
            3.75,
            None,
        ]
    elif extension == ".json":
        assert [item["id"] for item in json.loads(path.read_text(encoding="utf-8"))] == [identity, "=1+1"]
    else:
        assert [mol.GetNumAtoms() for mol in Chem.SDMolSupplier(str(path))] == [3, 0]


def test_failed_writer_raises_what_failed(tmp_path: Path) -> None:
    for extension in (".csv", ".xlsx", ".json", ".sdf"):
        path = tmp_path / f"out{extension}"
        with pytest.raises(ZeroDivisionError), writer_for(path)(path) as writer:
            writer.write(ROWS)
            raise ZeroDivisionError


def test_interrupted_csv_keeps_whole_inputs_only(tmp_path: Path) -> None:
    path = tmp_path / "out.csv"
    writer = CsvWriter(path)
    writer.write(ROWS[:1])
    writer.checkpoint()
    writer.write(ROWS[1:])
    writer.keep_complete()
    assert list(pd.read_csv(path)["id"]) == ["an id"]
    with CsvWriter(path, append=True) as writer:
        writer.write(ROWS[1:])
    assert path.read_text(encoding="utf-8") == write(tmp_path / "whole.csv").read_text(encoding="utf-8")


def test_unknown_format_is_one_line() -> None:
    with pytest.raises(UserError, match=r"\.csv, \.json, \.parquet, \.sdf, \.xlsx"):
        writer_for(Path("out.doc"))


def test_numbers_that_are_not_finite_are_left_out() -> None:
    step = Step(1, 4.0, -math.inf, math.inf, 0.9, nearest_distance=math.nan)
    (row,) = rows_of(RECORD, Prediction("O=C(O)CCl", [step]))
    assert (row.pka, row.low, row.high, row.nearest_distance) == (4.0, None, None, None)


# The table on the screen


def screen(rows: list[Row], width: int = 100) -> list[str]:
    return list(ScreenTable(0.9, width).lines([(RECORD, rows)]))


def test_screen_says_what_a_chemist_asks() -> None:
    lines = screen(ROWS)
    assert re.fullmatch(r"id +structure +pKa +90 % interval +verdict +nearest measured acid", lines[0])
    assert re.search(r"an id +O=C\(O\)CCl +2\.86 +0\.30 to 3\.14 +borderline +CC\(=O\)O \(4\.76\)", lines[2])
    assert [line.strip() for line in lines[3:6]] == ["· measured 2.87", "· salt stripped", "· rare group"]
    assert any(re.search(r"=1\+1 .* unusable", line) for line in lines)
    assert any("acids.csv, row 2: cannot be read" in line for line in lines)
    assert any(re.search(r"two, step 2 .* 4\.20 ", line) for line in lines)
    assert not any("\x07" in line for line in lines)


@pytest.mark.parametrize("width", [80, 100, 118])
def test_screen_keeps_its_width(width: int) -> None:
    long = Row(
        "a very long identity of an acid", "C" * 300, "C" * 300, 1, -12.345, -13.0, -11.0, 0.9, "borderline"
    )
    long = long._replace(nearest="N" * 200, nearest_pka=10.257, reasons="word " * 60 + "; " + "x" * 300)
    lines = screen([*ROWS, long], width)
    assert max(map(len, lines)) <= width
    assert any("(10.26)" in line for line in lines)


def test_screen_keeps_one_layout_over_a_stream() -> None:
    table = ScreenTable(0.9, 100)
    first = list(table.lines([(RECORD, ROWS[:1])]))
    second = list(table.lines([(RECORD, ROWS[:1])]))
    assert second == first[2:]
