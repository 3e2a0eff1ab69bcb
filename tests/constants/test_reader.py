"""The constants tables can be read, are complete in themselves and say where each value comes from."""

from __future__ import annotations

import dataclasses
import math
import subprocess
import sys
import zipfile
from pathlib import Path

import pytest
from rdkit import Chem

import qsar
from qsar import constants
from qsar.constants import reader

VALUES = (
    "sigma_meta",
    "sigma_para",
    "sigma_i",
    "sigma_r",
    "taft_star",
    "es",
    "group_electronegativity",
    "charton_nu",
)


def test_every_value_is_a_finite_number_with_a_source_that_covers_its_column() -> None:
    table = constants.substituents()
    assert len(table) >= 120
    for row in table:
        held = {name for name in VALUES if getattr(row, name) is not None}
        assert held, row.group
        assert all(math.isfinite(getattr(row, name)) for name in held)
        assert set(row.sources) == held
        assert all(name in constants.sources()[key].columns for name, key in row.sources.items()), row.group


def test_every_row_says_that_it_was_written_from_memory() -> None:
    assert all(row.from_memory for row in constants.substituents())
    assert all(row.from_memory for row in constants.elements())


def test_no_group_stands_twice() -> None:
    table = constants.substituents()
    assert len({row.group for row in table}) == len(table)
    assert len({constants.canonical_group(row.smiles) for row in table}) == len(table)


def test_no_element_stands_twice() -> None:
    table = constants.elements()
    assert len({row.symbol for row in table}) == len({row.atomic_number for row in table}) == len(table)


def test_each_group_is_attached_by_one_single_bond() -> None:
    for row in constants.substituents():
        if row.group == "H":
            continue
        molecule = Chem.MolFromSmiles(row.smiles)
        dummies = [atom for atom in molecule.GetAtoms() if atom.GetAtomicNum() == 0]
        assert [atom.GetDegree() for atom in dummies] == [1], row.group
        assert dummies[0].GetBonds()[0].GetBondType() == Chem.BondType.SINGLE, row.group


def test_elements_against_the_periodic_table_of_rdkit() -> None:
    """Atomic numbers and Cordero radii as RDKit holds them (in Angstrom); RDKit rounds to 0.01."""
    table = Chem.GetPeriodicTable()
    needed = {"H", "B", "C", "N", "O", "F", "Si", "P", "S", "Cl", "Se", "Br", "I"}
    assert needed <= {row.symbol for row in constants.elements()}
    for row in constants.elements():
        assert table.GetAtomicNumber(row.symbol) == row.atomic_number
        assert row.covalent_radius / 100 == pytest.approx(table.GetRcovalent(row.symbol), abs=0.0051), (
            row.symbol
        )


def test_electronegativity_follows_the_periodic_table() -> None:
    """Pauling, The Nature of the Chemical Bond: rises along a period and falls down a group."""
    rising = ["Li", "B", "C", "N", "O", "F"]
    falling = ["F", "Cl", "Br", "I"]
    chi = {row.symbol: row.electronegativity for row in constants.elements()}
    assert [chi[s] for s in rising] == sorted(chi[s] for s in rising)
    assert [chi[s] for s in falling] == sorted((chi[s] for s in falling), reverse=True)
    assert max(chi, key=lambda symbol: chi[symbol]) == "F"


@pytest.mark.parametrize(
    ("smiles", "group"),
    [
        ("[*]C#N", "CN"),
        ("N#C*", "CN"),
        ("[1*]C#N", "CN"),
        ("[*:3]C#N", "CN"),
        ("*N(=O)=O", "NO2"),
        ("[O-][N+](*)=O", "NO2"),
        ("*/C=C/c1ccccc1", "CH=CHC6H5"),
        ("C1=CC=CC=C1*", "C6H5"),
        ("[*][H]", "H"),
        ("[*]C(=O)[O-]", "CO2-"),
        ("[*]C(=O)O", "CO2H"),
    ],
)
def test_a_group_is_found_however_it_is_written(smiles: str, group: str) -> None:
    found = constants.substituent_by_smiles(smiles)
    assert found is not None
    assert found.group == group


def test_each_tabulated_group_finds_itself() -> None:
    assert all(constants.substituent_by_smiles(row.smiles) is row for row in constants.substituents())


def test_a_group_that_is_not_tabulated_gives_none() -> None:
    assert constants.substituent_by_smiles("[*]CCCCCCCCCCCC") is None


@pytest.mark.parametrize("smiles", ["C#N", "[*]C[*]", "[*]C(", ""])
def test_what_is_no_group_is_refused_in_one_line(smiles: str) -> None:
    with pytest.raises(ValueError, match=r"\[\*\]C#N") as caught:
        constants.substituent_by_smiles(smiles)
    assert "\n" not in str(caught.value)


def test_an_element_that_is_not_tabulated_is_named() -> None:
    with pytest.raises(KeyError, match="Xx"):
        constants.element("Xx")
    with pytest.raises(KeyError, match="118"):
        constants.element_by_number(118)


def test_rows_cannot_be_changed() -> None:
    row = constants.element("Cl")
    with pytest.raises(dataclasses.FrozenInstanceError):
        row.electronegativity = 0.0  # type: ignore[misc]
    with pytest.raises(TypeError):
        row.sources["electronegativity"] = "other"  # type: ignore[index]


@pytest.mark.parametrize(
    ("old", "new", "told"),
    [
        ("H,1,2.20,31,", "H,1,two,31,", "elements.csv row 2, column electronegativity: 'two'"),
        ("H,1,2.20,31,", "H,1,2.20,", "elements.csv row 2: 5 cells under 6 columns"),
        ("electronegativity=ALLRED1961", "electronegativity=NOBODY", "elements.csv row 2, column source"),
        ("covalent_radius=CORDERO2008", "", "elements.csv row 2, column source: name one source"),
    ],
)
def test_a_damaged_table_is_refused_with_its_place(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch, old: str, new: str, told: str
) -> None:
    folder = Path(reader.__file__).parent
    text = (folder / "elements.csv").read_text(encoding="utf-8")
    assert old in text
    (tmp_path / "elements.csv").write_text(text.replace(old, new), encoding="utf-8")
    (tmp_path / "sources.csv").write_bytes((folder / "sources.csv").read_bytes())
    monkeypatch.setattr(reader, "files", lambda package: tmp_path)
    with pytest.raises(ValueError, match=told.replace("(", r"\(")):
        reader.elements.__wrapped__()


def test_reading_imports_neither_rdkit_nor_pandas() -> None:
    code = (
        "import sys; from qsar import constants; constants.substituents(); constants.element('C'); "
        "print(sorted({'rdkit', 'pandas', 'numpy', 'scipy'} & set(sys.modules)))"
    )
    root = Path(qsar.__file__).parents[1]
    run = subprocess.run([sys.executable, "-c", code], cwd=root, capture_output=True, text=True, check=True)
    assert run.stdout.strip() == "[]"


def test_tables_are_read_from_inside_an_archive(tmp_path: Path) -> None:
    """A package that is imported from a zip file has no folder: the tables must come as package resources."""
    root = Path(qsar.__file__).parent
    archive = tmp_path / "packed.zip"
    with zipfile.ZipFile(archive, "w") as packed:
        packed.writestr("qsar/__init__.py", "")
        for path in (root / "constants").iterdir():
            if path.suffix in {".py", ".csv"}:
                packed.write(path, f"qsar/constants/{path.name}")
    code = (
        f"import sys; sys.path.insert(0, {str(archive)!r}); from qsar import constants; "
        "print(constants.__file__, len(constants.substituents()))"
    )
    run = subprocess.run(
        [sys.executable, "-c", code], cwd=tmp_path, capture_output=True, text=True, check=True
    )
    where, count = run.stdout.split()
    assert "packed.zip" in where
    assert int(count) == len(constants.substituents())
