"""Tables of measured acids: what is read, and the one line that says which cell is wrong."""

from __future__ import annotations

import hashlib
from pathlib import Path

import pytest

from qsar.errors import UserError
from qsar.table import COLUMNS, read_table, sha256


def write(folder: Path, text: str, encoding: str = "utf-8") -> Path:
    path = folder / "acids.csv"
    path.write_bytes(text.encode(encoding))
    return path


def test_the_smallest_table(tmp_path: Path) -> None:
    # invented values
    rows = read_table(write(tmp_path, "smiles,pka\nCC(=O)O,4.7\n[O-]C(=O)CCl.[Na+],2.9\n"))
    assert [(m.acid.smiles, m.step, m.pka, m.uncertainty) for m in rows] == [
        ("CC(=O)O", 1, 4.7, 0.05),
        ("O=C(O)CCl", 1, 2.9, 0.05),
    ]
    assert [(m.name, m.family, m.source) for m in rows] == [("", "", "")] * 2


def test_all_columns(tmp_path: Path) -> None:
    text = ",".join(COLUMNS) + "\nmade up,OC(=O)CC(=O)O,2,5.5,25,0,thermodynamic,0.02,dicarboxylic,NOTE1,yes,\n"
    (row,) = read_table(write(tmp_path, text))
    assert (row.step, row.pka, row.uncertainty) == (2, 5.5, 0.02)
    assert (row.name, row.family, row.source) == ("made up", "dicarboxylic", "NOTE1")


def test_order_of_columns_and_extra_columns_do_not_matter(tmp_path: Path) -> None:
    (row,) = read_table(write(tmp_path, 'note,pka,name,smiles\n"a, b",4.7,"x, y",CC(=O)O\n'))
    assert (row.pka, row.name) == (4.7, "x, y")


def test_spreadsheet_exports_with_a_byte_order_mark(tmp_path: Path) -> None:
    assert len(read_table(write(tmp_path, "smiles,pka\r\nCC(=O)O,4.7\r\n", "utf-8-sig"))) == 1


def test_default_uncertainty(tmp_path: Path) -> None:
    path = write(tmp_path, "smiles,pka,uncertainty\nCC(=O)O,4.7,\nOC=O,3.7,0.2\n")
    assert [m.uncertainty for m in read_table(path, 0.11)] == [0.11, 0.2]


@pytest.mark.parametrize(
    ("text", "words"),
    [
        ("", ["no column"]),
        ("smiles,pka\n", ["no rows"]),
        ("smiles,value\nCC(=O)O,4.7\n", ["pka", "value"]),
        ("structure,pka\nCC(=O)O,4.7\n", ["smiles", "structure"]),
        ("smiles,pka\nCC(=O)O,4.7\nCC(=O)O,four\n", ["row 3", "pka", "four"]),
        ("smiles,pka\nCC(=O)O,\n", ["row 2", "pka", "empty"]),
        ("smiles,pka\n,4.7\n", ["row 2", "smiles", "empty"]),
        ("smiles,pka\nCC(,4.7\n", ["row 2", "smiles", "CC("]),
        ("smiles,pka\nCCO,4.7\n", ["row 2", "smiles", "no carboxyl"]),
        ("smiles,pka,step\nCC(=O)O,4.7,2\n", ["row 2", "step", "1 COOH"]),
        ("smiles,pka,step\nCC(=O)O,4.7,0\n", ["row 2", "step"]),
        ("smiles,pka,step\nCC(=O)O,4.7,first\n", ["row 2", "step", "first"]),
        ("smiles,pka,step\nOC(=O)CC(=O)O,4.7,1.5\n", ["row 2", "step", "1.5"]),
        ("smiles,pka,uncertainty\nCC(=O)O,4.7,low\n", ["row 2", "uncertainty", "low"]),
        ("smiles,pka\nCC(=O)O,nan\n", ["row 2", "pka", "nan"]),
        ("smiles,pka\nCC(=O)O,inf\n", ["row 2", "pka", "inf"]),
        ("smiles,pka,uncertainty\nCC(=O)O,4.7,-0.1\n", ["row 2", "uncertainty", "-0.1"]),
        ("smiles,pka,uncertainty\nCC(=O)O,4.7,nan\n", ["row 2", "uncertainty", "nan"]),
    ],
)
def test_a_wrong_cell_is_named_in_one_line(tmp_path: Path, text: str, words: list[str]) -> None:
    path = write(tmp_path, text)
    with pytest.raises(UserError) as caught:
        read_table(path)
    message = str(caught.value)
    assert "\n" not in message
    assert path.name in message
    for word in words:
        assert word in message


def test_a_quoted_line_break_does_not_shift_the_row(tmp_path: Path) -> None:
    # the row that is named is the line of the file, as a text editor counts
    path = write(tmp_path, 'smiles,pka,name\nCC(=O)O,4.7,"two\nlines"\nCC(=O)O,x,\n')
    with pytest.raises(UserError, match="row 4, column pka"):
        read_table(path)


def test_a_row_with_too_few_cells(tmp_path: Path) -> None:
    with pytest.raises(UserError, match="row 2, column pka: empty"):
        read_table(write(tmp_path, "name,smiles,pka\nacetic acid,CC(=O)O\n"))


def test_not_utf8(tmp_path: Path) -> None:
    with pytest.raises(UserError, match="UTF-8"):
        read_table(write(tmp_path, "smiles,pka,name\nCC(=O)O,4.7,\xe4thans\xe4ure\n", "latin-1"))


def test_no_such_file(tmp_path: Path) -> None:
    with pytest.raises(UserError, match="cannot read"):
        read_table(tmp_path / "missing.csv")


def test_a_folder(tmp_path: Path) -> None:
    with pytest.raises(UserError, match="cannot read"):
        read_table(tmp_path)


def test_sha256_is_that_of_the_bytes(tmp_path: Path) -> None:
    path = tmp_path / "file"
    path.write_bytes(b"abc")
    # FIPS 180-4 example: SHA-256 of "abc"
    assert sha256(path) == "ba7816bf8f01cfea414140de5dae2223b00361a396177a9cb410ff61f20015ad"
    path.write_bytes(bytes(range(256)))
    assert sha256(path) == hashlib.sha256(bytes(range(256))).hexdigest()
