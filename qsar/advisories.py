"""Sentences about what a measured constant of an acid means, or what else ionises near by."""

from __future__ import annotations

import csv
import re
from collections import Counter
from collections.abc import Sequence
from dataclasses import dataclass
from functools import cache
from importlib.resources import files

from rdkit import Chem


@dataclass(frozen=True)
class Advisory:
    """A pattern and its sentence; `positive` and `negative` are SMILES that it must and must not match.

    `least` are the elements (atomic number, atoms) without which the pattern cannot match, told from the pattern.
    """

    name: str
    pattern: Chem.Mol
    sentence: str
    positive: str
    negative: str
    least: tuple[tuple[int, int], ...]


@cache
def advisories() -> tuple[Advisory, ...]:
    """All advisories, from ``constants/advisories.csv``."""
    text = files("qsar.constants").joinpath("advisories.csv").read_text(encoding="utf-8")
    found = []
    for row in csv.DictReader(text.splitlines()):
        pattern = Chem.MolFromSmarts(row["smarts"])
        found.append(
            Advisory(row["name"], pattern, row["sentence"], row["positive"], row["negative"], _least(pattern))
        )
    return tuple(found)


def _least(pattern: Chem.Mol) -> tuple[tuple[int, int], ...]:
    """Elements that a pattern needs; atoms that may be one of several elements are not counted."""
    counts: Counter[int] = Counter()
    for atom in pattern.GetAtoms():
        text = atom.GetSmarts().strip("[]")
        if re.search(r"[$!*]", text):
            continue
        elements = {re.sub(r"[XHDR]\d*|[&;+-]", "", choice).casefold() for choice in text.split(",")}
        if len(elements) == 1:
            counts[Chem.GetPeriodicTable().GetAtomicNumber(elements.pop().capitalize())] += 1
    return tuple(counts.items())


def advise(mol: Chem.Mol, numbers: Sequence[int] | None = None) -> tuple[str, ...]:
    """Sentences that apply to a molecule.

    Parameters
    ----------
    mol : rdkit.Chem.Mol
    numbers : sequence of int, optional
        Atomic numbers, where they have been read already: patterns whose elements are not there are not tried.
    """
    present = Counter(numbers) if numbers is not None else None
    return tuple(
        a.sentence
        for a in advisories()
        if (present is None or all(present[number] >= least for number, least in a.least))
        and mol.HasSubstructMatch(a.pattern)
    )
