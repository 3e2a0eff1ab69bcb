"""What the page shows of one acid, as plain data."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING, Any

from qsar.advisories import advise
from qsar.analogues import Position, positions
from qsar.reading import Record
from qsar.service.pictures import draw
from qsar.sources import citation
from qsar.writing import rows_of

if TYPE_CHECKING:
    from qsar.attribution import Explained, Explanation
    from qsar.model.model import Model, StepPrediction
    from qsar.structures import Acid

WIDTH, HEIGHT = 560, 400
PAPER_WIDTH, PAPER_HEIGHT = 280, 190


def acid_view(model: Model, explained: Explained, step: int, *, for_paper: bool = False) -> dict[str, Any]:
    """Everything about one acid.

    Parameters
    ----------
    model : Model
    explained : Explained
        A usable acid with its explanations, or without any.
    step : int
        The step whose contributions tint the drawing, from 1; held to those that there are.
    for_paper : bool
        A small drawing without positions.
    """
    prediction = explained.prediction
    acid = prediction.acid
    assert acid is not None
    record = Record("1", prediction.structure)
    notes = list(dict.fromkeys((*acid.notes, *advise(acid.mol))))
    explanations = explained.steps or (None,) * len(prediction.steps)
    steps = [
        _step_view(row._asdict(), s, e, notes)
        for row, s, e in zip(rows_of(record, prediction), prediction.steps, explanations, strict=True)
    ]
    shown = min(max(step, 1), len(steps))
    view: dict[str, Any] = {
        "smiles": prediction.structure,
        "name": name_of(model, prediction.structure),
        "model": model.name,
        "shown_step": shown,
        "steps": steps,
        "notes": notes,
    }
    places = () if for_paper else positions(acid)
    size = (PAPER_WIDTH, PAPER_HEIGHT) if for_paper else (WIDTH, HEIGHT)
    view["drawing"], view["positions"] = _drawing(acid, explanations[shown - 1], places, *size)
    return view


def name_of(model: Model, smiles: str) -> str:
    """Name of an acid that is in the table; empty for others."""
    rows = model.library.rows_of(smiles)
    return model.library.name[next(iter(rows.values()))] if rows else ""


def _drawing(
    acid: Acid, explanation: Explanation | None, places: Sequence[Position], width: int, height: int
) -> tuple[dict[str, Any], list[dict[str, Any]]]:
    lines = () if explanation is None else explanation.contributions
    tints = {a: line.contribution for line in lines for a in line.atoms}
    picture = draw(acid.mol, width, height, tints=tints, positions=places)
    drawing = {"light": picture.light, "dark": picture.dark, "width": width, "height": height}
    listed = [
        {
            "key": p.key,
            "place": p.place,
            "group": p.group,
            "label": p.label,
            "hydrogen": p.root is None,
            "x": picture.places[p.key][0],
            "y": picture.places[p.key][1],
        }
        for p in places
    ]
    return drawing, listed


def _step_view(
    row: dict[str, Any], step: StepPrediction, explanation: Explanation | None, notes: list[str]
) -> dict[str, Any]:
    """Row of the table of predictions for one step, and what stands behind it."""
    return {
        **row,
        "verdict_reasons": [r for r in step.reasons if r not in notes],
        "expected_error": step.expected_error,
        "measured_source": citation(step.measured_source) if step.measured_source else "",
        "measured_uncertainty": step.measured_uncertainty,
        "neighbours": [
            {
                "smiles": n.smiles,
                "name": n.name,
                "step": n.step,
                "pka": n.pka,
                "distance": n.distance,
                "source": citation(n.source),
            }
            for n in step.neighbours
        ],
        "parent": "" if explanation is None else explanation.parent,
        "parent_pka": None if explanation is None else explanation.parent_pka,
        "contributions": [
            {
                "substituent": c.substituent,
                "atoms": list(c.atoms),
                "path_length": c.path_length,
                "contribution": c.contribution,
                "low": c.low,
                "high": c.high,
                "pairs": c.witnesses.n,
                "pairs_mean": c.witnesses.mean if c.witnesses.n else None,
                "pairs_verdict": c.witnesses.verdict,
            }
            for c in (() if explanation is None else explanation.contributions)
        ],
    }
