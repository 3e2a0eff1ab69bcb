"""Tables of measured acids: what is read, and the one line that says which cell is wrong."""

from __future__ import annotations

import hashlib
from pathlib import Path

import pytest

from qsar.cli import main
from qsar.errors import UserError
from qsar.sources import key_of
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


# Constants in 0.1 mol/L salt (Martell & Smith, Critical Stability Constants) and at ionic strength 0 (acetic acid:
# Harned & Ehlers 1933; succinic acid: Pinching & Bates 1950; glycine: Owen 1934), from memory.
@pytest.mark.parametrize(
    ("smiles", "step", "in_salt", "kind", "wanted"),
    [
        ("CC(=O)O", 1, 4.56, "concentration", 4.756),
        ("CC(=O)O", 1, 4.65, "mixed", 4.756),
        ("O=C(O)CCC(=O)O", 1, 4.00, "concentration", 4.207),
        ("O=C(O)CCC(=O)O", 2, 5.24, "concentration", 5.638),
        ("NCC(=O)O", 1, 2.36, "concentration", 2.350),
    ],
)
def test_constants_in_salt_become_thermodynamic(
    smiles: str, step: int, in_salt: float, kind: str, wanted: float, tmp_path: Path
) -> None:
    text = f"smiles,pka,step,ionic_strength_m,constant,source\n{smiles},{in_salt},{step},0.1,{kind},KEY\n"
    (row,) = read_table(write(tmp_path, text))
    assert row.pka == pytest.approx(wanted, abs=0.05)
    assert row.source == f"KEY; as printed {in_salt:g} at I = 0.1 mol/L"
    assert key_of(row.source) == "KEY"


def test_a_constant_of_a_kind_that_is_not_stated_counts_as_mixed(tmp_path: Path) -> None:
    header = "smiles,pka,ionic_strength_m,constant\n"
    rows = read_table(write(tmp_path, header + "CC(=O)O,4.65,0.1,\nCC(=O)O,4.65,0.1,mixed\nCC(=O)O,4.76,,mixed\n"))
    assert rows[0].pka == rows[1].pka > 4.65
    assert (rows[2].pka, rows[2].source) == (4.76, "")


@pytest.mark.parametrize(
    ("text", "words"),
    [
        ("smiles,pka,ionic_strength_m\nCC(=O)O,4.7,1\n", ["row 2", "ionic_strength_m", "0.5 mol/L"]),
        ("smiles,pka,constant\nCC(=O)O,4.7,apparent\n", ["row 2", "constant", "apparent", "mixed"]),
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


def test_a_table_and_its_curation_bring_a_constant_to_the_same_value(tmp_path: Path) -> None:
    """A peptide of three lysines too, whose charges do not all count; the value is made up."""
    smiles = "NCCCCC(N)C(=O)NC(CCCCN)C(=O)NC(CCCCN)C(=O)O"
    path = write(tmp_path, f"smiles,pka,ionic_strength_m,constant\n{smiles},3.1,0.1,concentration\n")
    assert main(["curate", str(path), "--output", str(tmp_path / "clean.csv")]) == 0
    (direct,), (curated,) = read_table(path), read_table(tmp_path / "clean.csv")
    assert curated.pka == pytest.approx(direct.pka, abs=1e-4)
