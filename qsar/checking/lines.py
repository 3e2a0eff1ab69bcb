"""Rows of a table against linear free-energy lines with published group constants.

The constants come from :mod:`qsar.constants`, which names the source of each.
"""

from __future__ import annotations

import math
from collections.abc import Iterable, Sequence
from dataclasses import dataclass

import numpy as np
from rdkit import Chem

from qsar.checking.rows import TableRow
from qsar.constants import Substituent, substituents

BENZOIC = 4.20
"""pKa of benzoic acid, from which Hammett's constants are counted (Hansch, Leo, Taft 1991)."""

IONISED_GROUPS = frozenset({"NH2", "NHCH3", "N(CH3)2", "NHC2H5", "N(C2H5)2", "NHNH2", "CO2H"})
"""Groups that gain a proton before the carboxyl group loses its own, or are a second carboxyl group."""

HINDERED_BELOW = -1.0
"""Taft's steric constant E_s below which an alkyl group counts as hindered (that of t-C4H9 is -1.54)."""


@dataclass(frozen=True)
class Point:
    """One acid on a line.

    Attributes
    ----------
    row : TableRow
    group : str
        The substituent, with its position where there are several.
    constant : float
        Its group constant.
    """

    row: TableRow
    group: str
    constant: float


@dataclass(frozen=True)
class Line:
    """Least-squares line pKa = intercept + slope * constant.

    Attributes
    ----------
    slope, intercept : float
    points : tuple of Point
    residuals : tuple of float
        Measured minus line, pKa units, in the order of the points.
    """

    slope: float
    intercept: float
    points: tuple[Point, ...]
    residuals: tuple[float, ...]

    @property
    def rms(self) -> float:
        """Root mean square of the residuals, pKa units."""
        return math.sqrt(sum(r * r for r in self.residuals) / len(self.residuals))

    def beyond(self, limit: float) -> list[tuple[Point, float]]:
        """Points further than `limit` from the line, with their residuals, the furthest first."""
        far = [(p, r) for p, r in zip(self.points, self.residuals, strict=True) if abs(r) > limit]
        return sorted(far, key=lambda pair: -abs(pair[1]))


def fit(points: Sequence[Point]) -> Line:
    """Draw the least-squares line.

    Parameters
    ----------
    points : sequence of Point
        At least three, not all of one constant.

    Returns
    -------
    Line

    Raises
    ------
    ValueError
        If there are too few points.
    """
    if len({p.constant for p in points}) < 3:
        raise ValueError(f"{len(points)} acids of this series in the table; a line needs three different groups")
    x = np.array([p.constant for p in points])
    y = np.array([p.row.pka for p in points])
    slope, intercept = np.polyfit(x, y, 1)
    residuals = y - (intercept + slope * x)
    return Line(float(slope), float(intercept), tuple(points), tuple(float(r) for r in residuals))


def left_out(points: Sequence[Point]) -> list[float]:
    """Measured minus the line drawn through all other points, pKa units, in the order of the points."""
    return [
        point.row.pka - (line.intercept + line.slope * point.constant)
        for i, point in enumerate(points)
        for line in [fit([p for j, p in enumerate(points) if j != i])]
    ]


def hammett_points(rows: Iterable[TableRow]) -> list[Point]:
    """Acids of a table with one substituent in meta or para position and its sigma constant.

    Parameters
    ----------
    rows : iterable of TableRow

    Returns
    -------
    list of Point
        Amino and ionic groups and second carboxyl groups are left out.
    """
    wanted: dict[str, tuple[str, float]] = {}
    for group in substituents():
        if _ionised(group):
            continue
        for position, sigma in (("m", group.sigma_meta), ("p", group.sigma_para)):
            if sigma is not None:
                name = "H" if group.group == "H" else f"{position}-{group.group}"
                wanted.setdefault(_benzoic(group, position), (name, sigma))
    return [Point(row, *wanted[row.smiles]) for row in rows if row.step == 1 and row.smiles in wanted]


def taft_points(rows: Iterable[TableRow]) -> list[Point]:
    """Acids R-COOH of a table, R unhindered and bound by a saturated carbon atom or hydrogen, with sigma*.

    The relation pKa = 4.66 - 1.62 sigma* is that of Perrin, Dempsey and Serjeant, *pKa Prediction for Organic
    Acids and Bases*, 1981 (from memory).

    Returns
    -------
    list of Point
    """
    wanted: dict[str, tuple[str, float]] = {}
    for group in substituents():
        if group.taft_star is None or group.es is None or group.es < HINDERED_BELOW:
            continue
        if _ionised(group) or not _saturated_end(group):
            continue
        wanted[_joined(group, "C(=O)O")] = (group.group, group.taft_star)
    return [Point(row, *wanted[row.smiles]) for row in rows if row.step == 1 and row.smiles in wanted]


def chain_gaps(rows: Iterable[TableRow], longest: int = 10) -> dict[int, float]:
    """Second minus first pKa of the straight-chain dicarboxylic acids.

    Returns
    -------
    dict of int to float
        By number of carbon atoms, from oxalic acid (2) up; acids that lack a step are left out.
    """
    by_key = {(row.smiles, row.step): row.pka for row in rows}
    gaps = {}
    for carbons in range(2, longest + 1):
        smiles = str(Chem.MolToSmiles(Chem.MolFromSmiles("OC(=O)" + "C" * (carbons - 2) + "C(=O)O")))
        if (smiles, 1) in by_key and (smiles, 2) in by_key:
            gaps[carbons] = by_key[smiles, 2] - by_key[smiles, 1]
    return gaps


def _benzoic(group: Substituent, position: str) -> str:
    ring = "c1cccc(C(=O)O)c1" if position == "m" else "c1ccc(C(=O)O)cc1"
    return _joined(group, ring)


def _joined(group: Substituent, rest: str) -> str:
    """Canonical SMILES of the group on the first atom of the rest."""
    side, core = Chem.MolFromSmiles(group.smiles), Chem.MolFromSmiles(rest)
    if group.group == "H":
        return str(Chem.MolToSmiles(core))
    joined = Chem.RWMol(Chem.CombineMols(side, core))
    dummy = next(atom for atom in joined.GetAtoms() if atom.GetAtomicNum() == 0)
    joined.AddBond(dummy.GetNeighbors()[0].GetIdx(), side.GetNumAtoms(), Chem.BondType.SINGLE)
    joined.RemoveAtom(dummy.GetIdx())
    Chem.SanitizeMol(joined)
    return str(Chem.MolToSmiles(joined, isomericSmiles=False))


def _ionised(group: Substituent) -> bool:
    return group.group in IONISED_GROUPS or Chem.GetFormalCharge(Chem.MolFromSmiles(group.smiles)) != 0


def _saturated_end(group: Substituent) -> bool:
    if group.group == "H":
        return True
    mol = Chem.MolFromSmiles(group.smiles)
    dummy = next(atom for atom in mol.GetAtoms() if atom.GetAtomicNum() == 0)
    end = dummy.GetNeighbors()[0]
    saturated: bool = end.GetAtomicNum() == 6 and end.GetHybridization() == Chem.HybridizationType.SP3
    return saturated
