"""A molecule as a parent plus substituents, each with its bond path to the carboxyl carbon.

The parent is found by the first rule that fits the carboxyl group that is asked about:

a. on an aromatic atom: that whole fused aromatic system with its hetero atoms;
b. on an acyclic C=C or C≡C: propenoic or propynoic acid;
c. on another ring atom: its ring, bridged, fused and spiro systems whole, ring double bonds kept;
d. else the straight alkanoic acid along the longest acyclic saturated carbon chain from the carboxyl carbon.
   Carbons of C=C, C≡C, COOH, ester, amide and CN end the chain; a =O on it is a substituent. Of equally long
   chains the one with most substituents is taken, then the one of lowest canonical rank.

What is not parent falls into units: ring systems, functional groups, alkyl branches. A unit further out belongs
to the one that carries it. Alkyl that a functional group carries is part of that group (methoxy, acetamido,
dimethylammonio). A nitrogen that would turn into an aliphatic amine, and so take up a proton, without the aryl
or acyl group on it is one unit with that group (anilino, 4-acetylpiperazinyl).
"""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import dataclass

from rdkit import Chem

from qsar.graph import Graph
from qsar.groups import CATIONIC, Group, perceive
from qsar.structures import Acid

_ACYL = ("amide", "ester", "urea", "carbamate")


@dataclass(frozen=True, slots=True)
class Substituent:
    """One unit of a molecule outside the parent.

    Attributes
    ----------
    name : str
        What people call it, without its place: "chloro", "methoxy", "phenyl".
    kind : str
        Canonical SMILES of the unit with ``*`` for the parent side and hydrogens for what it carries itself; equal
        for equal groups.
    atoms : tuple of int
        Heavy atoms, the one nearest to the carboxyl carbon first.
    path : tuple of int
        Atoms along the shortest bond path, from the carboxyl carbon to the first atom of the unit.
    place : str
        Where it sits, in words: "α", "ortho", "on N", "on 4-phenyl".
    carrier : int or None
        Position of the substituent that carries this one; None where it sits on the parent.
    """

    name: str
    kind: str
    atoms: tuple[int, ...]
    path: tuple[int, ...]
    place: str
    carrier: int | None

    @property
    def path_length(self) -> int:
        """Bonds between the carboxyl carbon and the unit: 2 for a group on the alpha atom."""
        return len(self.path) - 1

    @property
    def label(self) -> str:
        """Name with its place, for tables."""
        if not self.place:
            return self.name
        return f"{self.name} {self.place}" if self.place.startswith("on ") else f"{self.place}-{self.name}"


@dataclass(frozen=True, slots=True)
class Decomposition:
    """A carboxyl group's parent and the substituents around it.

    Attributes
    ----------
    site : int
        Carboxyl carbon.
    rule : str
        Which of the rules "a" to "d" gave the parent.
    parent : tuple of int
        Heavy atoms of the parent, the carboxyl group included.
    substituents : tuple of Substituent
        Nearest first; a carrier comes before what it carries.
    """

    site: int
    rule: str
    parent: tuple[int, ...]
    substituents: tuple[Substituent, ...]


def decompose(acid: Acid, site: int, ionised: frozenset[int] = frozenset()) -> Decomposition:
    """Split an acid into parent and substituents as one of its carboxyl groups sees them.

    Parameters
    ----------
    acid : Acid
    site : int
        Carboxyl carbon whose proton leaves; one of ``acid.sites``.
    ionised : frozenset of int
        Carboxyl carbons that have lost their proton already; only names depend on it.

    Returns
    -------
    Decomposition

    Raises
    ------
    ValueError
        If `site` is no carboxyl carbon of the acid.
    """
    if site not in acid.sites:
        raise ValueError(f"atom {site} is no carboxyl carbon of {acid.smiles}")
    from qsar.substituent_names import place_of, unit_kind, unit_name

    graph, groups = acid.graph, perceive(acid.graph)
    own = next(g for g in groups if g.kind == "carboxyl" and g.atoms[0] == site)
    rule, parent = _parent(acid, groups, own)
    distance = graph.distances(site, frozenset(own.atoms[1:]))
    protonated = frozenset(g.atoms[0] for g in groups if g.kind == "ammonium")
    units = _Units(graph, groups, parent, distance).run()
    rank = list(Chem.CanonicalRankAtoms(acid.mol, breakTies=True))
    units.sort(key=lambda unit: (min(distance[a] for a in unit), min(rank[a] for a in unit)))
    owner = {a: k for k, unit in enumerate(units) for a in unit}
    carrying = {owner.get(b) for a, k in owner.items() for b in graph.neighbours[a] if owner.get(b, k) < k}
    found: list[Substituent] = []
    for k, unit in enumerate(units):
        first = min(unit, key=lambda a: (distance[a], rank[a]))
        path = _path(graph, distance, rank, first, unit)
        atoms = (first, *sorted(a for a in unit if a != first))
        carrier = owner.get(path[-2])
        inner = parent if carrier is None else units[carrier]
        kind = unit_kind(acid.mol, unit, inner, ionised, protonated)
        found.append(
            Substituent(
                unit_name(kind, graph, groups, unit, k in carrying),
                kind,
                atoms,
                path,
                place_of(graph, rule, parent, path, "" if carrier is None else found[carrier].name),
                carrier,
            )
        )
    return Decomposition(site, rule, tuple(sorted(parent)), tuple(found))


def _path(
    graph: Graph, distance: Sequence[int], rank: Sequence[int], first: int, unit: frozenset[int]
) -> tuple[int, ...]:
    """Shortest path from the carboxyl carbon; of equal ones that of lowest rank."""
    path = [first]
    while distance[path[-1]] > 0:
        nearer = [b for b in graph.neighbours[path[-1]] if distance[b] == distance[path[-1]] - 1]
        path.append(min(nearer, key=rank.__getitem__))
    return tuple(reversed(path))


def _parent(acid: Acid, groups: list[Group], own: Group) -> tuple[str, frozenset[int]]:
    graph, site = acid.graph, own.atoms[0]
    carboxyl = frozenset(own.atoms)
    alpha = next((b for b in graph.neighbours[site] if b not in carboxyl), None)
    if alpha is None:
        return "d", carboxyl
    if graph.aromatic[alpha]:
        return "a", carboxyl | aromatic_system(graph, alpha)
    multiple = [
        b
        for b, order in zip(graph.neighbours[alpha], graph.orders[alpha], strict=True)
        if order >= 2.0 and graph.numbers[b] == 6
    ]
    if multiple and not graph.ring_size[alpha]:
        return "b", carboxyl | {alpha, min(multiple)}
    if graph.ring_size[alpha]:
        return "c", carboxyl | ring_system(graph, alpha)
    return "d", carboxyl | _longest_chain(acid, groups, own, alpha)


def aromatic_system(graph: Graph, start: int) -> frozenset[int]:
    """The whole fused aromatic system of an atom, with =O on its ring atoms (without it there is no such ring)."""
    system, queue = {start}, [start]
    for a in queue:
        for b in graph.neighbours[a]:
            if b not in system and graph.aromatic[b] and _share_ring(graph, a, b):
                system.add(b)
                queue.append(b)
    return frozenset(system) | _exocyclic_double(graph, system)


def ring_system(graph: Graph, start: int) -> frozenset[int]:
    """All ring atoms that hang together through rings: fused, bridged and spiro systems whole."""
    system, queue = {start}, [start]
    for a in queue:
        for ring in graph.rings:
            if a in ring:
                for b in ring:
                    if b not in system:
                        system.add(b)
                        queue.append(b)
    aromatic = {a for a in system if graph.aromatic[a]}
    return frozenset(system) | _exocyclic_double(graph, aromatic)


def _share_ring(graph: Graph, a: int, b: int) -> bool:
    return any(a in ring and b in ring for ring in graph.rings)


def _exocyclic_double(graph: Graph, ring: Iterable[int]) -> frozenset[int]:
    """Hetero atoms doubly bonded to aromatic ring atoms."""
    return frozenset(
        b
        for a in ring
        if graph.aromatic[a]
        for b, order in zip(graph.neighbours[a], graph.orders[a], strict=True)
        if order == 2.0 and not graph.ring_size[b] and graph.numbers[b] != 6
    )


def _is_chain_carbon(graph: Graph, a: int) -> bool:
    """Whether an atom may be part of the parent's chain: acyclic carbon, saturated but for a =O, =S or =N."""
    if graph.numbers[a] != 6 or graph.ring_size[a] or graph.aromatic[a]:
        return False
    double = False
    for b, order in zip(graph.neighbours[a], graph.orders[a], strict=True):
        if order > 1.0 and (order > 2.0 or graph.numbers[b] == 6):
            return False
        double = double or order == 2.0
    if not double:
        return True
    single = [b for b, o in zip(graph.neighbours[a], graph.orders[a], strict=True) if o == 1.0]
    return len(single) >= len(graph.neighbours[a]) - 1 and all(graph.numbers[b] == 6 for b in single)


def _longest_chain(acid: Acid, groups: list[Group], own: Group, alpha: int) -> frozenset[int]:
    graph = acid.graph
    if not _is_chain_carbon(graph, alpha):
        return frozenset()
    rank = list(Chem.CanonicalRankAtoms(acid.mol, breakTies=True))
    best: tuple[int, int, tuple[int, ...]] | None = None
    chosen: tuple[int, ...] = ()
    for chain in _chains(graph, own.atoms[0], alpha):
        members = {*chain, own.atoms[0]}
        substituents = sum(b not in members for a in chain for b in graph.neighbours[a])
        key = (-len(chain), -substituents, tuple(rank[a] for a in chain))
        if best is None or key < best:
            best, chosen = key, chain
    return frozenset(chosen)


def _chains(graph: Graph, site: int, alpha: int) -> list[tuple[int, ...]]:
    """Every chain from the alpha atom to an end; the carbons are acyclic, so there are few."""
    ended: list[tuple[int, ...]] = []
    stack: list[tuple[int, ...]] = [(alpha,)]
    while stack:
        chain = stack.pop()
        before = chain[-2] if len(chain) > 1 else site
        onward = [b for b in graph.neighbours[chain[-1]] if b != before and _is_chain_carbon(graph, b)]
        if onward:
            stack.extend((*chain, b) for b in onward)
        else:
            ended.append(chain)
    return ended


class _Units:
    """Cuts what is not parent into ring systems, functional groups and alkyl branches."""

    def __init__(self, graph: Graph, groups: list[Group], parent: frozenset[int], distance: Sequence[int]) -> None:
        self.graph, self.groups, self.parent, self.distance = graph, groups, parent, distance
        self.unit: dict[int, int] = {}
        self.members: dict[int, set[int]] = {}
        self.has_group: set[int] = set()

    def run(self) -> list[frozenset[int]]:
        self._rings()
        self._functional_groups()
        self._alkyl()
        self._dipoles()
        self._keep_nitrogens_neutral()
        return [frozenset(atoms) for atoms in self.members.values()]

    def _new(self, atoms: Iterable[int], group: bool) -> None:
        """Add a unit for each connected part of some atoms."""
        left = {a for a in atoms if a not in self.parent and a not in self.unit}
        while left:
            queue = [min(left)]
            left.discard(queue[0])
            for a in queue:
                for b in self.graph.neighbours[a]:
                    if b in left:
                        left.discard(b)
                        queue.append(b)
            key = len(self.members) if not self.members else max(self.members) + 1
            self.members[key] = set(queue)
            self.unit.update(dict.fromkeys(queue, key))
            if group:
                self.has_group.add(key)

    def _merge(self, into: int, other: int) -> None:
        if into == other:
            return
        for a in self.members[other]:
            self.unit[a] = into
        self.members[into] |= self.members.pop(other)
        if other in self.has_group:
            self.has_group.add(into)

    def _rings(self) -> None:
        seen: set[int] = set()
        for a, size in enumerate(self.graph.ring_size):
            if not size or a in seen:
                continue
            system = set(ring_system(self.graph, a))
            seen |= system
            free = system - self.parent
            # lactams, lactones, imides, cyclic sulfones: the ring is what it is by its whole group
            for group in self.groups:
                inside = free.intersection(group.atoms)
                if inside and (group.kind in _ACYL or any(self.graph.numbers[b] != 6 for b in inside)):
                    ends = {b for b in set(group.atoms) - system if len(self.graph.neighbours[b]) == 1}
                    system |= {b for b in ends if inside.intersection(self.graph.neighbours[b])}
            seen |= system
            self._new(system, False)

    def _functional_groups(self) -> None:
        for group in self.groups:
            self._new(group.atoms, True)

    def _alkyl(self) -> None:
        self._new(range(len(self.graph.numbers)), False)
        for key in sorted(self.members):
            atoms = self.members[key]
            if key in self.has_group or any(self.graph.ring_size[a] for a in atoms):
                continue
            if any(self.graph.numbers[a] != 6 for a in atoms):
                continue
            carrier = self._carrier(key)
            if carrier in self.has_group:
                self._merge(carrier, key)

    def _carrier(self, key: int) -> int:
        """The unit that a unit hangs on; -1 for the parent."""
        near = min(self.members[key], key=self.distance.__getitem__)
        inner = [b for b in self.graph.neighbours[near] if self.distance[b] == self.distance[near] - 1]
        return min(self.unit.get(b, -1) for b in inner) if inner else -1

    def _dipoles(self) -> None:
        """Atoms of opposite charge that are bonded are one group, whatever perception made of them."""
        graph = self.graph
        for a in list(self.unit):
            for b in graph.neighbours[a]:
                if graph.charges[a] > 0 > graph.charges[b] and b in self.unit:
                    self._merge(self.unit[a], self.unit[b])

    def _keep_nitrogens_neutral(self) -> None:
        graph = self.graph
        cations = {a for g in self.groups if g.kind in CATIONIC for a in g.atoms}
        for a in sorted(self.unit):
            if graph.numbers[a] != 7 or graph.aromatic[a] or graph.charges[a] or a in cations:
                continue
            if not all(o == 1.0 for o in graph.orders[a]):
                continue
            own = self.unit[a]
            carried = [b for b in graph.neighbours[a] if self.unit.get(b, own) != own and self._hangs_on(b, a)]
            rest = [b for b in graph.neighbours[a] if b not in carried]
            if carried and all(graph.numbers[b] == 6 and graph.saturated(b) for b in rest):
                for b in carried:
                    if graph.numbers[b] != 6 or not graph.saturated(b):
                        self._merge(own, self.unit[b])

    def _hangs_on(self, b: int, a: int) -> bool:
        return self.distance[b] == self.distance[a] + 1
