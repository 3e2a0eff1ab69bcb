"""Coalition molecules: the acid with hydrogen in place of the substituents that a coalition leaves out.

k bonds lost get k hydrogens. A double bond keeps its stated configuration as long as both ends have a substituent.
What is asked of such a molecule is the micro pKa of the same carboxyl group with the other carboxyl groups in the
same charge state; amines are protonated as in any acid.
"""

from __future__ import annotations

from collections.abc import Collection, Iterable
from dataclasses import dataclass

from rdkit import Chem

from qsar.isomers import configurations
from qsar.structures import Acid
from qsar.substituents import Decomposition

_SITE, _IONISED, _NEUTRAL = 1, 2, 3


@dataclass(frozen=True, slots=True)
class Hypothetical:
    """A coalition molecule as a new structure.

    Attributes
    ----------
    smiles : str
        Canonical.
    key : str
        Equal for molecules in which the same group is asked about in the same charge state: a
        SMILES with the site and the other carboxyl carbons marked by atom map numbers.
    """

    smiles: str
    key: str


def hypothetical(acid: Acid, parts: Decomposition, ionised: frozenset[int], kept: Collection[int]) -> Hypothetical:
    """The molecule that keeps some substituents.

    Parameters
    ----------
    acid : Acid
    parts : Decomposition
    ionised : frozenset of int
        Carboxyl carbons without their proton.
    kept : collection of int
        Positions of the substituents that stay.

    Returns
    -------
    Hypothetical
    """
    atoms = set(parts.parent)
    for position in kept:
        atoms.update(parts.substituents[position].atoms)
    mol = _without(acid, atoms)
    plain = Chem.Mol(mol)
    for atom in mol.GetAtoms():
        was = atom.GetIntProp("was")
        if was in acid.sites:
            atom.SetAtomMapNum(_SITE if was == parts.site else _IONISED if was in ionised else _NEUTRAL)
    key = Chem.MolToSmiles(mol)
    return Hypothetical(Chem.MolToSmiles(plain), key)


def _without(acid: Acid, atoms: set[int]) -> Chem.Mol:
    """The molecule cut down to some of its atoms, open valences filled with hydrogen."""
    source = acid.mol
    mol = Chem.RWMol(source)
    for atom in mol.GetAtoms():
        atom.SetIntProp("was", atom.GetIdx())
    gone = [a.GetIdx() for a in source.GetAtoms() if a.GetIdx() not in atoms]
    if gone:
        stereo = _configurations(acid, atoms)
        for bond in mol.GetBonds():
            bond.SetStereo(Chem.BondStereo.STEREONONE)
            if bond.GetBondDir() in (Chem.BondDir.ENDUPRIGHT, Chem.BondDir.ENDDOWNRIGHT):
                bond.SetBondDir(Chem.BondDir.NONE)
        for a in sorted(atoms):
            _fill(mol, source, a, atoms)
        mol.BeginBatchEdit()
        for a in gone:
            mol.RemoveAtom(a)
        mol.CommitBatchEdit()
        Chem.SanitizeMol(mol)
        Chem.AssignStereochemistry(mol, cleanIt=True, force=True)  # centres that are none any more
        _restore(mol, stereo)
        Chem.AssignStereochemistry(mol, cleanIt=False, force=True)
    return mol


def _fill(mol: Chem.RWMol, source: Chem.Mol, a: int, atoms: set[int]) -> None:
    """Give an atom a hydrogen for each bond that it loses."""
    lost = 0
    old, new = source.GetAtomWithIdx(a), mol.GetAtomWithIdx(a)
    for bond in old.GetBonds():
        other = bond.GetOtherAtom(old)
        if other.GetIdx() in atoms:
            continue
        if old.GetFormalCharge() > 0 > other.GetFormalCharge():
            new.SetFormalCharge(old.GetFormalCharge() - 1)  # an N-oxide gives its amine, not a cation
            continue
        lost += 1 if bond.GetIsAromatic() else round(bond.GetBondTypeAsDouble())
    if lost or new.GetFormalCharge() != old.GetFormalCharge():
        new.SetNumExplicitHs(old.GetTotalNumHs() + lost)
        new.SetNoImplicit(True)
        if old.GetChiralTag() != Chem.ChiralType.CHI_UNSPECIFIED and lost + old.GetTotalNumHs() > 1:
            new.SetChiralTag(Chem.ChiralType.CHI_UNSPECIFIED)


def _configurations(acid: Acid, atoms: set[int]) -> list[tuple[int, int, int, int, int]]:
    """Double bonds that keep a substituent at both ends: the bond, one substituent at each end, cis (1) or trans."""
    found = []
    for (a, b), pairs in acid.graph.double_stereo.items():
        kept = [(x, y, sign) for (x, y), sign in pairs.items() if x in atoms and y in atoms]
        if a in atoms and b in atoms and kept:
            x, y, sign = min(kept)
            found.append((a, b, x, y, sign))
    return found


def _restore(mol: Chem.RWMol, stereo: Iterable[tuple[int, int, int, int, int]]) -> None:
    place = {atom.GetIntProp("was"): atom.GetIdx() for atom in mol.GetAtoms()}
    for a, b, x, y, sign in stereo:
        bond = mol.GetBondBetweenAtoms(place[a], place[b])
        first, second = (x, y) if bond.GetBeginAtomIdx() == place[a] else (y, x)
        bond.SetStereoAtoms(place[first], place[second])
        bond.SetStereo(Chem.BondStereo.STEREOCIS if sign > 0 else Chem.BondStereo.STEREOTRANS)


@dataclass(frozen=True, slots=True)
class Case:
    """A molecule to evaluate: one configuration of a hypothetical molecule.

    Attributes
    ----------
    acid : Acid
    site : int
    ionised : frozenset of int
    """

    acid: Acid
    site: int
    ionised: frozenset[int]


def cases(molecule: Hypothetical) -> list[Case]:
    """The configurations that a hypothetical molecule leaves open; its value is their mean."""
    fresh = Chem.MolFromSmiles(molecule.key)
    site = next(a.GetIdx() for a in fresh.GetAtoms() if a.GetAtomMapNum() == _SITE)
    ionised = frozenset(a.GetIdx() for a in fresh.GetAtoms() if a.GetAtomMapNum() == _IONISED)
    sites = tuple(a.GetIdx() for a in fresh.GetAtoms() if a.GetAtomMapNum())
    for atom in fresh.GetAtoms():
        atom.SetAtomMapNum(0)
    Chem.AssignStereochemistry(fresh, cleanIt=True, force=True)
    return open_cases(Acid(molecule.smiles, fresh, sites), site, ionised)


def open_cases(acid: Acid, site: int, ionised: frozenset[int]) -> list[Case]:
    """The configurations of an acid that are open, the site and its charge state carried over."""
    if not _may_be_open(acid):
        return [Case(acid, site, ionised)]
    isomers, _ = configurations(acid)
    if len(isomers) == 1:
        return [Case(acid, site, ionised)]
    result = []
    for isomer in isomers:
        match = match_atoms(acid, isomer)
        result.append(Case(isomer, match[site], frozenset(match[s] for s in ionised)))
    return result


def match_atoms(acid: Acid, isomer: Acid) -> tuple[int, ...]:
    """For each atom of an acid the same atom of an isomer of it."""
    match = isomer.mol.GetSubstructMatch(acid.mol, useChirality=True)
    return tuple(match or isomer.mol.GetSubstructMatch(acid.mol))


def _may_be_open(acid: Acid) -> bool:
    graph = acid.graph
    ring_acids = sum(any(graph.ring_size[b] and graph.saturated(b) for b in graph.neighbours[s]) for s in acid.sites)
    if ring_acids > 1:
        return True
    return any(
        order == 2.0 and graph.numbers[a] == graph.numbers[b] == 6 and not (graph.ring_size[a] and graph.ring_size[b])
        for a, neighbours in enumerate(graph.neighbours)
        for b, order in zip(neighbours, graph.orders[a], strict=True)
    )
