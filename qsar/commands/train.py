"""``acidity train``: train a model and save it as a bundle."""

from __future__ import annotations

import argparse
import sys
from pathlib import Path

HELP = "train a model from a table of measured acids"


def add_arguments(parser: argparse.ArgumentParser) -> None:
    """Add the arguments of the command."""
    parser.add_argument(
        "--data",
        metavar="FILE",
        type=Path,
        help="clean CSV of measured acids to train on besides the reference table (see `acidity curate`)",
    )
    parser.add_argument(
        "--only", action="store_true", help="train on --data alone, without the reference table"
    )
    parser.add_argument(
        "--output", metavar="FOLDER", type=Path, required=True, help="folder of the new bundle"
    )
    parser.add_argument("--name", help="name of the model (default: name of the folder)")
    parser.add_argument("--seed", type=int, default=1, help="seed of folds and boosters (default: 1)")
    parser.add_argument(
        "--withhold-structures",
        action="store_true",
        help="keep structures and names of the training acids out of the bundle",
    )


def run(args: argparse.Namespace) -> int:
    """Train and save."""
    from qsar.errors import UserError
    from qsar.model import save
    from qsar.model.members import Settings
    from qsar.model.training import train
    from qsar.paths import reference_table
    from qsar.progress import progress
    from qsar.table import read_table, sha256

    if args.only and not args.data:
        raise UserError("--only needs --data FILE")
    tables = ([] if args.only else [reference_table()]) + ([args.data] if args.data else [])
    measurements = [m for table in tables for m in read_table(table)]
    settings = Settings(seed=args.seed)
    provenance = {
        "tables": [{"name": t.name, "sha256": sha256(t)} for t in tables],
    }
    with progress(lambda: settings.folds, "folds", wanted=True) as done:
        model = train(
            measurements,
            args.name or args.output.name,
            settings,
            provenance=provenance,
            withhold_structures=args.withhold_structures,
            done=done,
        )
    save(model, args.output)
    card = model.card
    print(
        f"{card['name']}: {card['steps']} steps of {card['acids']} acids, mean absolute error of acids left out "
        f"{card['metrics']['out_of_fold_mean_absolute_error']:.3f}; saved in {args.output}",
        file=sys.stdout,
    )
    return 0
