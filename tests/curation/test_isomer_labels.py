"""Isomers by word, and one spelling for mirror images (chemistry worked by hand)."""

from __future__ import annotations

import pytest
from hypothesis import given
from hypothesis import strategies as st
from rdkit import Chem

from qsar.curation.isomer_labels import is_isomer_word, isomer, one_spelling, without_centres


@pytest.mark.parametrize(
    ("smiles", "word", "expected"),
    [
        ("OC(=O)C=CC(=O)O", "cis", "O=C(O)/C=C\\C(=O)O"),
        ("OC(=O)C=CC(=O)O", "trans", "O=C(O)/C=C/C(=O)O"),
        ("CC=CC(=O)O", "trans", "C/C=C/C(=O)O"),
        ("CC(=CC(=O)O)C(=O)O", "cis", "C/C(=C/C(=O)O)C(=O)O"),
        ("O=C(O)C(O)C(O)C(=O)O", "meso", "O=C(O)[C@@H](O)[C@@H](O)C(=O)O"),
    ],
)
def test_words_settle_the_isomer(smiles: str, word: str, expected: str) -> None:
    found = isomer(smiles, word)
    assert found is not None
    assert Chem.CanonSmiles(found) == one_spelling(expected)


def test_cis_and_trans_on_a_ring_differ() -> None:
    cis, trans = (isomer("O=C(O)C1CCCCC1C(=O)O", word) for word in ("cis", "trans"))
    assert cis is not None and trans is not None and cis != trans
    mirrored = Chem.MolFromSmiles(cis)
    for atom in mirrored.GetAtoms():
        atom.InvertChirality()
    assert Chem.MolToSmiles(mirrored) == cis, "the cis acid is its own mirror image"


@pytest.mark.parametrize(
    ("smiles", "word"),
    [
        ("CC(=O)O", "cis"),
        ("CC(C)=CC(=O)O", "trans"),
        ("CC(O)C(N)C(=O)O", "DL"),
        ("O=C(O)C1C2CCC(C2)C1C(=O)O", "trans"),
        ("CC1(C(=O)O)CC1(Cl)C(=O)O", "cis"),
    ],
)
def test_words_that_settle_nothing(smiles: str, word: str) -> None:
    assert isomer(smiles, word) is None


def test_known_words() -> None:
    assert all(map(is_isomer_word, ("cis", "trans", "meso", "DL", "D and DL")))
    assert not any(map(is_isomer_word, ("OH", "threo", "half-ethanol", "")))


def test_mirror_images_have_one_spelling() -> None:
    assert one_spelling("C[C@H](N)C(=O)O") == one_spelling("C[C@@H](N)C(=O)O") == "CC(N)C(=O)O"
    assert one_spelling("C[C@@H](O)[C@H](N)C(=O)O") == one_spelling("C[C@H](O)[C@@H](N)C(=O)O")
    assert one_spelling("C[C@@H](O)[C@H](N)C(=O)O") != one_spelling("C[C@H](O)[C@H](N)C(=O)O")


def test_marks_on_double_bonds_stay() -> None:
    assert without_centres("C[C@H](F)/C=C/C(=O)O") == "CC(F)/C=C/C(=O)O"


@given(st.lists(st.sampled_from(["[C@H](F)", "[C@@H](F)", "[C@@H](Cl)", "C"]), min_size=1, max_size=4))
def test_spelling_does_not_depend_on_the_mirror(parts: list[str]) -> None:
    smiles = "C" + "".join(parts) + "C(=O)O"
    mirrored = Chem.MolFromSmiles(smiles)
    for atom in mirrored.GetAtoms():
        atom.InvertChirality()
    assert one_spelling(Chem.MolToSmiles(mirrored)) == one_spelling(smiles)
    assert one_spelling(one_spelling(smiles)) == one_spelling(smiles)
