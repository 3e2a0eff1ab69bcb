"""Sentences about what a measured constant of an acid means, or what else ionises near by."""

from __future__ import annotations

import csv
import re
from collections import Counter
from dataclasses import dataclass
from functools import cache
from importlib.resources import files

from rdkit import Chem

from qsar.graph import Graph


@dataclass(frozen=True)
class Advisory:
    """A pattern and its sentence; `positive` and `negative` are SMILES that it must and must not match.

    `least` is what the pattern needs at least, told from the pattern: pairs of a key of `census` and a number.
    """

    name: str
    pattern: Chem.Mol
    sentence: str
    positive: str
    negative: str
    least: tuple[tuple[int | str, int], ...]


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


HALOGENS = frozenset((9, 17, 35, 53))
_HYDROXYL, _ARYL_HYDROXYL, _CARBONYL, _HALOGEN, _NITROGEN_H = "OH", "aryl OH", "C=O", "halogen", "NH"
_SATURATED, _CARBON_H, _ALDEHYDE, _THIOL, _BESIDE_SULFUR = "CX4", "CH", "CH=O", "SH", "S-XH"
_ACYL_PAIR, _BETWEEN_ACYLS = "acyl-acyl", "acyl-X-acyl"


def census(graph: Graph) -> Counter[int | str]:
    """Atoms of each element, by atomic number, and of some kinds that patterns ask for."""
    counts: Counter[int | str] = Counter(graph.numbers)
    numbers, hydrogens, neighbours, orders = graph.numbers, graph.hydrogens, graph.neighbours, graph.orders
    counts[_HALOGEN] = sum(counts[number] for number in HALOGENS)
    hydroxyl = aryl = carbonyl = aldehyde = nitrogen = saturated = carbon = thiol = beside = 0
    acyls: set[int] = set()
    for a, number in enumerate(numbers):
        if number == 8:
            if hydrogens[a] == 1:
                hydroxyl += 1
                aryl += graph.aromatic[neighbours[a][0]]
            elif 2.0 in orders[a]:
                carbonyl += 1
                acyls.add(neighbours[a][0])
                aldehyde += hydrogens[neighbours[a][0]] == 1
        elif number == 6 and not graph.aromatic[a]:
            saturated += hydrogens[a] + len(neighbours[a]) == 4
            carbon += 1 <= hydrogens[a] <= 2
        elif number == 7:
            nitrogen += hydrogens[a] == 1
        elif number == 16:
            thiol += hydrogens[a] == 1
            beside += sum(hydrogens[b] > 0 for b in neighbours[a] if numbers[b] != 6)
    counts[_HYDROXYL], counts[_ARYL_HYDROXYL], counts[_CARBONYL] = hydroxyl, aryl, carbonyl
    counts[_NITROGEN_H], counts[_SATURATED], counts[_CARBON_H] = nitrogen, saturated, carbon
    counts[_ALDEHYDE], counts[_THIOL], counts[_BESIDE_SULFUR] = aldehyde, thiol, beside
    around = [b for a in acyls for b in neighbours[a]]
    counts[_ACYL_PAIR] = sum(b in acyls for b in around)
    counts[_BETWEEN_ACYLS] = len(around) - len(set(around))
    return counts


def _least(pattern: Chem.Mol) -> tuple[tuple[int | str, int], ...]:
    """What a pattern needs at least, as keys of `census`; atoms that may be anything are not counted."""
    counts: Counter[int | str] = Counter()
    acyls = {o.GetBonds()[0].GetOtherAtom(o).GetIdx() for o in pattern.GetAtoms() if _is_carbonyl_oxygen(o)}
    for atom in pattern.GetAtoms():
        text = atom.GetSmarts().strip("[]").replace("&", "")
        beside = [(b.GetBondType(), b.GetOtherAtom(atom)) for b in atom.GetBonds()]
        counts[_HYDROXYL] += text == "OX2H1"
        counts[_ARYL_HYDROXYL] += text == "OX2H1" and any(n.GetSmarts() == "c" for _, n in beside)
        counts[_ALDEHYDE] += text == "CX3H1" and any(n.GetSmarts() == "O" for _, n in beside)
        counts[_THIOL] += text == "SX2H1"
        counts[_BESIDE_SULFUR] += text in ("OX2H1", "NX3;H1,H2") and any(n.GetAtomicNum() == 16 for _, n in beside)
        counts[_NITROGEN_H] += text == "NX3H1"
        counts[_SATURATED] += text in ("CX4", "CX4H3")
        counts[_CARBON_H] += text == "CX4H2,CX3H1"
        counts[_CARBONYL] += _is_carbonyl_oxygen(atom)
        next_to = sum(n.GetIdx() in acyls for _, n in beside)
        if atom.GetIdx() in acyls:
            counts[_ACYL_PAIR] += next_to
        else:
            counts[_BETWEEN_ACYLS] += next_to > 1
        if re.search(r"[$!*]", text):
            continue
        elements = {re.sub(r"[XHDR]\d*|[;+-]", "", choice).casefold() for choice in text.split(",")}
        numbers = {Chem.GetPeriodicTable().GetAtomicNumber(e.capitalize()) for e in elements if e.isalpha()}
        if len(elements) == 1:
            counts.update(numbers)
        counts[_HALOGEN] += len(numbers) == len(elements) and numbers <= HALOGENS
    return tuple((key, n) for key, n in counts.items() if n)


def _is_carbonyl_oxygen(atom: Chem.Atom) -> bool:
    bonds = atom.GetBonds()
    return (
        atom.GetSmarts() == "O"
        and len(bonds) == 1
        and bonds[0].GetBondType() == Chem.BondType.DOUBLE
        and bonds[0].GetOtherAtom(atom).GetAtomicNum() == 6
    )


def advise(mol: Chem.Mol, graph: Graph | None = None) -> tuple[str, ...]:
    """Sentences that apply to a molecule.

    Parameters
    ----------
    mol : rdkit.Chem.Mol
    graph : Graph, optional
        Its graph, where it has been read already: patterns that ask for more than is there are not tried.
    """
    if graph is None:
        return tuple(a.sentence for a in advisories() if mol.HasSubstructMatch(a.pattern))
    present = census(graph).get  # a Counter answers a missing key slowly
    found = []
    for a in advisories():
        for key, least in a.least:
            if present(key, 0) < least:
                break
        else:
            if mol.HasSubstructMatch(a.pattern):
                found.append(a.sentence)
    return tuple(found)
