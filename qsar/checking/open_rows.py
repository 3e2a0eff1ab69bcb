"""A table against the IUPAC Digitized pKa Dataset, acid by acid and step by step."""

from __future__ import annotations

import statistics
from collections import defaultdict
from collections.abc import Iterable, Sequence
from dataclasses import dataclass

from qsar.checking.rows import TableRow
from qsar.curation.isomer_labels import one_spelling, without_centres
from qsar.curation.iupac import OpenStep

BANDS = (0.05, 0.1, 0.2)
"""Limits of the bands in pKa units; a difference above the last is "beyond"."""

_ROUNDING = 1e-9


@dataclass(frozen=True)
class Comparison:
    """A row of the table and the open value for the same step.

    Attributes
    ----------
    row : TableRow
    open : OpenStep
    """

    row: TableRow
    open: OpenStep

    @property
    def difference(self) -> float:
        """Table minus open value, pKa units."""
        return self.row.pka - self.open.pka

    @property
    def band(self) -> str:
        """The difference in words."""
        return band(self.difference)

    @property
    def conditions(self) -> str:
        """What is particular about the open value, in words; empty where nothing is."""
        parts = []
        if abs(self.open.temperature_c - 25) > 1:
            parts.append(f"at {self.open.temperature_c:g} °C")
        if self.open.ionic_strength_m:
            parts.append(f"at I = {self.open.ionic_strength_m:g} M")
        kinds = [note for note in self.open.note.split("; ") if note.endswith("constant")]
        parts += [f"a {kind}" for kind in kinds]
        if self.open.assessment.lower() not in ("reliable", "approximate"):
            parts.append(f"graded {self.open.assessment.lower() or 'not at all'}")
        return ", ".join(parts)


def band(difference: float) -> str:
    """Band of a difference in pKa units: within one of :data:`BANDS`, or beyond the last."""
    for limit in BANDS:
        if abs(difference) <= limit + _ROUNDING:
            return f"within {limit:g}"
    return f"beyond {BANDS[-1]:g}"


def compare(rows: Iterable[TableRow], steps: Iterable[OpenStep]) -> list[Comparison]:
    """Pair the rows of a table with open values of the same acid, isomer and step.

    Mirror images are one acid. Where one side does not state the configuration of its centres, they are
    paired if the other side holds a single configuration.

    Parameters
    ----------
    rows : iterable of TableRow
    steps : iterable of OpenStep

    Returns
    -------
    list of Comparison
        In the order of the rows; rows without an open value are left out.
    """
    rows = list(rows)
    exact: dict[tuple[str, int], OpenStep] = {}
    loose: dict[tuple[str, int], list[OpenStep]] = defaultdict(list)
    for step in steps:
        exact[step.smiles, step.step] = step
        loose[without_centres(step.smiles), step.step].append(step)
    isomers: dict[str, set[str]] = defaultdict(set)
    for row in rows:
        isomers[without_centres(row.smiles)].add(one_spelling(row.smiles))
    found = []
    for row in rows:
        smiles = one_spelling(row.smiles)
        bare = without_centres(row.smiles)
        match = exact.get((smiles, row.step))
        if match is None:
            others = loose.get((bare, row.step), [])
            one_each = len(others) == 1 and len(isomers[bare]) == 1
            if one_each and bare in (smiles, others[0].smiles):
                match = others[0]
        if match is not None:
            found.append(Comparison(row, match))
    return found


def summary(comparisons: Sequence[Comparison]) -> list[str]:
    """Lines for people: how many were compared, how far they lie apart, what lies beyond the last band."""
    if not comparisons:
        return ["open rows: no row of the table is among them"]
    size = [abs(c.difference) for c in comparisons]
    signed = [c.difference for c in comparisons]
    counts = ", ".join(f"{sum(s <= limit + _ROUNDING for s in size)} within {limit:g}" for limit in BANDS)
    beyond = [c for c in comparisons if abs(c.difference) > BANDS[-1] + _ROUNDING]
    lines = [
        f"open rows: {len(comparisons)} steps compared; absolute difference "
        f"median {statistics.median(size):.3f}, mean {statistics.fmean(size):.3f}; "
        f"table minus open, mean {statistics.fmean(signed):+.3f}; "
        f"{counts}, {len(beyond)} beyond {BANDS[-1]:g}"
    ]
    for c in sorted(beyond, key=lambda c: -abs(c.difference)):
        reason = c.row.entry("open rows").removeprefix(f"open rows: {c.band}").lstrip("; ")
        lines.append(f"  {c.row.label} ({c.difference:+.2f}): {reason or 'no reason given in the table'}")
    return lines
