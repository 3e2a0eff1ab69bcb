"""The measured acids of a bundle: found however an enantiomer is written."""

from __future__ import annotations

import numpy as np
from rdkit import Chem

from qsar.model import Model
from qsar.model.library import Library
from qsar.sources import citation, printed


def library(*smiles: str) -> Library:
    n = len(smiles)
    return Library(
        [Chem.CanonSmiles(s) if s else "" for s in smiles],
        [f"acid {k}" if k else "" for k in range(n)],
        [""] * n,
        [""] * n,
        np.ones(n, dtype=np.int64),
        np.linspace(3, 5, n),
        np.full(n, 0.05),
        np.linspace(3, 5, n),
        np.full(n, 0.1),
    )


def test_steps_of_an_acid() -> None:
    one = library("OC(=O)CC(=O)O", "CC(=O)O", "OC(=O)CC(=O)O")
    both = Library(
        one.smiles,
        one.name,
        one.family,
        one.source,
        np.array([1, 1, 2]),
        *(getattr(one, k) for k in ("pka", "uncertainty", "pka_without", "expected_error")),
    )
    assert both.rows_of(Chem.CanonSmiles("OC(=O)CC(=O)O")) == {1: 0, 2: 2}
    assert both.rows_of(Chem.CanonSmiles("CC(=O)O")) == {1: 1}
    assert both.rows_of("CCC(=O)O") == {}


def test_an_enantiomer_finds_its_mirror_image_and_a_diastereomer_does_not() -> None:
    # tartaric acid: (R,R) was measured; (S,S) is its mirror image, (R,S) another substance
    measured = "O[C@H]([C@@H](O)C(=O)O)C(=O)O"
    mirror = "O[C@@H]([C@H](O)C(=O)O)C(=O)O"
    meso = "O[C@@H]([C@@H](O)C(=O)O)C(=O)O"
    labels = [dict(Chem.FindMolChiralCenters(Chem.MolFromSmiles(s))) for s in (measured, mirror, meso)]
    assert [len(set(x.values())) for x in labels] == [1, 1, 2]  # RDKit agrees on which one is meso
    lib = library(measured)
    assert lib.rows_of(Chem.CanonSmiles(measured)) == {1: 0}
    assert lib.rows_of(Chem.CanonSmiles(mirror)) == {1: 0}
    assert lib.rows_of(Chem.CanonSmiles(meso)) == {}


def test_a_sample_without_configuration_is_found_for_any() -> None:
    lib = library("CC(N)C(=O)O")
    assert lib.rows_of(Chem.CanonSmiles("C[C@H](N)C(=O)O")) == {1: 0}
    assert lib.rows_of(Chem.CanonSmiles("C[C@@H](N)C(=O)O")) == {1: 0}


def test_e_and_z_are_different_acids() -> None:
    lib = library("C/C=C/C(=O)O")
    assert lib.rows_of(Chem.CanonSmiles("C/C=C/C(=O)O")) == {1: 0}
    assert lib.rows_of(Chem.CanonSmiles("C/C=C\\C(=O)O")) == {}
    assert lib.rows_of(Chem.CanonSmiles("CC=CC(=O)O")) == {}


def test_withheld_structures_are_never_found() -> None:
    lib = library("", "CC(=O)O")
    assert lib.rows_of("") == {}
    assert lib.label(0)
    assert lib.label(1) == "acid 1"


def test_a_value_that_was_brought_to_the_standard_state_says_what_is_printed(model: Model) -> None:
    lib = model.library
    row = next(k for k, source in enumerate(lib.source) if printed(source))
    step = model.predict([lib.smiles[row]])[0].steps[lib.step[row] - 1]
    assert step.measured == lib.pka[row]
    assert any(printed(lib.source[row]) in reason for reason in step.reasons)
    assert citation(lib.source[row]).endswith(printed(lib.source[row]))
    assert printed("KEY") == ""
    assert citation("no such key") == "no such key"
