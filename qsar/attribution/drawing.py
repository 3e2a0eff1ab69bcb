"""The structure, each substituent tinted by its contribution and labelled with the signed number.

Orange lowers the pKa, blue raises it; the two differ in every common kind of colour blindness (M. Okabe, K. Ito,
Color Universal Design, 2008). The sign stands in the label as well, so that grey print loses nothing.
"""

from __future__ import annotations

from typing import Any

import numpy as np
from rdkit import Chem, Geometry
from rdkit.Chem import rdDepictor
from rdkit.Chem.Draw import rdMolDraw2D

from qsar.attribution.explanation import Contribution, Explanation
from qsar.attribution.labels import place_labels

Colour = tuple[float, float, float]

LOWERS: Colour = (0.902, 0.45, 0.0)
RAISES: Colour = (0.0, 0.447, 0.698)
_STRONG = 1.5  # pKa units at which the tint is full
_FAINTEST = 0.12


def signed(value: float, digits: int = 2) -> str:
    """A number with its sign, with a true minus; zero has none."""
    text = f"{abs(value):.{digits}f}"
    if float(text) == 0.0:
        return text
    return ("−" if value < 0 else "+") + text


def tint(value: float) -> Colour:
    """Colour of a contribution: from nearly white to orange (lowers) or blue (raises)."""
    share = _FAINTEST + (0.75 - _FAINTEST) * min(abs(value) / _STRONG, 1.0)
    red, green, blue = LOWERS if value < 0 else RAISES
    return 1 - share * (1 - red), 1 - share * (1 - green), 1 - share * (1 - blue)


def structure_svg(explanation: Explanation, width: int = 520, height: int = 380) -> str:
    """The tinted structure as SVG text."""
    drawer = rdMolDraw2D.MolDraw2DSVG(width, height)
    _draw(drawer, explanation)
    return str(drawer.GetDrawingText())


def structure_png(explanation: Explanation, width: int = 1040, height: int = 760) -> bytes:
    """The tinted structure as PNG."""
    drawer = rdMolDraw2D.MolDraw2DCairo(width, height)
    _draw(drawer, explanation)
    return bytes(drawer.GetDrawingText())


def plain_svg(smiles: str, width: int = 180, height: int = 120) -> str:
    """A structure without tints as SVG text; empty where the SMILES cannot be read."""
    mol = Chem.MolFromSmiles(smiles)
    if mol is None:
        return ""
    drawer = rdMolDraw2D.MolDraw2DSVG(width, height)
    _plain_options(drawer)
    rdMolDraw2D.PrepareAndDrawMolecule(drawer, mol)
    drawer.FinishDrawing()
    return str(drawer.GetDrawingText())


def plain_png(smiles: str, width: int = 360, height: int = 200) -> bytes:
    """A structure without tints as PNG."""
    drawer = rdMolDraw2D.MolDraw2DCairo(width, height)
    _plain_options(drawer)
    rdMolDraw2D.PrepareAndDrawMolecule(drawer, Chem.MolFromSmiles(smiles))
    drawer.FinishDrawing()
    return bytes(drawer.GetDrawingText())


def _plain_options(drawer: rdMolDraw2D.MolDraw2D) -> None:
    options: Any = drawer.drawOptions()
    options.useBWAtomPalette()
    options.clearBackground = False
    options.padding = 0.06
    options.maxFontSize = 16


def _draw(drawer: rdMolDraw2D.MolDraw2D, explanation: Explanation) -> None:
    mol = _in_state(explanation)
    rdDepictor.SetPreferCoordGen(False)
    rdDepictor.Compute2DCoords(mol)
    rdDepictor.StraightenDepiction(mol)
    atoms: dict[int, Colour] = {}
    bonds: dict[int, Colour] = {}
    for line in explanation.contributions:
        if not line.atoms:
            continue
        colour = tint(line.contribution)
        members = set(line.atoms)
        atoms.update(dict.fromkeys(line.atoms, colour))
        for bond in mol.GetBonds():
            if bond.GetBeginAtomIdx() in members and bond.GetEndAtomIdx() in members:
                bonds[bond.GetIdx()] = colour
    options: Any = drawer.drawOptions()
    options.useBWAtomPalette()
    options.padding = 0.09
    options.fillHighlights = True
    options.highlightRadius = 0.38
    options.highlightBondWidthMultiplier = 16
    options.fixedBondLength = drawer.Width() / 13
    options.legendFraction = 0.11
    options.legendFontSize = 22 if drawer.Width() > 800 else 15
    rdMolDraw2D.PrepareAndDrawMolecule(
        drawer,
        mol,
        legend=_drawable(sum_in_words(explanation)),
        highlightAtoms=list(atoms),
        highlightAtomColors=atoms,
        highlightBonds=list(bonds),
        highlightBondColors=bonds,
    )
    _write_numbers(drawer, mol, [line for line in explanation.contributions if line.atoms])
    drawer.FinishDrawing()


def sum_in_words(explanation: Explanation) -> str:
    """The identity in one line: pKa, parent, what the substituents add, site statistics."""
    statistics = [line for line in explanation.contributions if not line.atoms]
    groups = sum(line.contribution for line in explanation.contributions if line.atoms)
    step = f"pKa{explanation.step}" if len(explanation.acid.sites) > 1 else "pKa"
    text = f"{step} {explanation.pka:.2f} = {explanation.parent_pka:.2f} (parent) {signed(groups)} (substituents)"
    return text + "".join(f" {signed(line.contribution)} (site statistics)" for line in statistics)


def _in_state(explanation: Explanation) -> Chem.Mol:
    """The acid as it is when the proton of the step leaves: other groups that have lost theirs are drawn so."""
    mol = Chem.RWMol(explanation.acid.mol)
    for carbon in explanation.ionised:
        for oxygen in mol.GetAtomWithIdx(carbon).GetNeighbors():
            if oxygen.GetAtomicNum() == 8 and oxygen.GetTotalNumHs():
                oxygen.SetFormalCharge(-1)
                oxygen.SetNumExplicitHs(0)
                oxygen.SetNoImplicit(True)
    from qsar.groups import perceive

    for group in perceive(explanation.acid.graph):
        if group.kind == "ammonium":
            nitrogen = mol.GetAtomWithIdx(group.atoms[0])
            hydrogens = nitrogen.GetTotalNumHs()
            nitrogen.SetFormalCharge(1)
            nitrogen.SetNumExplicitHs(hydrogens + 1)
            nitrogen.SetNoImplicit(True)
    result = mol.GetMol()
    Chem.SanitizeMol(result)
    return result


def _write_numbers(drawer: rdMolDraw2D.MolDraw2D, mol: Chem.Mol, lines: list[Contribution]) -> None:
    """Write each contribution beside its substituent."""
    if not lines:
        return
    coordinates = [drawer.GetDrawCoords(a) for a in range(mol.GetNumAtoms())]
    places = np.array([(p.x, p.y) for p in coordinates])
    ends = [(bond.GetBeginAtomIdx(), bond.GetEndAtomIdx()) for bond in mol.GetBonds()]
    texts = [_drawable(signed(line.contribution)) for line in lines]
    bonds = places[np.array(ends)]
    length = float(np.median(np.linalg.norm(bonds[:, 0] - bonds[:, 1], axis=1)))
    height = min(drawer.Width() / 26, 0.45 * length)
    options: Any = drawer.drawOptions()
    canvas = (float(drawer.Width()), drawer.Height() * (1.0 - options.legendFraction))
    drawer.SetFontSize(height)
    drawer.SetColour((0.0, 0.0, 0.0))
    middles = place_labels(texts, [places[list(line.atoms)] for line in lines], bonds, height, canvas)
    for text, (x, y) in zip(texts, middles, strict=True):
        drawer.DrawString(text, Geometry.Point2D(x, y), 0, True)


def _drawable(text: str) -> str:
    """Text for a drawing, whose font has no true minus."""
    return text.replace("−", "-")
