"""Groups that can be put in place of another: those with tabulated constants, and any that is drawn as a SMILES."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cache

from rdkit import Chem

from qsar.structures import ELEMENTS, StructureError

MOST_GROUP_ATOMS = 30


@dataclass(frozen=True, slots=True)
class Group:
    """A group that can be put in place of another.

    Attributes
    ----------
    name : str
        Condensed formula or name.
    smiles : str
        SMILES with ``[*]`` where it is attached by a single bond.
    """

    name: str
    smiles: str


@cache
def known_groups() -> tuple[Group, ...]:
    """The groups with tabulated constants, hydrogen first; those that bring a second acid proton are among them."""
    from qsar.constants import substituents

    return tuple(Group(s.group, s.smiles) for s in substituents() if _is_predictable(s.smiles))


def _is_predictable(smiles: str) -> bool:
    """Whether a tabulated group has one attachment and none but elements that acids are predicted with."""
    if _attachments(smiles) != 1:
        return False
    return all(a.GetAtomicNum() in ELEMENTS or a.GetAtomicNum() == 0 for a in Chem.MolFromSmiles(smiles).GetAtoms())


def group_named(text: str) -> Group:
    """A group by its name in the table, or by a SMILES with ``*``.

    Raises
    ------
    StructureError
        If it is neither.
    """
    wanted = text.strip()
    for group in known_groups():
        if wanted in (group.name, group.smiles):
            return group
    if "*" not in wanted:
        raise StructureError(f"{wanted[:40]!r} is no group of the list; give its SMILES with * where it is attached")
    read_group(wanted)
    return Group(wanted, wanted)


def read_group(smiles: str) -> Chem.Mol:
    """Molecule of a group, its attachment as a dummy atom.

    Raises
    ------
    StructureError
        If it cannot be read, or is not attached by exactly one single bond.
    """
    short = smiles[:40]
    if _attachments(smiles) != 1:
        raise StructureError(f"group {short!r}: a SMILES with one * on a single bond is expected, such as *C#N")
    mol = Chem.MolFromSmiles(smiles)
    if mol.GetNumHeavyAtoms() > MOST_GROUP_ATOMS + 1:
        raise StructureError(f"group {short!r} has more than {MOST_GROUP_ATOMS} atoms")
    return mol


def _attachments(smiles: str) -> int:
    """Number of attachment points on single bonds; 0 for what is not a group."""
    mol = Chem.MolFromSmiles(smiles) if 0 < len(smiles) <= 500 else None
    if mol is None or len(Chem.GetMolFrags(mol)) != 1:
        return 0
    stars = [a for a in mol.GetAtoms() if a.GetAtomicNum() == 0]
    single = [
        a for a in stars if a.GetDegree() == 1 and a.GetBonds()[0].GetBondType() == Chem.BondType.SINGLE
    ]
    return len(single) if len(single) == len(stars) else 0
