"""Puts the report together from its template; see ``templates/report.html``."""

from __future__ import annotations

import datetime
from collections.abc import Callable, Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import TYPE_CHECKING

from qsar import __version__
from qsar.attribution.drawing import plain_svg, signed, structure_svg, tint
from qsar.attribution.explanation import Contribution, Explanation
from qsar.attribution.tables import witness_words
from qsar.errors import UserError
from qsar.files import atomic_path
from qsar.report.dossier import dossier
from qsar.report.ruler import ruler_svg
from qsar.sources import key_of, publications

if TYPE_CHECKING:
    from qsar.attribution import Explained
    from qsar.model.model import Model, StepPrediction
    from qsar.reading import Record

_EVIDENCE = 4


@dataclass(frozen=True)
class Evidence:
    """A measured acid beside a prediction.

    Attributes
    ----------
    name, smiles, source : str
    step : int
    pka : float
    distance : float or None
        None for the acid itself.
    symbol : str
        Name of its drawing in the file; empty where the structure is withheld.
    """

    name: str
    smiles: str
    source: str
    step: int
    pka: float
    distance: float | None
    symbol: str


@dataclass(frozen=True)
class Sheet:
    """What the report shows of one step of one acid."""

    anchor: str
    record: Record
    explanation: Explanation
    step: StepPrediction
    drawing: str
    ruler: str
    evidence: list[Evidence]


class _Drawings:
    """Each measured acid is drawn once and shown wherever it is evidence."""

    def __init__(self) -> None:
        self.symbols: dict[str, tuple[str, str]] = {}

    def name(self, smiles: str) -> str:
        if not smiles:
            return ""
        if smiles not in self.symbols:
            svg = plain_svg(smiles)
            inner = svg[svg.index(">", svg.index("<svg")) + 1 : svg.rindex("</svg>")] if svg else ""
            self.symbols[smiles] = f"m{len(self.symbols)}", inner
        return self.symbols[smiles][0]


def write_report(
    target: Path,
    model: Model,
    records: Sequence[Record],
    answers: Sequence[Explained],
    coverage: float = 0.9,
    done: Callable[[int], object] = lambda _: None,
) -> None:
    """Write the report.

    Parameters
    ----------
    target : pathlib.Path
        An ``.html`` file in a folder that exists.
    model : Model
    records : sequence of Record
    answers : sequence of Explained
        As many, in the same order.
    coverage : float
        Of the intervals.
    done : callable
        Called with the number of acids while the model's own table is explained.

    Raises
    ------
    UserError
        If the file cannot be written.
    """
    try:
        from jinja2 import Environment, PackageLoader, StrictUndefined
    except ImportError as problem:
        raise UserError("a report needs the package jinja2; install it with pip install jinja2") from problem

    drawings = _Drawings()
    sheets = [
        _sheet(position, record, e, drawings)
        for position, (record, answer) in enumerate(zip(records, answers, strict=True), start=1)
        for e in answer.steps
    ]
    environment = Environment(
        loader=PackageLoader("qsar.report"),
        autoescape=True,
        undefined=StrictUndefined,
        trim_blocks=True,
        lstrip_blocks=True,
    )
    environment.filters.update(
        signed=signed, css=_css, pairs=lambda line: witness_words(line.witnesses), path=bond_path
    )
    about = dossier(model, done)
    cited = {key_of(e.source) for sheet in sheets for e in sheet.evidence}
    text = environment.get_template("report.html").render(
        sheets=sheets,
        refused=[(r, a.error) for r, a in zip(records, answers, strict=True) if a.error is not None],
        dossier=about,
        symbols=list(drawings.symbols.values()),
        sources=[(key, citation) for key, citation in _citations().items() if key in cited],
        coverage=coverage,
        version=__version__,
        date=datetime.date.today().isoformat(),
    )
    with atomic_path(target) as temporary:
        temporary.write_text(text, encoding="utf-8")


def _sheet(position: int, record: Record, e: Explanation, drawings: _Drawings) -> Sheet:
    step = e.prediction
    evidence = []
    if step.measured is not None:
        evidence.append(
            Evidence("this acid", e.smiles, step.measured_source, e.step, step.measured, None, drawings.name(e.smiles))
        )
    others = [n for n in step.neighbours if n.smiles != e.smiles or not n.smiles]
    for n in others[:_EVIDENCE]:
        evidence.append(Evidence(n.name, n.smiles, n.source, n.step, n.pka, n.distance, drawings.name(n.smiles)))
    return Sheet(
        f"acid{position}-{e.step}", record, e, step, structure_svg(e, 440, 330), ruler_svg(step, e.parent_pka), evidence
    )


def _css(value: float) -> str:
    """Tint of a contribution as a colour of style sheets."""
    red, green, blue = (round(255 * part) for part in tint(value))
    return f"rgb({red},{green},{blue})"


def bond_path(line: Contribution, explanation: Explanation) -> str:
    """The bond path in symbols, from the carboxyl carbon to the substituent: "C–C–Cl"."""
    mol = explanation.acid.mol
    return "–".join(mol.GetAtomWithIdx(a).GetSymbol() for a in line.path)


def _citations() -> dict[str, str]:
    """Publications of the measured values, by key."""
    return {
        key: ", ".join(row[c] for c in ("authors", "title", "year", "table") if row.get(c))
        for key, row in publications().items()
    }
