"""Acyclic and monocyclic carboxylic acids drawn at random, and edits of them."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from random import Random

from hypothesis import assume
from hypothesis import strategies as st
from rdkit import Chem

from qsar.structures import StructureError, read_acid

GROUPS = {"F": "F", "Cl": "Cl", "Br": "Br", "I": "I", "CN": "C#N", "NO2": "[N+](=O)[O-]"}
_ARYL = ("c1ccccc1", "c1ccc(C)cc1", "c1ccc(F)cc1", "c1cccs1", "c1ccco1", "Oc1ccccc1", "c1cccc(OC)c1")
_GROUPS = ("O", "OC", "N", "SC", "F", "Cl", "C#N", "[N+](=O)[O-]", "C(C)(C)C", "C(=O)OC", "C(N)=O", "NC(C)=O", "C=C")


@dataclass(frozen=True)
class Skeleton:
    """An acid as an RDKit molecule with atom 0 the carboxyl carbon, and its saturated carbons that bear H."""

    mol: Chem.Mol

    @property
    def smiles(self) -> str:
        return Chem.MolToSmiles(self.mol)

    @property
    def carriers(self) -> list[int]:
        """Saturated carbons with a hydrogen."""
        return [
            a.GetIdx()
            for a in self.mol.GetAtoms()
            if a.GetAtomicNum() == 6 and a.GetTotalNumHs() > 0 and a.GetHybridization() == Chem.HybridizationType.SP3
        ]

    def distance(self, atom: int) -> int:
        """Bonds from the carboxyl carbon."""
        return int(Chem.GetDistanceMatrix(self.mol)[0][atom])

    def steps_away(self) -> list[tuple[int, int]]:
        """Neighbouring carriers, the second one bond further from the carboxyl carbon."""
        carriers = set(self.carriers)
        ends = [(b.GetBeginAtomIdx(), b.GetEndAtomIdx()) for b in self.mol.GetBonds()]
        pairs = [p for a, b in ends for p in ((a, b), (b, a)) if a in carriers and b in carriers]
        return [(a, b) for a, b in pairs if self.distance(b) == self.distance(a) + 1]

    def with_group(self, atom: int, group: str) -> Skeleton:
        """The acid with a group in place of a hydrogen."""
        part = Chem.MolFromSmiles(GROUPS[group])
        joined = Chem.RWMol(Chem.CombineMols(self.mol, part))
        joined.AddBond(atom, self.mol.GetNumAtoms(), Chem.BondType.SINGLE)
        Chem.SanitizeMol(joined)
        return Skeleton(joined.GetMol())


@st.composite
def skeletons(draw: st.DrawFn) -> Skeleton:
    """Monobasic acids with at least one saturated carbon that bears hydrogen.

    Hypothesis draws a seed and the acid grows from it: drawn choice by choice, most acids would come up again and
    again.
    """
    skeleton = _grown(Random(draw(st.integers(0, 2**48))))
    assume(skeleton is not None)
    return skeleton


def _grown(rng: Random) -> Skeleton | None:
    mol = Chem.RWMol(Chem.MolFromSmiles("C(=O)O"))
    mol.AddBond(0, mol.AddAtom(Chem.Atom("C")), Chem.BondType.SINGLE)
    for _ in range(rng.randint(0, 10)):
        _grow(rng, mol)
    kind = rng.random()
    if kind < 0.45:
        _close_ring(rng, mol)
    elif kind < 0.7:
        _decorate(rng, mol, _ARYL)
    for _ in range(rng.randint(0, 2)):
        _decorate(rng, mol, _GROUPS)
    try:
        Chem.SanitizeMol(mol)
        acid = read_acid(Chem.MolToSmiles(mol))
    except (Chem.MolSanitizeException, StructureError):
        return None
    skeleton = Skeleton(mol.GetMol())
    return skeleton if len(acid.sites) == 1 and skeleton.carriers else None


def _free(mol: Chem.RWMol) -> list[int]:
    """Atoms other than those of the carboxyl group that can bear one more bond."""
    return [a.GetIdx() for a in mol.GetAtoms() if a.GetIdx() > 2 and _room(a) > 0]


def _room(atom: Chem.Atom) -> int:
    """Bonds that an atom can still form."""
    used = sum(int(b.GetBondTypeAsDouble()) for b in atom.GetBonds())
    return {6: 4, 7: 3, 8: 2, 16: 2}.get(atom.GetAtomicNum(), 0) - used


def _grow(rng: Random, mol: Chem.RWMol) -> None:
    places = [a for a in _free(mol) if mol.GetAtomWithIdx(a).GetAtomicNum() in (6, 7)]
    hetero = [a for a in _free(mol) if mol.GetAtomWithIdx(a).GetAtomicNum() != 6]
    place = rng.choice([*places[-4:], *hetero])
    on_carbon = mol.GetAtomWithIdx(place).GetAtomicNum() == 6
    crowded = any(n.GetAtomicNum() != 6 for n in mol.GetAtomWithIdx(place).GetNeighbors())
    element = rng.choices("CONS", (20, 2, 2, 1))[0] if on_carbon and not crowded else "C"
    double = on_carbon and element in "CO" and rng.random() < 0.12 and _room(mol.GetAtomWithIdx(place)) > 1
    mol.AddBond(place, mol.AddAtom(Chem.Atom(element)), Chem.BondType.DOUBLE if double else Chem.BondType.SINGLE)


def _close_ring(rng: Random, mol: Chem.RWMol) -> None:
    distances = Chem.GetDistanceMatrix(mol, force=True)
    places = [a for a in _free(mol) if mol.GetAtomWithIdx(a).GetAtomicNum() == 6]
    pairs = [(a, b) for a in places for b in places if a < b and 2 <= distances[a][b] <= 6]
    wide = [(a, b) for a, b in pairs if distances[a][b] >= 4]
    if pairs:
        mol.AddBond(*rng.choice(wide or pairs), Chem.BondType.SINGLE)


def _decorate(rng: Random, mol: Chem.RWMol, parts: Sequence[str]) -> None:
    places = [a for a in _free(mol) if mol.GetAtomWithIdx(a).GetAtomicNum() == 6]
    if places:
        offset = mol.GetNumAtoms()
        mol.InsertMol(Chem.MolFromSmiles(rng.choice(parts)))
        mol.AddBond(rng.choice(places), offset, Chem.BondType.SINGLE)
