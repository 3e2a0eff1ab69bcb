"""Files to take away: the table as CSV, XLSX, JSON or SDF, and the HTML report."""

from __future__ import annotations

import tempfile
from collections.abc import Iterable
from datetime import UTC, datetime
from pathlib import Path
from typing import Any

from qsar import __version__
from qsar.errors import UserError
from qsar.service.settings import Refused
from qsar.writing import WRITERS, Row

MEDIA = {
    "csv": "text/csv; charset=utf-8",
    "xlsx": "application/vnd.openxmlformats-officedocument.spreadsheetml.sheet",
    "json": "application/json",
    "sdf": "chemical/x-mdl-sdfile",
}


def table_file(kind: str, rows: Iterable[Row]) -> bytes:
    """Rows as a file.

    Parameters
    ----------
    kind : str
        Key of `MEDIA`.
    rows : iterable of Row

    Raises
    ------
    Refused
        If they cannot be written.
    """
    with tempfile.TemporaryDirectory(prefix="acidity-") as folder:
        place = Path(folder) / f"table.{kind}"
        try:
            with WRITERS[f".{kind}"](place) as writer:
                writer.write(rows)
        except (UserError, ValueError, RuntimeError) as problem:
            raise Refused(422, "a structure among the rows cannot be written; take it out") from problem
        return place.read_bytes()


def report_page(templates: Any, acids: list[dict[str, Any]], decisions: list[dict[str, Any]]) -> str:
    """The HTML report, whole in one file.

    Parameters
    ----------
    templates : jinja2.Environment
    acids : list of dict
        As `qsar.service.views.acid_view` gives them, or with an `error`.
    decisions : list of dict
        Answers to decisions.
    """
    steps = [s for a in acids if not a["error"] for s in a["steps"]]
    values = [v for s in steps for v in (s["low"], s["high"], s["measured"]) if v is not None]
    ends = axis_ends(values)
    return str(
        templates.get_template("report.html").render(
            acids=acids,
            decisions=decisions,
            ends=ends,
            ticks=axis_ticks(*ends),
            made=datetime.now(UTC).strftime("%Y-%m-%d %H:%M UTC"),
            version=__version__,
            model=next((a["model"] for a in acids if not a["error"]), ""),
        )
    )


def axis_ends(values: list[float]) -> tuple[float, float]:
    """Whole numbers that hold all values with room to spare; also those below 0."""
    import math

    if not values:
        return 0.0, 7.0
    low, high = math.floor(min(values) - 0.25), math.ceil(max(values) + 0.25)
    missing = max(0, 3 - (high - low))
    return float(low - missing // 2), float(high + missing - missing // 2)


def axis_ticks(low: float, high: float) -> list[float]:
    """Whole numbers along an axis."""
    return [low + k for k in range(int(high - low) + 1)]
