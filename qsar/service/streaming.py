"""Answers to long lists as they come: one JSON object a line, so that a page can show progress and stop.

Each line has an `event`: ``start`` with the total, ``rows`` with the rows of some inputs and how many are done,
``end``, or ``failed`` with a sentence. When the client leaves, the work ends with the part that is under way.
"""

from __future__ import annotations

import json
from collections.abc import AsyncIterator, Sequence
from typing import Any

from qsar.reading import Record
from qsar.service.settings import Refused, Settings
from qsar.service.workers import ProcessEnded, TimeExceeded, Workers
from qsar.writing import unusable

Plain = tuple[str, str, str, str | None]
_FIRST, _PART = 20, 100


def line(event: str, **content: Any) -> bytes:
    """One line of the stream."""
    return json.dumps({"event": event, **content}, ensure_ascii=False, allow_nan=False).encode() + b"\n"


async def stream(
    workers: Workers, settings: Settings, records: Sequence[Plain], coverage: float
) -> AsyncIterator[bytes]:
    """Lines of the answer to a list.

    Parameters
    ----------
    workers : Workers
    settings : Settings
    records : sequence of (id, SMILES, place, error)
    coverage : float
    """
    yield line("start", total=len(records))
    done, slow = 0, [0]
    try:
        while done < len(records):
            part = list(records[done : done + (_FIRST if done == 0 else _PART)])
            rows = await predict_part(workers, settings, part, coverage, slow)
            done += len(part)
            yield line("rows", done=done, rows=[row for own in rows for row in own])
    except Refused as refusal:
        yield line("failed", done=done, detail=refusal.sentence)
        return
    yield line("end", done=done)


async def predict_part(
    workers: Workers, settings: Settings, part: list[Plain], coverage: float, slow: list[int], background: bool = True
) -> list[list[dict[str, Any]]]:
    """Rows of a part; a structure that takes too long or ends its process costs its own answer only.

    Parameters
    ----------
    slow : list of int
        Counts, in its one item, the structures that did.

    Raises
    ------
    Refused
        If there were too many of them, or no process can be had.
    """
    seconds = settings.seconds + 0.1 * (len(part) - 1)
    try:
        rows: list[list[dict[str, Any]]] = await workers.run(
            "predict", seconds=seconds, background=background, records=part, coverage=coverage
        )
        return rows
    except (TimeExceeded, ProcessEnded) as reason:
        if len(part) == 1:
            slow[0] += 1
            if slow[0] > settings.slow_rows:
                said = f"stopped: more than {settings.slow_rows} structures took too long or too much memory"
                raise Refused(503, said) from reason
            record = Record(part[0][0], part[0][1], part[0][2])
            return [[unusable(record, reason.sentence)._asdict()]]
    middle = len(part) // 2
    first = await predict_part(workers, settings, part[:middle], coverage, slow, background)
    return first + await predict_part(workers, settings, part[middle:], coverage, slow, background)
