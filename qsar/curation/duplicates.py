"""Several rows for the same step of the same acid: merged where they agree, set apart where they do not."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from qsar.curation.isomer_labels import one_spelling
from qsar.curation.rules import Refusal, Usable, to_standard_state

LIMIT = 0.3  # pKa units; two laboratories differ by 0.4 at the 90th percentile of published pairs


@dataclass(frozen=True)
class Merged:
    """One step of one acid after merging.

    Attributes
    ----------
    row : Usable
        The first of the rows, with the merged value and uncertainty.
    rows : tuple of int
        Numbers of all rows that went in.
    """

    row: Usable
    rows: tuple[int, ...]


@dataclass(frozen=True)
class Conflict:
    """A row that disagrees with another one about the same step.

    Attributes
    ----------
    row, other : Usable
        The pair; `row` is left out.
    """

    row: Usable
    other: Usable

    @property
    def reason(self) -> str:
        """One line for the user."""
        return (
            f"pKa {self.row.pka:.2f} disagrees with row {self.other.number} ({self.other.pka:.2f}) on the same step "
            f"of the same acid by {abs(self.row.pka - self.other.pka):.2f}; look both up"
        )


def weighted_median(
    values: Sequence[float] | NDArray[np.float64], weights: Sequence[float] | NDArray[np.float64]
) -> float:
    """Value that half of the weight lies below and half above (the lower and upper one averaged where they tie).

    Parameters
    ----------
    values, weights : sequence of float, length n
        Weights are positive.

    Examples
    --------
    >>> weighted_median([1.0, 2.0, 10.0], [1.0, 1.0, 1.0])
    2.0
    >>> weighted_median([1.0, 2.0], [1.0, 3.0])
    2.0
    """
    order = np.argsort(values, kind="stable")
    v, w = np.asarray(values, dtype=float)[order], np.asarray(weights, dtype=float)[order]
    below = np.cumsum(w)
    half = below[-1] / 2.0
    k = int(np.searchsorted(below, half * (1.0 - 1e-12)))
    if k + 1 < len(v) and math.isclose(below[k], half, rel_tol=1e-12):
        return float((v[k] + v[k + 1]) / 2.0)
    return float(v[k])


def settle_steps(rows: Sequence[Usable]) -> tuple[list[Usable], list[tuple[int, Refusal]]]:
    """Give a step to the rows of polybasic acids that name none, where that is safe.

    One such row of an acid is its first step; as many rows as the acid has COOH are its steps by rising pKa.
    Anything else is refused.

    Returns
    -------
    rows : list of Usable
    refused : list of (row number, Refusal)
    """
    settled = [r for r in rows if r.step is not None]
    groups: dict[str, list[Usable]] = {}
    for row in rows:
        if row.step is None:
            groups.setdefault(one_spelling(row.acid.smiles), []).append(row)
    taken = {one_spelling(r.acid.smiles) for r in settled}
    refused: list[tuple[int, Refusal]] = []
    for key, group in groups.items():
        n = len(group[0].acid.sites)
        distinct = len({round(r.measured, 6) for r in group}) == len(group)
        if key not in taken and distinct and len(group) in (1, n):
            ordered = sorted(group, key=lambda r: r.measured)
            why = "by rising pKa" if len(group) > 1 else "as the only row of the acid"
            for k, row in enumerate(ordered, start=1):
                note = f"step not stated: taken as step {k} of {n} {why}"
                settled.append(to_standard_state(replace(row, step=k, changes=(*row.changes, note))))
            continue
        reason = f"step not stated, and the acid has {n} COOH and {len(group)} such rows; fill in the column step"
        refused.extend((row.number, Refusal(reason)) for row in group)
    return sorted(settled, key=lambda r: r.number), refused


def merge(rows: Sequence[Usable], limit: float = LIMIT) -> tuple[list[Merged], list[Conflict]]:
    """Merge duplicates.

    Parameters
    ----------
    rows : sequence of Usable
        All with a step.
    limit : float
        Largest difference between rows that are merged, pKa units.

    Returns
    -------
    merged : list of Merged
        In the order of the first row of each. Value: the median weighted by the inverse variance.
    conflicts : list of Conflict
        Rows left out. Where all rows of a step but one lie within `limit` of their median and there are at least
        three, that one is left out; otherwise all are.
    """
    groups: dict[tuple[str, int], list[Usable]] = {}
    for row in rows:
        assert row.step is not None
        groups.setdefault((one_spelling(row.acid.smiles), row.step), []).append(row)
    merged, conflicts = [], []
    for group in groups.values():
        agreeing, odd = _split(group, limit)
        conflicts.extend(odd)
        if agreeing:
            merged.append(_merge(agreeing))
    return sorted(merged, key=lambda m: m.rows[0]), sorted(conflicts, key=lambda c: c.row.number)


def _split(group: list[Usable], limit: float) -> tuple[list[Usable], list[Conflict]]:
    values = np.array([r.pka for r in group])
    if np.ptp(values) <= limit:
        return group, []
    if len(group) > 2:
        far = np.flatnonzero(np.abs(values - _median(group)) > limit)
        rest = [r for k, r in enumerate(group) if k not in far]
        if len(far) == 1 and np.ptp([r.pka for r in rest]) <= limit:
            odd = group[int(far[0])]
            return rest, [Conflict(odd, max(rest, key=lambda r: abs(r.pka - odd.pka)))]
    return [], [Conflict(r, max(group, key=lambda o: abs(o.pka - r.pka))) for r in group]


def _median(group: Sequence[Usable]) -> float:
    return weighted_median([r.pka for r in group], [r.uncertainty**-2 for r in group])


def _merge(group: list[Usable]) -> Merged:
    first = group[0]
    numbers = tuple(r.number for r in group)
    if len(group) == 1:
        return Merged(first, numbers)
    weights = np.array([r.uncertainty**-2 for r in group])
    value = _median(group)
    scatter = float(np.sqrt(np.sum(weights * (np.array([r.pka for r in group]) - value) ** 2) / weights.sum()))
    # Rows of one table share their systematic errors, so that many of them are never better than half of one.
    uncertainty = max(1.0 / math.sqrt(weights.sum()), scatter, 0.5 * min(r.uncertainty for r in group))
    others = ", ".join(str(n) for n in numbers[1:])
    changes = tuple(dict.fromkeys(c for r in group for c in r.changes))
    row = replace(
        first,
        pka=value,
        uncertainty=uncertainty,
        changes=(*changes, f"weighted median of {len(group)} rows (with {others})"),
    )
    return Merged(row, numbers)
