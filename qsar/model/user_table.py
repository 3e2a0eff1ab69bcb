"""A user's clean table: measurements with the dates that it may hold."""

from __future__ import annotations

import csv
import re
from collections.abc import Sequence
from dataclasses import dataclass, replace
from datetime import date
from pathlib import Path

from qsar.errors import UserError
from qsar.sources import key_of
from qsar.table import Measurement, read_table

PRECISE = 0.15  # pKa units; rows that are less certain count less than one


@dataclass(frozen=True)
class UserTable:
    """Measurements and the day of each.

    Attributes
    ----------
    measurements : list of Measurement
    dates : list of date or None
        None where the row states none.
    suspected : list of str
        The artefact that the curation holds for likely, empty where it holds none.
    """

    measurements: list[Measurement]
    dates: list[date | None]
    suspected: list[str]

    @property
    def newest(self) -> date | None:
        """Day of the last measurement, None where no row states one."""
        return max((d for d in self.dates if d is not None), default=None)

    @property
    def suspects(self) -> list[str]:
        """One line for each row that is suspected."""
        return [
            f"{m.name or m.acid.smiles} {m.pka:.2f} ({s})"
            for m, s in zip(self.measurements, self.suspected, strict=True)
            if s
        ]

    def sound(self) -> UserTable:
        """The rows that are not suspected."""
        return self._some([not s for s in self.suspected])

    def until(self, last: date) -> UserTable:
        """The rows measured up to a day; those without a date are left out."""
        return self._some([d is not None and d <= last for d in self.dates])

    def after(self, last: date) -> UserTable:
        """The rows measured after a day; those without a date are left out."""
        return self._some([d is not None and d > last for d in self.dates])

    def _some(self, wanted: Sequence[bool]) -> UserTable:
        kept = [i for i, w in enumerate(wanted) if w]
        return UserTable(
            [self.measurements[i] for i in kept], [self.dates[i] for i in kept], [self.suspected[i] for i in kept]
        )


def read_user_table(path: Path) -> UserTable:
    """Read a clean table (see ``acidity curate``) with its optional columns ``date`` and ``suspected``.

    Raises
    ------
    UserError
        With file, row and column of the first cell that is wrong.
    """
    try:
        measurements = read_table(path)
    except UserError as problem:
        if not path.is_file():
            raise
        raise UserError(f"{problem}; `acidity curate {path.name}` makes a clean table") from problem
    with path.open(encoding="utf-8-sig", newline="") as handle:
        reader = csv.DictReader(handle)
        dates, suspected = [], []
        for row in reader:
            dates.append(read_date(row.get("date") or "", f"{path.name}, row {reader.line_num}, column date"))
            suspected.append((row.get("suspected") or "").strip())
    measurements = [replace(m, source=m.source if key_of(m.source) else f"in-house{m.source}") for m in measurements]
    return UserTable(measurements, dates, suspected)


def read_date(text: str, where: str) -> date | None:
    """Read a day written YYYY-MM-DD; a time behind it is ignored, a missing month or day is the first.

    Raises
    ------
    UserError
        If it is written in another way.
    """
    text = text.strip()
    if not text:
        return None
    parts = re.fullmatch(r"(\d{4})(?:-(\d{1,2})(?:-(\d{1,2})(?:[T ].*)?)?)?", text)
    try:
        if parts is None:
            raise ValueError(text)
        return date(int(parts[1]), int(parts[2] or 1), int(parts[3] or 1))
    except ValueError as problem:
        raise UserError(f"{where}: '{text[:30]}' is not a day; write YYYY-MM-DD") from problem


def weights_of(measurements: Sequence[Measurement]) -> list[float]:
    """Weight of each row beside its variance.

    The trend weighs each target by the inverse of its variance by itself; this weight tells the booster, and lets a
    row that is less certain than `PRECISE` count for :math:`(0.15/u)^2`.
    """
    return [min(1.0, (PRECISE / max(m.uncertainty, 0.01)) ** 2) for m in measurements]
