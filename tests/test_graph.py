"""The graph of a molecule: atoms, bonds, distances, and which groups lie on the same side."""

from __future__ import annotations

import pytest
from rdkit import Chem

from qsar.graph import Graph
from qsar.structures import read_acid


def graph_of(smiles: str) -> Graph:
    return Graph.from_mol(Chem.MolFromSmiles(smiles))


def test_atoms_and_bonds_of_glycine() -> None:
    g = graph_of("NCC(=O)O")  # atoms in the order written: N C C O O
    assert g.numbers == [7, 6, 6, 8, 8]
    assert g.charges == [0, 0, 0, 0, 0]
    assert g.hydrogens == [2, 2, 0, 0, 1]
    assert [sorted(n) for n in g.neighbours] == [[1], [0, 2], [1, 3, 4], [2], [2]]
    assert g.order(2, 3) == 2.0 and g.order(3, 2) == 2.0
    assert g.order(2, 4) == 1.0
    assert [g.saturated(a) for a in range(5)] == [True, True, False, False, True]
    assert g.rings == () and g.ring_size == [0] * 5


def test_charges_of_betaine() -> None:
    assert graph_of("C[N+](C)(C)CC(=O)[O-]").charges == [0, 1, 0, 0, 0, 0, 0, -1]


def test_aromatic_bonds_count_one_and_a_half() -> None:
    g = graph_of("c1ccccc1C(=O)O")
    assert g.order(0, 1) == 1.5
    assert sum(g.aromatic) == 6
    assert not g.saturated(0)


def test_the_smallest_ring_of_each_atom() -> None:
    # spiro[2.5]octane: the spiro atom is in a three- and a six-membered ring
    g = graph_of("C1CC12CCCCC2")
    assert g.ring_size == [3, 3, 3, 6, 6, 6, 6, 6]
    assert sorted(len(r) for r in g.rings) == [3, 6]


@pytest.mark.parametrize(
    "smiles", ["CCCCC(=O)O", "OC(=O)c1ccc2ccccc2c1", "OC(=O)C12CC3CC(CC(C3)C1)C2", "OC(=O)CC(O)(C(=O)O)CC(=O)O"]
)
def test_distances_are_those_of_the_reference_library(smiles: str) -> None:
    mol = Chem.MolFromSmiles(smiles)
    g = Graph.from_mol(mol)
    matrix = Chem.GetDistanceMatrix(mol)
    for a in range(mol.GetNumAtoms()):
        assert g.distances(a) == [int(d) for d in matrix[a]]


def test_no_path_enters_a_blocked_atom() -> None:
    g = graph_of("C1CCCCC1")
    assert g.distances(0) == [0, 1, 2, 3, 2, 1]
    assert g.distances(0, frozenset({1})) == [0, -1, 4, 3, 2, 1]
    assert graph_of("CCO").distances(0, frozenset({1})) == [0, -1, -1]


# Cis and trans: written with / and \ in SMILES ("F/C=C/F" is trans, "F/C=C\\F" is cis: Weininger 1988).


def pair(smiles: str, x: int, y: int) -> int | None:
    """Sign of two atoms, by position in the SMILES as it is written."""
    g = graph_of(smiles)
    for table in g.double_stereo.values():
        for key in ((x, y), (y, x)):
            if key in table:
                return table[key]
    return None


@pytest.mark.parametrize(
    ("smiles", "x", "y", "sign"),
    [
        ("F/C=C/F", 0, 3, -1),
        ("F/C=C\\F", 0, 3, 1),
        ("F\\C=C/F", 0, 3, 1),
        ("C(\\F)=C/F", 1, 3, -1),  # the same as F/C=C/F with the branch written after its carbon
        ("OC(=O)/C=C/C(=O)O", 1, 5, -1),  # fumaric
        ("OC(=O)/C=C\\C(=O)O", 1, 5, 1),  # maleic
        ("C/C=C/C(=O)O", 0, 3, -1),  # crotonic
        ("OC(=O)C=CC(=O)O", 1, 5, None),
    ],
)
def test_cis_and_trans_on_double_bonds(smiles: str, x: int, y: int, sign: int | None) -> None:
    assert pair(smiles, x, y) == sign


def test_all_four_pairs_of_a_fully_substituted_double_bond() -> None:
    # 2-chloro-3-methylbut-2-enedioic acid with its COOH groups cis: Cl and CH3 are then cis too, all others trans
    smiles = "OC(=O)/C(Cl)=C(C)/C(=O)O"
    mol = Chem.MolFromSmiles(smiles)
    g = Graph.from_mol(mol)
    (table,) = g.double_stereo.values()
    signs = {frozenset(key): value for key, value in table.items()}
    assert len(signs) == 4
    c1, cl, me, c2 = 1, 4, 6, 7
    assert signs[frozenset({c1, c2})] == signs[frozenset({cl, me})]
    assert signs[frozenset({c1, me})] == signs[frozenset({cl, c2})] == -signs[frozenset({c1, c2})]


@pytest.mark.parametrize("size", [3, 4, 5, 6, 7])
def test_a_small_ring_holds_its_double_bond_cis(size: int) -> None:
    # cycloalkene-1,2-dicarboxylic acids: both COOH are outside the ring, on the same side of the double bond
    smiles = "OC(=O)C1=C(C(=O)O)" + "C" * (size - 2) + "1"
    g = graph_of(smiles)
    (table,) = g.double_stereo.values()
    assert table.get((1, 5), table.get((5, 1))) == 1


def test_rings_that_may_be_trans_are_not_taken_as_cis() -> None:
    assert graph_of("OC(=O)C1=C(C(=O)O)CCCCCC1").double_stereo == {}  # cyclooctene


# Faces of a ring. Names and SMILES: for two substituents on carbons 1 and 2 of a ring, written
# [C@H]1...[C@@H]1, RDKit's own CIP labels say which isomer it is: trans-cyclopropane-1,2-dicarboxylic acid is
# (1R,2R) or (1S,2S), the cis acid is (1R,2S), meso (IUPAC 2013 Recommendations, P-93.5).


def sides(smiles: str) -> tuple[int, list[str]]:
    acid = read_acid(smiles)
    g = acid.graph
    carriers = [next(b for b in g.neighbours[s] if g.numbers[b] == 6) for s in acid.sites]
    a, b = carriers
    index = next(i for i, ring in enumerate(g.rings) if a in ring and b in ring)
    labels = dict(Chem.FindMolChiralCenters(acid.mol, useLegacyImplementation=False))
    return g.side[index, a, acid.sites[0]] * g.side[index, b, acid.sites[1]], [labels[a], labels[b]]


@pytest.mark.parametrize("ring", ["C", "CC", "CCC", "CCCC", "O", "CSC"])
@pytest.mark.parametrize("first", ["@", "@@"])
@pytest.mark.parametrize("second", ["@", "@@"])
def test_cis_and_trans_on_rings(ring: str, first: str, second: str) -> None:
    product, labels = sides(f"OC(=O)[C{first}H]1{ring}[C{second}H]1C(=O)O")
    # symmetric rings: like labels (R,R or S,S) are trans, unlike ones (meso) are cis
    assert product == (-1 if labels[0] == labels[1] else 1)


def test_cis_and_trans_on_opposite_corners() -> None:
    # cyclohexane-1,4-dicarboxylic acid has no R and S; its two isomers must differ, and a mirror image must not
    first, second = "OC(=O)[C@H]1CC[C@@H](CC1)C(=O)O", "OC(=O)[C@H]1CC[C@H](CC1)C(=O)O"
    found = []
    for smiles in (first, second):
        acid = read_acid(smiles)
        g = acid.graph
        a, b = (next(x for x in g.neighbours[s] if g.numbers[x] == 6) for s in acid.sites)
        found.append(g.side[0, a, acid.sites[0]] * g.side[0, b, acid.sites[1]])
    assert sorted(found) == [-1, 1]
    mirror = first.replace("@@", "!").replace("@", "@@").replace("!", "@")
    acid = read_acid(mirror)
    g = acid.graph
    a, b = (next(x for x in g.neighbours[s] if g.numbers[x] == 6) for s in acid.sites)
    assert g.side[0, a, acid.sites[0]] * g.side[0, b, acid.sites[1]] == found[0]


def test_a_quaternary_ring_atom_has_a_group_on_each_face() -> None:
    acid = read_acid("OC(=O)[C@]1(C)C[C@@H]1C(=O)O")
    faces: dict[tuple[int, int], list[int]] = {}
    for (ring, atom, _), sign in acid.graph.side.items():
        faces.setdefault((ring, atom), []).append(sign)
    assert faces and all(sorted(signs) == [-1, 1] for signs in faces.values())
