"""Parents by rule and substituents with their paths, on acids that anyone can draw; no model is needed.

The parents follow from the rules as stated in the module; names are those of substitutive nomenclature (IUPAC
Recommendations 2013) or common use.
"""

from __future__ import annotations

from collections import Counter

import pytest
from rdkit import Chem

from qsar.attribution.coalitions import hypothetical
from qsar.structures import read_acid
from qsar.substituents import Decomposition, decompose


def parts_of(smiles: str, carbon: int = 0, ionised: bool = False) -> tuple[Decomposition, str]:
    """Decomposition as the given carboxyl group (in atom order) sees it, and the SMILES of the parent."""
    acid = read_acid(smiles)
    site = acid.sites[carbon]
    state = frozenset(acid.sites) - {site} if ionised else frozenset[int]()
    parts = decompose(acid, site, state)
    return parts, hypothetical(acid, parts, state, ()).smiles


PARENTS = [
    # formic and the acids whose alpha carbon ends the chain
    ("O=CO", "d", "O=CO"),
    ("OC(=O)C(=O)O", "d", "O=CO"),  # oxalic acid
    ("NC(=O)C(=O)O", "d", "O=CO"),  # oxamic acid: the amide carbon ends the chain
    # a: aromatic systems whole, with hetero atoms
    ("Cc1ccccc1C(=O)O", "a", "O=C(O)c1ccccc1"),
    ("OC(=O)c1cccc2ccc(O)cc12", "a", "O=C(O)c1cccc2ccccc12"),
    ("OC(=O)c1ccc(Cl)nc1", "a", "O=C(O)c1cccnc1"),
    ("OC(=O)c1cc2cc(OC)ccc2[nH]1", "a", "O=C(O)c1cc2ccccc2[nH]1"),
    ("OC(=O)c1ccc2CCCCc2c1", "a", "O=C(O)c1ccccc1"),  # the saturated ring is a substituent
    ("OC(=O)c1ccc(cc1)-c1ccccc1", "a", "O=C(O)c1ccccc1"),
    ("OC(=O)c1ccc(=O)[nH]c1", "a", "O=C(O)c1ccc(=O)[nH]c1"),  # without its =O there is no aromatic ring
    # b: acyclic C=C and C#C
    ("C/C=C/C(=O)O", "b", "C=CC(=O)O"),
    ("OC(=O)/C=C/c1ccccc1", "b", "C=CC(=O)O"),
    ("CCC#CC(=O)O", "b", "C#CC(=O)O"),
    ("CC(=C)C(=O)O", "b", "C=CC(=O)O"),
    ("OC(=O)C=C1CCCCC1", "b", "C=CC(=O)O"),
    # c: other rings, bridged and spiro systems whole, double bonds kept
    ("OC(=O)C1CCCCC1C", "c", "O=C(O)C1CCCCC1"),
    ("OC(=O)C1=CCCC1", "c", "O=C(O)C1=CCCC1"),
    ("OC(=O)C1CC2CCC1C2", "c", "O=C(O)C1CC2CCC1C2"),
    ("OC(=O)C1CC12CCCC2", "c", "O=C(O)C1CC12CCCC2"),
    ("OC(=O)C1CCCO1", "c", "O=C(O)C1CCCO1"),
    # d: the longest acyclic saturated chain
    ("CC(C)CC(=O)O", "d", "CCCC(=O)O"),
    ("CC(C)(C)C(=O)O", "d", "CCC(=O)O"),
    ("FC(F)(F)CC(=O)O", "d", "CCC(=O)O"),
    ("CC(=O)CC(=O)O", "d", "CCCC(=O)O"),  # =O on the chain is a substituent
    ("OC(=O)C(=O)C", "d", "CCC(=O)O"),
    ("OC(=O)CC=C", "d", "CC(=O)O"),  # C=C ends the chain
    ("OC(=O)CC#N", "d", "CC(=O)O"),
    ("OC(=O)CCC(=O)OC", "d", "CCC(=O)O"),
    ("OC(=O)CCC(N)=O", "d", "CCC(=O)O"),
    ("OC(=O)CCCC(=O)O", "d", "CCCC(=O)O"),
    ("OC(=O)CC1CCCC1", "d", "CC(=O)O"),
    ("CC(C)Cc1ccc(cc1)C(C)C(=O)O", "d", "CCC(=O)O"),
    ("CCC(CCC)C(=O)O", "d", "CCCCC(=O)O"),
]


@pytest.mark.parametrize(("smiles", "rule", "parent"), PARENTS)
def test_parent_follows_the_first_rule_that_fits(smiles: str, rule: str, parent: str) -> None:
    parts, found = parts_of(smiles)
    assert parts.rule == rule
    assert found == Chem.CanonSmiles(parent)


def test_of_equal_chains_the_one_with_most_substituents_is_taken() -> None:
    # 2-ethyl-3-chlorobutanoic acid: both ways are four carbons long, one carries the chlorine
    parts, parent = parts_of("CCC(C(C)Cl)C(=O)O")
    assert parent == Chem.CanonSmiles("CCCC(=O)O")
    assert sorted(s.label for s in parts.substituents) == ["α-ethyl", "β-chloro"]


NAMES = [
    ("CC(C)Cc1ccc(cc1)C(C)C(=O)O", ["α-phenyl", "isobutyl on phenyl"]),
    ("COc1ccc2cc(ccc2c1)C(C)C(=O)O", ["methoxy on 2-naphthyl", "α-2-naphthyl"]),
    ("ClC(Cl)C(=O)O", ["α-chloro", "α-chloro"]),
    ("ClCCC(=O)O", ["β-chloro"]),
    ("NCC(=O)O", ["α-ammonio"]),
    ("CN(C)CCC(=O)O", ["β-dimethylammonio"]),
    ("COCC(=O)O", ["α-methoxy"]),
    ("CC(=O)NCC(=O)O", ["α-acetamido"]),
    ("OC(=O)CC#N", ["α-cyano"]),
    ("CC(=O)C(=O)O", ["α-oxo"]),
    ("Oc1ccccc1C(=O)O", ["ortho-hydroxy"]),
    ("OC(=O)c1cccc(c1)[N+](=O)[O-]", ["meta-nitro"]),
    ("OC(=O)c1ccc(cc1)OC", ["para-methoxy"]),
    ("OC(=O)CNc1ccccc1", ["α-anilino"]),  # without the ring the nitrogen would take up a proton
    ("OC(=O)COc1ccccc1", ["phenyl on oxy", "α-oxy"]),
    ("OC(=O)c1cccc(c1)C(F)(F)F", ["fluoro on methyl"] * 3 + ["meta-methyl"]),
    ("C[N+](C)(C)CC(=O)[O-]", ["α-trimethylammonio"]),
]


@pytest.mark.parametrize(("smiles", "names"), NAMES)
def test_substituents_have_the_names_that_people_use(smiles: str, names: list[str]) -> None:
    parts, _ = parts_of(smiles)
    assert sorted(s.label for s in parts.substituents) == sorted(names)


def test_an_isocyanate_is_not_called_an_isothiocyanate() -> None:
    """Prefixes isocyanato and isothiocyanato: IUPAC nomenclature of organic chemistry (2013), P-61.8."""
    for smiles, name in (("O=C=NCCC(=O)O", "isocyanato"), ("S=C=NCCC(=O)O", "isothiocyanato")):
        acid = read_acid(smiles)
        assert [s.name for s in decompose(acid, acid.sites[0]).substituents] == [name]


@pytest.mark.parametrize(("smiles", "length"), [("ClCC(=O)O", 2), ("ClCCC(=O)O", 3), ("ClCCCC(=O)O", 4)])
def test_path_counts_the_bonds_to_the_carboxyl_carbon(smiles: str, length: int) -> None:
    parts, _ = parts_of(smiles)
    (chlorine,) = parts.substituents
    assert chlorine.path_length == length
    assert chlorine.path[0] == parts.site and chlorine.path[-1] == chlorine.atoms[0]


@pytest.mark.parametrize(("smiles", "length"), [("Clc1ccccc1C(=O)O", 3), ("Clc1ccc(cc1)C(=O)O", 5)])
def test_path_goes_the_short_way_round_a_ring(smiles: str, length: int) -> None:
    parts, _ = parts_of(smiles)
    assert parts.substituents[0].path_length == length


def test_another_carboxyl_group_is_a_substituent_in_its_charge_state() -> None:
    neutral, parent = parts_of("OC(=O)CCC(=O)O")
    ionised, _ = parts_of("OC(=O)CCC(=O)O", ionised=True)
    assert parent == Chem.CanonSmiles("CCC(=O)O")
    assert [s.label for s in neutral.substituents] == ["β-carboxy"]
    assert [s.label for s in ionised.substituents] == ["β-carboxylate"]


def test_a_group_further_out_belongs_to_what_carries_it() -> None:
    parts, _ = parts_of("OC(=O)CCc1ccc(OC(F)F)cc1")
    names = [s.name for s in parts.substituents]
    phenyl, methoxy = names.index("phenyl"), names.index("methoxy")
    assert parts.substituents[phenyl].carrier is None
    assert parts.substituents[methoxy].carrier == phenyl
    assert [s.carrier for s in parts.substituents if s.name == "fluoro"] == [methoxy, methoxy]


ANY_ACIDS = [
    "CC1(C)SC2C(NC(=O)Cc3ccccc3)C(=O)N2C1C(=O)O",
    "OC(=O)CC(O)(C(=O)O)CC(=O)O",
    "OC(=O)CN(CCN(CC(=O)O)CC(=O)O)CC(=O)O",
    "CC(=O)N1CCN(CC1)CC(=O)O",
    "OC(=O)c1ccc2c(c1)C(=O)OC2=O",
    "OP(=O)(O)CC(=O)O",
    "OC(=O)CS(=O)(=O)c1ccc(Cl)cc1",
    "O=C(O)c1ccc[n+]([O-])c1",
    "C[Si](C)(C)CCC(=O)O",
    "OC(=O)CC(C(=O)O)C(=O)OCc1ccccc1",
    "O=C(O)CCCCC1CCSS1",
    "NC(=N)NCCCC(N)C(=O)O",
    "OC(=O)C1CC(=O)N1S(=O)(=O)c1ccccc1",
]


@pytest.mark.parametrize("smiles", ANY_ACIDS)
def test_every_atom_is_in_the_parent_or_in_one_substituent(smiles: str) -> None:
    acid = read_acid(smiles)
    for site in acid.sites:
        parts = decompose(acid, site)
        counted = Counter(parts.parent)
        for s in parts.substituents:
            counted.update(s.atoms)
        assert counted == Counter(range(acid.mol.GetNumAtoms()))


@pytest.mark.parametrize("smiles", ANY_ACIDS)
def test_parent_is_an_acid_and_the_whole_coalition_is_the_molecule(smiles: str) -> None:
    acid = read_acid(smiles)
    parts = decompose(acid, acid.sites[0])
    everyone = range(len(parts.substituents))
    assert hypothetical(acid, parts, frozenset(), everyone).smiles == acid.smiles
    assert read_acid(hypothetical(acid, parts, frozenset(), ()).smiles).sites


def test_hydrogens_take_the_place_of_what_is_left_out() -> None:
    # formulas by hand: each substituent of n bonds is replaced by n hydrogens
    from rdkit.Chem.rdMolDescriptors import CalcMolFormula

    for smiles, formula in [
        ("CC(=O)C(=O)O", "C3H6O2"),  # =O gives two
        ("O=C(O)c1ccc[n+]([O-])c1", "C6H5NO2"),  # an N-oxide gives the amine
        ("OC(=O)C=C1CCCCC1", "C3H4O2"),
        ("OC(=O)c1ccc2CCCCc2c1", "C7H6O2"),
    ]:
        _, parent = parts_of(smiles)
        assert CalcMolFormula(Chem.MolFromSmiles(parent)) == formula


def test_double_bond_keeps_its_configuration_only_while_both_ends_have_a_substituent() -> None:
    acid = read_acid("OC(=O)/C(Cl)=C(/C)Br")
    parts = decompose(acid, acid.sites[0])
    place = {s.name: k for k, s in enumerate(parts.substituents)}
    without_methyl = hypothetical(acid, parts, frozenset(), [place["chloro"], place["bromo"]]).smiles
    # methyl is trans to COOH as drawn, so bromine is cis to it
    assert without_methyl == Chem.CanonSmiles(r"OC(=O)/C(Cl)=C\Br")
    only_chlorine = hypothetical(acid, parts, frozenset(), [place["chloro"]]).smiles
    assert only_chlorine == Chem.CanonSmiles("OC(=O)C(Cl)=C")


def test_a_wrong_site_is_refused() -> None:
    acid = read_acid("CCC(=O)O")
    with pytest.raises(ValueError, match="carboxyl"):
        decompose(acid, 0)
