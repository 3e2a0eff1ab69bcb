"""What can hurt at the bench, one line each, and only where it applies."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from functools import cache
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from rdkit.Chem import Mol

    from qsar.decisions.bases import Base

REFER = (
    "These lines are not complete: read the safety data sheet, follow the local rules, and ask a "
    "qualified person before the work is done."
)


@dataclass(frozen=True)
class StructuralCaution:
    """A caution that a structure calls for.

    Attributes
    ----------
    name : str
        What is matched.
    smarts : str
        Pattern.
    text : str
        The line for the user.
    example, counterexample : str
        SMILES that match and that do not.
    covered_by : str
        Name of a caution that says the same and more; where that one applies, this one is left out.
    """

    name: str
    smarts: str
    text: str
    example: str
    counterexample: str
    covered_by: str = ""


STRUCTURAL: tuple[StructuralCaution, ...] = (
    StructuralCaution(
        "nitro compound",
        "[#6][$([NX3](=O)=O),$([NX3+](=O)[O-])]",
        "Nitro compound: may be toxic, and several nitro groups or heat with strong base can make it "
        "explosive.",
        "OC(=O)c1ccc(cc1)[N+](=O)[O-]",
        "OC(=O)c1ccc(N)cc1",
    ),
    StructuralCaution(
        "azide",
        "[$([NX2]=[NX2+]=[NX1-]),$([NX2-]-[NX2+]#[NX1])]",
        "Azide: may explode on heating, shock or contact with metals; acid sets free toxic, explosive "
        "hydrazoic acid.",
        "[N-]=[N+]=NCC(=O)O",
        "N#CCC(=O)O",
    ),
    StructuralCaution(
        "peroxide",
        "[OX2,OX1-][OX2]",
        "Peroxide: may explode on heating, concentrating or contact with metals; keep it cold and dilute.",
        "CC(C)(C)OOCC(=O)O",
        "COCOCC(=O)O",
    ),
    StructuralCaution(
        "fluoroacetic acid",
        "[CX4H2](F)[CX3](=O)[OX2H1,OX1-]",
        "Fluoroacetic acid and its salts: extremely toxic by every route, in milligrams.",
        "OC(=O)CF",
        "OC(=O)C(F)(F)F",
    ),
    StructuralCaution(
        "haloacetic acid",
        "[F,Cl,Br,I][CX4;!$(C([#6])[#6])][CX3](=O)[OX2H1,OX1-]",
        "Haloacetic acid: corrosive and toxic, also through the skin.",
        "OC(=O)CCl",
        "CC(Cl)C(=O)O",
        covered_by="fluoroacetic acid",
    ),
    StructuralCaution(
        "fluorinated acid",
        "[CX4]F",
        "Fluorinated acid: may be corrosive or toxic, and longer chains persist in the environment.",
        "OC(=O)CCC(F)(F)F",
        "OC(=O)c1ccc(F)cc1",
        covered_by="haloacetic acid",
    ),
)


@cache
def _pattern(smarts: str) -> Mol:
    from rdkit import Chem

    return Chem.MolFromSmarts(smarts)


def matched(smiles: str) -> list[StructuralCaution]:
    """Cautions whose pattern a structure holds, before any is left out.

    Parameters
    ----------
    smiles : str
        Structure that was read before.

    Raises
    ------
    ValueError
        When the SMILES cannot be read.
    """
    from rdkit import Chem

    mol = Chem.MolFromSmiles(smiles)
    if mol is None:
        raise ValueError(f"{smiles!r} is not a readable SMILES")
    return [caution for caution in STRUCTURAL if mol.HasSubstructMatch(_pattern(caution.smarts))]


def structural_cautions(smiles: str) -> list[str]:
    """Lines that a structure calls for when it is handled; empty for most."""
    found = matched(smiles)
    said: set[str] = set()
    lines = []
    for caution in found:
        # A caution that is left out still covers what it covers.
        if caution.covered_by not in said:
            lines.append(caution.text)
        said.add(caution.name)
    return lines


def base_cautions(bases: Iterable[Base], co2_bar: float = 0.0, closed: bool = False) -> list[str]:
    """Lines for acid meeting bases: gas from (hydrogen)carbonate, heat from hydroxide.

    Parameters
    ----------
    bases : iterable of Base
        Those that are used or offered.
    co2_bar : float
        Highest pressure of CO2 computed for them [bar].
    closed : bool
        The vessel is kept closed.
    """
    chosen = list(bases)
    lines = []
    if any(base.is_carbonate for base in chosen):
        pressure = f" (up to {co2_bar:.1f} bar of it computed here)" if closed and co2_bar >= 0.05 else ""
        lines.append(
            f"Acid and (hydrogen)carbonate give off CO2{pressure}: add in portions, and vent the funnel "
            "early and often."
        )
    if any(not base.pka for base in chosen):
        lines.append(
            "Acid and hydroxide give off heat: add slowly to cold, stirred solution; hydroxide is corrosive."
        )
    return lines


def with_reference(lines: Sequence[str]) -> list[str]:
    """The lines, and where to read on; nothing where there are none."""
    return [*lines, REFER] if lines else []
