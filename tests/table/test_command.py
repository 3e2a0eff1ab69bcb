"""``acidity check-table`` on small tables of invented values (how the program behaves; no source)."""

from __future__ import annotations

from pathlib import Path

import pytest

from qsar.cli import main
from qsar.report.table_plots import group_distances
from qsar.table import COLUMNS

HEADER = ",".join(COLUMNS)
GOOD = "acetic acid,CC(=O)O,1,4.76,25,0,thermodynamic,0.01,alkanoic,MADE_UP,yes,open rows: within 0.05"
FIRST = "malonic acid,OC(=O)CC(=O)O,1,2.85,25,0,thermodynamic,0.01,dicarboxylic,MADE_UP,yes,"
SECOND = "malonic acid,OC(=O)CC(=O)O,2,{pka},25,0,thermodynamic,0.01,dicarboxylic,MADE_UP,yes,"


def write(folder: Path, *lines: str) -> str:
    path = folder / "table.csv"
    path.write_text("\n".join([HEADER, *lines]) + "\n", encoding="utf-8")
    return str(path)


def test_a_sound_table_passes(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    table = write(tmp_path, GOOD, FIRST, SECOND.format(pka=5.70))
    assert main(["check-table", table]) == 0
    out = capsys.readouterr().out
    assert "3 steps of 2 acids; 1 (33.3%) carry a check" in out
    assert "too few acids" in out
    assert "C3 2.85" in out


def test_contradictions_are_listed(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    table = write(tmp_path, GOOD, GOOD, FIRST, SECOND.format(pka=2.70))
    assert main(["check-table", table]) == 3
    out = capsys.readouterr().out
    assert "row 3: acetic acid stands in row 2 already" in out
    assert "row 5: malonic acid, step 2 is not weaker than the step before it" in out


@pytest.mark.parametrize(
    ("line", "told"),
    [
        (GOOD.replace("4.76", "about 5"), "row 2, column pka: 'about 5' is not a number"),
        (GOOD.replace("CC(=O)O", "CCO"), "row 2, column smiles: no carboxyl group"),
        (GOOD + ",one more cell", "row 2: not 12 cells"),
    ],
)
def test_a_wrong_cell_is_told_in_one_line(
    line: str, told: str, tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    assert main(["check-table", write(tmp_path, line)]) == 2
    error = capsys.readouterr().err
    assert told in error
    assert error.count("\n") == 1


def test_a_file_of_other_columns_is_told(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    path = tmp_path / "other.csv"
    path.write_text("a,b\n1,2\n", encoding="utf-8")
    assert main(["check-table", str(path)]) == 2
    assert "other.csv: no column name" in capsys.readouterr().err
    assert main(["check-table", write(tmp_path, GOOD), "--open-data", str(path)]) == 2
    assert "this is not the IUPAC dataset" in capsys.readouterr().err


def test_plots_are_drawn_whole(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    folder = tmp_path / "plots"
    assert main(["check-table", write(tmp_path, GOOD, FIRST), "--plots", str(folder)]) == 0
    assert sorted(path.name for path in folder.iterdir()) == ["table_coverage.png", "table_families.png"]
    assert all(path.read_bytes().startswith(b"\x89PNG") for path in folder.iterdir())
    assert "drawn" in capsys.readouterr().out


def test_groups_are_counted_by_their_distance() -> None:
    """By hand: in 3-chlorobutanoic acid the chlorine is three bonds from the carboxyl carbon."""
    counts = group_distances({"CC(Cl)CC(=O)O", "O=C(O)CC(=O)O", "O=C(O)c1ccccc1"})
    assert counts == {("chloro", 3): 1, ("carboxyl", 2): 1, ("phenyl", 1): 1}
