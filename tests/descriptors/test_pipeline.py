"""All columns together: named once, with unit and citation, finite over the measured acids, free of atom order."""

from __future__ import annotations

import random
import re

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from rdkit import Chem

from qsar.descriptors import COLUMNS, EFFECTS, LOWERS, NAMES
from qsar.ionisation import edge_descriptors
from qsar.paths import reference_table
from qsar.structures import Acid, acid_from_mol, read_acid
from qsar.table import read_table


def test_names_are_unique_and_speak() -> None:
    assert len(set(NAMES)) == len(NAMES) == len(COLUMNS) == len(LOWERS)
    for name in NAMES:
        assert re.fullmatch(r"[a-z][a-z0-9_]+", name), name


def test_each_column_has_a_unit() -> None:
    assert {column.unit for column in COLUMNS} <= {"1", "Pauling", "e", "pm", "bonds"}


def test_each_effect_is_described_and_cited() -> None:
    assert len({effect.name for effect in EFFECTS}) == len(EFFECTS)
    for effect in EFFECTS:
        assert effect.columns
        assert effect.citations
        assert all(re.search(r"\b(18|19|20)\d\d\b", citation) for citation in effect.citations), effect.name


def test_only_the_inductive_effect_of_groups_on_saturated_carbon_is_constrained() -> None:
    assert {e.name for e in EFFECTS for c in e.columns if c.lowers} == {"inductive"}
    assert all(n.startswith("withdrawing") == bool(low) for n, low in zip(NAMES, LOWERS, strict=True))


@pytest.fixture(scope="module")
def measured() -> tuple[list[str], np.ndarray]:
    acids = {m.acid.smiles: m.acid for m in read_table(reference_table())}
    blocks = [edge_descriptors(a) for a in acids.values()]
    names = [s for s, block in zip(acids, blocks, strict=True) for _ in block]
    return names, np.vstack(blocks)


def test_every_column_is_finite_over_the_measured_acids(measured: tuple[list[str], np.ndarray]) -> None:
    names, x = measured
    assert x.shape[1] == len(NAMES)
    bad = [(names[i], NAMES[j]) for i, j in np.argwhere(~np.isfinite(x))]
    assert bad == []


def test_constrained_columns_are_never_negative(measured: tuple[list[str], np.ndarray]) -> None:
    assert measured[1][:, LOWERS].min() >= 0.0


def test_no_two_columns_are_the_same_over_the_measured_acids(measured: tuple[list[str], np.ndarray]) -> None:
    x = measured[1]
    varying = np.flatnonzero(x.std(axis=0) > 0)
    twins = [
        (NAMES[a], NAMES[b])
        for i, a in enumerate(varying)
        for b in varying[i + 1 :]
        if np.array_equal(x[:, a], x[:, b])
    ]
    assert twins == []


SOME = [
    "OC(=O)CC(O)(C(=O)O)CC(=O)O",
    "O=C(O)[C@H]1CC[C@@H](C(=O)O)C1(C)C",
    "OC(=O)/C=C\\C(=O)O",
    "Nc1ccc(C(=O)O)c(O)c1Cl",
    "OC(=O)C(F)(F)CC1CC1C#N",
    "COc1cc(/C=C/C(=O)O)ccc1OC(C)=O",
    "O=C(O)C[C@@](C)(N)c1ccncc1",
]


@settings(max_examples=50, deadline=None, derandomize=True)
@given(st.sampled_from(SOME), st.integers(0, 10**6))
def test_the_order_of_atoms_changes_no_bit(smiles: str, seed: int) -> None:
    mol = Chem.MolFromSmiles(smiles)
    order = list(range(mol.GetNumAtoms()))
    random.Random(seed).shuffle(order)
    shuffled = acid_from_mol(Chem.RenumberAtoms(mol, order))
    assert np.array_equal(edge_descriptors(shuffled), edge_descriptors(read_acid(smiles)))


@pytest.mark.parametrize(
    "smiles",
    [
        *SOME,
        "Cc1cc(C(=O)O)ccc1C(=O)O",  # between the groups two paths of equal length, one of them substituted
        "OC(=O)C1CCC(C(=O)O)C(C)C1",
        "OC(=O)c1ccc(C(=O)O)c(C(=O)O)c1",
        "CC1(C)SC2C(NC(=O)C(C(=O)O)c3ccsc3)C(=O)N2C1C(=O)O",
    ],
)
def test_descriptors_see_the_molecule_and_not_its_numbering(smiles: str) -> None:
    # The numbers are canonical, but those of a mirror image, or of the other end of a molecule, are others.
    acid = read_acid(smiles)
    expected = edge_descriptors(acid)
    for seed in range(4):
        order = list(range(acid.mol.GetNumAtoms()))
        random.Random(seed).shuffle(order)
        place = {old: new for new, old in enumerate(order)}
        renumbered = Acid(acid.smiles, Chem.RenumberAtoms(acid.mol, order), tuple(place[s] for s in acid.sites))
        found = edge_descriptors(renumbered)
        moved = {NAMES[j] for j in np.argwhere(np.abs(found - expected) > 1e-9)[:, 1]}
        assert moved == set()


@pytest.mark.parametrize("smiles", [s for s in SOME if "@" in s] + ["OC(=O)[C@H]1CC[C@@H]1C(=O)O", "C[C@H](N)C(=O)O"])
def test_mirror_images_have_the_same_descriptors(smiles: str) -> None:
    mirror = smiles.replace("@@", "!").replace("@", "@@").replace("!", "@")
    mine, other = edge_descriptors(read_acid(smiles)), edge_descriptors(read_acid(mirror))
    # the sites of a mirror image may be numbered the other way round
    assert np.array_equal(mine[np.lexsort(mine.T)], other[np.lexsort(other.T)])
