"""``acidity train``: train a model and save it as a bundle."""

from __future__ import annotations

import argparse
import sys
from dataclasses import dataclass
from datetime import date
from pathlib import Path
from typing import TYPE_CHECKING, Any

from qsar.commands.validate import processes
from qsar.errors import UserError

if TYPE_CHECKING:
    from qsar.model import Model
    from qsar.model.members import Settings
    from qsar.model.offset import Offset
    from qsar.model.user_table import UserTable
    from qsar.table import Measurement

HELP = "train a model on the reference table and your own measurements"

LEAST_ACIDS = 20


def add_arguments(parser: argparse.ArgumentParser) -> None:
    """Describe the arguments of the command."""
    parser.add_argument(
        "--data",
        metavar="FILE",
        type=Path,
        help="clean CSV of your measurements (see `acidity curate`), used besides the reference table",
    )
    parser.add_argument("--only", action="store_true", help="train on --data alone, without the reference table")
    parser.add_argument("--until", metavar="DAY", help="use only rows of --data measured up to this day (YYYY-MM-DD)")
    parser.add_argument(
        "--correct-offset",
        action="store_true",
        help="take the systematic offset between --data and the reference table off the rows of --data; without "
        "this it is reported only",
    )
    parser.add_argument(
        "--keep-suspected",
        action="store_true",
        help="train also on rows that `acidity curate` suspects of an artefact (column suspected)",
    )
    parser.add_argument("--name", metavar="NAME", help="name of the model (default: by the table)")
    parser.add_argument(
        "-o",
        "--output",
        metavar="FOLDER",
        type=Path,
        help="folder of the new bundle (default: a folder of that name among your models, see `acidity models`)",
    )
    parser.add_argument("--models", type=Path, metavar="FOLDER", help="folder of your models")
    parser.add_argument("--seed", type=int, default=1, help="seed of folds and boosters (default: 1)")
    parser.add_argument(
        "--folds",
        type=int,
        metavar="N",
        help="members of the ensemble, each blind to one share of the acids (default: 10); fewer train faster",
    )
    parser.add_argument(
        "--jobs", type=processes, default=1, metavar="N", help="number of processes that fit the folds (default: 1)"
    )
    parser.add_argument(
        "--cluster",
        metavar="ADDRESS",
        help="fit the folds on a running Dask cluster, such as tcp://host:8786 (needs the package distributed)",
    )
    parser.add_argument(
        "--withhold-structures",
        action="store_true",
        help="keep structures and names of the training acids out of the bundle; neighbours then show as values only",
    )


@dataclass(frozen=True)
class _Inputs:
    """What is trained on."""

    measurements: list[Measurement]
    tables: list[dict[str, Any]]
    offset: Offset | None
    corrected: bool
    newest: date | None
    reference_acids: int


def run(args: argparse.Namespace) -> int:
    """Train and save."""
    from qsar.files import check_folder
    from qsar.model.registry import Registry, check_name

    _check(args)
    name = check_name(args.name or (args.output or args.data or Path("reference")).stem.removesuffix("_clean"))
    registry = None if args.output else Registry(args.models)
    if registry is not None and registry.is_taken(name):
        own = (registry.folder / name).exists()
        instead = f", or `acidity models delete {name}` first" if own else ""
        raise UserError(f"a model {name} exists; choose another --name{instead}")
    inputs = _inputs(args)
    settings = _settings(args, len({m.acid.smiles for m in inputs.measurements}))
    if args.output is not None:
        check_folder(args.output)
    target = args.output or registry.folder / name  # type: ignore[union-attr]
    cache = target.parent / f".{target.name}.folds"
    model = _train(args, inputs, settings, name, cache)
    if registry is None:
        from qsar.model import save

        save(model, args.output)
    else:
        entry = registry.add(model, name)
        target, name = entry.folder, entry.name
    _remove(cache)
    _report(args, model, inputs, name, target)
    return 0


def _check(args: argparse.Namespace) -> None:
    for option in ("only", "until", "correct_offset", "keep_suspected"):
        if getattr(args, option) and not args.data:
            raise UserError(f"--{option.replace('_', '-')} needs --data FILE")
    if args.only and args.correct_offset:
        raise UserError("--correct-offset compares with the reference table, which --only leaves out")
    if args.folds is not None and args.folds < 3:
        raise UserError(f"--folds {args.folds}: at least 3")
    if not 0 <= args.seed < 2**31:
        raise UserError(f"--seed {args.seed}: give a whole number from 0 to {2**31 - 1}")


def _inputs(args: argparse.Namespace) -> _Inputs:
    from qsar.model.offset import estimate_offset, without_offset
    from qsar.paths import reference_table
    from qsar.table import read_table

    reference = [] if args.only else read_table(reference_table())
    tables = [] if args.only else [_described(reference_table(), reference)]
    known = len({m.acid.smiles for m in reference})
    if not args.data:
        return _Inputs(reference, tables, None, False, None, known)
    table = _own(args)
    own = table.measurements
    offset = None
    if reference:
        offset = estimate_offset(reference, own, seed=args.seed)
        if offset is None:
            say("acidity: too few acids in --data to tell whether they are offset from the reference table")
        elif args.correct_offset:
            own = without_offset(own, offset)
    tables.append(_described(args.data, own))
    return _Inputs([*reference, *own], tables, offset, bool(offset and args.correct_offset), table.newest, known)


def _own(args: argparse.Namespace) -> UserTable:
    from qsar.model.user_table import read_date, read_user_table

    table = read_user_table(args.data)
    if table.suspects and not args.keep_suspected:
        say(f"acidity: {leaving_out(table.suspects)}; --keep-suspected trains on them")
        table = table.sound()
    if not table.measurements:
        raise UserError(f"{args.data}: every row is suspected of an artefact; see its column flag")
    if not args.until:
        return table
    last = read_date(args.until, "--until")
    assert last is not None
    early = table.until(last)
    if not early.measurements:
        raise UserError(f"--until {args.until}: no row of {args.data} is dated up to that day (column date)")
    return early


def leaving_out(suspects: list[str], shown: int = 5) -> str:
    """What is said of rows that the curation suspects."""
    more = f" and {len(suspects) - shown} more" if len(suspects) > shown else ""
    count = f"{len(suspects)} row" + ("" if len(suspects) == 1 else "s")
    return f"{count} suspected of an artefact left out: {', '.join(suspects[:shown])}{more}"


def _described(path: Path, measurements: list[Measurement]) -> dict[str, Any]:
    from qsar.table import sha256

    return {
        "name": path.name,
        "sha256": sha256(path),
        "rows": len(measurements),
        "acids": len({m.acid.smiles for m in measurements}),
    }


def _settings(args: argparse.Namespace, acids: int) -> Settings:
    from qsar.model.members import Settings

    if acids < LEAST_ACIDS:
        raise UserError(
            f"{acids} acids to train on; at least {LEAST_ACIDS} are needed to train and calibrate. Leave out --only to "
            "add them to the reference table"
        )
    plain = Settings(seed=args.seed)
    return plain if args.folds is None else Settings(seed=args.seed, folds=min(args.folds, acids))


def _train(args: argparse.Namespace, inputs: _Inputs, settings: Settings, name: str, cache: Path) -> Model:
    from qsar.model.resumable import fit_members_resumably
    from qsar.model.training import assemble
    from qsar.model.training_set import training_set
    from qsar.model.user_table import weights_of
    from qsar.progress import progress

    say(f"acidity: training on {len(inputs.measurements)} steps; a run that is interrupted goes on where it stopped")
    data = training_set(inputs.measurements, weights_of(inputs.measurements))
    with progress(lambda: settings.folds, "folds", wanted=True) as done:
        members, fold = fit_members_resumably(
            data,
            settings,
            cache,
            done,
            lambda t: say(f"acidity: note: {t}"),
            inputs.reference_acids,
            args.cluster,
            args.jobs,
        )
    return assemble(data, members, fold, name, _provenance(args, inputs), withhold_structures=args.withhold_structures)


def _provenance(args: argparse.Namespace, inputs: _Inputs) -> dict[str, Any]:
    """What the card says of where the model comes from."""
    stored: dict[str, Any] = {
        "tables": inputs.tables,
        "weights": "inverse variance of each row; beyond 0.15 pKa units also the booster's weight (0.15/u)^2",
    }
    if args.until:
        stored["measured_until"] = args.until
    if inputs.newest is not None:
        stored["newest_measurement"] = inputs.newest.isoformat()
    if inputs.offset is not None:
        o = inputs.offset
        stored["offset"] = {
            "in_house_minus_reference": o.value,
            "low": o.low,
            "high": o.high,
            "method": o.method,
            "acids": o.acids,
            "corrected": inputs.corrected,
        }
    return stored


def _report(args: argparse.Namespace, model: Model, inputs: _Inputs, name: str, target: Path) -> None:
    card = model.card
    if inputs.offset is not None:
        option = "not corrected (--correct-offset takes it off)" if inputs.offset.is_clear else "not corrected"
        print(f"offset: {inputs.offset.sentence}; {'taken off' if inputs.corrected else option}")
    print(
        f"{name}: {card['steps']} steps of {card['acids']} acids; mean absolute error of acids left out "
        f"{card['metrics']['out_of_fold_mean_absolute_error']:.3f}; saved in {target}"
    )
    if args.withhold_structures:
        print("the bundle holds values and descriptors of its training acids, not their structures and names")
    elif args.data:
        print(
            "the bundle holds structures, names and values of all its training acids, which whoever gets it can read; "
            "--withhold-structures keeps structures and names out"
        )
    if not args.output:
        print(f"`acidity models use {name}` puts it to use")


def _remove(cache: Path) -> None:
    from qsar.model.resumable import remove_cache

    remove_cache(cache)


def say(text: str) -> None:
    """Print a line for the user on standard error."""
    print(text, file=sys.stderr, flush=True)
