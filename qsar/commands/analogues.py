"""``acidity analogues``: one acid with every group of a list at a chosen place."""

from __future__ import annotations

import argparse
import csv
import sys
from collections.abc import Sequence
from pathlib import Path
from typing import TYPE_CHECKING

from qsar.errors import UserError

if TYPE_CHECKING:
    from qsar.analogues import Analogue, Group, Position
    from qsar.structures import Acid

HELP = "exchange a substituent for each group of a list"

COLUMNS = (
    "group", "smiles", "step", "pka", "low", "high", "coverage", "domain", "reasons", "measured", "change",
    "start", "position", "place", "replaced", "model",
)  # fmt: skip
ALL_PREDICTED, SOME_UNUSABLE = 0, 3


def add_arguments(parser: argparse.ArgumentParser) -> None:
    """Describe the arguments of the command."""
    from qsar.commands.predict import coverage
    from qsar.commands.quantities import number

    parser.add_argument("smiles", metavar="SMILES", help="the acid to start from")
    parser.add_argument(
        "--at",
        metavar="PLACE",
        help="place of the exchange: its number, key or label, or α, ortho, meta, para; without it the places "
        "are listed",
    )
    parser.add_argument(
        "--groups",
        metavar="LIST",
        help="groups parted by blanks, by name (CF3) or SMILES with * (*C#N), or a file with one a line "
        "(default: all that have tabulated constants)",
    )
    parser.add_argument("--low", type=number, metavar="PKA", help="only those whose pKa is not below this")
    parser.add_argument("--high", type=number, metavar="PKA", help="only those whose pKa is not above this")
    parser.add_argument("--step", type=int, default=1, metavar="K", help="step that sorts and filters (default: 1)")
    parser.add_argument(
        "--coverage",
        type=coverage,
        default=0.9,
        metavar="FRACTION",
        help="fraction of true values that the intervals are meant to hold (default: 0.9)",
    )
    parser.add_argument(
        "--model", type=Path, metavar="FOLDER", help="folder of another model than the shipped one"
    )
    parser.add_argument(
        "-o", "--output", type=Path, metavar="FILE", help="write a .csv instead of a table on the screen"
    )


def run(args: argparse.Namespace) -> int:
    """Run the command.

    Returns
    -------
    int
        0 if every group gave a prediction, 3 if some did not.

    Raises
    ------
    UserError
        If the acid, the place or a group cannot be used, or the output cannot be written.
    """
    from qsar.analogues import analogues, find_position, positions
    from qsar.model import load_model
    from qsar.structures import StructureError, read_acid

    _check(args)
    try:
        acid = read_acid(args.smiles)
        if args.at is None:
            _list_positions(acid, positions(acid))
            return ALL_PREDICTED
        place = find_position(acid, args.at)
        groups = _groups(args.groups)
    except StructureError as reason:
        raise UserError(str(reason)) from reason
    found = analogues(
        load_model(args.model),
        acid,
        place,
        groups,
        step=args.step,
        low=args.low,
        high=args.high,
        coverage=args.coverage,
    )
    if args.output is None:
        _show(acid, place, found, args.coverage)
    else:
        _write(args.output, acid, place, found, args.step, args.coverage)
    return SOME_UNUSABLE if any(a.step is None for a in found) else ALL_PREDICTED


def _check(args: argparse.Namespace) -> None:
    """Refuse what cannot be answered before any work is done."""
    from qsar.files import check_target

    if args.output is not None:
        if args.output.suffix.lower() != ".csv":
            raise UserError(f"cannot write {args.output}: the extension must be .csv")
        if args.at is None:
            raise UserError(f"--output {args.output}: choose a place with --at first; without it the places are listed")
        check_target(args.output)
    if not 1 <= args.step <= 6:
        raise UserError(f"--step {args.step}: a number from 1 to 6 is expected")
    if args.low is not None and args.high is not None and args.low > args.high:
        raise UserError(f"--low {args.low:g} lies above --high {args.high:g}: no pKa can meet both")


def _groups(text: str | None) -> list[Group] | None:
    from qsar.analogues import group_named

    if text is None:
        return None
    path = Path(text)
    try:
        words = path.read_text(encoding="utf-8").splitlines() if path.is_file() else text.split()
    except (OSError, ValueError) as problem:
        raise UserError(f"{text[:60]}: cannot be read as a list of groups ({problem})") from problem
    chosen = [group_named(word) for word in words if word.strip()]
    if not chosen:
        raise UserError("--groups names no group")
    return chosen


def _list_positions(acid: Acid, places: Sequence[Position]) -> None:
    print(f"{acid.smiles}: choose a place with --at")
    for number, place in enumerate(places, start=1):
        print(f"  {number:3}  {place.key:8} {place.label}")


def _show(acid: Acid, place: Position, found: Sequence[Analogue], coverage: float) -> None:
    print(f"{acid.smiles}, {place.label}")
    interval = f"{100 * coverage:g} % interval"
    print(f"{'group':18} {'pKa':>6}  {interval:16} {'change':>6}  {'measured':>8}  {'verdict':10} structure")
    for a in found:
        if a.step is None:
            reason = a.prediction.error or "no such step"
            print(f"{a.group.name:18} {'':6}  {'':16} {'':6}  {'':8}  {'unusable':10} {reason}")
            continue
        s = a.step
        change = "" if a.change is None else f"{a.change:+.2f}"
        interval = f"{s.low:.2f} to {s.high:.2f}"
        measured = "" if s.measured is None else f"{s.measured:.2f}"
        print(f"{a.group.name:18} {s.pka:6.2f}  {interval:16} {change:>6}  {measured:>8}  {s.domain:10} {a.smiles}")
    if not found:
        print("no group of the list meets that range of pKa", file=sys.stderr)


def _write(
    target: Path, acid: Acid, place: Position, found: Sequence[Analogue], step: int, coverage: float
) -> None:
    from qsar.commands.quantities import counted
    from qsar.files import atomic_path
    from qsar.writing import UNUSABLE, disarmed

    with atomic_path(target) as temporary, temporary.open("w", encoding="utf-8", newline="") as handle:
        writer = csv.writer(handle, lineterminator="\n")
        writer.writerow(COLUMNS)
        for a in found:
            s = a.step
            values = (
                (None, None, None, coverage, UNUSABLE, a.prediction.error or f"no step {step}", None, None)
                if s is None
                else (s.pka, s.low, s.high, s.coverage, s.domain, "; ".join(s.reasons), s.measured, a.change)
            )
            row = (a.group.name, a.smiles, step, *values, acid.smiles, place.key, place.place, place.group)
            row += ("" if s is None else s.model,)
            writer.writerow([disarmed(cell) if isinstance(cell, str) else cell for cell in row])
    print(f"{target}: {counted(len(found), 'analogue')}", file=sys.stderr)
