"""Sentences about what a measured constant of an acid means, or what else ionises near by."""

from __future__ import annotations

import csv
from dataclasses import dataclass
from functools import cache
from importlib.resources import files

from rdkit import Chem


@dataclass(frozen=True)
class Advisory:
    """A pattern and its sentence; `positive` and `negative` are SMILES that it must and must not match."""

    name: str
    pattern: Chem.Mol
    sentence: str
    positive: str
    negative: str


@cache
def advisories() -> tuple[Advisory, ...]:
    """All advisories, from ``constants/advisories.csv``."""
    text = files("qsar.constants").joinpath("advisories.csv").read_text(encoding="utf-8")
    return tuple(
        Advisory(r["name"], Chem.MolFromSmarts(r["smarts"]), r["sentence"], r["positive"], r["negative"])
        for r in csv.DictReader(text.splitlines())
    )


def advise(mol: Chem.Mol) -> tuple[str, ...]:
    """Sentences that apply to a molecule."""
    return tuple(a.sentence for a in advisories() if mol.HasSubstructMatch(a.pattern))
