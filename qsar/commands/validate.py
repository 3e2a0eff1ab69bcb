"""``acidity validate``: judge a model and write the validation report."""

from __future__ import annotations

import argparse
import sys
from pathlib import Path
from typing import TYPE_CHECKING

from qsar.errors import UserError

if TYPE_CHECKING:
    from qsar.model import Model
    from qsar.validation.report import Section

HELP = "judge a model: cross-validation, families left out, intervals, domain, baselines"


def add_arguments(parser: argparse.ArgumentParser) -> None:
    """Add the arguments of the command."""
    parser.add_argument("--model", type=Path, metavar="FOLDER", help="folder of another model than the shipped one")
    parser.add_argument(
        "--output", type=Path, metavar="FOLDER", default=Path("reports"), help="folder (default: reports)"
    )
    parser.add_argument("--name", help="name of the report's files (default: the model's name)")
    parser.add_argument("--quick", action="store_true", help="fewer repeats, for a first look")
    parser.add_argument("--jobs", type=processes, default=2, metavar="N", help="number of processes (default: 2)")
    parser.add_argument(
        "--cluster",
        metavar="ADDRESS",
        help="make the fits on a running Dask cluster instead, such as tcp://host:8786 (needs the package distributed)",
    )
    parser.add_argument("--again", action="store_true", help="forget what an interrupted run had finished")
    parser.add_argument(
        "--open-data",
        type=Path,
        metavar="DIR",
        help="print the evaluation on the IUPAC Digitized pKa Dataset (CSV in DIR) instead of writing a report",
    )
    parser.add_argument(
        "--train-on-it",
        action="store_true",
        help="with --open-data: train a model on those rows too, and report what they add",
    )


def processes(text: str) -> int:
    """Read a number of processes.

    Raises
    ------
    argparse.ArgumentTypeError
        If it is not a whole number from 1 to 256.
    """
    if not text.isdigit() or not 1 <= int(text) <= 256:
        raise argparse.ArgumentTypeError(f"{text!r}: give the number of processes, from 1 to 256")
    return int(text)


def run(args: argparse.Namespace) -> int:
    """Validate."""
    from qsar.files import check_folder
    from qsar.model import load_model

    if args.train_on_it and not args.open_data:
        raise UserError("--train-on-it needs --open-data DIR")
    if args.cluster and args.open_data:
        raise UserError("--cluster makes the fits of a report; leave it out with --open-data")
    if args.name is not None and (not args.name.strip() or Path(args.name).name != args.name):
        raise UserError(f"--name {args.name}: give a name without a folder; --output names the folder")
    model = load_model(args.model)
    if not args.open_data or args.train_on_it:
        check_folder(args.output)  # before minutes of work
    if args.open_data and args.train_on_it:
        return _with_open_rows(model, args)
    if args.open_data:
        return _open_rows(model, args.open_data)
    return _report(model, args)


def _open_rows(model: Model, folder: Path) -> int:
    from qsar.curation.iupac import in_standard_state, sort_iupac
    from qsar.progress import progress
    from qsar.validation.judged import judge
    from qsar.validation.metrics import LEVELS
    from qsar.validation.open_rows import as_printed, as_text, find_open_file

    path = find_open_file(folder)
    data = sort_iupac(path)
    with progress(lambda: len(LEVELS) + 1, "parts", wanted=True) as done:
        judged = judge(model, in_standard_state(data.steps), done)
    print(f"{model.name} on {path.name}: {len(data.excluded)} rows left out by rule")
    print(as_text(judged))
    print(as_printed(judged, [step.pka for step in data.steps]))
    return 0


def _with_open_rows(model: Model, args: argparse.Namespace) -> int:
    from qsar.curation.iupac import in_standard_state, read_iupac
    from qsar.progress import progress
    from qsar.validation.open_rows import find_open_file
    from qsar.validation.report import write
    from qsar.validation.with_open_rows import compare, train_with

    steps = in_standard_state(read_iupac(find_open_file(args.open_data)))
    with progress(lambda: model.members.settings.folds, "folds", wanted=True) as done:
        richer = train_with(model, steps, done, args.jobs)
    sections = compare(model, richer, steps)
    title = "What the open rows add to training"
    opening = (
        f"{model.name} ({len(model.library.pka)} steps) beside a model trained on its table and the IUPAC Digitized "
        f"pKa Dataset (doi:10.5281/zenodo.7236452, CC BY-NC 4.0) too ({len(richer.library.pka)} steps). The shipped "
        "model is trained on the free table alone. Every acid is predicted without it."
    )
    _tell(write(args.output, args.name or "with-open-rows", title, opening, sections), sections)
    return 0


def _report(model: Model, args: argparse.Namespace) -> int:
    import platformdirs

    from qsar.progress import progress
    from qsar.validation import studies
    from qsar.validation.cache import Cache
    from qsar.validation.fits import problem_of, run
    from qsar.validation.judging import PARTS, judge_table
    from qsar.validation.report import write

    key = f"{model.card['arrays_sha256'][:16]}{'-quick' if args.quick else ''}"
    cache = Cache(Path(platformdirs.user_cache_dir("acidity")) / "validation" / key)
    if args.again:
        cache.clear()
    problem = problem_of(model.library, model.members.settings)
    scale = studies.QUICK if args.quick else studies.scale_of(problem.data)
    fits = studies.all_fits(problem, scale)
    with progress(lambda: len(fits) + PARTS, "parts", wanted=True) as done:
        results = run(problem, fits, cache, args.jobs, done, args.cluster)
        judged = judge_table(model, done, args.jobs, args.cluster)
    sections = _sections(model, problem.data, judged, scale, results)
    opening = (
        f"Model {model.name} of {model.card['date']}: {model.card['steps']} measured steps of "
        f"{model.card['acids']} acids. Written by acidity validate{' --quick' if args.quick else ''}; the command "
        "writes it again."
    )
    _tell(write(args.output, args.name or model.name, f"Validation of {model.name}", opening, sections), sections)
    cache.clear()
    return 0


def _sections(model, data, judged, scale, results) -> list[Section]:  # type: ignore[no-untyped-def]
    from qsar.validation import sections as s

    family = list(model.library.family)
    return [
        s.accuracy(judged, family),
        s.cross_validation(data, scale, results),
        s.intervals(judged),
        s.domain(judged),
        *s.left_out(data, scale, results),
        s.learning_curve(data, scale, results),
        s.randomisation(data, scale, results),
        s.leverages(model, data, judged),
        s.robustness(data, scale, results),
    ]


def _tell(written: list[Path], sections: list[Section]) -> None:
    from qsar.validation.report import shown

    for section in sections:
        print(f"\n{section.title}\n{section.text}")
        for table in section.tables[:1]:
            cells = [list(table.headings), *[[shown(c) for c in row] for row in table.rows]]
            widths = [max(len(row[k]) for row in cells) for k in range(len(table.headings))]
            for row in cells:
                first, *rest = (f"{c:>{w}}" for c, w in zip(row, widths, strict=True))
                print("  ".join([f"{first.strip():<{widths[0]}}", *rest]))
    size = sum(path.stat().st_size for path in written) / 1e6
    print(f"\nWritten: {written[0]} and {len(written) - 1} more files, {size:.1f} MB", file=sys.stdout)
