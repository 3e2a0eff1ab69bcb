"""Reading and standardising: one acid, however it is written, and what is refused with which words."""

from __future__ import annotations

import pickle
import random
from dataclasses import fields

import pytest
from benchmarks.many_acids import LIMIT
from benchmarks.many_acids import acid as made_up_acid
from hypothesis import given, settings
from hypothesis import strategies as st
from rdkit import Chem

from qsar.graph import Graph
from qsar.paths import reference_table
from qsar.structures import MAX_HEAVY_ATOMS, MAX_SITES, Acid, StructureError, acid_from_mol, read_acid
from qsar.table import read_table

# Canonical SMILES are compared as RDKit writes them, so that no spelling is fixed here.


def canonical(smiles: str) -> str:
    return Chem.CanonSmiles(smiles)


SAME = {
    "acetic acid": (
        "CC(=O)O",
        ["OC(C)=O", "CC(=O)[O-]", "CC(=O)[O-].[Na+]", "[K+].CC([O-])=O", "CC(=O)O.O", " CC(=O)O ", "[CH3]C(=O)[OH]"],
    ),
    "acetic acid, labelled": (
        "CC(=O)O",
        ["[13CH3]C(=O)O", "[2H]OC(=O)C", "[2H]C([2H])([2H])C(=O)O[2H]", "CC(=O)[18OH]", "[CH3:1][C:2](=[O:3])[OH:4]"],
    ),
    "formic acid": ("OC=O", ["C(=O)O", "[O-]C=O", "O=C[O-].[NH4+]", "[H]C(=O)O[H]", "O=C([2H])O"]),
    "oxalic acid": ("OC(=O)C(=O)O", ["[O-]C(=O)C([O-])=O.[Ca+2]", "OC(=O)C([O-])=O.[K+]", "OC(=O)C(O)=O.O.O"]),
    "glycine": (
        "NCC(=O)O",
        [
            "[NH3+]CC(=O)[O-]",
            "[NH3+]CC(=O)O",
            "[NH3+]CC(=O)O.[Cl-]",
            "NCC(=O)O.Cl",
            "NCC(=O)[O-].[Na+]",
            "[15NH3+]CC([O-])=O",
        ],
    ),
    "lysine": (
        "NCCCC[C@H](N)C(=O)O",
        ["[NH3+]CCCC[C@H]([NH3+])C(=O)[O-].[Cl-]", "NCCCC[C@H](N)C(=O)O.Cl.Cl", "[NH3+]CCCC[C@H](N)C(=O)[O-]"],
    ),
    "3-aminobenzoic acid": (
        "Nc1cccc(C(=O)O)c1",
        ["NC1=CC=CC(=C1)C(O)=O", "NC1=CC(C(O)=O)=CC=C1", "[NH3+]c1cccc(c1)C([O-])=O"],
    ),
    "betaine": ("C[N+](C)(C)CC(=O)O", ["C[N+](C)(C)CC(=O)[O-]", "C[N+](C)(C)CC(=O)O.[Cl-]"]),
    "nitroacetic acid": ("OC(=O)C[N+](=O)[O-]", ["[O-]C(=O)C[N+](=O)[O-].[Na+]", "[O-][N+](=O)CC(O)=O"]),
    "sulfoacetic acid": ("OC(=O)CS(=O)(=O)O", ["OC(=O)CS(=O)(=O)[O-].[Na+]", "[O-]C(=O)CS(=O)(=O)[O-].[Na+].[Na+]"]),
    "small acid, large counter-ion": ("CC(=O)O", ["CC(=O)[O-].CCCC[N+](CCCC)(CCCC)CCCC", "CC(=O)O.C1CCCCC1NC2CCCCC2"]),
}


@pytest.mark.parametrize(("wanted", "written"), [(w, s) for w, many in SAME.values() for s in many])
def test_every_way_of_writing_gives_one_structure(wanted: str, written: str) -> None:
    assert read_acid(written).smiles == canonical(wanted)
    assert read_acid(wanted).smiles == canonical(wanted)


@pytest.mark.parametrize(
    ("smiles", "word"),
    [
        ("", "empty"),
        ("   ", "empty"),
        ("not a structure", "cannot|can be read"),
        ("C1CC", "can be read"),
        ("CC(=O)O)", "can be read"),
        ("C[N](C)(C)CC(=O)O", "impossible"),
        ("CC", "no carboxyl"),
        ("O", "no carboxyl"),
        ("CC(=O)OC", "no carboxyl"),
        ("CC(=O)OC(C)=O", "no carboxyl"),
        ("CC(N)=O", "no carboxyl"),
        ("CC(=O)S", "no carboxyl"),
        ("CC(O)O", "no carboxyl"),
        ("O=C=O", "no carboxyl"),
        ("NC(=O)O", "nitrogen"),
        ("CN(C)C(=O)O", "nitrogen"),
        ("NC(=O)[O-].[NH4+]", "nitrogen"),
        ("COC(=O)O", "oxygen"),
        ("OC(=O)O", "oxygen|carbonic"),
        ("[O-]C(=O)O.[Na+]", "oxygen|carbonic"),
        ("CSC(=O)O", "on S"),
        ("C[Si](C)(C)C(=O)O", "on Si"),
        ("CC(=O)OO", "peroxy"),
        ("OOC(=O)c1ccccc1", "peroxy"),
        ("*CC(=O)O", "wildcard|attachment"),
        ("[1*]CC(=O)O", "wildcard|attachment"),
        ("[CH2]C(=O)O", "radical"),
        ("CC(=O)[O]", "radical"),
        ("[Na+].[Cl-]", "inorganic"),
        ("[NH4+].[O-]S(=O)(=O)[O-].[NH4+]", "inorganic"),
        ("C[Hg]CC(=O)O", "Hg"),
        ("CC(=O)O[Cu]OC(C)=O", "Cu"),
        ("OC(=O)C1=CC=C[CH]1[Fe]", "Fe|radical"),
        ("C[As](C)CC(=O)O", "As"),
        ("[H][H]", "no heavy atoms"),
    ],
)
def test_refused_with_one_line_that_says_why(smiles: str, word: str) -> None:
    with pytest.raises(StructureError, match=word) as caught:
        read_acid(smiles)
    assert "\n" not in str(caught.value)


def test_only_two_hundred_heavy_atoms() -> None:
    assert len(read_acid("C" * (MAX_HEAVY_ATOMS - 3) + "C(=O)O").sites) == 1
    with pytest.raises(StructureError, match="201 heavy atoms"):
        read_acid("C" * (MAX_HEAVY_ATOMS - 2) + "C(=O)O")


def test_the_limit_counts_the_acid_without_its_counter_ion() -> None:
    # 150 heavy atoms of acid and 61 of tetraalkylammonium
    cation = "CCCCCCCCCCCCCCC[N+](CCCCCCCCCCCCCCC)(CCCCCCCCCCCCCCC)CCCCCCCCCCCCCCC"
    acid = "C" * 147 + "C(=O)[O-]"
    assert read_acid(f"{acid}.{cation}").mol.GetNumHeavyAtoms() == 150


def test_only_six_carboxyl_groups() -> None:
    six = "OC(=O)" + "C(C(=O)O)" * 4 + "C(=O)O"
    assert len(read_acid(six).sites) == MAX_SITES
    with pytest.raises(StructureError, match="7 COOH"):
        read_acid("OC(=O)" + "C(C(=O)O)" * 5 + "C(=O)O")


@pytest.mark.parametrize(
    ("smiles", "words"),
    [
        ("CC(=O)[O-].[Na+]", ["removed: [Na+]", "carboxylate re-protonated"]),
        ("[K+].[K+].[O-]C(=O)C([O-])=O", ["removed: [K+]", "2 carboxylates re-protonated"]),
        ("CC(=O)O.O", ["removed: O"]),
        ("[NH3+]CC(=O)O.[Cl-]", ["removed: [Cl-]", "amine"]),
        ("[13CH3]C(=O)O", ["isotope"]),
        ("[O-]c1ccc(C(=O)O)cc1", ["anionic group"]),
    ],
)
def test_each_act_is_said(smiles: str, words: list[str]) -> None:
    said = " | ".join(read_acid(smiles).notes)
    for word in words:
        assert word in said


@pytest.mark.parametrize("smiles", ["CC(=O)O", "C[C@H](N)C(=O)O", "OC(=O)/C=C/C(=O)O", "C[N+](C)(C)CC(=O)O"])
def test_nothing_is_said_where_nothing_was_done(smiles: str) -> None:
    assert read_acid(smiles).notes == ()


def test_a_sulfonate_is_not_called_a_carboxylate() -> None:
    assert not any("carboxylate" in note for note in read_acid("[O-]S(=O)(=O)CC(=O)O.[Na+]").notes)


@pytest.mark.parametrize(
    ("smiles", "sites"),
    [
        ("OC=O", 1),
        ("OC(=O)C(=O)O", 2),
        ("OC(=O)CC(O)(C(=O)O)CC(=O)O", 3),
        ("OC(=O)CN(CC(=O)O)CCN(CC(=O)O)CC(=O)O", 4),
        ("COC(=O)CC(=O)O", 1),
        ("OC(=O)c1c(C(=O)O)c(C(=O)O)c(C(=O)O)c(C(=O)O)c1C(=O)O", 6),
        ("NC(=O)CC(N)C(=O)O", 1),
        ("OC1=C(O)C(=O)OC1C(O)CO.CC(=O)O", 1),
    ],
)
def test_sites_are_the_carboxyl_carbons(smiles: str, sites: int) -> None:
    acid = read_acid(smiles)
    assert len(acid.sites) == sites
    assert list(acid.sites) == sorted(set(acid.sites))
    for carbon in acid.sites:
        atom = acid.mol.GetAtomWithIdx(carbon)
        oxygens = [n for n in atom.GetNeighbors() if n.GetAtomicNum() == 8]
        assert atom.GetAtomicNum() == 6 and len(oxygens) == 2
        assert sum(o.GetTotalNumHs() for o in oxygens) == 1


def test_permanent_charges_stay() -> None:
    assert Chem.GetFormalCharge(read_acid("C[N+](C)(C)CC(=O)[O-]").mol) == 1
    assert Chem.GetFormalCharge(read_acid("C[S+](C)CCC(=O)[O-]").mol) == 1
    assert Chem.GetFormalCharge(read_acid("[O-][n+]1ccc(C(=O)O)cc1").mol) == 0


VARIED = [
    "CC(=O)O",
    "OC(=O)CC(O)(C(=O)O)CC(=O)O",
    "C[C@H](N)C(=O)O",
    "OC(=O)/C=C\\C(=O)O",
    "Cc1ccc(C(=O)O)c([N+](=O)[O-])c1",
    "O=C(O)[C@H]1CC[C@@H](C(=O)O)C1(C)C",
    "OC(=O)c1cc2ccccc2[nH]1",
    "OC(=O)CSSCC(=O)O",
]


@settings(max_examples=60, deadline=None, derandomize=True)
@given(st.sampled_from(VARIED), st.integers(0, 10**6))
def test_renumbered_atoms_give_the_same_acid_in_the_same_order(smiles: str, seed: int) -> None:
    mol = Chem.MolFromSmiles(smiles)
    order = list(range(mol.GetNumAtoms()))
    random.Random(seed).shuffle(order)
    shuffled = acid_from_mol(Chem.RenumberAtoms(mol, order))
    wanted = read_acid(smiles)
    assert shuffled.smiles == wanted.smiles
    assert shuffled.sites == wanted.sites
    assert shuffled.graph.numbers == wanted.graph.numbers
    assert shuffled.graph.neighbours == wanted.graph.neighbours


@pytest.mark.parametrize("smiles", VARIED)
def test_kekule_and_explicit_hydrogens_make_no_difference(smiles: str) -> None:
    mol = Chem.MolFromSmiles(smiles)
    kekule = Chem.MolToSmiles(mol, kekuleSmiles=True, allHsExplicit=True)
    with_hydrogens = Chem.MolToSmiles(Chem.AddHs(mol))
    block = Chem.MolFromMolBlock(Chem.MolToMolBlock(mol), sanitize=False, removeHs=False)
    assert read_acid(kekule).smiles == read_acid(smiles).smiles
    assert read_acid(with_hydrogens).smiles == read_acid(smiles).smiles
    if not Chem.FindMolChiralCenters(mol, useLegacyImplementation=False) and "/" not in smiles:
        assert acid_from_mol(block).smiles == read_acid(smiles).smiles


@pytest.mark.parametrize("smiles", VARIED)
def test_standardising_twice_changes_nothing(smiles: str) -> None:
    once = read_acid(smiles)
    assert read_acid(once.smiles).smiles == once.smiles
    assert acid_from_mol(once.mol).smiles == once.smiles


def test_an_acid_survives_being_sent_to_another_process() -> None:
    acid = read_acid("[Na+].[O-]C(=O)C[C@H](N)C(=O)O")
    sent = pickle.loads(pickle.dumps(acid))
    assert isinstance(sent, Acid)
    assert (sent.smiles, sent.sites, sent.notes) == (acid.smiles, acid.sites, acid.notes)


def test_the_given_molecule_is_left_alone() -> None:
    mol = Chem.MolFromSmiles("CC(=O)[O-].[Na+]")
    before = Chem.MolToSmiles(mol)
    acid_from_mol(mol)
    assert Chem.MolToSmiles(mol) == before


@settings(max_examples=150, deadline=None, derandomize=True)
@given(st.text(alphabet="CNOSFcno()[]=#+-123@/\\.%Hl*$:~ \t", max_size=25))
def test_any_text_is_read_or_refused_in_one_line(text: str) -> None:
    try:
        acid = read_acid(text)
    except StructureError as error:
        assert str(error).strip()
        assert "\n" not in str(error)
    else:
        assert acid.sites


@given(number=st.integers(0, LIMIT - 1), seed=st.integers(0, 2**32 - 1), kekulised=st.booleans())
@settings(max_examples=300, deadline=None)
def test_quick_way_reads_what_the_general_way_reads(number: int, seed: int, kekulised: bool) -> None:
    """Same structure, sites, atoms, bonds and rings in the same order, however the SMILES is written."""
    mol = Chem.MolFromSmiles(made_up_acid(number))
    general = acid_from_mol(mol)
    order = list(range(mol.GetNumAtoms()))
    random.Random(seed).shuffle(order)
    if kekulised:
        Chem.Kekulize(mol, clearAromaticFlags=True)
    written = Chem.MolToSmiles(Chem.RenumberAtoms(mol, order), canonical=False, kekuleSmiles=kekulised)
    quick = read_acid(written)
    assert (quick.smiles, quick.sites) == (general.smiles, general.sites)
    for part in fields(Graph):
        assert getattr(quick.graph, part.name) == getattr(general.graph, part.name), part.name
    assert Chem.MolToSmiles(quick.mol, canonical=False) == Chem.MolToSmiles(general.mol, canonical=False)


def test_quick_way_reads_stereo_marks_like_the_general_way() -> None:
    """The same over all acids of the table whose configuration is stated, each written in two other orders."""
    stated = sorted({r.acid.smiles for r in read_table(reference_table()) if set("@/\\") & set(r.acid.smiles)})
    assert len(stated) > 100
    shuffle = random.Random(7).shuffle
    for smiles in stated:
        mol = Chem.MolFromSmiles(smiles)
        general = acid_from_mol(mol)
        for _ in range(2):
            order = list(range(mol.GetNumAtoms()))
            shuffle(order)
            quick = read_acid(Chem.MolToSmiles(Chem.RenumberAtoms(mol, order), canonical=False))
            assert (quick.smiles, quick.sites) == (general.smiles, general.sites)
            for part in fields(Graph):
                assert getattr(quick.graph, part.name) == getattr(general.graph, part.name), (smiles, part.name)
