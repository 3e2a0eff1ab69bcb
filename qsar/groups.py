"""Functional groups of a molecule, found by walking its graph once.

A group is a set of atoms with a kind; carbon that is only saturated skeleton belongs to no group. Kinds are
looked up by other modules for their constants (``constants/groups.csv``), by the domain for what was never
measured, and by the attribution as players.
"""

from __future__ import annotations

from collections.abc import Sequence
from typing import NamedTuple

from qsar.graph import Graph

HALOGENS = {9: "fluoro", 17: "chloro", 35: "bromo", 53: "iodo"}
#: Withdrawing groups that act through constrained columns when they sit on saturated carbon.
WITHDRAWING = ("fluoro", "chloro", "bromo", "iodo", "cyano", "nitro")
#: Kinds that carry a proton when a carboxyl proton leaves (conjugate acids with pKa well above it).
CATIONIC = ("ammonium", "amidinium", "imidazolium", "pyridinium", "quaternary_n", "onium")
ANIONIC = ("carboxylate", "sulfonate", "phosphonate")


class Group(NamedTuple):
    """A functional group.

    Attributes
    ----------
    kind : str
        Key of ``constants/groups.csv``, the orientation not yet resolved (an ester is "ester" whichever end
        looks at the acid).
    atoms : tuple of int
        Heavy atoms, the defining one first.
    """

    kind: str
    atoms: tuple[int, ...]


class _Perception:
    """One pass over the atoms of a graph; claims each hetero or unsaturated atom for one group."""

    def __init__(self, graph: Graph) -> None:
        self.g = graph
        self.claimed = [False] * len(graph.numbers)
        self.groups: list[Group] = []

    def add(self, kind: str, *atoms: int) -> None:
        for a in atoms:
            self.claimed[a] = True
        self.groups.append(Group(kind, tuple(atoms)))

    def bonded(self, a: int, number: int, order: float | None = None) -> list[int]:
        g = self.g
        return [
            b
            for b, o in zip(g.neighbours[a], g.orders[a], strict=True)
            if g.numbers[b] == number and (order is None or o == order) and not self.claimed[b]
        ]

    def run(self) -> list[Group]:
        """All groups; what is claimed first (nitro, carboxyl) is not looked at again by what comes later."""
        g = self.g
        elements = set(g.numbers)
        if 7 in elements:
            self._azides()
            self._special_nitrogen()
        if not elements.isdisjoint((15, 16, 34)):
            self._sulfur_phosphorus_oxides()
        self._carbonyls()
        if 7 in elements:
            self._amidines()
        for a, number in enumerate(g.numbers):
            if not self.claimed[a] and not g.aromatic[a] and number not in (1, 6):
                self._lone_heteroatom(a, number)
        self._unsaturated_carbon()
        self._aromatic_systems()
        return self.groups

    def _azides(self) -> None:
        g = self.g
        for a, number in enumerate(g.numbers):
            if number == 7 and g.charges[a] > 0 and not g.aromatic[a] and len(self.bonded(a, 7)) == 2:
                self.add("azido", a, *self.bonded(a, 7))

    def _special_nitrogen(self) -> None:
        g = self.g
        for a, number in enumerate(g.numbers):
            if number != 7 or self.claimed[a]:
                continue
            for b, order in zip(g.neighbours[a], g.orders[a], strict=True):
                if order == 3.0 and g.numbers[b] == 6:
                    sulfur = self.bonded(b, 16)
                    if sulfur:
                        self.add("thiocyanato", sulfur[0], b, a)
                    elif g.charges[a] == 0:
                        self.add("cyano", b, a)
                    else:
                        self.add("isocyano", a, b)
                    break
            if self.claimed[a]:
                continue
            oxygens = self.bonded(a, 8)
            terminal = [o for o in oxygens if len(g.neighbours[o]) == 1 and g.hydrogens[o] == 0]
            if g.charges[a] > 0 and len(terminal) == 2:
                self.add("nitro", a, *terminal)
            elif g.charges[a] > 0 and len(terminal) == 1 and 2.0 not in g.orders[a]:
                self.add("n_oxide", *([] if g.aromatic[a] else [a]), terminal[0])
            elif len(terminal) == 1 and g.charges[a] == 0 and 2.0 in g.orders[a]:
                self.add("nitroso", a, terminal[0])
            elif 2.0 in g.orders[a]:
                self._double_bonded_nitrogen(a)

    def _double_bonded_nitrogen(self, a: int) -> None:
        g = self.g
        partner = g.neighbours[a][g.orders[a].index(2.0)]
        if self.claimed[partner]:
            return
        if g.numbers[partner] == 7:
            self.add("azo", a, partner)
        elif g.numbers[partner] == 6 and not g.aromatic[partner]:
            others = [
                (b, o) for b, o in zip(g.neighbours[partner], g.orders[partner], strict=True) if b != a and o == 2.0
            ]
            far = others[0][0] if others else -1
            if others and g.numbers[far] in (8, 16):
                self.add("isocyanato" if g.numbers[far] == 8 else "isothiocyanato", a, partner, far)
            elif self.bonded(a, 8):
                self.add("oximino", partner, a, *self.bonded(a, 8))
            elif self.bonded(a, 7, 1.0):
                self.add("oximino", partner, a)

    def _sulfur_phosphorus_oxides(self) -> None:
        g = self.g
        for a, number in enumerate(g.numbers):
            if number in (16, 34) and not g.aromatic[a]:
                if len(self.bonded(a, 9)) >= 4:
                    self.add("pentafluorosulfanyl", a, *self.bonded(a, 9))
                    continue
                oxo = [o for o in self.bonded(a, 8) if len(g.neighbours[o]) == 1 and g.hydrogens[o] == 0]
                hydroxy = [o for o in self.bonded(a, 8) if g.hydrogens[o]]
                if len(oxo) >= 2:
                    nitrogen = self.bonded(a, 7)
                    if hydroxy:
                        self.add("sulfonate", a, *oxo, *hydroxy)
                    elif nitrogen:
                        self.add("sulfonamide", a, *oxo, nitrogen[0])
                    else:
                        self.add("sulfonyl", a, *oxo)
                elif len(oxo) == 1:
                    self.add("sulfinyl", a, *oxo)
            elif number == 15:
                oxo = self.bonded(a, 8)
                if any(g.hydrogens[o] for o in oxo):
                    self.add("phosphonate", a, *oxo)
                elif oxo:
                    self.add("phosphoryl", a, *oxo)
                elif g.charges[a] > 0:
                    self.add("onium", a)
                else:
                    self.add("phosphino", a)

    def _carbonyls(self) -> None:
        g = self.g
        carbonyls = []
        for a, number in enumerate(g.numbers):
            if number != 6 or self.claimed[a] or 2.0 not in g.orders[a]:
                continue
            for b, order in zip(g.neighbours[a], g.orders[a], strict=True):
                if order == 2.0 and g.numbers[b] in (8, 16, 34) and not self.claimed[b]:
                    carbonyls.append((a, b))
        for a, oxo in carbonyls:  # acids first, so that an ester never takes their atoms
            hydroxy = [o for o in self.bonded(a, 8, 1.0) if g.hydrogens[o]]
            if hydroxy and g.numbers[oxo] == 8 and not g.aromatic[a]:
                self.add("carboxyl", a, oxo, hydroxy[0])
        for a, oxo in carbonyls:
            if not self.claimed[a]:
                self._carbonyl(a, oxo)

    def _carbonyl(self, a: int, oxo: int) -> None:
        g = self.g
        if g.aromatic[a]:
            self.add("ring_carbonyl", oxo)
            return
        neighbours = [b for b in g.neighbours[a] if b != oxo]
        nitrogen = [b for b in neighbours if g.numbers[b] == 7]
        oxygen = [b for b in neighbours if g.numbers[b] == 8]
        free_n = [b for b in nitrogen if not self.claimed[b] and not g.aromatic[b]]
        if len(nitrogen) == 2:
            self.add("urea", a, oxo, *free_n)
        elif nitrogen and oxygen:
            self.add("carbamate", a, oxo, *free_n, *[o for o in oxygen if not self.claimed[o]])
        elif nitrogen:
            self.add("amide", a, oxo, *free_n)
        elif oxygen:
            self.add("ester", a, oxo, *[o for o in oxygen if not self.claimed[o]])
        elif any(g.numbers[b] in (16, 34) and not self.claimed[b] for b in neighbours):
            self.add("ester", a, oxo, *[b for b in neighbours if g.numbers[b] in (16, 34)])
        elif g.hydrogens[a]:
            self.add("aldehyde", a, oxo)
        else:
            self.add("ketone", a, oxo)

    def _amidines(self) -> None:
        g = self.g
        for a, number in enumerate(g.numbers):
            if number != 6 or self.claimed[a] or g.aromatic[a] or 2.0 not in g.orders[a]:
                continue
            imino = self.bonded(a, 7, 2.0)
            amino = [n for n in self.bonded(a, 7, 1.0) if not g.aromatic[n]]
            if imino and amino:
                self.add("amidinium", a, *imino, *amino)
            elif imino:
                self.add("imino", a, *imino)

    def _lone_heteroatom(self, a: int, number: int) -> None:
        if self.claimed[a]:
            return
        g = self.g
        if number in HALOGENS:
            self.add(HALOGENS[number], a)
        elif number == 8:
            self._oxygen(a)
        elif number in (16, 34):
            partner = self.bonded(a, number)
            if partner:
                self.add("disulfide", a, partner[0])
            elif g.charges[a] > 0:
                self.add("onium", a)
            else:
                self.add("thiol" if g.hydrogens[a] else "sulfide", a)
        elif number == 7:
            self._nitrogen(a)
        else:
            self.add({14: "silyl", 5: "boryl"}.get(number, "other"), a)

    def _oxygen(self, a: int) -> None:
        g = self.g
        partner = self.bonded(a, 8)
        if partner:
            self.add("peroxy", a, partner[0])
        elif g.charges[a] > 0:
            self.add("onium", a)
        else:
            self.add("hydroxy" if g.hydrogens[a] else "ether", a)

    def _nitrogen(self, a: int) -> None:
        g = self.g
        if g.charges[a] > 0:
            self.add("quaternary_n", a)
            return
        partner = [b for b in self.bonded(a, 7) if not g.aromatic[b]]
        if partner:
            self.add("hydrazino", a, partner[0])
        elif self.bonded(a, 8):
            self.add("hydroxyamino", a, self.bonded(a, 8)[0])
        elif all(g.numbers[b] == 6 and g.saturated(b) for b in g.neighbours[a]):
            self.add("ammonium", a)
        else:
            self.add("amino", a)

    def _unsaturated_carbon(self) -> None:
        """C=C and C#C; cumulated double bonds are one group, so that no atom order decides which pair is found."""
        g = self.g
        for a, number in enumerate(g.numbers):
            if number != 6 or self.claimed[a] or g.aromatic[a] or g.saturated(a):
                continue
            run, triple = [a], False
            for x in run:
                for b, order in zip(g.neighbours[x], g.orders[x], strict=True):
                    free = g.numbers[b] == 6 and not self.claimed[b] and not g.aromatic[b]
                    if order >= 2.0 and free and b not in run:
                        run.append(b)
                        triple = triple or order == 3.0
            if len(run) > 1:
                self.add("alkynyl" if triple else "alkenyl", *sorted(run))

    def _aromatic_systems(self) -> None:
        g = self.g
        seen: set[int] = set()
        for start, aromatic in enumerate(g.aromatic):
            if not aromatic or start in seen:
                continue
            system, queue = {start}, [start]
            for a in queue:
                for b, order in zip(g.neighbours[a], g.orders[a], strict=True):
                    if g.aromatic[b] and b not in system and (order == 1.5 or _share_ring(g, a, b)):
                        system.add(b)
                        queue.append(b)
            seen |= system
            self.add(_ring_kind(g, system), *sorted(system))


def _share_ring(g: Graph, a: int, b: int) -> bool:
    return any(a in ring and b in ring for ring in g.rings)


def _ring_kind(g: Graph, system: set[int]) -> str:
    """Kind of an aromatic system; basic ones are named by the cation they form."""
    hetero = sorted(g.numbers[a] for a in system if g.numbers[a] != 6)
    if not hetero:
        return "phenyl" if len(system) == 6 else "fused_aryl"
    nitrogens = [a for a in system if g.numbers[a] == 7]
    pyridine_like = [a for a in nitrogens if g.hydrogens[a] == 0 and len(g.neighbours[a]) == 2]
    if any(g.charges[a] > 0 and not _has_oxide(g, a) for a in nitrogens):
        return "quaternary_n"
    if (
        len(nitrogens) == 2
        and len(pyridine_like) == 1
        and hetero == [7, 7]
        and len(system) == 5
        and _one_three(g, nitrogens)
    ):
        return "imidazolium"
    if pyridine_like and len(nitrogens) == 1 and hetero == [7]:
        return "pyridinium"
    if len(system) not in (5, 9, 13):
        return "heteroaryl"  # a pyrone or a pyridine N-oxide, not a five-membered ring with its one hetero atom
    kinds: dict[tuple[int, ...], str] = {(8,): "furyl", (16,): "thienyl", (7,): "pyrrolyl", (34,): "thienyl"}
    return kinds.get(tuple(hetero), "heteroaryl")


def _has_oxide(g: Graph, a: int) -> bool:
    return any(g.charges[b] < 0 for b in g.neighbours[a])


def _one_three(g: Graph, nitrogens: list[int]) -> bool:
    return nitrogens[1] not in g.neighbours[nitrogens[0]]


def owners(groups: Sequence[Group]) -> dict[int, Group]:
    """The group that each atom belongs to; the first, where two share an atom."""
    return {a: group for group in reversed(groups) for a in group.atoms}


def perceive(graph: Graph) -> list[Group]:
    """Find the functional groups of a molecule.

    Parameters
    ----------
    graph : Graph

    Returns
    -------
    list of Group
        Each hetero atom and each unsaturated atom is in at least one group.
    """
    return _Perception(graph).run()
