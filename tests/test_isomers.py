"""Configurations that a drawing leaves open: which ones there are, and which make no difference."""

from __future__ import annotations

import pytest
from rdkit import Chem

from qsar.isomers import MOST, configurations
from qsar.structures import read_acid


def found(smiles: str) -> tuple[set[str], str]:
    acids, note = configurations(read_acid(smiles))
    assert len(acids) == len({a.smiles for a in acids})
    return {a.smiles for a in acids}, note


def canonical(*smiles: str) -> set[str]:
    return {Chem.CanonSmiles(s) for s in smiles}


@pytest.mark.parametrize(
    ("drawn", "isomers"),
    [
        ("CC=CC(=O)O", ["C/C=C/C(=O)O", "C/C=C\\C(=O)O"]),  # crotonic and isocrotonic acid
        ("OC(=O)C=CC(=O)O", ["OC(=O)/C=C/C(=O)O", "OC(=O)/C=C\\C(=O)O"]),  # fumaric and maleic acid
        ("CC=C(C)C(=O)O", ["C/C=C(C)/C(=O)O", "C/C=C(C)\\C(=O)O"]),  # tiglic and angelic acid
        ("CC=CC=CC(=O)O", [f"C/C=C{a}C=C{b}C(=O)O" for a in "/\\" for b in "/\\"]),
    ],
)
def test_open_double_bonds(drawn: str, isomers: list[str]) -> None:
    smiles, note = found(drawn)
    assert smiles == canonical(*isomers)
    assert "E/Z" in note
    assert str(len(isomers)) in note


def test_a_bond_that_is_stated_is_left_as_it_is() -> None:
    smiles, note = found("C/C=C/C=CC(=O)O")
    assert smiles == canonical("C/C=C/C=C/C(=O)O", "C/C=C/C=C\\C(=O)O")
    assert "2 isomers" in note


@pytest.mark.parametrize(
    "smiles",
    [
        "CC(=O)O",
        "C/C=C/C(=O)O",
        "C=CC(=O)O",  # nothing to be cis to
        "CC(C)=CC(=O)O",  # both groups alike
        "OC(=O)C1=CCCCC1",  # held by the ring
        "OC(=O)C#CC(=O)O",
        "OC(=O)c1ccccc1C(=O)O",
        "OC(=O)CC(=O)O",
        "CC(N)C(=O)O",  # enantiomers have one pKa
        "OC(=O)C1CCCCC1",
        "OC(=O)C1(CC1)C(=O)O",
        "OC(=O)[C@H]1C[C@@H]1C(=O)O",
    ],
)
def test_nothing_is_open(smiles: str) -> None:
    acid = read_acid(smiles)
    assert configurations(acid) == ([acid], "")


@pytest.mark.parametrize("ring", ["C", "CC", "CCC", "CCCC"])
def test_two_carboxyl_groups_on_a_ring_are_cis_or_trans(ring: str) -> None:
    acids, note = configurations(read_acid(f"OC(=O)C1{ring}C1C(=O)O"))
    assert "cis/trans" in note
    products = set()
    for acid in acids:
        a, b = (next(x for x in acid.graph.neighbours[s] if acid.graph.numbers[x] == 6) for s in acid.sites)
        products.add(acid.graph.side[0, a, acid.sites[0]] * acid.graph.side[0, b, acid.sites[1]])
    assert products == {-1, 1}


@pytest.mark.parametrize("ring", ["C", "CC", "CCC", "CCCC"])
def test_mirror_images_are_not_two_isomers(ring: str) -> None:
    # (R,R) and (S,S) have one pKa; counted twice they would pull the mean towards trans.
    acids, note = configurations(read_acid(f"OC(=O)C1{ring}C1C(=O)O"))
    assert len(acids) == 2
    assert "2 isomers" in note


def test_opposite_corners_of_cyclohexane() -> None:
    smiles, _ = found("OC(=O)C1CCC(CC1)C(=O)O")
    assert smiles == canonical("OC(=O)[C@H]1CC[C@@H](CC1)C(=O)O", "OC(=O)[C@H]1CC[C@H](CC1)C(=O)O")


def test_cis_and_trans_where_no_hydrogen_is_left() -> None:
    # 1,2-dimethylcyclopropane-1,2-dicarboxylic acid
    acids, note = configurations(read_acid("OC(=O)C1(C)CC1(C)C(=O)O"))
    assert "cis/trans" in note
    assert len(acids) == 2


def test_double_bond_and_ring_together() -> None:
    smiles, note = found("CC=CC1C(C(=O)O)C1C(=O)O")
    assert "E/Z and cis/trans" in note
    assert {s.count("\\") % 2 for s in smiles} == {0, 1}


def test_never_more_than_a_few() -> None:
    smiles, _ = found("C" + "C=C" * 6 + "C(=O)O")
    assert 2 <= len(smiles) <= MOST


def test_the_bond_beside_the_carboxyl_group_goes_first() -> None:
    # of more open bonds than are enumerated, the nearest ones matter most
    smiles, _ = found("C" + "C=C" * 6 + "C(=O)O")
    stated = Chem.MolFromSmarts("C/C=C/C(=O)[OH]"), Chem.MolFromSmarts("C/C=C\\C(=O)[OH]")
    for s in smiles:
        mol = Chem.MolFromSmiles(s)
        assert any(mol.HasSubstructMatch(p, useChirality=True) for p in stated), s


def test_the_given_acid_is_left_alone() -> None:
    acid = read_acid("CC=CC(=O)O")
    before = Chem.MolToSmiles(acid.mol)
    configurations(acid)
    assert Chem.MolToSmiles(acid.mol) == before
