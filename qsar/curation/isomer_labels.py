"""Isomers named by a word: cis, trans, meso, racemic.

Collections of constants often draw one structure without stereo marks and say in the label of each constant
which isomer it belongs to. The functions here put the word into the structure, and give compounds that are
mirror images of each other one spelling, since they have one pKa in water.
"""

from __future__ import annotations

from functools import lru_cache

from rdkit import Chem
from rdkit.Chem.EnumerateStereoisomers import EnumerateStereoisomers, StereoEnumerationOptions

_UNSPECIFIED = Chem.ChiralType.CHI_UNSPECIFIED
_RACEMIC = frozenset({"dl", "dl*", "d", "l", "d and dl", "d[+]", "d[-]", "l[+]", "l[-]"})
_WORDS = _RACEMIC | {"cis", "trans", "meso", "h2o cis"}


def is_isomer_word(word: str) -> bool:
    """Whether a label names an isomer that :func:`isomer` understands."""
    return word.strip().lower() in _WORDS


def isomer(smiles: str, word: str) -> str | None:
    """Structure of the isomer that a word names.

    Parameters
    ----------
    smiles : str
        The acid; stereo marks on what the word describes are replaced.
    word : str
        cis, trans, meso, or one of DL, D, L and their spellings.

    Returns
    -------
    str or None
        SMILES in the spelling of :func:`one_spelling`, or None where the word does not settle the isomer.
    """
    word = word.strip().lower().removeprefix("h2o ")
    if word in ("cis", "trans"):
        found = _double_bond_isomer(smiles, word) or _ring_isomer(smiles, word)
    else:
        found = _pair_isomer(smiles, meso=word == "meso")
    return one_spelling(found) if found else None


@lru_cache(maxsize=8192)
def one_spelling(smiles: str) -> str:
    """One canonical SMILES for a compound and its mirror image.

    A single stereocentre, which water cannot tell from its mirror image, is written without mark; of two
    mirror images with several centres the one that sorts first stands for both.

    Parameters
    ----------
    smiles : str
        A structure that RDKit can read.

    Returns
    -------
    str
        Canonical SMILES.
    """
    mol = Chem.MolFromSmiles(smiles)
    tagged = [a for a in mol.GetAtoms() if a.GetChiralTag() != _UNSPECIFIED]
    if not tagged:
        return str(Chem.MolToSmiles(mol))
    if len(stereocentres(mol)) == 1:
        for atom in tagged:
            atom.SetChiralTag(_UNSPECIFIED)
        return _canonical(mol)
    spellings = [_canonical(mol)]
    for atom in tagged:
        atom.InvertChirality()
    return min(*spellings, _canonical(mol))


@lru_cache(maxsize=8192)
def without_centres(smiles: str) -> str:
    """Canonical SMILES without marks on tetrahedral centres; those on double bonds stay."""
    mol = Chem.MolFromSmiles(smiles)
    for atom in mol.GetAtoms():
        atom.SetChiralTag(_UNSPECIFIED)
    return _canonical(mol)


def stereocentres(mol: Chem.Mol) -> list[int]:
    """Atoms that are stereocentres, whether their configuration is stated or not."""
    found = Chem.FindMolChiralCenters(  # type: ignore[no-untyped-call]
        mol, includeUnassigned=True, useLegacyImplementation=False
    )
    return [index for index, _ in found]


def _canonical(mol: Chem.Mol) -> str:
    again = Chem.MolFromSmiles(Chem.MolToSmiles(mol))  # drops marks that have lost their meaning
    return str(Chem.MolToSmiles(again))


def _isomers(smiles: str) -> list[Chem.Mol]:
    mol = Chem.MolFromSmiles(smiles)
    options = StereoEnumerationOptions(unique=True, maxIsomers=16)  # type: ignore[no-untyped-call]
    return list(EnumerateStereoisomers(mol, options=options))  # type: ignore[no-untyped-call]


def _double_bond_isomer(smiles: str, word: str) -> str | None:
    """The one C=C that COOH sits on, with the carbon chain on the same side or across."""
    mol = Chem.MolFromSmiles(smiles)
    matches = mol.GetSubstructMatches(_ALKENOIC)
    if not matches or len({frozenset(match[1:]) for match in matches}) > 1:
        return None
    carboxyl, near, far = matches[0]
    bond = mol.GetBondBetweenAtoms(near, far)
    other = None if bond.IsInRing() else _main_chain(mol, near, far, {match[0] for match in matches})
    if other is None:
        return None
    pair = (carboxyl, other) if bond.GetBeginAtomIdx() == near else (other, carboxyl)
    bond.SetStereoAtoms(*pair)
    bond.SetStereo(Chem.BondStereo.STEREOCIS if word == "cis" else Chem.BondStereo.STEREOTRANS)
    return _canonical(mol)


def _main_chain(mol: Chem.Mol, near: int, far: int, carboxyls: set[int]) -> int | None:
    """Atom that carries on the chain behind a double bond; None where two could."""
    chain = [a for a in mol.GetAtomWithIdx(far).GetNeighbors() if a.GetIdx() != near]
    carbons = [a.GetIdx() for a in chain if a.GetAtomicNum() == 6]
    acids = [index for index in carbons if index in carboxyls]
    for choice in (acids, carbons, [a.GetIdx() for a in chain] if not carbons else []):
        if len(choice) == 1:
            return int(choice[0])
    return None


_ALKENOIC = Chem.MolFromSmarts("[CX3;$(C(=O)[OX2H1])]-[CX3;!a]=[CX3;!a]")


def _ring_isomer(smiles: str, word: str) -> str | None:
    """Two marked or markable centres of one ring, each with one substituent and one hydrogen."""
    mol = Chem.MolFromSmiles(without_centres(smiles))
    centres = stereocentres(mol)
    rings = [ring for ring in mol.GetRingInfo().AtomRings() if set(centres) <= set(ring)]
    if len(centres) != 2 or not rings or any(mol.GetAtomWithIdx(c).GetTotalNumHs() != 1 for c in centres):
        return None
    for candidate in _isomers(Chem.MolToSmiles(mol)):
        pair = stereocentres(candidate)
        ring = next((r for r in candidate.GetRingInfo().AtomRings() if set(pair) <= set(r)), None)
        if len(pair) == 2 and ring and (_same_side(candidate, ring, pair) == (word == "cis")):
            return _canonical(candidate)
    return None


def _same_side(mol: Chem.Mol, ring: tuple[int, ...], pair: list[int]) -> bool:
    """Whether the substituents of two ring atoms lie on one side: equal handedness seen along the ring."""
    first, second = (_handedness(mol, ring, index) for index in pair)
    return first == second


def _handedness(mol: Chem.Mol, ring: tuple[int, ...], index: int) -> bool:
    atom = mol.GetAtomWithIdx(index)
    place = ring.index(index)
    before, after = ring[place - 1], ring[(place + 1) % len(ring)]
    drawn = [bond.GetOtherAtomIdx(index) for bond in atom.GetBonds()]
    outside = next(n for n in drawn if n not in (before, after))
    wanted = [before, after, outside]
    swaps = sum(drawn.index(wanted[i]) > drawn.index(wanted[j]) for i in range(3) for j in range(i + 1, 3))
    clockwise: bool = atom.GetChiralTag() == Chem.ChiralType.CHI_TETRAHEDRAL_CW
    return clockwise == (swaps % 2 == 0)


def _pair_isomer(smiles: str, *, meso: bool) -> str | None:
    """Of a compound with two like centres the form that is its own mirror image, or the one that is not."""
    bare = without_centres(smiles)
    if len(stereocentres(Chem.MolFromSmiles(bare))) != 2:
        return None
    spellings = {_canonical(candidate) for candidate in _isomers(bare)}
    own_mirror = {s for s in spellings if _canonical(_mirrored(s)) == s}
    if len(own_mirror) != 1 or len(spellings) != 3:
        return None
    return own_mirror.pop() if meso else min(spellings - own_mirror)


def _mirrored(smiles: str) -> Chem.Mol:
    mol = Chem.MolFromSmiles(smiles)
    for atom in mol.GetAtoms():
        atom.InvertChirality()
    return mol
