"""Analogues of an acid: one substituent, or one hydrogen, exchanged for another group.

A place is chosen once (`positions`), a group is put there (`swap`), or every group of a list is (`analogues`).
What is next to the place keeps its configuration.
"""

from __future__ import annotations

import re
from collections.abc import Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

from rdkit import Chem

from qsar.exchange_groups import Group, group_named, known_groups, read_group
from qsar.structures import Acid, StructureError, acid_from_mol

if TYPE_CHECKING:
    from qsar.model.model import Model, Prediction, StepPrediction
    from qsar.substituents import Decomposition

__all__ = [
    "Analogue",
    "Group",
    "Position",
    "analogues",
    "find_position",
    "group_named",
    "group_words",
    "known_groups",
    "positions",
    "read_group",
    "swap",
]


@dataclass(frozen=True, slots=True)
class Position:
    """A place of an acid that carries hydrogen or a substituent.

    Attributes
    ----------
    key : str
        Short name that is stable for an acid: ``h5`` for a hydrogen on atom 5, ``g5-7`` for the group that begins
        with atom 7 and hangs on atom 5; atom numbers are those of ``Acid.mol``.
    place : str
        Where it is, in words: "α", "para", "on methoxy".
    group : str
        What is there now: name, condensed formula or SMILES.
    anchor : int
        Atom that stays.
    root : int or None
        First atom of the group that goes; None for a hydrogen.
    atoms : tuple of int
        All heavy atoms that go; empty for a hydrogen.
    """

    key: str
    place: str
    group: str
    anchor: int
    root: int | None
    atoms: tuple[int, ...]

    @property
    def label(self) -> str:
        """Place and what is there now, for lists."""
        return f"{self.place}: {self.group}" if self.place else self.group


@dataclass(frozen=True, slots=True)
class Analogue:
    """One acid of a series.

    Attributes
    ----------
    group : Group
    smiles : str
        Canonical SMILES; empty where the exchange gives no acid.
    prediction : Prediction
        All steps, or the reason why there are none.
    step : StepPrediction or None
        The step that was asked for.
    change : float or None
        pKa of that step less that of the acid that was started from.
    """

    group: Group
    smiles: str
    prediction: Prediction
    step: StepPrediction | None
    change: float | None


def group_words(group: Group) -> str:
    """Name of a group in words, for searching: "nitro", "methyl phenyl"."""
    from qsar.structures import read_acid
    from qsar.substituents import decompose

    benzoic = read_acid("O=C(O)c1ccccc1")
    place = next(p for p in positions(benzoic) if p.place == "para")
    try:
        made = swap(benzoic, place, group)
    except StructureError:
        return ""
    parts = decompose(made, made.sites[-1] if len(made.sites) == 1 else _aromatic_site(made))
    return " ".join(dict.fromkeys(s.name for s in parts.substituents))


def _aromatic_site(acid: Acid) -> int:
    """Carboxyl carbon on the ring, where the group brings another one."""
    return next(
        s
        for s in acid.sites
        if any(n.GetIsAromatic() for n in acid.mol.GetAtomWithIdx(s).GetNeighbors())
    )


def positions(acid: Acid) -> tuple[Position, ...]:
    """Every place of an acid whose hydrogen or substituent can be exchanged.

    The first carboxyl group stays; another one can be exchanged as a whole, but not the proton in it.

    Parameters
    ----------
    acid : Acid

    Returns
    -------
    tuple of Position
        Nearest to the carboxyl group first.
    """
    from qsar.substituents import decompose

    parts = decompose(acid, acid.sites[0])
    site, graph = acid.sites[0], acid.graph
    distance = graph.distances(site, frozenset())
    fixed = _carboxyl_atoms(acid)
    found: list[tuple[tuple[int, int, int], Position]] = []
    for atom in acid.mol.GetAtoms():
        a = atom.GetIdx()
        bears_hydrogen = atom.GetTotalNumHs() > 0 and (a not in fixed or a == site)  # formic acid's own
        if bears_hydrogen:
            place = _place(acid, parts, a)
            found.append(((distance[a] + 1, 1, a), Position(f"h{a}", place, "H", a, None, ())))
        for bond in atom.GetBonds():
            b = bond.GetOtherAtomIdx(a)
            if distance[b] <= distance[a] or bond.IsInRing() or bond.GetBondType() != Chem.BondType.SINGLE:
                continue
            if b in fixed and b not in acid.sites:
                continue  # the OH of a carboxyl group
            if atom.GetFormalCharge() > 0 > acid.mol.GetAtomWithIdx(b).GetFormalCharge():
                continue  # one bond of a nitro group or an N-oxide
            atoms = _beyond(acid.mol, a, b)
            known = next((s for s in parts.substituents if s.atoms[0] == b and set(s.atoms) == set(atoms)), None)
            name = known.name if known is not None else _name(acid.mol, a, b, atoms)
            place = known.place if known is not None else _place(acid, parts, a)
            found.append(((distance[b], 0, b), Position(f"g{a}-{b}", place, name, a, b, atoms)))
    return tuple(p for _, p in sorted(found, key=lambda item: item[0]))


def find_position(acid: Acid, wanted: str) -> Position:
    """A position by its key, its number in `positions` (from 1), its place, or its label.

    Raises
    ------
    StructureError
        If there is none, or more than one of different kinds.
    """
    places = positions(acid)
    text = wanted.strip()
    if text.isascii() and text.isdigit() and 1 <= int(text) <= len(places):
        return places[int(text) - 1]
    for tried in ("key", "label", "place"):
        hits = [p for p in places if getattr(p, tried) == text]
        if hits and (len(hits) == 1 or len(set(_equivalent(acid, hits))) == 1):
            return hits[0]
        if hits:
            listed = ", ".join(f"{p.key} ({p.label})" for p in hits[:6])
            raise StructureError(f"position {text!r} fits {len(hits)} places: {listed}; name one by its key")
    listed = ", ".join(dict.fromkeys(p.label for p in places[:12]))
    raise StructureError(f"no position {text[:40]!r} in {acid.smiles}; there are {listed}")


def _equivalent(acid: Acid, places: Sequence[Position]) -> list[tuple[int, int]]:
    rank = list(Chem.CanonicalRankAtoms(acid.mol, breakTies=False))
    return [(rank[p.anchor], -1 if p.root is None else rank[p.root]) for p in places]


def _carboxyl_atoms(acid: Acid) -> frozenset[int]:
    atoms = set(acid.sites)
    for site in acid.sites:
        atoms |= {n.GetIdx() for n in acid.mol.GetAtomWithIdx(site).GetNeighbors() if n.GetAtomicNum() == 8}
    return frozenset(atoms)


def _beyond(mol: Chem.Mol, a: int, b: int) -> tuple[int, ...]:
    """Atoms on the far side of a bond that is in no ring."""
    seen, queue = {a, b}, [b]
    for atom in queue:
        for other in mol.GetAtomWithIdx(atom).GetNeighbors():
            if other.GetIdx() not in seen:
                seen.add(other.GetIdx())
                queue.append(other.GetIdx())
    return tuple(sorted(seen - {a}))


def _name(mol: Chem.Mol, a: int, b: int, atoms: tuple[int, ...]) -> str:
    """Condensed formula of a group where it is tabulated, else its SMILES."""
    from qsar.constants import substituent_by_smiles

    smiles = Chem.MolFragmentToSmiles(mol, (a, *atoms), atomSymbols=_symbols(mol, a), rootedAtAtom=a)
    smiles = re.sub(r"^\[?\*\]?", "[*]", smiles, count=1)
    group = Chem.MolFromSmiles(smiles)
    if group is None:
        return smiles
    known = substituent_by_smiles(Chem.MolToSmiles(group))
    return known.group if known is not None else smiles


def _symbols(mol: Chem.Mol, star: int) -> list[str]:
    return ["*" if atom.GetIdx() == star else atom.GetSmarts() for atom in mol.GetAtoms()]


def _place(acid: Acid, parts: Decomposition, atom: int) -> str:
    """Place of whatever hangs on an atom, in words."""
    from qsar.substituent_names import place_of

    owner = next((s for s in parts.substituents if atom in s.atoms), None)
    if atom == parts.site:
        return "on the carboxyl carbon"
    if owner is not None:
        return f"on {owner.label}"
    path = Chem.GetShortestPath(acid.mol, parts.site, atom)
    return place_of(acid.graph, parts.rule, parts.parent, (*path, -1), "")


def swap(acid: Acid, position: Position, group: Group) -> Acid:
    """The acid with another group at a place.

    Parameters
    ----------
    acid : Acid
    position : Position
        One of its `positions`.
    group : Group

    Returns
    -------
    Acid

    Raises
    ------
    StructureError
        If the group cannot be read, or what comes out is no acid that is predicted.
    """
    new = read_group(group.smiles)
    star = next(a for a in new.GetAtoms() if a.GetAtomicNum() == 0)
    first = star.GetNeighbors()[0].GetIdx()
    mol = Chem.RWMol(acid.mol)
    root = position.root
    if root is None:
        before = mol.GetNumAtoms()
        mol = Chem.RWMol(Chem.AddHs(mol, onlyOnAtoms=[position.anchor]))
        root = before  # the first hydrogen that was added
    # The first atom of the new group takes the very place of the old one: the order of the bonds around the
    # anchor, and with it the configuration there, stays.
    for bond in list(mol.GetAtomWithIdx(root).GetBonds()):
        if bond.GetOtherAtomIdx(root) != position.anchor:
            mol.RemoveBond(bond.GetBeginAtomIdx(), bond.GetEndAtomIdx())
    mol.ReplaceAtom(root, _fresh(new.GetAtomWithIdx(first)))
    index = {first: root}
    for atom in new.GetAtoms():
        if atom.GetIdx() not in (first, star.GetIdx()):
            index[atom.GetIdx()] = mol.AddAtom(atom)
    for bond in new.GetBonds():
        ends = bond.GetBeginAtomIdx(), bond.GetEndAtomIdx()
        if star.GetIdx() not in ends:
            mol.AddBond(index[ends[0]], index[ends[1]], bond.GetBondType())
            copy = mol.GetBondBetweenAtoms(index[ends[0]], index[ends[1]])
            copy.SetIsAromatic(bond.GetIsAromatic())
    for a in sorted((a for a in position.atoms if a != position.root), reverse=True):
        mol.RemoveAtom(a)
    return acid_from_mol(_without_hydrogens(mol.GetMol()))


def _without_hydrogens(mol: Chem.Mol) -> Chem.Mol:
    """Fold drawn hydrogens back, also one that no longer tells cis from trans."""
    options: Any = Chem.RemoveHsParameters()
    options.removeDefiningBondStereo = True
    try:
        Chem.SanitizeMol(mol)
        return Chem.RemoveHs(mol, options)
    except (Chem.MolSanitizeException, ValueError, RuntimeError) as problem:
        raise StructureError("this group cannot be attached there: a valence is exceeded") from problem


def _fresh(atom: Chem.Atom) -> Chem.Atom:
    copy = Chem.Atom(atom.GetAtomicNum())
    copy.SetFormalCharge(atom.GetFormalCharge())
    copy.SetIsAromatic(atom.GetIsAromatic())
    copy.SetNumExplicitHs(atom.GetNumExplicitHs())
    copy.SetNoImplicit(atom.GetNoImplicit())
    return copy


def analogues(
    model: Model,
    acid: Acid,
    position: Position,
    groups: Sequence[Group] | None = None,
    *,
    step: int = 1,
    low: float | None = None,
    high: float | None = None,
    coverage: float = 0.9,
) -> list[Analogue]:
    """Every group of a list at one place of an acid, each with its prediction.

    Parameters
    ----------
    model : Model
    acid : Acid
    position : Position
        Where the groups go.
    groups : sequence of Group, optional
        By default `known_groups`.
    step : int
        The step that sorts and filters, from 1.
    low, high : float, optional
        Only analogues whose predicted pKa lies in this range; the intervals say how sure that is.
    coverage : float
        Of the intervals.

    Returns
    -------
    list of Analogue
        By rising pKa; those that could not be used last. With a range of pKa these are left out.

    Raises
    ------
    UserError
        If `coverage` is out of range.
    """
    chosen = known_groups() if groups is None else groups
    asked: list[Acid | StructureError] = [acid]
    for group in chosen:
        try:
            asked.append(swap(acid, position, group))
        except StructureError as reason:
            asked.append(reason)
    start, *others = model.predict(asked, coverage=coverage)
    origin = _step(start, step)
    found = []
    for group, prediction in zip(chosen, others, strict=True):
        own = _step(prediction, step)
        change = None if own is None or origin is None else own.pka - origin.pka
        found.append(Analogue(group, prediction.structure, prediction, own, change))
    if groups is None:  # CO2H and CO2- of the table give the same acid
        found = list({a.smiles or a.group.name: a for a in reversed(found)}.values())[::-1]
    if low is not None or high is not None:
        found = [a for a in found if a.step is not None and _meets(a.step, low, high)]
    return sorted(found, key=lambda a: float("inf") if a.step is None else a.step.pka)


def _meets(step: StepPrediction, low: float | None, high: float | None) -> bool:
    return (low is None or step.pka >= low) and (high is None or step.pka <= high)


def _step(prediction: Prediction, step: int) -> StepPrediction | None:
    return next((s for s in prediction.steps if s.step == step), None)
