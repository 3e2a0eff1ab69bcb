"""Sources of measured values: their keys, the publications behind them, and what was printed there.

A value that was brought to the standard state says so behind the key of its source:
``"KEY; as printed 4.56 at I = 0.1 mol/L"``.
"""

from __future__ import annotations

import csv
from functools import cache

from qsar.paths import sources_table

_PRINTED = "; as printed "


def as_printed(source: str, pka: float, ionic_strength_m: float) -> str:
    """A source together with the value that it prints and the ionic strength, mol/L, that this value belongs to."""
    return f"{source}{_PRINTED}{pka:g} at I = {ionic_strength_m:g} mol/L"


def key_of(source: str) -> str:
    """Key of a source without what stands behind it."""
    return source.partition(_PRINTED)[0]


@cache
def publications() -> dict[str, dict[str, str]]:
    """Rows of the list of sources by their key; empty where there is no list."""
    path = sources_table()
    if not path.is_file():
        return {}
    with path.open(encoding="utf-8", newline="") as handle:
        return {row["source"]: row for row in csv.DictReader(handle)}


def citation(source: str) -> str:
    """Publication behind a source, with what it prints; the key itself for one that is not in the list."""
    key, printed, value = source.partition(_PRINTED)
    row = publications().get(key)
    if row is not None:
        key = " ".join(x for x in (row["authors"], row["title"], f"({row['year']})") if x)
    return f"{key}{printed}{value}"


def printed(source: str) -> str:
    """What a source prints where that was brought to the standard state: "as printed 4.56 at I = 0.1 mol/L"."""
    return "".join(source.partition(_PRINTED)[1:]).removeprefix("; ")
