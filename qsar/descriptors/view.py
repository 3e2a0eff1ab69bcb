"""One carboxyl group's view of its molecule: who is there, how many bonds away, and in which state.

Groups that withdraw and sit on saturated carbon (F, Cl, Br, I, CN, NO2) are set apart in ``withdrawing``; all
other attributes describe the *scaffold*, the acid with hydrogen in their place. Descriptors that may point
either way are computed on the scaffold alone, so that adding, doubling or moving such a group can act only
through columns on which the model is constrained to be monotone.
"""

from __future__ import annotations

from functools import cached_property
from typing import NamedTuple

from qsar.basicity import pyridinium_pka, zwitterion_ratio
from qsar.constants.functional_groups import FunctionalGroup, functional_groups
from qsar.graph import Graph
from qsar.groups import WITHDRAWING, Group, owners, perceive

_ORIENTED = {
    # kind: (through its carbonyl or sulfonyl atom, through nitrogen, through oxygen or sulfur)
    "ester": ("alkoxycarbonyl", "alkoxycarbonyl", "acyloxy"),
    "amide": ("carbamoyl", "acylamino", "carbamoyl"),
    "urea": ("carbamoyl", "ureido", "carbamoyl"),
    "carbamate": ("alkoxycarbonyl", "carbamate_n", "carbamate_o"),
    "sulfonamide": ("sulfonamide_s", "sulfonamide_n", "sulfonamide_s"),
}


class Term(NamedTuple):
    """A functional group as one site sees it.

    Attributes
    ----------
    kind : str
        Key of the constants, orientation resolved.
    atoms : tuple of int
    anchor : int
        The group's atom nearest to the carboxyl carbon.
    bonds : int
        Bonds from the carboxyl carbon to the atom that carries the group: 1 for a group on the alpha atom.
    pi : bool
        Whether every shortest path to that atom crosses an unsaturated atom.
    constants : FunctionalGroup
    """

    kind: str
    atoms: tuple[int, ...]
    anchor: int
    bonds: int
    pi: bool
    constants: FunctionalGroup


class Molecule:
    """What all sites of a molecule share: its graph and its groups, perceived once."""

    def __init__(self, graph: Graph) -> None:
        self.graph = graph
        self.groups: list[Group] = _with_basicity(graph, perceive(graph))
        self.set_apart: set[int] = set()
        self.withdrawing: list[tuple[Group, int]] = []
        self.carboxyls: dict[int, Group] = {}
        others = []
        for group in self.groups:
            carrier = _saturated_carrier(graph, group) if group.kind in WITHDRAWING else -1
            if carrier >= 0:
                self.withdrawing.append((group, carrier))
                self.set_apart.update(group.atoms)
            elif group.kind == "carboxyl":
                self.carboxyls[group.atoms[0]] = group
            else:
                others.append(group)
        self.others = others
        self.scaffold_hydrogens = list(graph.hydrogens)
        for _, carrier in self.withdrawing:
            self.scaffold_hydrogens[carrier] += 1
        self.unsaturated = [
            aromatic or orders.count(1.0) != len(orders)
            for aromatic, orders in zip(graph.aromatic, graph.orders, strict=True)
        ]
        for a in self.set_apart:
            self.unsaturated[a] = False
        self._around: dict[int, Surroundings] = {}

    def around(self, site: int) -> Surroundings:
        """What the carboxyl group with this carbon sees, made once."""
        if site not in self._around:
            self._around[site] = Surroundings(self, site)
        return self._around[site]


_PROTONATED_ABOVE = 1.5  # a ring nitrogen weaker than this is neutral where the carboxyl proton leaves


def _with_basicity(graph: Graph, groups: list[Group]) -> list[Group]:
    """Take the proton from ring nitrogens that are too weak a base, and give it to anilines that are strong enough."""
    if not any(group.kind in ("pyridinium", "amino") for group in groups):
        return groups
    group_of = owners(groups)
    result = []
    for group in groups:
        if group.kind == "pyridinium" and pyridinium_pka(graph, group, group_of) < _PROTONATED_ABOVE:
            group = Group("heteroaryl", group.atoms)
        elif group.kind == "amino" and (zwitterion_ratio(graph, group.atoms[0], group_of) or 0.0) > 0.0:
            group = Group("ammonium", group.atoms)
        result.append(group)
    return result


def _saturated_carrier(graph: Graph, group: Group) -> int:
    """The saturated carbon that carries a group, or -1."""
    first = group.atoms[0]
    for b in graph.neighbours[first]:
        if b not in group.atoms:
            return b if graph.numbers[b] == 6 and graph.saturated(b) else -1
    return -1


class Surroundings:
    """What one carboxyl group sees whatever the charges of the others: shared by the views of all its states.

    Parameters
    ----------
    molecule : Molecule
    site : int
        Carboxyl carbon.
    """

    def __init__(self, molecule: Molecule, site: int) -> None:
        self.graph = graph = molecule.graph
        self.unsaturated = molecule.unsaturated
        own = molecule.carboxyls[site].atoms
        self.own = frozenset(own)
        blocked = frozenset(own[1:])
        self.distance = graph.distances(site, blocked)
        alpha = [b for b in graph.neighbours[site] if b not in blocked]
        self.alpha = alpha[0] if alpha else -1
        self.through_pi = self._through_pi()
        self.atoms = [a for a, d in enumerate(self.distance) if d > 0 and a not in molecule.set_apart]
        self._constants = functional_groups()
        self.withdrawing = [
            Term(g.kind, g.atoms, g.atoms[0], self.distance[c], self.through_pi[c], self._constants[g.kind])
            for g, c in molecule.withdrawing
        ]
        self.terms = [self._term(g) for g in molecule.others]

    def _through_pi(self) -> list[bool]:
        """For each atom, whether all shortest paths to it cross an unsaturated atom (itself not counted)."""
        neighbours, dist, unsaturated = self.graph.neighbours, self.distance, self.unsaturated
        flags = [False] * len(dist)
        for a in sorted((x for x, d in enumerate(dist) if d > 1), key=dist.__getitem__):
            before = dist[a] - 1
            for p in neighbours[a]:
                if dist[p] == before and not (flags[p] or unsaturated[p]):
                    break
            else:
                flags[a] = True
        return flags

    def _term(self, group: Group) -> Term:
        graph, dist = self.graph, self.distance
        anchor = group.atoms[0] if len(group.atoms) == 1 else min(group.atoms, key=dist.__getitem__)
        kind = group.kind
        if kind in _ORIENTED:
            number = graph.numbers[anchor]
            by_centre, by_nitrogen, by_oxygen = _ORIENTED[kind]
            if anchor == group.atoms[0] or anchor == group.atoms[1]:
                kind = by_centre
            elif number == 7:
                kind = by_nitrogen
            else:
                kind = "acylthio" if number in (16, 34) and kind == "ester" else by_oxygen
        elif kind in ("ether", "sulfide"):
            far = [b for b in graph.neighbours[anchor] if dist[b] > dist[anchor]]
            aryl = any(self.unsaturated[b] for b in far)
            kind = {
                ("ether", True): "aryloxy",
                ("ether", False): "alkoxy",
                ("sulfide", True): "arylthio",
            }.get((kind, aryl), "alkylthio")
        return self.oriented(kind, group, anchor)

    def oriented(self, kind: str, group: Group, anchor: int) -> Term:
        """The group as a term of this kind, seen from `anchor`."""
        return Term(
            kind,
            group.atoms,
            anchor,
            max(self.distance[anchor] - 1, 0),
            self.through_pi[anchor],
            self._constants[kind],
        )


class SiteView:
    """Everything a descriptor needs to know about one carboxyl group in one charge state.

    Parameters
    ----------
    molecule : Molecule
    site : int
        Carboxyl carbon whose proton leaves.
    ionised : frozenset of int
        Carboxyl carbons of the other groups that have already lost their proton.
    """

    def __init__(self, molecule: Molecule, site: int, ionised: frozenset[int] = frozenset()) -> None:
        self.molecule = molecule
        self.graph = molecule.graph
        self.site = site
        self.ionised = ionised
        around = molecule.around(site)
        self.own = around.own
        self.distance = around.distance
        self.alpha = around.alpha
        self.through_pi = around.through_pi
        self.atoms = around.atoms
        self.withdrawing = around.withdrawing
        self.terms = list(around.terms)
        for carbon, group in molecule.carboxyls.items():
            if carbon != site:
                kind = "carboxylate" if carbon in ionised else "carboxyl"
                self.terms.append(around.oriented(kind, group, carbon))
        #: What :mod:`qsar.model.domain` asks about, once it has been found.
        self.features: list[tuple[str, ...]] | None = None
        #: What :mod:`qsar.descriptors.resonance` found on each aromatic system, so that it looks once.
        self.on_rings: dict[tuple[int, int], list[tuple[int, FunctionalGroup, int]]] = {}

    @cached_property
    def term_of(self) -> dict[int, Term]:
        """The term that each group atom belongs to (the first, where two share an atom)."""
        table: dict[int, Term] = {}
        for term in self.terms:
            for a in term.atoms:
                table.setdefault(a, term)
        return table

    @cached_property
    def alpha_system(self) -> Term | None:
        """The aromatic system that carries the carboxyl group, if any."""
        if self.alpha < 0 or not self.graph.aromatic[self.alpha]:
            return None
        return self.term_of.get(self.alpha)

    @cached_property
    def path_pairs(self) -> dict[tuple[int, int], int]:
        """Cis (+1) and trans (-1) pairs of substituents on double bonds, both orders."""
        table: dict[tuple[int, int], int] = {}
        for pairs in self.graph.double_stereo.values():
            for (x, y), sign in pairs.items():
                table[x, y] = table[y, x] = sign
        return table

    def carbons_on(self, a: int) -> list[int]:
        """Scaffold neighbours of an atom that lie further out."""
        dist, skip = self.distance, self.molecule.set_apart
        here = dist[a]
        return [b for b in self.graph.neighbours[a] if dist[b] > here and b not in skip]
