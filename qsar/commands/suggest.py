"""``acidity suggest``: which acids to measure next."""

from __future__ import annotations

import argparse
import sys
from collections.abc import Sequence
from pathlib import Path
from typing import TYPE_CHECKING

from qsar.errors import UserError

if TYPE_CHECKING:
    from qsar.model import Model
    from qsar.reading import Record
    from qsar.structures import Acid

HELP = "rank candidate acids by what measuring them would teach the model"


def add_arguments(parser: argparse.ArgumentParser) -> None:
    """Describe the arguments of the command."""
    parser.add_argument("sources", nargs="*", metavar="SOURCE", help="files or SMILES of acids that could be measured")
    parser.add_argument(
        "--for",
        dest="targets",
        action="append",
        default=[],
        metavar="FILE",
        help="acids that the model shall predict well (default: the candidates themselves)",
    )
    parser.add_argument("--count", type=int, default=10, metavar="N", help="how many to pick (default: 10)")
    parser.add_argument("--model", metavar="MODEL", help="name or folder of a model (default: the one in use)")
    parser.add_argument("-o", "--output", type=Path, metavar="FILE", help="write the list as CSV")
    parser.add_argument(
        "--campaign",
        type=Path,
        metavar="FOLDER",
        help="simulate on the reference table whether suggestions beat random choice, and put the plot there",
    )


def run(args: argparse.Namespace) -> int:
    """Run the command.

    Returns
    -------
    int
        0, or 3 if some candidates could not be used.
    """
    if args.campaign:
        return _campaign(args)
    if not args.sources:
        raise UserError("name a file or SMILES of acids that could be measured")
    if args.count < 1:
        raise UserError(f"--count {args.count}: at least 1")
    if args.output is not None and args.output.suffix.lower() != ".csv":
        raise UserError(f"--output {args.output}: give a name that ends in .csv")
    return _suggest(args)


def _suggest(args: argparse.Namespace) -> int:
    from qsar.model import load_model
    from qsar.model.suggestion import MOST_CANDIDATES, suggest
    from qsar.progress import progress

    model = load_model(args.model)
    candidates, refused = _acids(args.sources)
    candidates = _unmeasured(model, candidates)
    if not candidates:
        raise UserError("no candidate is left to choose from")
    if len(candidates) > MOST_CANDIDATES:
        raise UserError(f"{len(candidates):,} candidates; at most {MOST_CANDIDATES:,} are ranked at once")
    targets, bad = _acids(args.targets)
    acids = [acid for _, acid in candidates]
    with progress(lambda: min(args.count, len(acids)), "picks") as done:
        picks = suggest(model, acids, [acid for _, acid in targets], args.count, done=done)
    rows = []
    predictions = model.predict([acids[p.index] for p in picks])
    for rank, (pick, prediction) in enumerate(zip(picks, predictions, strict=True), start=1):
        step, record = prediction.steps[0], candidates[pick.index][0]
        rows.append(
            (rank, record.id, prediction.structure, step.pka, step.low, step.high, step.domain, pick.gain, step.nearest)
        )
    _show(rows, args.output)
    return 3 if refused or bad else 0


def _acids(sources: Sequence[str]) -> tuple[list[tuple[Record, Acid]], int]:
    """The acids of some sources, each structure once, and how many could not be used."""
    from qsar.reading import read_sources
    from qsar.structures import StructureError, acid_from_mol, read_acid

    found: dict[str, tuple[Record, Acid]] = {}
    refused = 0
    for record in read_sources(sources, on_note=lambda text: say(f"acidity: note: {text}")):
        try:
            if record.error:
                raise StructureError(record.error)
            acid = acid_from_mol(record.mol) if record.mol is not None else read_acid(record.smiles)
        except StructureError as problem:
            refused += 1
            say(f"acidity: {record.where or 'input'} {record.id}: {problem}")
            continue
        found.setdefault(acid.smiles, (record, acid))
    return list(found.values()), refused


def _unmeasured(model: Model, candidates: list[tuple[Record, Acid]]) -> list[tuple[Record, Acid]]:
    from qsar.validation.comparison import leaked

    known = leaked(model, [acid for _, acid in candidates])
    if known.any():
        say(f"acidity: {int(known.sum())} candidates are measured already and left out")
    return [c for c, k in zip(candidates, known, strict=True) if not k]


_COLUMNS = ("rank", "id", "smiles", "pka", "low", "high", "domain", "gain", "nearest")


def _show(rows: list[tuple[int, str, str, float, float, float, str, float, str]], output: Path | None) -> None:
    if output is None:
        print("rank  pKa   90 % interval  verdict     gain   acid")
        for rank, identity, smiles, pka, low, high, domain, gain, _ in rows:
            name = smiles if identity.isdigit() else f"{identity}  {smiles}"
            print(f"{rank:4}  {pka:5.2f}  {low:5.2f} to {high:5.2f}  {domain:10}  {gain:.3f}  {name}")
        print("gain: what measuring it takes off the uncertainty of the others after those above it, pKa units")
        return
    import csv

    from qsar.files import atomic_path
    from qsar.writing import disarmed

    with atomic_path(output) as temporary, temporary.open("w", encoding="utf-8", newline="") as handle:
        writer = csv.writer(handle)
        writer.writerow(_COLUMNS)
        writer.writerows([rank, disarmed(identity), *rest] for rank, identity, *rest in rows)
    print(f"{output}: {len(rows)} acids, best first")


def _campaign(args: argparse.Namespace) -> int:
    from qsar.paths import reference_table
    from qsar.progress import progress
    from qsar.table import read_table
    from qsar.validation.campaign import Plan, plot, simulate

    if not args.campaign.is_dir():
        raise UserError(f"--campaign {args.campaign}: no such folder; create it first")
    plan = Plan()
    with progress(lambda: plan.seeds, "seeds", wanted=True) as done:
        outcome = simulate(read_table(reference_table()), plan, done=done)
    plot(outcome, args.campaign / "suggestion_campaign.png")
    print(outcome.sentence)
    print(f"plot: {args.campaign / 'suggestion_campaign.png'}")
    return 0


def say(text: str) -> None:
    """Print a line for the user on standard error."""
    print(text, file=sys.stderr, flush=True)
