"""What a row of the IUPAC Digitized pKa Dataset measures: a carboxyl step in water, or something else.

The label of a constant there is that of the book it was typed from, not a site: the first constant of an
aminobenzoic acid can be the loss of the N-H proton, the base constants of an amino acid are counted from the
other end. The rules here keep what is surely a carboxyl proton and say of all else why it is left out.
"""

from __future__ import annotations

import re
from collections.abc import Mapping
from dataclasses import dataclass

from rdkit import Chem

from qsar.basicity import amine_pka
from qsar.curation.isomer_labels import is_isomer_word
from qsar.groups import owners, perceive
from qsar.structures import Acid

COLDEST, WARMEST = 15.0, 40.0
"""Degrees Celsius; the constant of a carboxyl group moves by some hundredths over this range."""

ZWITTERION_LIMIT = 5.0
"""Below it a constant of an amino acid is that of a carboxyl group, above it that of a cation."""

WEAK_AMINE = ZWITTERION_LIMIT + 0.5
"""An amine with an estimated pKa below it, the error of the estimate allowed for, may be what a low constant means."""

WEAKEST_SINGLE = 7.0
"""A single COOH is never weaker; a constant above belongs to another proton."""

LONGEST_CHAIN = 9
"""Longest straight run of CH2 and CH3; acids of eleven carbon atoms and more form micelles."""

MOST_SALT = 0.5
"""Ionic strength in mol/L; above it a constant is that of another medium."""

ADDED_SOLVENT_PERCENT = 1.0
"""Up to this content an organic solvent moves a constant less than its own uncertainty."""

_SOLVENTS = "ethanol|methanol|dioxan|acetone|alcohol|propanol|dimethyl|acetonitrile|glycol"
_PERCENT = re.compile(rf"(\d+(?:\.\d+)?)\s*%[^,;]*?(?:{_SOLVENTS})", re.IGNORECASE)
_FROM_MIXTURES = re.compile(rf"(?:extrapolated|estimated)[^;]*(?:{_SOLVENTS})", re.IGNORECASE)
_ACIDITY_FUNCTION = re.compile(r"H2SO4|HClO4|\bH[oA0I+]\s+(?:scale|function)|H\+ function", re.IGNORECASE)
_HEAVY_WATER = re.compile(r"\bin D2O|\bDCl\b", re.IGNORECASE)
_LABEL = re.compile(r"pKa(?P<base>H)?(?P<number>\d)?(?:\((?P<word>.*)\))?")
_IONIC = re.compile(r"\bI\s*=\s*(\d*\.?\d+)(\s*(?:to|-)\s*\d*\.?\d+)?")


@dataclass(frozen=True)
class Label:
    """The label of a constant, taken apart.

    Attributes
    ----------
    base : bool
        Counted as the constant of a protonated base ("pKaH"), usually from the weakest acid down.
    number : int or None
        Place in the count.
    word : str
        What stands in brackets, an isomer or nothing.
    carboxyl : bool
        Whether the label itself says that it is the carboxyl proton.
    """

    base: bool
    number: int | None
    word: str
    carboxyl: bool


def read_label(text: str) -> Label | str:
    """Take a label apart.

    Returns
    -------
    Label or str
        The label, or the reason why a constant with such a label is left out.
    """
    match = _LABEL.fullmatch(text.strip())
    if match is None:
        return "not an acid constant (base constant, or an equation)"
    word = (match["word"] or "").strip()
    carboxyl = word.strip("-").upper() == "COOH"
    if "D2O" in word or re.search(r"d\d", word):
        return "deuterated acid or heavy water"
    if "excited" in word:
        return "excited state"
    if "ethanol" in word:
        return "cosolvent"
    if word and not carboxyl and word.upper() != "H2O" and not is_isomer_word(word):
        return f"another site or isomer than can be placed: ({word})"
    isomer = word if is_isomer_word(word) else ""
    number = int(match["number"]) if match["number"] else None
    return Label(match["base"] is not None, number, isomer, carboxyl)


def condition_refusal(row: Mapping[str, str]) -> str | None:
    """Why the conditions of a row keep it out; None if they do not."""
    remarks = row["remarks"]
    percent = [float(found) for found in _PERCENT.findall(remarks)]
    if row["cosolvent"] or _FROM_MIXTURES.search(remarks) or max(percent, default=0) > ADDED_SOLVENT_PERCENT:
        return "cosolvent"
    if row["pressure"]:
        return "pressure"
    if _HEAVY_WATER.search(remarks):
        return "deuterated acid or heavy water"
    if _ACIDITY_FUNCTION.search(remarks):
        return "acidity function in strong acid"
    if re.match(r"\s*\[", remarks):
        return "another species, named in the remarks"
    if (ionic_strength(remarks) or 0.0) > MOST_SALT:
        return f"ionic strength above {MOST_SALT:g} M"
    if row["assessment"].strip().lower() == "very uncertain":
        return "rated very uncertain"
    temperature = number(row["T"])
    if temperature is None:
        return "temperature not stated"
    if not COLDEST <= temperature <= WARMEST:
        return f"temperature outside {COLDEST:g} to {WARMEST:g} °C"
    if number(row["pka_value"]) is None:
        return "no single value"
    return None


def number(text: str) -> float | None:
    """A plain number, or None where the cell holds a limit, a guess or something else."""
    return float(text) if re.fullmatch(r"\s*-?\d+(\.\d+)?\s*", text) else None


def ionic_strength(remarks: str) -> float | None:
    """Ionic strength in mol/L that the remarks state, None where they state none or a range.

    A range is that of solutions from which a constant was extrapolated.
    """
    match = _IONIC.search(remarks)
    return None if match is None or match[2] else float(match[1])


def kind_of_constant(remarks: str) -> str:
    """Say "mixed", "concentration", or nothing where the remarks do not say."""
    lower = remarks.lower()
    return next((kind for kind in ("mixed", "concentration") if f'{kind}"' in lower or f"{kind} const" in lower), "")


_UNCLEAR_NITROGEN = frozenset({"amino", "pyridinium", "hydrazino", "hydroxyamino", "imino"})
_STRONG_BASES = frozenset({"ammonium", "amidinium", "imidazolium"})


def unclear_nitrogen(acid: Acid) -> bool:
    """Whether a nitrogen could lose or take a proton in the range where the carboxyl group does."""
    groups = perceive(acid.graph)
    group_of = owners(groups)
    for group in groups:
        if group.kind in _UNCLEAR_NITROGEN:
            return True
        if group.kind == "ammonium" and amine_pka(acid.graph, group.atoms[0], group_of) < WEAK_AMINE:
            return True
        if group.kind == "heteroaryl" and any(acid.graph.numbers[a] == 7 for a in group.atoms):
            return True
    return False


def count_bases(acid: Acid) -> int:
    """Number of groups that hold a proton while the carboxyl proton leaves."""
    return sum(group.kind in _STRONG_BASES for group in perceive(acid.graph))


def structure_refusal(acid: Acid) -> str | None:
    """Why the constants of a structure cannot be told apart; None if they can."""
    kinds = {group.kind for group in perceive(acid.graph)}
    if kinds & {"phosphonate", "phosphoryl", "sulfonate"} or 15 in acid.graph.numbers:
        return "phosphonic or sulfonic acid: the label may be that of the other group"
    if acid.mol.HasSubstructMatch(_ENOL):
        return "enol: it may lose its proton first"
    if _straight_chain(acid) > LONGEST_CHAIN:
        return "long chain: aggregates in water"
    return None


def _straight_chain(acid: Acid) -> int:
    """Longest run of unbranched CH2 and CH3 outside rings."""
    graph = acid.graph
    links = {
        a
        for a, n in enumerate(graph.numbers)
        if n == 6 and graph.hydrogens[a] >= 2 and graph.saturated(a) and not graph.ring_size[a]
    }
    longest = 0
    while links:
        run, queue = 0, [links.pop()]
        while queue:
            run += 1
            found = links.intersection(graph.neighbours[queue.pop()])
            links -= found
            queue.extend(found)
        longest = max(longest, run)
    return longest


_ENOL = Chem.MolFromSmarts("[OX2H1][CX3;!a]=[CX3;!a]")
