"""Attributions as rows: the table of contributions, the table of witnesses, and lines for the screen."""

from __future__ import annotations

import csv
from collections.abc import Iterable, Iterator, Sequence
from pathlib import Path
from typing import TYPE_CHECKING, Any

from rdkit import Chem

from qsar.attribution.drawing import signed, sum_in_words
from qsar.attribution.explanation import Contribution, Explanation, Witnesses
from qsar.writing import disarmed

if TYPE_CHECKING:
    from qsar.reading import Record

CONTRIBUTIONS = (
    "id",
    "smiles",
    "step",
    "parent",
    "parent_pka",
    "substituent",
    "atoms",
    "path_length",
    "electronegativity",
    "contribution",
    "low",
    "high",
    "alone",
    "strongest_pair",
    "pair_interaction",
    "pka",
)
WITNESSES = (
    "id",
    "step",
    "substituent",
    "contribution",
    "pairs",
    "measured_low",
    "measured_high",
    "measured_mean",
    "verdict",
    "examples",
)

Row = tuple[object, ...]


def contribution_rows(record: Record, explanations: Sequence[Explanation]) -> Iterator[Row]:
    """Rows of one input; an input or a step without contributions has one row with those cells empty.

    Atom numbers count from 0 in the order of the SMILES as given.
    """
    if not explanations:
        yield (record.id, record.smiles, *[None] * (len(CONTRIBUTIONS) - 2))
    for e in explanations:
        order = given_order(record.smiles, e)
        head: Row = (record.id, record.smiles, e.step, e.parent, e.parent_pka)
        if not e.contributions:
            yield (*head, *[None] * 10, e.pka)
        for line in e.contributions:
            yield (
                *head,
                line.substituent,
                " ".join(str(order[a]) for a in line.atoms),
                line.path_length,
                line.electronegativity,
                line.contribution,
                line.low,
                line.high,
                line.alone,
                line.strongest_pair,
                line.pair_interaction,
                e.pka,
            )


def witness_rows(record: Record, explanations: Sequence[Explanation]) -> Iterator[Row]:
    """One row for each substituent: the measured matched pairs beside its contribution."""
    for e in explanations:
        for line in e.contributions:
            if not line.atoms:
                continue
            w = line.witnesses
            numbers = (w.low, w.high, w.mean) if w.n else (None, None, None)
            examples = "; ".join(f"{a} against {b}: {signed(d)}" for a, b, d in w.examples)
            yield record.id, e.step, line.substituent, line.contribution, w.n, *numbers, w.verdict, examples


def given_order(smiles: str, explanation: Explanation) -> dict[int, int]:
    """For each atom of the standardised acid its number in the SMILES as given, counted from 0.

    Where that SMILES cannot be matched, which a drawing of other bonds may cause, atoms keep the numbers of the
    standardised SMILES.
    """
    own = {a.GetIdx(): a.GetIdx() for a in explanation.acid.mol.GetAtoms()}
    params: Any = Chem.SmilesParserParams()
    params.removeHs = False
    given = Chem.MolFromSmiles(smiles, params)
    if given is None:
        return own
    query, target = Chem.RWMol(explanation.acid.mol), Chem.RWMol(given)
    for mol in (query, target):
        for atom in mol.GetAtoms():
            atom.SetFormalCharge(0)
            atom.SetIsotope(0)
    match = target.GetSubstructMatch(query, useChirality=True) or target.GetSubstructMatch(query)
    return dict(enumerate(match)) if match else own


def write_table(path: Path, columns: Sequence[str], rows: Iterable[Row]) -> None:
    """Write rows as CSV; numbers keep every digit."""
    with path.open("w", encoding="utf-8", newline="") as handle:
        writer = csv.writer(handle)
        writer.writerow(columns)
        writer.writerows([_cell(value) for value in row] for row in rows)


def _cell(value: object) -> object:
    if value is None:
        return ""
    return disarmed(" ".join(value.split())) if isinstance(value, str) else value


def screen_lines(name: str, explanations: Sequence[Explanation]) -> Iterator[str]:
    """Lines for people."""
    for e in explanations:
        step = f", step {e.step}" if len(e.acid.sites) > 1 else ""
        yield f"{name}{step}: {e.smiles}"
        yield f"  {sum_in_words(e)}; parent {e.parent}; {e.prediction.domain}"
        if e.contributions:
            heading = f"{100 * e.coverage:g} % interval"
            yield f"  {'substituent':<34} {'share':>6}  {heading:<16} {'alone':>6}  {'bonds':>5}  measured pairs"
        for line in e.contributions:
            yield "  " + _screen_line(line)
        for note in _remarks(e):
            yield f"    · {note}"


def _screen_line(line: Contribution) -> str:
    interval = f"{signed(line.low)} to {signed(line.high)}"
    alone = "" if line.alone is None else signed(line.alone)
    bonds = "" if line.path_length is None else str(line.path_length)
    text = f"{line.substituent[:34]:<34} {signed(line.contribution):>6}  {interval:<16} {alone:>6}  {bonds:>5}"
    return f"{text}  {witness_words(line.witnesses) if line.atoms else ''}".rstrip()


def witness_words(w: Witnesses) -> str:
    """The measured pairs in a few words."""
    if not w.n:
        return "none"
    span = signed(w.low) if w.n == 1 else f"{signed(w.low)} to {signed(w.high)}"
    return f"{w.n}: {span}, {w.verdict}"


def _remarks(e: Explanation) -> Iterator[str]:
    yield from e.notes
    if e.outside:
        count = len(e.outside)
        yield f"{count} of {e.molecules} hypothetical molecules {'is' if count == 1 else 'are'} outside the domain"
