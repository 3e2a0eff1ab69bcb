"""An in-house table for measurements: real structures, INVENTED pKa values.

The structures are those of :mod:`benchmarks.many_acids`. The values come from a formula that nobody measured: each
skeleton has a constant, each group takes off what its electronegative atoms are worth, less at a remote place, and a
normal deviate is added. They are good for timing and for nothing else.
"""

from __future__ import annotations

import csv
from pathlib import Path

import numpy as np
from benchmarks.many_acids import SKELETONS, acid, parts

NOISE = 0.08  # pKa units
_WORTH = {"F": 0.25, "l": 0.2, "r": 0.18, "N": 0.1, "O": 0.12, "S": 0.06, "n": 0.08, "s": 0.05, "#": 0.15, "c": 0.02}
_PLACES = (1.0, 0.7, 0.5)
_SECOND_STEP = 1.2


def value(number: int) -> float:
    """Invented pKa of the first step of an acid, without the deviate."""
    skeleton, groups = parts(number)
    worth = sum(w * _WORTH.get(atom, 0.0) for w, g in zip(_PLACES, groups, strict=True) for atom in g)
    return 3.2 + 0.11 * skeleton - 0.6 * np.tanh(worth)


def write_table(path: Path, count: int) -> int:
    """Write the table of `count` acids, both steps of the dibasic ones.

    Returns
    -------
    int
        Rows.
    """
    deviates = np.random.default_rng(1).normal(scale=NOISE, size=(count, 2))
    rows = 0
    with path.open("w", encoding="utf-8", newline="") as handle:
        writer = csv.writer(handle)
        writer.writerow(("name", "smiles", "step", "pka", "uncertainty", "family", "source"))
        for number in range(count):
            skeleton, smiles = parts(number)[0], acid(number)
            for step in range(2 if SKELETONS[skeleton].count("C(=O)O)") else 1):
                pka = value(number) + _SECOND_STEP * step + deviates[number, step]
                cells = (f"invented {number}", smiles, step + 1, f"{pka:.2f}", 0.05, f"series {skeleton}", "invented")
                writer.writerow(cells)
                rows += 1
    return rows
