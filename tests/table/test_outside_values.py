"""The table against measurements and thermodynamic data from outside the project."""

from __future__ import annotations

import math
import re
import statistics
from itertools import pairwise
from pathlib import Path

import pytest

from qsar.checking.open_rows import Comparison, compare, summary
from qsar.checking.rows import TableRow
from qsar.curation.iupac import sort_iupac


@pytest.fixture(scope="module")
def comparisons(rows: list[TableRow], open_data_path: Path) -> list[Comparison]:
    return compare(rows, sort_iupac(open_data_path).steps)


def test_open_rows_agree(comparisons: list[Comparison], capsys: pytest.CaptureFixture[str]) -> None:
    """IUPAC Digitized pKa Dataset, doi:10.5281/zenodo.7236452.

    Two laboratories that measured one acid there at 24 to 26 °C differ by 0.09 in the median and 0.14 on
    average.
    """
    size = [abs(c.difference) for c in comparisons]
    with capsys.disabled():
        print("\n" + "\n".join(summary(comparisons)))
    assert len(comparisons) >= 200
    assert statistics.median(size) < 0.05
    assert statistics.fmean(size) < 0.10
    assert abs(statistics.fmean(c.difference for c in comparisons)) < 0.05


def test_the_table_says_what_the_comparison_says(comparisons: list[Comparison]) -> None:
    for c in comparisons:
        entry = c.row.entry("open rows")
        assert entry.startswith(f"open rows: {c.band}"), f"row {c.row.line}: {entry!r}, not {c.band}"
        if c.band.startswith("beyond"):
            reason = entry.removeprefix(f"open rows: {c.band}")
            assert len(reason) > 20, f"row {c.row.line} ({c.row.label}) gives no reason"


# Species of the OBIGT database: acid, then the anions of each step.
SPECIES = {
    "O=CO": ("formic acid", "formate"),
    "CC(=O)O": ("acetic acid", "acetate"),
    "CCC(=O)O": ("propanoic acid", "propanoate"),
    "CCCC(=O)O": ("n-butanoic acid", "n-butanoate"),
    "CCCCC(=O)O": ("n-pentanoic acid", "n-pentanoate"),
    "CCCCCC(=O)O": ("n-hexanoic acid", "n-hexanoate"),
    "CCCCCCC(=O)O": ("n-heptanoic acid", "n-heptanoate"),
    "O=C(O)c1ccccc1": ("n-benzoic acid", "benzoate"),
    "Cc1ccccc1C(=O)O": ("o-toluic acid", "o-toluate"),
    "Cc1cccc(C(=O)O)c1": ("m-toluic acid", "m-toluate"),
    "Cc1ccc(C(=O)O)cc1": ("p-toluic acid", "p-toluate"),
    "O=C(O)C(=O)O": ("oxalic acid", "H-oxalate", "oxalate-2"),
    "O=C(O)CC(=O)O": ("malonic acid", "H-malonate", "malonate-2"),
    "O=C(O)CCC(=O)O": ("succinic acid", "H-succinate", "succinate-2"),
    "O=C(O)CCCC(=O)O": ("glutaric acid", "H-glutarate", "glutarate-2"),
    "O=C(O)CCCCCC(=O)O": ("pimelic acid", "H-pimelate", "pimelate-2"),
    "O=C(O)CCCCCCC(=O)O": ("suberic acid", "H-suberate", "suberate-2"),
    "O=C(O)CO": ("glycolic acid", "glycolate"),
    "CC(O)C(=O)O": ("lactic acid", "lactate"),
    "O=C(O)CC(O)(CC(=O)O)C(=O)O": ("citric acid", "H2-citrate", "H-citrate-2", "citrate-3"),
    "O=C(O)CC(O)C(=O)O": ("malic acid", "H-malate", "malate-2"),
    "NCC(=O)O": ("glycinium", "glycine"),
    "CC(N)C(=O)O": ("alaninium", "alanine"),
}


def test_gibbs_energies_of_ionisation_agree(rows: list[TableRow]) -> None:
    """OBIGT (Dick, Front. Earth Sci. 2019, 7, 180), read through pychnosz; most acids after Shock 1995.

    pKa = (G(anion) - G(acid)) / (RT ln 10) at 25 °C, the proton having G = 0 by convention.
    """
    pychnosz = pytest.importorskip("pychnosz", reason="needs pychnosz (pip install 'qsar[test]')")
    import pandas as pd

    folder = Path(pychnosz.__file__).parent / "data" / "extdata" / "OBIGT"
    frame = pd.read_csv(folder / "organic_aq.csv").set_index("name")
    joules = frame["G"] * frame["E_units"].map({"cal": 4.184, "J": 1.0})
    measured = {(row.smiles, row.step): row.pka for row in rows}
    differences = {}
    for smiles, species in SPECIES.items():
        for step, (acid, anion) in enumerate(pairwise(species), start=1):
            there = (joules[anion] - joules[acid]) / (math.log(10) * 8.314462618 * 298.15)
            differences[smiles, step] = measured[smiles, step] - there
    size = [abs(value) for value in differences.values()]
    assert statistics.median(size) < 0.02
    assert max(size) < 0.1, differences


def test_entries_of_checked_are_read(rows: list[TableRow]) -> None:
    """A row that reports a check begins the entry in a known way; anything else would not be counted."""
    for row in rows:
        for entry in row.checked.split("; "):
            if (
                re.match(r"(open rows|OBIGT|Hammett|Taft|second (handbook|table|source))", entry)
                and "no conclusion" not in entry
            ):
                assert row.kinds(), f"row {row.line}: {entry}"
