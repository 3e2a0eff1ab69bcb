"""SMILES against names, read by an independent name-to-structure library.

py2opsin calls OPSIN (Lowe, Corbett, Murray-Rust, Glen, J. Chem. Inf. Model. 2011, 51, 739), which needs Java.
"""

from __future__ import annotations

import pytest
from rdkit import Chem

from qsar.curation.isomer_labels import one_spelling, without_centres
from qsar.structures import read_acid

#: Names that OPSIN reads as another structure, or not at all, and why the table is right.
DISAGREEMENTS: dict[str, str] = {}


@pytest.mark.usefixtures("java")
def test_names_give_the_structures(cells: list[dict[str, str]]) -> None:
    """The constitution and E/Z of every acid, and relative configuration where the table states one.

    Where the table leaves centres open, a trivial name of one enantiomer is no disagreement.
    """
    opsin = pytest.importorskip("py2opsin", reason="needs py2opsin (pip install 'qsar[test]')")
    by_name = {row["name"]: row["smiles"] for row in cells}
    names = list(by_name)
    found = opsin.py2opsin(names, output_format="SMILES")
    assert len(found) == len(names)
    different = {}
    for name, given in zip(names, found, strict=True):
        if not given:
            different[name] = "not read"
            continue
        ours, theirs = by_name[name], read_acid(given).smiles
        spelling = one_spelling if "@" in ours else without_centres
        if spelling(ours) != spelling(theirs):
            different[name] = theirs
    assert different.keys() == DISAGREEMENTS.keys(), different


@pytest.mark.usefixtures("java")
@pytest.mark.parametrize(
    ("name", "smiles", "word"),
    [
        ("trans-4-chlorocyclohexane-1-carboxylic acid", "O=C(O)C1CCC(Cl)CC1", "trans"),
        ("cis-4-chlorocyclohexane-1-carboxylic acid", "O=C(O)C1CCC(Cl)CC1", "cis"),
        ("cis-cyclopropane-1,2-dicarboxylic acid", "O=C(O)C1CC1C(=O)O", "cis"),
        ("trans-cyclopentane-1,3-dicarboxylic acid", "O=C(O)C1CCC(C(=O)O)C1", "trans"),
        ("cis-3-hydroxycyclohexane-1-carboxylic acid", "O=C(O)C1CCCC(O)C1", "cis"),
        ("(2R,3S)-2,3-dihydroxybutanedioic acid", "O=C(O)C(O)C(O)C(=O)O", "meso"),
        ("(2R,3R)-2,3-dihydroxybutanedioic acid", "O=C(O)C(O)C(O)C(=O)O", "DL"),
        ("(2Z)-3-iodobut-2-enoic acid", "CC(I)=CC(=O)O", "trans"),
        ("(2E)-3-phenylprop-2-enoic acid", "O=C(O)C=Cc1ccccc1", "trans"),
        ("(2E)-2-chlorobut-2-enoic acid", "CC=C(Cl)C(=O)O", "cis"),
    ],
)
def test_words_for_isomers_against_systematic_names(name: str, smiles: str, word: str) -> None:
    """The structure that a label such as "trans" is given, against the systematic name of that isomer.

    Cis and trans of an open chain follow the main chain, E and Z the ranks of the groups (IUPAC
    Recommendations 2013, P-91.2 and P-93.5; from memory).
    """
    opsin = pytest.importorskip("py2opsin", reason="needs py2opsin (pip install 'qsar[test]')")
    from qsar.curation.isomer_labels import isomer

    expected = opsin.py2opsin(name, output_format="SMILES")
    assert Chem.MolFromSmiles(expected) is not None
    assert isomer(smiles, word) == one_spelling(read_acid(expected).smiles)
