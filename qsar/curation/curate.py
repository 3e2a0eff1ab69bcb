"""Curation of one table: from rows as they came to rows that can be trained on, with nothing lost on the way."""

from __future__ import annotations

import csv
from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from pathlib import Path

from qsar.curation.duplicates import LIMIT, Conflict, Merged, merge, settle_steps
from qsar.curation.examination import Flag
from qsar.curation.families import family_of
from qsar.curation.readers import RawRow
from qsar.curation.rules import Defaults, Refusal, Usable, apply_rules
from qsar.files import atomic_path
from qsar.writing import disarmed

CLEAN_COLUMNS = (
    "name",
    "smiles",
    "step",
    "pka",
    "temperature_c",
    "ionic_strength_m",
    "constant",
    "uncertainty",
    "family",
    "source",
    "date",
    "rows",
    "pka_before_correction",
    "suspected",
    "flag",
)
LEFT_COLUMNS = ("row", "outcome", "reason", "other_rows")
FLAG_COLUMNS = (
    "rows",
    "name",
    "smiles",
    "step",
    "pka",
    "expected",
    "low",
    "high",
    "domain",
    "rank",
    "likelihood",
    "artefact",
    "explanation",
    "pka_difference_left",
    "decided_by",
)


@dataclass(frozen=True)
class Curated:
    """The outcome of a curation.

    Attributes
    ----------
    rows : list of RawRow
        Everything that came in.
    kept : list of Merged
    refused : dict of int to str
        Reason by row number, conflicts not included.
    conflicts : list of Conflict
    """

    rows: list[RawRow]
    kept: list[Merged]
    refused: dict[int, str]
    conflicts: list[Conflict]

    @property
    def merged(self) -> int:
        """Rows that were merged into another one."""
        return sum(len(m.rows) - 1 for m in self.kept)

    @property
    def balance(self) -> str:
        """The count that shows that nothing disappeared."""
        left_out = len(self.refused) + len(self.conflicts)
        return (
            f"{len(self.rows)} in = {len(self.kept)} kept + {self.merged} merged + {left_out} refused"
            f" ({len(self.conflicts)} of them in conflict)"
        )


def curate(rows: Sequence[RawRow], defaults: Defaults, limit: float = LIMIT) -> Curated:
    """Apply the rules, settle steps and merge duplicates.

    Parameters
    ----------
    rows : sequence of RawRow
    defaults : Defaults
        What holds where a row does not say.
    limit : float
        Largest difference between rows that are merged, pKa units.
    """
    usable: list[Usable] = []
    refused: dict[int, str] = {}
    for row in rows:
        try:
            usable.append(apply_rules(row, defaults))
        except Refusal as problem:
            refused[row.number] = " ".join(str(problem).split())
    settled, unsettled = settle_steps(usable)
    refused.update({number: str(problem) for number, problem in unsettled})
    kept, conflicts = merge(settled, limit)
    result = Curated(list(rows), kept, refused, conflicts)
    assert len(rows) == len(kept) + result.merged + len(refused) + len(conflicts)
    return result


def write_clean(path: Path, curated: Curated, flags: Sequence[Flag] = ()) -> None:
    """Write the table to train on; see `CLEAN_COLUMNS`.

    Constants are thermodynamic, at ionic strength 0. ``rows`` are the rows of the source that went in; ``suspected`` is
    the artefact that most likely lies behind a value, empty where none is likelier than a sound value.
    """
    flagged = {f.merged.rows: f for f in flags}

    def line(m: Merged) -> list[object]:
        r = m.row
        flag = flagged.get(m.rows)
        temperature = 25.0 if r.temperature_c is None else r.temperature_c
        return [
            r.name,
            r.acid.smiles,
            r.step,
            f"{r.pka:.4f}",
            f"{temperature:g}",
            0,
            "thermodynamic",
            f"{r.uncertainty:.4f}",
            r.family or family_of(r.acid),
            r.source or "in-house",
            r.date,
            _numbers(m.rows),
            f"{r.measured:.4f}",
            flag.artefact if flag else "",
            flag.sentence if flag else "",
        ]

    write_csv(path, CLEAN_COLUMNS, (line(m) for m in curated.kept))


def write_left(path: Path, curated: Curated) -> None:
    """Write every refused, conflicting, merged or changed row, under `LEFT_COLUMNS` and its own headers."""
    headers = list(dict.fromkeys(h for row in curated.rows for h in row.original))
    of_row = {n: m for m in curated.kept for n in m.rows}
    conflict = {c.row.number: c for c in curated.conflicts}

    def lines() -> Iterable[list[object]]:
        for row in curated.rows:
            n = row.number
            if n in curated.refused:
                head = [n, "refused", curated.refused[n], ""]
            elif n in conflict:
                head = [n, "conflict", conflict[n].reason, conflict[n].other.number]
            else:
                m = of_row[n]
                if n == m.rows[0] and not m.row.changes:
                    continue
                outcome = "changed" if n == m.rows[0] else "merged"
                reason = "; ".join(m.row.changes) if n == m.rows[0] else f"merged into row {m.rows[0]}"
                head = [n, outcome, reason, _numbers(r for r in m.rows if r != n)]
            yield [*head, *(row.original.get(h, "") for h in headers)]

    write_csv(path, (*LEFT_COLUMNS, *headers), lines())


def write_flags(path: Path, flags: Sequence[Flag]) -> None:
    """Write the cross-examination, one line for each explanation; see `FLAG_COLUMNS`."""

    def lines() -> Iterable[list[object]]:
        for flag in flags:
            r = flag.merged.row
            for k, e in enumerate(flag.explanations, start=1):
                s = e.suspicion
                yield [
                    _numbers(flag.merged.rows),
                    r.name,
                    r.acid.smiles,
                    r.step,
                    f"{r.pka:.3f}",
                    f"{flag.expected:.3f}",
                    f"{flag.low:.3f}",
                    f"{flag.high:.3f}",
                    flag.domain,
                    k,
                    f"{e.likelihood:.3f}",
                    s.kind,
                    s.explanation,
                    f"{s.residual:.3f}",
                    s.decide,
                ]

    write_csv(path, FLAG_COLUMNS, lines())


def _numbers(rows: Iterable[int]) -> str:
    return " ".join(str(n) for n in rows)


def write_csv(path: Path, header: Sequence[str], lines: Iterable[Sequence[object]]) -> None:
    """Write a CSV file, whole or not at all; no cell of it is taken for a formula by a spreadsheet."""
    with atomic_path(path) as temporary, temporary.open("w", encoding="utf-8", newline="") as handle:
        writer = csv.writer(handle)
        writer.writerow(header)
        for line in lines:
            writer.writerow([disarmed(cell) if isinstance(cell, str) else cell for cell in line])
