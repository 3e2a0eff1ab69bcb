"""Predictions as a table for people: two decimals, as wide as the terminal."""

from __future__ import annotations

import shutil
import textwrap
from collections.abc import Iterable, Iterator, Sequence

from qsar.reading import Record
from qsar.writing import UNUSABLE, Row

_GAP = "  "
_WIDEST = 118
_NARROWEST = 80


class ScreenTable:
    """Lays out rows, and below each the reasons for its verdict.

    The widths of the columns follow the first rows that are given, so that a stream of any length keeps one
    layout.

    Parameters
    ----------
    coverage : float
        Fraction that the intervals are meant to hold, for the heading.
    width : int, optional
        Characters in a line; by default those of the terminal, 80 to 118.
    """

    def __init__(self, coverage: float, width: int | None = None) -> None:
        columns = shutil.get_terminal_size((_WIDEST, 24)).columns
        self._width = width or min(max(columns, _NARROWEST), _WIDEST)
        self._interval = f"{coverage * 100:g} % interval"
        self._widths: tuple[int, ...] = ()

    def lines(self, answers: Iterable[tuple[Record, Sequence[Row]]]) -> Iterator[str]:
        """Lines for inputs and their rows; the first call begins with the heading."""
        answers = list(answers)
        table = [(record, row, _cells(row)) for record, rows in answers for row in rows]
        if not self._widths and table:
            heading = ("id", "structure", "pKa", self._interval, "verdict", "nearest measured acid")
            self._widths = self._fit([heading, *(cells for _, _, cells in table)])
            line = self._line(heading)
            yield line
            yield "-" * len(line)
        for record, row, cells in table:
            yield self._line(cells)
            yield from self._below(record, row)

    def _fit(self, table: Sequence[tuple[str, ...]]) -> tuple[int, ...]:
        """Widths of the columns; identity, structure and nearest acid share what the others leave."""
        wanted = [max(len(row[i]) for row in table) for i in range(6)]
        wanted[4] = max(wanted[4], len("borderline"))
        wanted[0] = min(wanted[0], 24 if self._width >= 100 else 14)
        room = self._width - sum(wanted[i] for i in (0, 2, 3, 4)) - 5 * len(_GAP)
        if wanted[1] + wanted[5] > room:
            half = room // 2
            wanted[5] = min(wanted[5], max(half, room - wanted[1]))
            wanted[1] = room - wanted[5]
        return tuple(wanted)

    def _line(self, cells: Sequence[str]) -> str:
        shown = []
        for i, (cell, width) in enumerate(zip(cells, self._widths, strict=True)):
            text = _clean(cell)
            if len(text) > width:
                text = _shorten_nearest(text, width) if i == 5 else text[: width - 1] + "…"
            shown.append(text.rjust(width) if i == 2 else text.ljust(width))
        return _GAP.join(shown).rstrip()

    def _below(self, record: Record, row: Row) -> Iterator[str]:
        notes = [note for note in row.reasons.split("; ") if note]
        if row.measured is not None:
            without = "" if row.pka_without is None else f"; predicted without it {row.pka_without:.2f}"
            notes.insert(0, f"measured {row.measured:.2f}{without}")
        if row.domain == UNUSABLE and record.where:
            notes = [f"{record.where}: {'; '.join(notes)}"]
        for note in notes:
            yield from textwrap.wrap(
                _clean(note), self._width, initial_indent="    · ", subsequent_indent="      "
            )


def _cells(row: Row) -> tuple[str, ...]:
    nearest = row.nearest
    if nearest and row.nearest_pka is not None:
        nearest += f" ({row.nearest_pka:.2f})"
    identity = row.id if row.step in (None, 1) else f"{row.id}, step {row.step}"
    interval = "" if row.low is None or row.high is None else f"{row.low:.2f} to {row.high:.2f}"
    return (
        identity,
        row.structure or row.smiles or "(none)",
        "" if row.pka is None else f"{row.pka:.2f}",
        interval,
        row.domain,
        nearest,
    )


def _shorten_nearest(text: str, width: int) -> str:
    """Shorten the structure and keep the value behind it."""
    smiles, blank, value = text.rpartition(" (")
    room = width - len(value) - 3
    return f"{smiles[:room]}…{blank}{value}" if blank and room > 0 else text[: width - 1] + "…"


def _clean(text: str) -> str:
    """Text that cannot steer the terminal."""
    return "".join(c if c.isprintable() else "?" for c in text)
