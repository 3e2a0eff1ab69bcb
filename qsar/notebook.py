"""Predictions that show themselves in a notebook: a table with a drawing of each acid."""

from __future__ import annotations

from html import escape
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from rdkit import Chem

    from qsar.model.model import Prediction, StepPrediction

#: Mark of each verdict, so that no colour is needed to tell them apart.
MARKS = {"inside": "●", "borderline": "◐", "outside": "○"}
_SHOWN = 50
_SIZE = (150, 110)


class Predictions(list["Prediction"]):
    """A list of predictions with a face for notebooks."""

    def _repr_html_(self) -> str:
        return predictions_html(self)


def predictions_html(predictions: list[Prediction]) -> str:
    """Predictions as an HTML table with drawings.

    Parameters
    ----------
    predictions : list of Prediction

    Returns
    -------
    str
        One table, complete in itself: drawings are inline SVG, nothing is fetched, all text is escaped. Beyond 50
        acids the rest is counted in a last line.
    """
    if not predictions:
        return "<p>no predictions</p>"
    level = next((s.coverage for p in predictions for s in p.steps), 0.9)
    heads = ("structure", "step", "pKa", f"{level:.0%} interval", "verdict", "nearest measured acid", "reasons")
    head = "".join(f'<th style="text-align:left">{escape(h)}</th>' for h in heads)
    body = "".join(_rows(p) for p in predictions[:_SHOWN])
    rest = len(predictions) - _SHOWN
    more = f'<tr><td colspan="{len(heads)}">and {rest} more</td></tr>' if rest > 0 else ""
    return f"<table><thead><tr>{head}</tr></thead><tbody>{body}{more}</tbody></table>"


def _rows(prediction: Prediction) -> str:
    if prediction.error is not None or prediction.acid is None:
        return f'<tr><td></td><td colspan="6">{escape(prediction.error or "not predicted")}</td></tr>'
    n = len(prediction.steps)
    picture = (
        f'<td rowspan="{n}" title="{escape(prediction.structure, quote=True)}">{drawing(prediction.acid.mol)}</td>'
    )
    return "".join(
        f"<tr>{picture if k == 0 else ''}{''.join(f'<td>{c}</td>' for c in _cells(s))}</tr>"
        for k, s in enumerate(prediction.steps)
    )


def _cells(s: StepPrediction) -> tuple[str, ...]:
    near = "" if s.nearest_pka is None else f"{s.nearest or 'structure withheld'} ({s.nearest_pka:.2f})"
    measured = "" if s.measured is None else f" (measured {s.measured:.2f})"
    return (
        str(s.step),
        f"<b>{s.pka:.2f}</b>{measured}",
        f"{s.low:.2f} to {s.high:.2f}",
        f"{MARKS.get(s.domain, '')} {escape(s.domain)}",
        escape(near),
        escape("; ".join(s.reasons)),
    )


def drawing(mol: Chem.Mol, size: tuple[int, int] = _SIZE) -> str:
    """A molecule as inline SVG, in black."""
    from rdkit.Chem.Draw import rdMolDraw2D

    canvas = rdMolDraw2D.MolDraw2DSVG(*size)
    options = canvas.drawOptions()
    options.useBWAtomPalette()
    options.clearBackground = False  # type: ignore[assignment]
    rdMolDraw2D.PrepareAndDrawMolecule(canvas, mol)
    canvas.FinishDrawing()
    svg = str(canvas.GetDrawingText())
    return svg[svg.index("<svg") :]  # an XML declaration has no place inside a page
