"""A molecule as plain lists, read once from RDKit, so that every descriptor walks it without further calls."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field

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
        ``(a, b) -> {(x, y): +1 cis | -1 trans}`` for double bonds with stated configuration.
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
    def from_mol(cls, mol: Chem.Mol, *, stereo: bool = True, order: Sequence[int] | None = None) -> Graph:
        """Read atoms and bonds of a sanitised molecule without explicit hydrogens.

        Parameters
        ----------
        mol : rdkit.Chem.Mol
        stereo : bool
            False where no configuration is stated, which spares looking for it.
        order : sequence of int, optional
            Atoms of `mol` in the order that the graph is to have; only without `stereo`.

        Notes
        -----
        Neighbours are sorted, and so are rings: nothing depends on how the molecule was written.
        """
        matrix = Chem.GetAdjacencyMatrix(mol, True)
        rings: Sequence[Sequence[int]] = mol.GetRingInfo().AtomRings()
        atoms = list(map(mol.GetAtomWithIdx, range(len(matrix)) if order is None else order))
        if order is not None:
            written = list(order)
            matrix = matrix[written][:, written]
            place = {a: k for k, a in enumerate(order)}
            rings = [[place[a] for a in ring] for ring in rings]
        neighbours: list[list[int]] = [[] for _ in atoms]
        orders: list[list[float]] = [[] for _ in atoms]
        begin, end = matrix.nonzero()
        for a, b, bond in zip(begin.tolist(), end.tolist(), matrix[begin, end].tolist(), strict=True):
            neighbours[a].append(b)
            orders[a].append(bond)
        cycles = tuple(sorted(map(_turned, rings), key=lambda ring: (len(ring), ring)))
        graph = cls(
            list(map(Chem.Atom.GetAtomicNum, atoms)),
            list(map(Chem.Atom.GetFormalCharge, atoms)),
            list(map(Chem.Atom.GetTotalNumHs, atoms)),
            list(map(Chem.Atom.GetIsAromatic, atoms)),
            neighbours,
            orders,
            cycles,
            _smallest_ring(len(atoms), cycles),
        )
        if stereo:
            for bond in mol.GetBonds():
                if bond.GetBondType() == Chem.BondType.DOUBLE and bond.GetStereo() > Chem.BondStereo.STEREOANY:
                    pair = bond.GetBeginAtomIdx(), bond.GetEndAtomIdx()
                    graph.double_stereo[pair] = _cis_trans(bond, neighbours)
        if cycles:
            graph.double_stereo.update(_held_cis(graph))
            if stereo and any(atom.GetChiralTag() != Chem.ChiralType.CHI_UNSPECIFIED for atom in atoms):
                graph.side = _ring_sides(mol, cycles)
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


def _cis_trans(bond: Chem.Bond, neighbours: list[list[int]]) -> dict[tuple[int, int], int]:
    a, b = bond.GetBeginAtomIdx(), bond.GetEndAtomIdx()
    atoms = list(bond.GetStereoAtoms())
    if len(atoms) != 2:
        return {}
    x0, y0 = atoms
    sign = 1 if bond.GetStereo() in (Chem.BondStereo.STEREOZ, Chem.BondStereo.STEREOCIS) else -1
    # STEREOZ/E are CIP labels relative to the stereo atoms RDKit stores, which are the CIP leaders.
    table = {}
    for x in neighbours[a]:
        for y in neighbours[b]:
            if x == b or y == a:
                continue
            table[x, y] = sign * (1 if x == x0 else -1) * (1 if y == y0 else -1)
    return table


def _held_cis(graph: Graph) -> dict[tuple[int, int], dict[tuple[int, int], int]]:
    """Double bonds that a ring of up to seven atoms holds cis, where no configuration needs to be stated."""
    table: dict[tuple[int, int], dict[tuple[int, int], int]] = {}
    aromatic, orders = graph.aromatic, graph.orders
    for ring in graph.rings:
        if len(ring) > 7:
            continue
        for k, b in enumerate(ring):
            a = ring[k - 1]
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


def _ring_sides(mol: Chem.Mol, rings: tuple[tuple[int, ...], ...]) -> dict[tuple[int, int, int], int]:
    """Face of each ring on which the substituents of its chiral atoms lie.

    The sign of one ring is arbitrary (it flips with the direction in which the ring is walked and for the
    mirror image); only products of two signs of one ring mean something: +1 cis, -1 trans.
    """
    sides = {}
    for index, ring in enumerate(rings):
        for k, a in enumerate(ring):
            atom = mol.GetAtomWithIdx(a)
            tag = atom.GetChiralTag()
            if tag not in (Chem.ChiralType.CHI_TETRAHEDRAL_CW, Chem.ChiralType.CHI_TETRAHEDRAL_CCW):
                continue
            order = [bond.GetOtherAtomIdx(a) for bond in atom.GetBonds()]
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
