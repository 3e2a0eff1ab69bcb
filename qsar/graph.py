"""A molecule as plain lists, read once from RDKit, so that every descriptor walks it without further calls."""

from __future__ import annotations

import re
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field
from itertools import pairwise

import numpy as np
from numpy.typing import NDArray
from rdkit import Chem


@dataclass(slots=True, eq=False)
class Graph:
    """Atoms and bonds of one molecule, hydrogens counted on their atoms.

    Attributes
    ----------
    numbers, charges, hydrogens : list of int
        Atomic number, formal charge and number of hydrogens of each atom.
    aromatic : list of bool
    neighbours : list of list of int
        Heavy neighbours of each atom.
    orders : list of list of float
        Bond orders in the same order as `neighbours`; 1.5 for aromatic bonds.
    rings : tuple of tuple of int
        Smallest set of smallest rings, as atom indices in ring order.
    ring_size : list of int
        Size of the smallest ring an atom is in, 0 outside rings.
    double_stereo : dict
        ``(a, b) -> {(x, y): +1 cis | -1 trans}`` for double bonds with stated configuration, ``a < b``.
    side : dict
        ``(ring index, atom, neighbour) -> +1 or -1``: which face of the ring a substituent is on.
    """

    numbers: list[int]
    charges: list[int]
    hydrogens: list[int]
    aromatic: list[bool]
    neighbours: list[list[int]]
    orders: list[list[float]]
    rings: tuple[tuple[int, ...], ...]
    ring_size: list[int]
    double_stereo: dict[tuple[int, int], dict[tuple[int, int], int]] = field(default_factory=dict)
    side: dict[tuple[int, int, int], int] = field(default_factory=dict)

    @classmethod
    def from_mol(
        cls, mol: Chem.Mol, *, stereo: bool = True, order: Sequence[int] | None = None, smiles: str = ""
    ) -> Graph:
        """Read atoms and bonds of a sanitised molecule without explicit hydrogens.

        Parameters
        ----------
        mol : rdkit.Chem.Mol
        stereo : bool
            False where no configuration is stated, which spares looking for it.
        order : sequence of int, optional
            Atoms of `mol` in the order that the graph is to have.
        smiles : str, optional
            SMILES of RDKit's with the atoms in that order: they are read from there where it has only such as are
            written without a bracket or often, which takes a quarter of the time of asking each of them.

        Notes
        -----
        Neighbours are sorted, and so are rings: nothing depends on how the molecule was written.
        """
        matrix = Chem.GetAdjacencyMatrix(mol, True)
        rings: Sequence[Sequence[int]] = mol.GetRingInfo().AtomRings()
        place: _Places = range(len(matrix))
        if order is None:
            order = range(len(matrix))
        else:
            written = np.array(order)
            matrix = matrix.take(written, 0).take(written, 1)
            place = {a: k for k, a in enumerate(order)}
            rings = [[place[ring[k]] for k in range(len(ring))] for ring in rings]  # quicker than to iterate over it
        atoms = (_atoms_written(smiles, matrix) if smiles else None) or _atoms_asked(mol, order)
        neighbours, orders = _bonds(matrix)
        cycles = tuple(sorted(map(_turned, rings), key=lambda ring: (len(ring), ring)))
        graph = cls(
            *atoms,
            neighbours,
            orders,
            cycles,
            _smallest_ring(len(matrix), cycles),
        )
        if stereo and (not smiles or "/" in smiles or "\\" in smiles):
            graph.double_stereo.update(_stated_double_bonds(mol, graph, order, place))
        if cycles:
            graph.double_stereo.update(_held_cis(graph))
            if stereo and ("@" in smiles or not smiles):
                graph.side = _ring_sides(mol, cycles, order, place)
        return graph

    def order(self, a: int, b: int) -> float:
        """Bond order between two neighbours."""
        return self.orders[a][self.neighbours[a].index(b)]

    def saturated(self, a: int) -> bool:
        """Whether an atom has single bonds only."""
        if self.aromatic[a]:
            return False
        orders = self.orders[a]
        return orders.count(1.0) == len(orders)

    def distances(self, start: int, blocked: frozenset[int] = frozenset()) -> list[int]:
        """Bonds on the shortest path from `start` to each atom; -1 where there is none.

        Parameters
        ----------
        start : int
        blocked : frozenset of int
            Atoms that no path may enter.
        """
        neighbours = self.neighbours
        dist = [-1] * len(neighbours)
        dist[start] = 0
        for b in blocked:
            dist[b] = 0  # not to be entered
        queue = [start]
        for a in queue:
            further = dist[a] + 1
            for b in neighbours[a]:
                if dist[b] < 0:
                    dist[b] = further
                    queue.append(b)
        for b in blocked:
            if b != start:
                dist[b] = -1
        return dist


_Atoms = tuple[list[int], list[int], list[int], list[bool]]  # numbers, charges, hydrogens, aromatic


def _atoms_asked(mol: Chem.Mol, order: Sequence[int]) -> _Atoms:
    atoms = list(map(mol.GetAtomWithIdx, order))
    return (
        list(map(Chem.Atom.GetAtomicNum, atoms)),
        list(map(Chem.Atom.GetFormalCharge, atoms)),
        list(map(Chem.Atom.GetTotalNumHs, atoms)),
        list(map(Chem.Atom.GetIsAromatic, atoms)),
    )


_TOKEN = re.compile(r"\[[^]]*\]|Cl|Br|[BCNOPSFIbcnops]")
# Atomic number, charge, whether aromatic, and hydrogens by the sum of the bond orders (Daylight's rules of the organic
# subset, published with the SMILES language; aromatic bonds count 1.5). What is not here is asked of RDKit.
_WRITTEN: dict[str, tuple[int, int, bool, dict[float, int]]] = {
    "C": (6, 0, False, {0: 4, 1: 3, 2: 2, 3: 1, 4: 0}),
    "N": (7, 0, False, {0: 3, 1: 2, 2: 1, 3: 0}),
    "O": (8, 0, False, {0: 2, 1: 1, 2: 0}),
    "S": (16, 0, False, {0: 2, 1: 1, 2: 0, 4: 0, 6: 0}),
    "F": (9, 0, False, {1: 0}),
    "Cl": (17, 0, False, {1: 0}),
    "Br": (35, 0, False, {1: 0}),
    "I": (53, 0, False, {1: 0}),
    "c": (6, 0, True, {3: 1, 4: 0, 4.5: 0, 5: 0}),
    "n": (7, 0, True, {3: 0, 4: 0, 4.5: 0}),
    "o": (8, 0, True, {3: 0}),
    "s": (16, 0, True, {3: 0}),
    "[nH]": (7, 0, True, {3: 1}),
    "[N+]": (7, 1, False, {4: 0}),
    "[O-]": (8, -1, False, {1: 0}),
    "[C@H]": (6, 0, False, {3: 1}),
    "[C@@H]": (6, 0, False, {3: 1}),
    "[C@]": (6, 0, False, {4: 0}),
    "[C@@]": (6, 0, False, {4: 0}),
}


def _atoms_written(smiles: str, matrix: NDArray[np.float64]) -> _Atoms | None:
    """Atoms in the order of `smiles`, or None where one is not among `_WRITTEN`."""
    try:
        known = [_WRITTEN[token] for token in _TOKEN.findall(smiles)]
        hydrogens = [k[3][total] for k, total in zip(known, matrix.sum(axis=1).tolist(), strict=True)]
    except (KeyError, ValueError):
        return None
    return [k[0] for k in known], [k[1] for k in known], hydrogens, [k[2] for k in known]


def _bonds(matrix: NDArray[np.float64]) -> tuple[list[list[int]], list[list[float]]]:
    """Neighbours of each atom, and the orders of the bonds to them."""
    n = len(matrix)
    flat = matrix.ravel()
    places = flat.nonzero()[0]
    begin, end = np.divmod(places, n)
    neighbours, orders = end.tolist(), flat[places].tolist()
    starts = np.searchsorted(begin, np.arange(n + 1)).tolist()
    pairs = list(pairwise(starts))
    return [neighbours[i:j] for i, j in pairs], [orders[i:j] for i, j in pairs]


def _turned(ring: Sequence[int]) -> tuple[int, ...]:
    """A ring from its lowest atom on, in the direction of that atom's lower neighbour."""
    k = ring.index(min(ring))
    turned = (*ring[k:], *ring[:k])
    return turned if turned[1] < turned[-1] else (turned[0], *turned[:0:-1])


def _smallest_ring(n: int, rings: tuple[tuple[int, ...], ...]) -> list[int]:
    """Size of the smallest ring that each of `n` atoms is in, 0 outside rings."""
    size = [0] * n
    for ring in rings:
        length = len(ring)
        for a in ring:
            if not size[a] or length < size[a]:
                size[a] = length
    return size


_Table = dict[tuple[int, int], int]
_Places = Sequence[int] | Mapping[int, int]


def _stated_double_bonds(
    mol: Chem.Mol, graph: Graph, order: Sequence[int], place: _Places
) -> dict[tuple[int, int], _Table]:
    """Double bonds whose configuration is stated; `place` is the inverse of `order`."""
    found = {}
    for a, bond_orders in enumerate(graph.orders):
        for b, bond_order in zip(graph.neighbours[a], bond_orders, strict=True):
            if a < b and bond_order == 2.0:
                bond = mol.GetBondBetweenAtoms(order[a], order[b])
                if bond.GetStereo() > Chem.BondStereo.STEREOANY:
                    found[a, b] = _cis_trans(bond, a, b, graph.neighbours, place)
    return found


def _cis_trans(bond: Chem.Bond, a: int, b: int, neighbours: list[list[int]], place: _Places) -> _Table:
    atoms = [place[x] for x in bond.GetStereoAtoms()]
    if len(atoms) != 2:
        return {}
    x0, y0 = atoms if place[bond.GetBeginAtomIdx()] == a else reversed(atoms)
    sign = 1 if bond.GetStereo() in (Chem.BondStereo.STEREOZ, Chem.BondStereo.STEREOCIS) else -1
    # STEREOZ/E are CIP labels relative to the stereo atoms RDKit stores, which are the CIP leaders.
    table = {}
    for x in neighbours[a]:
        for y in neighbours[b]:
            if x == b or y == a:
                continue
            table[x, y] = sign * (1 if x == x0 else -1) * (1 if y == y0 else -1)
    return table


def _held_cis(graph: Graph) -> dict[tuple[int, int], _Table]:
    """Double bonds that a ring of up to seven atoms holds cis, where no configuration needs to be stated."""
    table: dict[tuple[int, int], _Table] = {}
    aromatic, orders = graph.aromatic, graph.orders
    for ring in graph.rings:
        if len(ring) > 7:
            continue
        for k in range(len(ring)):
            a, b = sorted((ring[k - 1], ring[k]))
            if aromatic[a] or 2.0 not in orders[a] or graph.order(a, b) != 2.0:
                continue
            members = set(ring)
            table[a, b] = {
                (x, y): 1 if (x in members) == (y in members) else -1
                for x in graph.neighbours[a]
                for y in graph.neighbours[b]
                if x != b and y != a
            }
    return table


def _ring_sides(
    mol: Chem.Mol, rings: tuple[tuple[int, ...], ...], atom_of: Sequence[int], place: _Places
) -> dict[tuple[int, int, int], int]:
    """Face of each ring on which the substituents of its chiral atoms lie.

    The sign of one ring is arbitrary (it flips with the direction in which the ring is walked and for the
    mirror image); only products of two signs of one ring mean something: +1 cis, -1 trans.
    """
    sides = {}
    for index, ring in enumerate(rings):
        for k, a in enumerate(ring):
            atom = mol.GetAtomWithIdx(atom_of[a])
            tag = atom.GetChiralTag()
            if tag not in (Chem.ChiralType.CHI_TETRAHEDRAL_CW, Chem.ChiralType.CHI_TETRAHEDRAL_CCW):
                continue
            order = [place[bond.GetOtherAtomIdx(atom_of[a])] for bond in atom.GetBonds()]
            before, after = ring[k - 1], ring[(k + 1) % len(ring)]
            outside = [x for x in order if x not in (before, after)]
            if len(order) == 3:
                order = [*order, -1]  # the implicit hydrogen; its place is checked by the tests
                outside.append(-1)
            if len(outside) != 2:
                continue
            wanted = [before, after, outside[0], outside[1]]
            parity = _parity([wanted.index(x) for x in order])
            sign = parity if tag == Chem.ChiralType.CHI_TETRAHEDRAL_CW else -parity
            sides[index, a, outside[0]] = sign
            sides[index, a, outside[1]] = -sign
    return sides


def _parity(permutation: list[int]) -> int:
    sign = 1
    for i in range(len(permutation)):
        for j in range(i + 1, len(permutation)):
            if permutation[i] > permutation[j]:
                sign = -sign
    return sign
