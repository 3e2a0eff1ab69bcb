"""``acidity check-table``: a table of measured acids against itself, published lines and open rows."""

from __future__ import annotations

import argparse
import os
from collections import Counter
from collections.abc import Sequence
from pathlib import Path
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from qsar.checking.lines import Line, Point
    from qsar.checking.rows import TableRow

HELP = "check a table of measured acids against itself, published lines and open measurements"

OPEN_ROWS = "iupac_pka_acids_half.csv"
SOUND, FAULTY = 0, 3


def add_arguments(parser: argparse.ArgumentParser) -> None:
    """Describe the arguments of the command."""
    parser.add_argument(
        "table",
        nargs="?",
        type=Path,
        metavar="TABLE",
        help="a CSV with the columns of the reference table (default: the reference table)",
    )
    parser.add_argument(
        "--open-data",
        type=Path,
        metavar="PATH",
        default=os.environ.get("QSAR_OPEN_DATA"),
        help="file of the IUPAC Digitized pKa Dataset (release v2.4 or its header), or the folder that holds "
        f"{OPEN_ROWS}; it is compared with and never copied (default: QSAR_OPEN_DATA)",
    )
    parser.add_argument("--plots", type=Path, metavar="FOLDER", help="also draw the table, as PNG files in FOLDER")


def run(args: argparse.Namespace) -> int:
    """Run the command.

    Returns
    -------
    int
        0 if the table does not contradict itself, 3 if it does.

    Raises
    ------
    UserError
        If a file cannot be read or a plot cannot be written.
    """
    from qsar.checking.rows import faults, read_rows
    from qsar.paths import reference_table

    table = args.table or reference_table()
    rows = read_rows(table)
    found = faults(rows)
    print("\n".join([*_counts(rows), *found, *_lines(rows), *_chain(rows), *_open(rows, args.open_data)]))
    if args.plots is not None:
        from qsar.report.table_plots import draw

        for path in draw(rows, args.plots):
            print(f"drawn: {path}")
    return FAULTY if found else SOUND


def _counts(rows: Sequence[TableRow]) -> list[str]:
    from qsar.checking.rows import KINDS

    kinds = [row.kinds() for row in rows]
    checked = sum(bool(found) for found in kinds)
    share = f"{checked / len(rows):.1%}" if rows else "none"
    by_kind = ", ".join(f"{kind} {sum(kind in found for found in kinds)}" for kind in KINDS)
    families = Counter(family for _, family in {(row.smiles, row.family) for row in rows})
    return [
        f"{len(rows)} steps of {len({row.smiles for row in rows})} acids; {checked} ({share}) carry a check: {by_kind}",
        "acids by family: " + ", ".join(f"{name} {count}" for name, count in families.most_common()),
    ]


def _lines(rows: Sequence[TableRow]) -> list[str]:
    from qsar.checking.lines import hammett_points, taft_points

    return [
        *_line("Hammett line of meta and para benzoic acids", hammett_points(rows), 0.12),
        *_line("Taft line of unhindered RCOOH", taft_points(rows), 0.15),
    ]


def _line(name: str, points: Sequence[Point], limit: float) -> list[str]:
    from qsar.checking.lines import fit

    if len({point.constant for point in points}) < 3:
        return [f"{name}: too few acids of it in the table"]
    line: Line = fit(points)
    far = ", ".join(f"{point.group} {residual:+.2f}" for point, residual in line.beyond(limit))
    return [
        f"{name}: {len(points)} acids, pKa = {line.intercept:.3f} {line.slope:+.3f} constant, "
        f"RMS {line.rms:.3f}; beyond {limit:g}: {far or 'none'}"
    ]


def _chain(rows: Sequence[TableRow]) -> list[str]:
    from qsar.checking.lines import chain_gaps

    gaps = chain_gaps(rows)
    if not gaps:
        return []
    listed = ", ".join(f"C{carbons} {gap:.2f}" for carbons, gap in gaps.items())
    return [f"second minus first pKa of straight-chain diacids (log10 4 = 0.60 when far apart): {listed}"]


def _open(rows: Sequence[TableRow], place: str | Path | None) -> list[str]:
    from qsar.checking.open_rows import compare, summary
    from qsar.curation.iupac import sort_iupac

    if place is None:
        return ["open rows: not compared; name the file of the IUPAC Digitized pKa Dataset with --open-data"]
    path = Path(place)
    if path.is_dir():
        path /= OPEN_ROWS
    data = sort_iupac(path)
    reasons = Counter(_shortened(row.reason) for row in data.excluded)
    left = "; ".join(f"{count} {reason}" for reason, count in reasons.most_common())
    return [
        *summary(compare(rows, data.steps)),
        f"open rows used: {len(data.steps)} steps of {len({step.smiles for step in data.steps})} acids; "
        f"left out: {left}",
    ]


def _shortened(reason: str) -> str:
    """The reason without its particulars."""
    return reason.split(":")[0].split(" (")[0]
