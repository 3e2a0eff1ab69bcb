"""``acidity compare``: is one model better than another, on acids that neither has seen."""

from __future__ import annotations

import argparse
import csv
import sys
from collections.abc import Sequence
from pathlib import Path
from typing import TYPE_CHECKING

from qsar.errors import UserError

if TYPE_CHECKING:
    from qsar.model import Model
    from qsar.table import Measurement
    from qsar.validation.comparison import Comparison, Difference, Pair

HELP = "say which of two models is better on the same acids, with the proof"

_LISTED = 8


def add_arguments(parser: argparse.ArgumentParser) -> None:
    """Describe the arguments of the command."""
    parser.add_argument("a", metavar="A", help="model to compare with: its name (see `acidity models`) or folder")
    parser.add_argument("b", metavar="B", help="model that may be better")
    parser.add_argument(
        "--data",
        type=Path,
        metavar="FILE",
        help="clean CSV of measured acids; those that either model was trained on are left out. Without it every "
        "training acid is predicted by the part of each model that never saw it",
    )
    parser.add_argument(
        "--by-date",
        nargs="?",
        const="",
        metavar="DAY",
        help="use only rows of --data measured after DAY (default: after the newest row that either model holds)",
    )
    parser.add_argument(
        "--refuse-leakage", action="store_true", help="stop where a row of --data is in a training table"
    )
    parser.add_argument(
        "--keep-suspected", action="store_true", help="use also rows that `acidity curate` suspects of an artefact"
    )
    parser.add_argument(
        "--source", metavar="NAME", help="use only rows of this source, such as in-house (column source)"
    )
    parser.add_argument(
        "--coverage", type=float, default=0.9, metavar="FRACTION", help="of the intervals (default: 0.9)"
    )
    parser.add_argument("-o", "--output", type=Path, metavar="FILE", help="write every pair as CSV")
    parser.add_argument("--models", type=Path, metavar="FOLDER", help="folder of your models")


def run(args: argparse.Namespace) -> int:
    """Run the command."""
    from qsar.files import check_target
    from qsar.model import load
    from qsar.model.registry import resolve
    from qsar.validation.comparison import compare

    if not args.data and (args.by_date is not None or args.refuse_leakage):
        raise UserError("--by-date and --refuse-leakage need --data FILE")
    if not 0.5 <= args.coverage <= 0.99:
        raise UserError(f"--coverage {args.coverage:g}: give a fraction from 0.5 to 0.99")
    if args.output is not None and args.output.suffix.lower() != ".csv":
        raise UserError(f"--output {args.output}: give a name that ends in .csv")
    if args.output is not None:
        check_target(args.output)
    a, b = load(resolve(args.a, args.models)), load(resolve(args.b, args.models))
    if a.card["arrays_sha256"] == b.card["arrays_sha256"]:
        raise UserError(f"{args.a} and {args.b} are the same model")
    pairs = _held_out(args, a, b) if args.data else _shared(args, a, b)
    comparison = compare(pairs, _names(a, b), args.coverage)
    print("\n".join(report(comparison)))
    if args.output:
        write_pairs(args.output, comparison)
        print(f"every pair: {args.output}")
    return 0


def _names(a: Model, b: Model) -> tuple[str, str]:
    return (a.name, b.name) if a.name != b.name else (f"{a.name} (A)", f"{b.name} (B)")


def _held_out(args: argparse.Namespace, a: Model, b: Model) -> list[Pair]:
    from qsar.progress import progress
    from qsar.validation.comparison import held_out_pairs

    rows = _rows(args, a, b)
    with progress(lambda: len(rows), "steps") as done:
        pairs, left_out = held_out_pairs(a, b, rows, args.coverage, done)
    if left_out:
        acids = list(dict.fromkeys(m.name or m.acid.smiles for m in left_out))
        shown = ", ".join(acids[:5]) + (f" and {len(acids) - 5} more" if len(acids) > 5 else "")
        if args.refuse_leakage:
            raise UserError(f"{args.data}: {len(acids)} acids are in the training table of a model: {shown}")
        say(f"acidity: {len(left_out)} rows left out: their acids were trained on ({shown})")
    if not pairs:
        raise UserError(
            f"{args.data}: every acid is in the training table of one of the models; leave out --data to compare the "
            "predictions that each made without the acid"
        )
    return pairs


def _rows(args: argparse.Namespace, a: Model, b: Model) -> list[Measurement]:
    from qsar.commands.train import leaving_out
    from qsar.model.user_table import read_date, read_user_table
    from qsar.sources import key_of

    table = read_user_table(args.data)
    if table.suspects and not args.keep_suspected:
        say(f"acidity: {leaving_out(table.suspects)}; --keep-suspected counts them")
        table = table.sound()
    if args.by_date is not None:
        stated = args.by_date or max(str(m.card.get("newest_measurement") or "") for m in (a, b))
        if not stated:
            raise UserError("--by-date: neither model says up to which day its rows were measured; name the DAY")
        day = read_date(stated, "--by-date")
        assert day is not None
        table = table.after(day)
        say(f"acidity: {len(table.measurements)} rows measured after {day.isoformat()}")
        if not table.measurements:
            raise UserError(f"{args.data}: no row is dated after {day.isoformat()} (column date)")
    rows = [m for m in table.measurements if args.source in (None, key_of(m.source))]
    if not rows:
        raise UserError(f"{args.data}: no row of source {args.source}")
    return rows


def _shared(args: argparse.Namespace, a: Model, b: Model) -> list[Pair]:
    from qsar.validation.comparison import shared_fold_pairs

    say("acidity: each training acid is predicted by the part of each model that never saw it")
    pairs = shared_fold_pairs(a, b, args.coverage, args.source)
    if not pairs:
        raise UserError(f"neither model holds a row of source {args.source}")
    return pairs


def _share(chance: float) -> str:
    """A small probability in words: nothing is impossible because it did not come up."""
    return "less than 0.1%" if chance < 0.0005 else f"{chance:.1%}"


def report(c: Comparison) -> list[str]:
    """Lines for people; the verdict comes first."""
    width = max([12, *(len(d.label) for d in (*c.by_family, *c.by_verdict))])
    first, second = c.names
    lines = [
        c.sentence + ".",
        "",
        f"A = {first}, B = {second}; errors in pKa units, B minus A below zero where B is better",
    ]
    head = f"{'':{width}}  steps  acids  error A  error B  B minus A"
    for title, found in (("", [c.overall]), ("by family", c.by_family), ("by verdict of B", c.by_verdict)):
        lines += ["", title, head] if title else [head]
        lines += [_line(d, width) for d in found]
    lines += [
        "",
        f"a difference this large comes up in {_share(c.chance)} of random swaps of A and B",
        f"measured values inside the {c.coverage:.0%} interval: A {c.held[0]:.0%}, B {c.held[1]:.0%}; median width "
        f"A {c.width[0]:.2f}, B {c.width[1]:.2f}",
    ]
    better = [p for p in c.pairs if p.change < 0][:_LISTED]
    worse = [p for p in reversed(c.pairs) if p.change > 0][:_LISTED]
    lines += _acids("got better most", better) + _acids("got worse most", worse)
    return lines


def _line(d: Difference, width: int) -> str:
    interval = f"{d.value:+.3f}" + ("" if d.low != d.low else f"  ({d.low:+.3f} to {d.high:+.3f})")
    return f"{d.label:{width}}  {d.steps:5}  {d.acids:5}  {d.errors[0]:7.3f}  {d.errors[1]:7.3f}  {interval}"


def _acids(title: str, pairs: Sequence[Pair]) -> list[str]:
    return ["", title] * bool(pairs) + [
        f"  {p.name or p.smiles} (step {p.step}): measured {p.measured:.2f}, A {p.pka[0]:.2f}, B {p.pka[1]:.2f}"
        for p in pairs
    ]


def write_pairs(path: Path, c: Comparison) -> None:
    """Write every pair, from the greatest improvement to the greatest loss."""
    from qsar.files import atomic_path
    from qsar.writing import disarmed

    names = ("pka", "low", "high", "domain")
    with atomic_path(path) as temporary, temporary.open("w", encoding="utf-8", newline="") as handle:
        writer = csv.writer(handle)
        both = [f"{n}_{k}" for k in "ab" for n in names]
        writer.writerow(["name", "smiles", "family", "step", "measured", *both, "error_change"])
        for p in c.pairs:
            cells = [v[k] for k in (0, 1) for v in (p.pka, p.low, p.high, p.domain)]
            writer.writerow([disarmed(p.name), p.smiles, p.family, p.step, p.measured, *cells, p.change])


def say(text: str) -> None:
    """Print a line for the user on standard error."""
    print(text, file=sys.stderr, flush=True)
