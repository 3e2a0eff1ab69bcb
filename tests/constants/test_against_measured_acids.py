"""Hammett constants against measured benzoic acids: sigma = 4.20 - pKa by Hammett's definition.

The measured acids are those of the IUPAC Digitized pKa Dataset (Zheng, Lafontant-Joseph,
doi:10.5281/zenodo.7236452), read where they lie and not copied.
"""

from __future__ import annotations

import csv
import os
import statistics
from collections import defaultdict
from pathlib import Path

import pytest
from rdkit import Chem

from qsar.constants import substituents

#: Groups that lose or gain a proton before the carboxyl group, or are a second carboxyl group.
IONISED = {"NH2", "NHCH3", "N(CH3)2", "N(C2H5)2", "CO2H", "CO2-"}


@pytest.fixture(scope="module")
def measured(request: pytest.FixtureRequest) -> dict[str, float]:
    """Median first pKa near 25 C in water by canonical SMILES."""
    default = os.environ.get("QSAR_OPEN_DATA") or Path(__file__).parents[3] / "shared" / "open_data"
    path = Path(request.config.getoption("--open-data", default=None) or default)
    path /= "iupac_pka_acids_half.csv"
    if not path.is_file():
        pytest.skip(f"no open data at {path}")
    found: dict[str, list[float]] = defaultdict(list)
    with path.open(encoding="utf-8", newline="") as handle:
        for row in csv.DictReader(handle):
            plain = row["pka_type"] == "pKa1" and not row["cosolvent"] and not row["pressure"]
            if not plain or row["assessment"] == "Uncertain" or "I=" in row["remarks"] or not row["T"]:
                continue
            molecule = Chem.MolFromSmiles(row["SMILES"])
            if molecule is not None and abs(float(row["T"]) - 25) <= 1:
                found[Chem.MolToSmiles(molecule, isomericSmiles=False)].append(float(row["pka_value"]))
    return {smiles: statistics.median(values) for smiles, values in found.items()}


def benzoic_acid(group: str, position: str) -> str:
    """Canonical SMILES of the benzoic acid that bears the group."""
    ring = {"meta": "OC(=O)c1cccc([*])c1", "para": "OC(=O)c1ccc([*])cc1"}[position]
    core, side = Chem.MolFromSmiles(ring), Chem.MolFromSmiles(group)
    joined = Chem.RWMol(Chem.CombineMols(core, side))
    ends = [atom for atom in joined.GetAtoms() if atom.GetAtomicNum() == 0]
    first, second = (end.GetNeighbors()[0].GetIdx() for end in ends)
    joined.AddBond(first, second, Chem.BondType.SINGLE)
    for index in sorted((end.GetIdx() for end in ends), reverse=True):
        joined.RemoveAtom(index)
    Chem.SanitizeMol(joined)
    return str(Chem.MolToSmiles(joined, isomericSmiles=False))


def test_hammett_constants_against_measured_benzoic_acids(measured: dict[str, float]) -> None:
    """Measured: 21 acids, median miss 0.01; beyond 0.08 m-t-C4H9 (0.10) and p-C(CH3)=CH2 (0.11)."""
    misses: dict[str, float] = {}
    for row in substituents():
        for position, sigma in (("meta", row.sigma_meta), ("para", row.sigma_para)):
            if sigma is None or row.group in IONISED | {"H"}:
                continue
            smiles = benzoic_acid(row.smiles, position)
            if smiles in measured:
                misses[f"{position}-{row.group}"] = 4.20 - measured[smiles] - sigma
    far = {name: round(miss, 2) for name, miss in misses.items() if abs(miss) > 0.08}
    assert len(misses) >= 15
    assert statistics.median(map(abs, misses.values())) <= 0.03
    assert len(far) <= 2, far
