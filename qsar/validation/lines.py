r"""Plain Hammett and Taft lines: what a chemist does with a table of constants and a ruler.

A meta- or para-substituted benzoic acid lies on :math:`pK_a = a - \rho\sum\sigma` (Hammett 1937), an acid RCOOH
with R saturated at its first atom on :math:`pK_a = a - \rho^*\sigma^*` (Taft 1956). A group :math:`CR_1R_2R_3`
that is not tabulated has :math:`\sigma^* = \sum(\sigma^*_i - 0.49)/2.8`. All other acids get the mean of their
number of COOH groups, step and charge.
"""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray
from rdkit import Chem

from qsar.constants import substituent_by_smiles
from qsar.groups import CATIONIC, perceive
from qsar.structures import Acid

Floats = NDArray[np.float64]
Ints = NDArray[np.int64]
Flags = NDArray[np.bool_]

HYDROGEN_STAR = 0.49
PER_ATOM = 2.8


def group_on(mol: Chem.Mol, carrier: int, first: int) -> str | None:
    """SMILES, with a dummy for the carrier, of the group that begins at `first`; None if it closes a ring."""
    seen, queue = {first}, [first]
    for a in queue:
        for b in mol.GetAtomWithIdx(a).GetNeighbors():
            i = b.GetIdx()
            if i == carrier:
                if a != first:
                    return None
            elif i not in seen:
                seen.add(i)
                queue.append(i)
    part = Chem.RWMol(mol)
    part.ReplaceAtom(carrier, Chem.Atom(0))
    for a in sorted(set(range(mol.GetNumAtoms())) - seen - {carrier}, reverse=True):
        part.RemoveAtom(a)
    return str(Chem.MolToSmiles(part, isomericSmiles=False))


def hammett_sum(acid: Acid) -> float | None:
    """Sum of sigma over the ring of a benzoic acid, or None if it is no such acid or a group is not tabulated.

    Returns
    -------
    float or None
        None too where an ortho position is taken or the ring is fused.
    """
    found = ring_groups(acid)
    if found is None:
        return None
    total = 0.0
    for bonds, smiles in found:
        constants = substituent_by_smiles(smiles) if bonds in (2, 3) else None
        value = None if constants is None else constants.sigma_meta if bonds == 2 else constants.sigma_para
        if value is None:
            return None
        total += value
    return total


def ring_groups(acid: Acid) -> list[tuple[int, str]] | None:
    """Groups on the ring of a monobasic benzoic acid: 1, 2 or 3 for ortho, meta or para, and SMILES."""
    if len(acid.sites) != 1:
        return None
    mol = acid.mol
    alpha = _alpha(acid)
    rings = [r for r in mol.GetRingInfo().AtomRings() if alpha is not None and alpha in r]
    if len(rings) != 1 or len(rings[0]) != 6:
        return None
    ring = rings[0]
    if not all(mol.GetAtomWithIdx(a).GetIsAromatic() and mol.GetAtomWithIdx(a).GetAtomicNum() == 6 for a in ring):
        return None
    start = ring.index(alpha)
    found = []
    for k in range(1, 6):
        a = ring[(start + k) % 6]
        for b in mol.GetAtomWithIdx(a).GetNeighbors():
            if b.GetIdx() not in ring:
                smiles = group_on(mol, a, b.GetIdx())
                if smiles is None:
                    return None
                found.append((min(k, 6 - k), smiles))
    return found


def taft_star(acid: Acid) -> float | None:
    """sigma* of R in a monobasic acid RCOOH with R saturated at its first atom, or None where it has none."""
    alpha = _alpha(acid)
    if len(acid.sites) != 1 or alpha is None:
        return None
    atom = acid.mol.GetAtomWithIdx(alpha)
    if atom.GetHybridization() != Chem.HybridizationType.SP3 or atom.IsInRing():
        return None
    return _star(acid.mol, acid.sites[0], alpha)


def _star(mol: Chem.Mol, carrier: int, first: int) -> float | None:
    smiles = group_on(mol, carrier, first)
    constants = None if smiles is None else substituent_by_smiles(smiles)
    if constants is not None and constants.taft_star is not None:
        return constants.taft_star
    atom = mol.GetAtomWithIdx(first)
    saturated = atom.GetAtomicNum() == 6 and atom.GetHybridization() == Chem.HybridizationType.SP3
    if not saturated or atom.IsInRing():
        return None
    total = 0.0
    for b in atom.GetNeighbors():
        if b.GetIdx() != carrier:
            value = _star(mol, first, b.GetIdx())
            if value is None:
                return None
            total += value - HYDROGEN_STAR
    return total / PER_ATOM


def _alpha(acid: Acid) -> int | None:
    carbon = acid.mol.GetAtomWithIdx(acid.sites[0])
    others = [b.GetIdx() for b in carbon.GetNeighbors() if b.GetAtomicNum() != 8]
    return others[0] if others else None


def line_of(acid: Acid, step: int) -> tuple[str, float]:
    """The line that an acid's step lies on, and its place there.

    Returns
    -------
    series : str
        ``"Hammett"``, ``"Taft"``, or one for acids without a line, which share a mean.
    x : float
        Sum of sigma or sigma*; 0 where there is no line.
    """
    charged = any(group.kind in CATIONIC for group in perceive(acid.graph))
    if len(acid.sites) == 1 and not charged:
        sigma = hammett_sum(acid)
        if sigma is not None:
            return "Hammett", sigma
        star = taft_star(acid)
        if star is not None:
            return "Taft", star
    return f"{len(acid.sites)} COOH, step {step}{', cation' if charged else ''}", 0.0


Place = tuple[str, float]


def places(acids: Sequence[Acid], steps: Ints) -> list[Place]:
    """`line_of` each row: what does not depend on which rows are known."""
    return [line_of(acid, int(step)) for acid, step in zip(acids, steps, strict=True)]


def line_predictions(places: Sequence[Place], pka: Floats, train: Flags) -> Floats:
    """Fit each line to the rows in `train` and predict all rows.

    Parameters
    ----------
    places : sequence of (str, float)
        From `places`, one for each row.
    pka : ndarray, shape (n,)
    train : ndarray of bool, shape (n,)

    Returns
    -------
    ndarray, shape (n,)
        The mean of the training rows where a series has fewer than three of them.
    """
    series, x = np.array([p[0] for p in places]), np.array([p[1] for p in places])
    result = np.full(len(pka), pka[train].mean())
    for name in np.unique(series):
        own = series == name
        known = own & train
        if known.sum() < 3:
            continue
        if np.ptp(x[known]) > 0:
            slope, offset = np.polyfit(x[known], pka[known], 1)
            result[own] = offset + slope * x[own]
        else:
            result[own] = pka[known].mean()
    return result
