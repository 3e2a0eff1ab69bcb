"""The evaluation on acids measured elsewhere, as tables for people.

The rows judge; nothing of the model is set on them.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace
from pathlib import Path

import numpy as np

from qsar.errors import UserError
from qsar.model.domain import VERDICTS
from qsar.validation.judged import AMINO, FAMILIES, Flags, Judged
from qsar.validation.metrics import LEVELS, bootstrap, ratio_of_means


def find_open_file(folder: Path) -> Path:
    """The dataset's file in a folder.

    Raises
    ------
    UserError
        If the folder holds no or several CSV files.
    """
    if folder.is_file():
        return folder
    files = sorted(folder.glob("*.csv")) if folder.is_dir() else []
    if len(files) != 1:
        raise UserError(f"--open-data {folder}: {len(files) or 'no'} CSV files there; name the one to read")
    return files[0]


def as_text(judged: Judged) -> str:
    """The evaluation as tables for people; every number with its n."""
    lines = [
        f"{len(judged.measured)} measured steps of {judged.acid.max() + 1} acids, each predicted without it; "
        f"{int((~judged.trained_on).sum())} steps of acids that are not in the training table",
        "",
        "mean absolute error (n)                   all, model   forest         not in table, model   forest",
    ]
    for name, rows in _groups(judged).items():
        new = rows & ~judged.trained_on
        cells = [judged.errors(r, forest=f) for r in (rows, new) for f in (False, True)]
        lines.append(
            f"{name:40}  {cells[0].mean_absolute:6.3f} ({cells[0].n:3d})  {cells[1].mean_absolute:6.3f}"
            f"         {cells[2].mean_absolute:9.3f} ({cells[2].n:3d})   {cells[3].mean_absolute:9.3f}"
        )
    lines += ["", *_coverage_lines(judged), "", *_verdict_lines(judged)]
    return "\n".join(lines)


def as_printed(judged: Judged, printed: Sequence[float]) -> str:
    """The errors once more against the values as they are printed, whatever medium they belong to."""
    raw = replace(judged, measured=np.array(printed))
    moved = np.abs(raw.measured - judged.measured) > 1e-9
    lines = [
        "",
        f"{int(moved.sum())} values above were brought to ionic strength 0 from the medium that their row states "
        "(Davies); against the values as printed:",
    ]
    for name, rows in _groups(judged).items():
        e, held = raw.errors(rows), raw.coverage(0.9, rows)
        lines.append(
            f"{name:40}  {e.mean_absolute:6.3f} ({e.n:3d}, {int((moved & rows).sum())} of them moved)   90 %: "
            f"{100 * held.share:5.1f}{' ' if held.within else '!'}({100 * held.low:.0f}-{100 * held.high:.0f})"
        )
    return "\n".join(lines)


def _groups(judged: Judged) -> dict[str, Flags]:
    """The families, amino acids once more by their number of COOH groups, and all."""
    groups: dict[str, Flags] = {}
    for name in FAMILIES:
        groups[name] = judged.family == name
        if name == AMINO:
            groups["  of these, one COOH"] = groups[name] & (judged.n_sites == 1)
            groups["  of these, several COOH"] = groups[name] & (judged.n_sites > 1)
    groups["all"] = np.ones(len(judged.measured), dtype=bool)
    return groups


def _coverage_lines(judged: Judged) -> list[str]:
    lines = ["share held by the intervals, with the binomial 95 % band of the level"]
    for name, rows in {**_groups(judged), "not in table": ~judged.trained_on}.items():
        cells = []
        for level in LEVELS:
            c = judged.coverage(level, rows)
            mark = " " if c.within else "!"
            cells.append(f"{100 * level:2.0f} %: {100 * c.share:5.1f}{mark}({100 * c.low:.0f}-{100 * c.high:.0f})")
        lines.append(f"{name:32} n {int(rows.sum()):3d}   {'   '.join(cells)}")
    width, error = judged.width(0.9), np.abs(judged.error)
    inside = judged.verdict == VERDICTS[0]
    order = np.argsort(judged.expected, kind="stable")
    by_width = np.argsort(width, kind="stable")
    third = max(len(order) // 3, 1)
    lines += [
        f"median 90 % width inside the domain: {np.median(width[inside]):.2f} (n {int(inside.sum())}); "
        f"all: {np.median(width):.2f}",
        f"mean absolute error of the narrowest third {error[by_width[:third]].mean():.3f}, of the widest third "
        f"{error[by_width[-third:]].mean():.3f} (n {third} each); by expected error "
        f"{error[order[:third]].mean():.3f} and {error[order[-third:]].mean():.3f}",
    ]
    return lines


def _verdict_lines(judged: Judged) -> list[str]:
    lines = ["verdict       share      n   mean absolute error   median"]
    for verdict in VERDICTS:
        rows = judged.verdict == verdict
        e = judged.errors(rows)
        lines.append(
            f"{verdict:12} {100 * rows.mean():5.1f} %  {e.n:4d}   {e.mean_absolute:.3f}                 "
            f"{e.median_absolute:.3f}"
        )
    warned = judged.verdict != VERDICTS[0]
    values = bootstrap(lambda rows: ratio_of_means(judged.error, warned, rows), judged.acid)
    whole = ratio_of_means(judged.error, warned, np.arange(len(warned)))
    low = float(np.quantile(values, 0.05)) if len(values) else float("nan")
    lines.append(f"warned over inside: {whole:.2f}, bootstrap 5 % bound {low:.2f} ({len(values)} resamples of acids)")
    return lines
