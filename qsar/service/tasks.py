"""What the worker processes do. Each task takes the desk and plain arguments and returns plain data."""

from __future__ import annotations

import html
from collections.abc import Callable, Sequence
from dataclasses import dataclass, field
from pathlib import Path
from typing import TYPE_CHECKING, Any

from qsar.reading import MAX_SMILES, Record
from qsar.service.settings import Refused
from qsar.structures import Acid, StructureError, read_acid

if TYPE_CHECKING:
    from qsar.attribution import Explained
    from qsar.model.model import Model
    from qsar.writing import Row

PARENTS: tuple[tuple[str, str], ...] = (
    ("formic", "O=CO"),
    ("acetic", "CC(=O)O"),
    ("propanoic", "CCC(=O)O"),
    ("pivalic", "CC(C)(C)C(=O)O"),
    ("cyclohexanecarboxylic", "O=C(O)C1CCCCC1"),
    ("acrylic", "C=CC(=O)O"),
    ("propiolic", "C#CC(=O)O"),
    ("benzoic", "O=C(O)c1ccccc1"),
    ("phenylacetic", "O=C(O)Cc1ccccc1"),
    ("phenoxyacetic", "O=C(O)COc1ccccc1"),
    ("cinnamic (trans)", "O=C(O)/C=C/c1ccccc1"),
    ("1-naphthoic", "O=C(O)c1cccc2ccccc12"),
    ("nicotinic", "O=C(O)c1cccnc1"),
    ("2-furoic", "O=C(O)c1ccco1"),
    ("succinic", "O=C(O)CCC(=O)O"),
    ("glycine", "NCC(=O)O"),
)
"""Acids to build from: name and SMILES."""


_TOGETHER = 100  # structures predicted at once: bounds the memory of a list that is answered in one piece


@dataclass
class Desk:
    """What a worker process keeps from task to task."""

    model: Model
    names: dict[str, str] = field(default_factory=dict)


def open_desk(folder: Path | None) -> Desk:
    """Load the model; called once in each process."""
    from qsar.batch import open_model

    model = open_model(folder)
    library = model.library
    names: dict[str, str] = {}
    for name, smiles in zip(library.name, library.smiles, strict=True):
        if name and smiles:
            names.setdefault(name.casefold(), smiles)
    _explained(Desk(model), "CC(=O)O", 0.9)  # what is computed once is computed now
    return Desk(model, names)


def usable(smiles: str) -> Acid:
    """Read one acid.

    Raises
    ------
    Refused
        With the reason.
    """
    try:
        if len(smiles) > MAX_SMILES:
            raise StructureError(f"the SMILES is longer than {MAX_SMILES:,} characters: too large a molecule")
        return read_acid(smiles)
    except StructureError as reason:
        raise Refused(422, str(reason)) from reason


def _explained(desk: Desk, smiles: str, coverage: float, contributions: bool = True) -> Explained:
    (answer,) = _explain_all(desk, [usable(smiles)], coverage, contributions)
    if answer.error is not None:
        raise Refused(422, answer.error)
    return answer


def _explain_all(
    desk: Desk, acids: Sequence[Acid | StructureError], coverage: float, contributions: bool
) -> list[Explained]:
    """Predictions with what each substituent contributed, or, much faster for large acids, without."""
    from qsar.attribution import Explained, explain_many

    if contributions:
        return explain_many(desk.model, acids, coverage)
    return [Explained(prediction, ()) for prediction in desk.model.predict(acids, coverage=coverage)]


def about(desk: Desk) -> dict[str, Any]:
    """The model and the names of its acids."""
    card = desk.model.card
    names = sorted({n for n, s in zip(desk.model.library.name, desk.model.library.smiles, strict=True) if n and s})
    return {"name": desk.model.name, "card": {k: v for k, v in card.items() if _plain(v)}, "names": names}


def _plain(value: object) -> bool:
    return isinstance(value, str | int | float | bool)


def read_text(desk: Desk, text: str, most: int) -> list[tuple[str, str, str, str | None]]:
    """Records of pasted text: id, SMILES, place, error."""
    from qsar.service.intake import records_of_text

    return [(r.id, r.smiles, r.where, r.error) for r in records_of_text(text, desk.names, most)]


def read_file(desk: Desk, content: bytes, name: str, most: int) -> list[tuple[str, str, str, str | None]]:
    """Records of a file: id, SMILES, place, error."""
    from qsar.service.intake import records_of_file

    return [(r.id, r.smiles, r.where, r.error) for r in records_of_file(content, name, most)]


def predict(
    desk: Desk, records: Sequence[tuple[str, str, str, str | None]], coverage: float
) -> list[list[dict[str, Any]]]:
    """Rows of the table of predictions, a list of them for each input."""
    from qsar.batch import predict_records

    given = [Record(i, s, w, None, e) for i, s, w, e in records]
    answers = predict_records(given, lambda: desk.model, coverage=coverage, chunk=_TOGETHER)
    return [[row._asdict() for row in rows] for block in answers for _, rows in block]


def acid(desk: Desk, smiles: str, coverage: float, step: int, contributions: bool = True) -> dict[str, Any]:
    """Everything about one acid."""
    from qsar.service.views import acid_view

    return acid_view(desk.model, _explained(desk, smiles, coverage, contributions), step)


def swap(
    desk: Desk, smiles: str, position: str, group: str, coverage: float, step: int, contributions: bool = True
) -> dict[str, Any]:
    """Everything about the acid with another group at a place, and what was exchanged."""
    from qsar.analogues import find_position, group_named
    from qsar.analogues import swap as exchange

    start = usable(smiles)
    try:
        place, new = find_position(start, position), group_named(group)
        made = exchange(start, place, new)
    except StructureError as reason:
        raise Refused(422, str(reason)) from reason
    view = acid(desk, made.smiles, coverage, step, contributions)
    view["swapped"] = {"place": place.place, "old": place.group, "new": new.name}
    return view


def groups(desk: Desk) -> list[dict[str, str]]:
    """The groups that can be put in."""
    from qsar.analogues import group_words, known_groups

    return [{"name": g.name, "smiles": g.smiles, "words": group_words(g)} for g in known_groups()]


def all_groups(
    desk: Desk,
    smiles: str,
    position: str,
    step: int,
    low: float | None,
    high: float | None,
    coverage: float,
    only: Sequence[str] | None,
) -> dict[str, Any]:
    """Every group at one place, sorted by pKa."""
    from qsar.analogues import analogues, find_position, group_named

    start = usable(smiles)
    try:
        place = find_position(start, position)
        chosen = None if only is None else [group_named(text) for text in only]
    except StructureError as reason:
        raise Refused(422, str(reason)) from reason
    found = analogues(desk.model, start, place, chosen, step=step, low=low, high=high, coverage=coverage)
    rows = []
    for a in found:
        s = a.step
        rows.append(
            {
                "group": a.group.name,
                "smiles": a.smiles,
                "step": step,
                "pka": None if s is None else s.pka,
                "low": None if s is None else s.low,
                "high": None if s is None else s.high,
                "coverage": coverage,
                "domain": "unusable" if s is None else s.domain,
                "reasons": a.prediction.error or f"no step {step}" if s is None else "; ".join(s.reasons),
                "measured": None if s is None else s.measured,
                "change": a.change,
            }
        )
    return {"smiles": start.smiles, "position": position, "place": place.place, "group": place.group, "rows": rows}


def drawing(desk: Desk, smiles: str, width: int, height: int, dark: bool) -> str:
    """A plain drawing as SVG; a sign of absence for what cannot be drawn."""
    from qsar.service.pictures import plain_svg

    short = smiles if len(smiles) <= MAX_SMILES else ""
    return plain_svg(short, width, height, dark) or _absent(width, height)


def _absent(width: int, height: int) -> str:
    label = html.escape("no drawing")
    return (
        f'<svg xmlns="http://www.w3.org/2000/svg" width="{width}" height="{height}" role="img">'
        f'<text x="50%" y="50%" text-anchor="middle" font-size="11" fill="#7a828a">{label}</text></svg>'
    )


def parents(desk: Desk) -> list[dict[str, str]]:
    """Acids to build from."""
    return [{"name": name, "smiles": smiles} for name, smiles in PARENTS]


def report(
    desk: Desk, smiles: Sequence[tuple[str, str]], coverage: float, contributions: bool = True
) -> list[dict[str, Any]]:
    """Everything about some acids, for the report; an acid that cannot be used has its `error`."""
    from qsar.service.views import acid_view

    given: list[Acid | StructureError] = []
    for _, text in smiles:
        try:
            given.append(usable(text))
        except Refused as refusal:
            given.append(StructureError(refusal.sentence))
    answers = _explain_all(desk, given, coverage, contributions)
    return [
        {"id": name, "given": text, "error": a.error}
        if a.error is not None
        else {"id": name, "given": text, "error": None, **acid_view(desk.model, a, 1, for_paper=True)}
        for (name, text), a in zip(smiles, answers, strict=True)
    ]


def export(desk: Desk, kind: str, rows: Sequence[Row]) -> bytes:
    """Rows as a file."""
    from qsar.service.exports import table_file

    return table_file(kind, rows)


def decide(desk: Desk, kind: str, question: dict[str, Any]) -> dict[str, Any]:
    """Answer to a decision: base, window, buffer, risk."""
    from qsar.service.decide import DECISIONS

    return DECISIONS[kind](desk.model, question)


TASKS: dict[str, Callable[..., Any]] = {
    task.__name__: task
    for task in (
        about, read_text, read_file, predict, acid, swap, groups, all_groups, drawing, parents, report, export,
        decide,
    )
}  # fmt: skip

__all__ = ["PARENTS", "TASKS", "Desk", "open_desk"]
