"""The structure, each substituent tinted by its contribution and labelled with the signed number.

Orange lowers the pKa, blue raises it; the two differ in every common kind of colour blindness (M. Okabe, K. Ito,
Color Universal Design, 2008). The sign stands in the label as well, so that grey print loses nothing.
"""

from __future__ import annotations

from typing import Any

from rdkit import Chem
from rdkit.Chem import rdDepictor
from rdkit.Chem.Draw import rdMolDraw2D

from qsar.attribution.explanation import Contribution, Explanation

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
        _label(mol, line)
    options: Any = drawer.drawOptions()
    options.useBWAtomPalette()
    options.setAnnotationColour((0.0, 0.0, 0.0))
    options.setBondNoteColour((0.0, 0.0, 0.0))
    options.annotationFontScale = 0.8
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


def _label(mol: Chem.Mol, line: Contribution) -> None:
    """Put the number beside the outermost atom with the fewest bonds, or on the bond to a crowded lone atom."""
    chosen = min(reversed(line.atoms), key=lambda a: mol.GetAtomWithIdx(a).GetDegree())
    text = _drawable(signed(line.contribution))
    if mol.GetAtomWithIdx(chosen).GetDegree() < 4:
        mol.GetAtomWithIdx(chosen).SetProp("atomNote", text)
    else:
        mol.GetBondBetweenAtoms(line.path[-2], line.atoms[0]).SetProp("bondNote", text)


def _drawable(text: str) -> str:
    """Text for a drawing, whose font has no true minus."""
    return text.replace("−", "-")
