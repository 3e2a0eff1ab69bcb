"""Drawings of acids as SVG, for light and dark pages, with the places that can be chosen on them."""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import Any

from rdkit import Chem
from rdkit.Chem import rdDepictor
from rdkit.Chem.Draw import rdMolDraw2D
from rdkit.Geometry import Point2D

from qsar.analogues import Position

Colour = tuple[float, float, float]

_DARK_PAGE: Colour = (0.086, 0.106, 0.122)
_DARK_INK: Colour = (0.91, 0.92, 0.93)
_STUB = 0.62  # of a bond, from the atom to the handle of its hydrogen


@dataclass(frozen=True)
class Picture:
    """A drawing.

    Attributes
    ----------
    light, dark : str
        SVG text for a light and a dark page; transparent background.
    width, height : int
        Pixels.
    places : mapping of str to (float, float)
        For each key of a position where it lies, as fractions of width and height.
    """

    light: str
    dark: str
    width: int
    height: int
    places: Mapping[str, tuple[float, float]]


def draw(
    mol: Chem.Mol,
    width: int,
    height: int,
    *,
    tints: Mapping[int, float] | None = None,
    positions: Sequence[Position] = (),
) -> Picture:
    """Draw a molecule.

    Parameters
    ----------
    mol : rdkit.Chem.Mol
    width, height : int
        Pixels.
    tints : mapping of int to float, optional
        Contribution of the substituent to which an atom belongs, pKa units: orange lowers, blue raises.
    positions : sequence of Position
        Places to find on the drawing.
    """
    flat = Chem.Mol(mol)
    rdDepictor.Compute2DCoords(flat)
    rdDepictor.StraightenDepiction(flat)
    light, _ = _drawn(flat, width, height, tints or {}, dark=False, wide=bool(positions))
    dark, drawer = _drawn(flat, width, height, tints or {}, dark=True, wide=bool(positions))
    places = {p.key: _place(flat, drawer, p, width, height) for p in positions}
    return Picture(light, dark, width, height, places)


def plain_svg(smiles: str, width: int, height: int, dark: bool) -> str:
    """One drawing without tints; empty where the SMILES cannot be read."""
    mol = Chem.MolFromSmiles(smiles)
    if mol is None or mol.GetNumAtoms() == 0:
        return ""
    picture = draw(mol, width, height)
    return picture.dark if dark else picture.light


def _drawn(
    mol: Chem.Mol, width: int, height: int, tints: Mapping[int, float], *, dark: bool, wide: bool
) -> tuple[str, rdMolDraw2D.MolDraw2DSVG]:
    drawer = rdMolDraw2D.MolDraw2DSVG(width, height)
    options: Any = drawer.drawOptions()
    if dark:
        rdMolDraw2D.SetDarkMode(drawer)
    options.useBWAtomPalette()
    if dark:
        options.updateAtomPalette(dict.fromkeys((-1, *_DRAWN_ELEMENTS), _DARK_INK))
    options.clearBackground = False
    options.padding = 0.13 if wide else 0.06
    options.maxFontSize = 17
    options.fixedBondLength = 42 if wide else 26
    options.highlightRadius = 0.36
    options.highlightBondWidthMultiplier = 14
    colours = {atom: _tint(value, dark) for atom, value in tints.items()}
    bonds = {}
    for bond in mol.GetBonds():
        a, b = bond.GetBeginAtomIdx(), bond.GetEndAtomIdx()
        if a in colours and b in colours and tints[a] == tints[b]:
            bonds[bond.GetIdx()] = colours[a]
    rdMolDraw2D.PrepareAndDrawMolecule(
        drawer,
        mol,
        highlightAtoms=list(colours),
        highlightAtomColors=colours,
        highlightBonds=list(bonds),
        highlightBondColors=bonds,
    )
    drawer.FinishDrawing()
    return str(drawer.GetDrawingText()), drawer


_DRAWN_ELEMENTS = (1, 5, 6, 7, 8, 9, 14, 15, 16, 17, 34, 35, 53)


def _tint(value: float, dark: bool) -> Colour:
    """The tint of a contribution; on a dark page it leaves black instead of white."""
    from qsar.attribution.drawing import tint

    red, green, blue = tint(value)
    if not dark:
        return red, green, blue
    strength = 1.0 - min(red, green, blue)
    full = [c / max(1e-9, max(red, green, blue)) for c in (red, green, blue)]
    return tuple(d + 0.55 * strength * (f * f - d) for d, f in zip(_DARK_PAGE, full, strict=True))  # type: ignore[return-value]


def _place(
    mol: Chem.Mol, drawer: rdMolDraw2D.MolDraw2DSVG, position: Position, width: int, height: int
) -> tuple[float, float]:
    """A group lies on its first atom; a hydrogen beside its atom, where there is most room."""
    conformer = mol.GetConformer()

    def at(atom: int) -> Point2D:
        point = conformer.GetAtomPosition(atom)
        return Point2D(point.x, point.y)

    if position.root is not None:
        point = drawer.GetDrawCoords(position.root)
    else:
        centre = at(position.anchor)
        neighbours = [at(n.GetIdx()) for n in mol.GetAtomWithIdx(position.anchor).GetNeighbors()]
        angle = _free_angle([math.atan2(n.y - centre.y, n.x - centre.x) for n in neighbours])
        stub = Point2D(centre.x + 1.5 * _STUB * math.cos(angle), centre.y + 1.5 * _STUB * math.sin(angle))
        point = drawer.GetDrawCoords(stub)
    return _inside(point.x / width), _inside(point.y / height)


def _inside(share: float) -> float:
    return round(min(max(share, 0.02), 0.98), 4)


def _free_angle(taken: list[float]) -> float:
    """Direction in the middle of the widest gap between bonds."""
    if not taken:
        return 0.0
    ordered = sorted(taken)
    gaps = [(b - a, a) for a, b in zip(ordered, [*ordered[1:], ordered[0] + 2 * math.pi], strict=True)]
    width, start = max(gaps, key=lambda gap: round(gap[0], 6))
    return start + width / 2
