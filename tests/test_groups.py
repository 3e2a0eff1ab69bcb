"""Functional groups: each kind on an acid that carries it, and every hetero or unsaturated atom in a group."""

from __future__ import annotations

from collections import Counter

import pytest
from rdkit import Chem

from qsar.constants.functional_groups import functional_groups
from qsar.descriptors import Molecule, SiteView
from qsar.groups import ANIONIC, CATIONIC, WITHDRAWING, perceive
from qsar.paths import reference_table
from qsar.structures import read_acid
from qsar.table import read_table


def kinds(smiles: str) -> Counter[str]:
    return Counter(g.kind for g in perceive(read_acid(smiles).graph))


# The groups are those of common nomenclature (IUPAC Blue Book 2013, P-31 and P-6); which amines carry a proton in
# weak acid is general knowledge: alkylamines (pKa 9 to 11) do, anilines (4.6) and amides do not (common practice).
@pytest.mark.parametrize(
    ("smiles", "expected"),
    [
        ("CC(=O)O", {}),
        ("OC=O", {}),
        ("OC(=O)CC(=O)O", {"carboxyl": 1}),
        ("OC(=O)CF", {"fluoro": 1}),
        ("OC(=O)C(Cl)(Cl)Cl", {"chloro": 3}),
        ("OC(=O)CBr", {"bromo": 1}),
        ("OC(=O)CI", {"iodo": 1}),
        ("OC(=O)CC#N", {"cyano": 1}),
        ("OC(=O)C[N+]#[C-]", {"isocyano": 1}),
        ("OC(=O)C[N+](=O)[O-]", {"nitro": 1}),
        ("OC(=O)CN=[N+]=[N-]", {"azido": 1}),
        ("OC(=O)CN=O", {"nitroso": 1}),
        ("OC(=O)c1ccc(N=Nc2ccccc2)cc1", {"azo": 1, "phenyl": 2}),
        ("OC(=O)CO", {"hydroxy": 1}),
        ("OC(=O)COC", {"ether": 1}),
        ("OC(=O)COOC", {"peroxy": 1}),
        ("OC(=O)CS", {"thiol": 1}),
        ("OC(=O)CSC", {"sulfide": 1}),
        ("OC(=O)C[Se]C", {"sulfide": 1}),
        ("OC(=O)CSSC", {"disulfide": 1}),
        ("OC(=O)CSC#N", {"thiocyanato": 1}),
        ("OC(=O)CN=C=S", {"isothiocyanato": 1}),
        ("OC(=O)CN=C=O", {"isocyanato": 1}),
        ("OC(=O)CS(C)=O", {"sulfinyl": 1}),
        ("OC(=O)CS(C)(=O)=O", {"sulfonyl": 1}),
        ("OC(=O)CS(N)(=O)=O", {"sulfonamide": 1}),
        ("OC(=O)CS(=O)(=O)O", {"sulfonate": 1}),
        ("OC(=O)c1ccc(S(F)(F)(F)(F)F)cc1", {"pentafluorosulfanyl": 1, "phenyl": 1}),
        ("OC(=O)CN", {"ammonium": 1}),
        ("OC(=O)CN(C)C", {"ammonium": 1}),
        ("OC(=O)C1CCCN1", {"ammonium": 1}),
        ("OC(=O)c1ccc(N)cc1", {"amino": 1, "phenyl": 1}),
        ("OC(=O)CNc1ccccc1", {"amino": 1, "phenyl": 1}),
        ("OC(=O)CNN", {"hydrazino": 1}),
        ("OC(=O)CON", {"hydroxyamino": 1}),
        ("OC(=O)CNC(N)=N", {"amidinium": 1}),
        ("OC(=O)CC(N)=N", {"amidinium": 1}),
        ("OC(=O)Cc1c[nH]cn1", {"imidazolium": 1}),
        ("OC(=O)c1ccncc1", {"pyridinium": 1}),
        ("C[N+](C)(C)CC(=O)O", {"quaternary_n": 1}),
        ("C[n+]1ccc(C(=O)O)cc1", {"quaternary_n": 1}),
        ("C[S+](C)CC(=O)O", {"onium": 1}),
        ("OC(=O)C[P+](C)(C)C", {"onium": 1}),
        ("OC(=O)CNC(C)=O", {"amide": 1}),
        ("OC(=O)CC(N)=O", {"amide": 1}),
        ("OC(=O)CNC(N)=O", {"urea": 1}),
        ("OC(=O)CNC(=O)OC", {"carbamate": 1}),
        ("OC(=O)CC(=O)OC", {"ester": 1}),
        ("OC(=O)COC(C)=O", {"ester": 1}),
        ("OC(=O)C=O", {"aldehyde": 1}),
        ("OC(=O)C(C)=O", {"ketone": 1}),
        ("OC(=O)c1cc(=O)cc[nH]1", {"ring_carbonyl": 1}),
        ("OC(=O)C(C)=NO", {"oximino": 1}),
        ("OC(=O)C(C)=NC", {"imino": 1}),
        ("OC(=O)CP(O)(O)=O", {"phosphonate": 1}),
        ("OC(=O)CP(C)(C)=O", {"phosphoryl": 1}),
        ("OC(=O)CP(C)C", {"phosphino": 1}),
        ("OC(=O)C[Si](C)(C)C", {"silyl": 1}),
        ("OC(=O)c1ccc(B(O)O)cc1", {"boryl": 1, "phenyl": 1}),
        ("OC(=O)c1cc[n+]([O-])cc1", {"n_oxide": 1}),
        ("OC(=O)CC=C", {"alkenyl": 1}),
        ("OC(=O)CC#C", {"alkynyl": 1}),
        ("OC(=O)Cc1ccccc1", {"phenyl": 1}),
        ("OC(=O)c1cccc2ccccc12", {"fused_aryl": 1}),
        ("OC(=O)c1ccco1", {"furyl": 1}),
        ("OC(=O)c1cccs1", {"thienyl": 1}),
        ("OC(=O)c1ccc[nH]1", {"pyrrolyl": 1}),
        ("OC(=O)c1cnccn1", {"heteroaryl": 1}),
    ],
)
def test_kind(smiles: str, expected: dict[str, int]) -> None:
    found = kinds(smiles)
    found["carboxyl"] -= 1
    for kind, n in expected.items():
        assert found[kind] == n, found
    allowed = set(expected) | {"carboxyl", "heteroaryl", "hydroxy"}  # a boronic acid's OH, the ring of a pyridone
    assert {k for k, n in found.items() if n} <= allowed


def test_a_cation_that_carries_its_own_anion_is_no_cation() -> None:
    # amine and pyridine N-oxides are dipolar, without a net charge
    for smiles in ("C[N+](C)([O-])CC(=O)O", "OC(=O)c1cc[n+]([O-])cc1", "OC(=O)c1ccc([N+](=O)[O-])cc1"):
        assert not set(kinds(smiles)) & set(CATIONIC), smiles


def test_acids_and_esters_share_no_atom() -> None:
    groups = perceive(read_acid("OC(=O)CC(=O)OCC(=O)OC").graph)
    atoms = [a for g in groups for a in g.atoms]
    assert len(atoms) == len(set(atoms))
    assert Counter(g.kind for g in groups) == {"carboxyl": 1, "ester": 2}


def term_kinds(smiles: str) -> set[str]:
    acid = read_acid(smiles)
    return {t.kind for t in SiteView(Molecule(acid.graph), acid.sites[0]).terms}


@pytest.mark.parametrize(
    ("smiles", "kind"),
    [
        ("OC(=O)CC(=O)OC", "alkoxycarbonyl"),
        ("OC(=O)COC(C)=O", "acyloxy"),
        ("OC(=O)CSC(C)=O", "acylthio"),
        ("OC(=O)CC(N)=O", "carbamoyl"),
        ("OC(=O)CNC(C)=O", "acylamino"),
        ("OC(=O)CNC(N)=O", "ureido"),
        ("OC(=O)CNC(=O)OC", "carbamate_n"),
        ("OC(=O)COC(N)=O", "carbamate_o"),
        ("OC(=O)CS(N)(=O)=O", "sulfonamide_s"),
        ("OC(=O)CNS(C)(=O)=O", "sulfonamide_n"),
        ("OC(=O)COC", "alkoxy"),
        ("OC(=O)COc1ccccc1", "aryloxy"),
        ("OC(=O)CSC", "alkylthio"),
        ("OC(=O)CSc1ccccc1", "arylthio"),
    ],
)
def test_a_group_is_named_by_the_end_that_looks_at_the_acid(smiles: str, kind: str) -> None:
    assert kind in term_kinds(smiles)


def test_kinds_of_an_effect_have_constants() -> None:
    table = functional_groups()
    for kind in (*WITHDRAWING, *CATIONIC, *ANIONIC):
        assert kind in table
    assert all(table[kind].sigma_i > 0 for kind in (*WITHDRAWING, *CATIONIC))


def test_every_hetero_and_unsaturated_atom_of_the_measured_acids_is_in_a_group_with_constants() -> None:
    table = functional_groups()
    for measurement in read_table(reference_table()):
        acid = measurement.acid
        g = acid.graph
        groups = perceive(g)
        covered = {a for group in groups for a in group.atoms}
        for a, number in enumerate(g.numbers):
            assert a in covered or (number == 6 and g.saturated(a)), f"{acid.smiles}: atom {a} in no group"
        assert sum(group.kind == "carboxyl" for group in groups) == len(acid.sites)
        for site in acid.sites:
            assert all(t.kind in table for t in SiteView(Molecule(g), site).terms)


def test_groups_do_not_depend_on_the_order_of_atoms() -> None:
    smiles = "CC(=O)Oc1ccc(C[C@H](N)C(=O)O)cc1[N+](=O)[O-]"
    mol = Chem.MolFromSmiles(smiles)
    reversed_order = Chem.MolToSmiles(Chem.RenumberAtoms(mol, list(range(mol.GetNumAtoms()))[::-1]), canonical=False)
    assert kinds(reversed_order) == kinds(smiles)
