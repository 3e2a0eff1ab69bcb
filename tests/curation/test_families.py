"""Families of acids that a chemist would name without looking; common practice, no source."""

from __future__ import annotations

import pytest

from qsar.curation.families import family_of
from qsar.structures import read_acid


@pytest.mark.parametrize(
    ("smiles", "family"),
    [
        ("CCCC(=O)O", "alkanoic"),
        ("OC(=O)CCl", "halogenoalkanoic"),
        ("OCC(=O)O", "substituted_alkanoic"),
        ("OC(=O)CCc1ccccc1", "arylalkanoic"),
        ("OC(=O)c1cccc(Cl)c1", "benzoic_meta_para"),
        ("OC(=O)c1ccccc1Cl", "benzoic_ortho"),
        ("OC(=O)c1cccc2ccccc12", "naphthoic_fused"),
        ("OC(=O)c1ccco1", "heteroaromatic"),
        ("OC(=O)C=C", "alkenoic_alkynoic"),
        ("OC(=O)C#C", "alkenoic_alkynoic"),
        ("NCC(=O)O", "amino_acid"),
        ("OC(=O)CC(=O)O", "dicarboxylic"),
        ("OC(=O)CC(O)(C(=O)O)CC(=O)O", "tricarboxylic_more"),
    ],
)
def test_family(smiles: str, family: str) -> None:
    assert family_of(read_acid(smiles)) == family
