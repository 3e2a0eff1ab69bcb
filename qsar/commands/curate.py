"""``acidity curate``: turn a table of measurements into one that can be trained on."""

from __future__ import annotations

import argparse
import sys
from pathlib import Path
from typing import TYPE_CHECKING

from qsar.errors import UserError

if TYPE_CHECKING:
    from qsar.curation.curate import Curated
    from qsar.curation.examination import Flag

HELP = "clean a table of measurements, and say what was refused, changed or looks wrong"

ALL_USED, SOME_REFUSED = 0, 3
_SHOWN = 10


def add_arguments(parser: argparse.ArgumentParser) -> None:
    """Describe the arguments of the command."""
    parser.add_argument(
        "file",
        type=Path,
        metavar="FILE",
        help="CSV, TSV, XLSX or SDF with a structure and a pKa (or Ka, pKb) in each row; or the IUPAC Digitized "
        "pKa Dataset as downloaded",
    )
    parser.add_argument(
        "-o",
        "--output",
        type=Path,
        metavar="FILE",
        help="clean table (default: FILE_clean.csv in the working folder); beside it come *_left.csv with every "
        "refused or changed row and *_questions.csv with what looks wrong",
    )
    parser.add_argument(
        "--column",
        action="append",
        default=[],
        metavar="FIELD=HEADER",
        help="which column holds what, such as pka=Value; fields: smiles, pka, step, name, temperature_c, "
        "ionic_strength_m, constant, uncertainty, quantity, family, source, date",
    )
    parser.add_argument(
        "--quantity", choices=("pka", "ka", "pkb"), help="what the values are (default: by their header)"
    )
    parser.add_argument("--temperature", type=float, metavar="C", help="°C, where a row states none")
    parser.add_argument(
        "--ionic-strength", type=float, metavar="M", help="mol/L, where a row states none, such as 0.15"
    )
    parser.add_argument(
        "--constant",
        choices=("thermodynamic", "mixed", "concentration"),
        help="kind of constant, where a row states none; a glass electrode calibrated with buffers gives mixed ones",
    )
    parser.add_argument(
        "--uncertainty",
        type=float,
        default=0.05,
        metavar="U",
        help="standard uncertainty, pKa units, where a row states none (default: 0.05)",
    )
    parser.add_argument(
        "--limit",
        type=float,
        default=0.3,
        metavar="D",
        help="largest difference between duplicates that are merged (default: 0.3)",
    )
    parser.add_argument(
        "--model",
        metavar="MODEL",
        help="name or folder of the model for the cross-examination (default: the one in use)",
    )
    parser.add_argument(
        "--no-examination", action="store_true", help="do not compare the values with a model's expectation"
    )


def run(args: argparse.Namespace) -> int:
    """Run the command.

    Returns
    -------
    int
        0 if every row was kept or merged, 3 if some were refused.
    """
    from qsar.curation.readers import is_iupac

    output = args.output or Path(f"{args.file.stem}_clean.csv")
    _check_arguments(args, output)
    if is_iupac(args.file):
        return _run_iupac(args, output)
    return _finish(args, output, _curate(args))


def _check_arguments(args: argparse.Namespace, output: Path) -> None:
    if output.suffix.lower() != ".csv":
        raise UserError(f"--output {output}: the clean table is a CSV; give a name that ends in .csv")
    if not args.limit > 0:
        raise UserError(f"--limit {args.limit:g}: give a positive difference in pKa units")
    if not 0 < args.uncertainty <= 2:
        raise UserError(f"--uncertainty {args.uncertainty:g}: give a standard uncertainty of up to 2 pKa units")
    if args.file.exists() and output.exists() and output.samefile(args.file):
        raise UserError(f"--output {output} is the table that is read; give it another name")


def _named(columns: list[str]) -> dict[str, str]:
    named = {}
    for text in columns:
        field, separator, header = text.partition("=")
        if not separator or not header:
            raise UserError(f"--column {text}: write FIELD=HEADER, such as pka=Value")
        named[field.strip().casefold()] = header.strip()
    return named


def _curate(args: argparse.Namespace) -> Curated:
    from qsar.curation.curate import curate
    from qsar.curation.readers import read_rows
    from qsar.curation.rules import Defaults

    rows, columns = read_rows(args.file, _named(args.column), args.quantity, lambda text: say(f"acidity: note: {text}"))
    defaults = Defaults(args.temperature, args.ionic_strength, args.constant or "", args.uncertainty, columns.quantity)
    return curate(rows, defaults, args.limit)


def _finish(args: argparse.Namespace, output: Path, curated: Curated) -> int:
    from qsar.curation.curate import write_clean, write_flags, write_left

    flags = [] if args.no_examination or not curated.kept else _examine(args, curated)
    left, questions = beside(output, "left"), beside(output, "questions")
    write_left(left, curated)
    write_clean(output, curated, flags)
    if flags:
        write_flags(questions, flags)
    else:
        questions.unlink(missing_ok=True)  # of an earlier run
    _report(args.file, output, left, questions, curated, flags)
    return SOME_REFUSED if curated.refused or curated.conflicts else ALL_USED


def beside(output: Path, what: str) -> Path:
    """Name of a file that goes with the clean table."""
    return output.with_name(f"{output.stem.removesuffix('_clean')}_{what}.csv")


def _examine(args: argparse.Namespace, curated: Curated) -> list[Flag]:
    from qsar.curation.examination import examine
    from qsar.model import load_model
    from qsar.progress import progress

    try:
        model = load_model(args.model)
    except UserError as problem:
        raise UserError(f"{problem}; --no-examination curates without a model") from problem
    with progress(lambda: len(curated.kept), "rows") as done:
        return examine(curated.kept, model, done)


def _report(source: Path, output: Path, left: Path, questions: Path, curated: Curated, flags: list[Flag]) -> None:
    shown = sorted([*curated.refused.items(), *((c.row.number, c.reason) for c in curated.conflicts)])
    for number, reason in shown[:_SHOWN]:
        say(f"acidity: {source.name}, row {number}: {reason}")
    if len(shown) > _SHOWN:
        say(f"acidity: and {len(shown) - _SHOWN} more refused rows in {left}")
    for flag in flags[:_SHOWN]:
        numbers = " ".join(str(n) for n in flag.merged.rows)
        say(f"acidity: question: row {numbers}: {flag.sentence}")
    if len(flags) > _SHOWN:
        say(f"acidity: and {len(flags) - _SHOWN} more questions in {questions}")
    changed = sum(bool(m.row.changes) for m in curated.kept)
    print(f"{curated.balance}")
    print(f"{output}: {len(curated.kept)} steps to train on; {changed} of them changed or corrected, see {left}")
    if flags:
        suspect = sum(bool(f.artefact) for f in flags)
        print(
            f"{questions}: {len(flags)} rows far from what the model expects, flagged and not changed; an artefact is "
            f"the likeliest cause for {suspect} of them (column suspected), which `acidity train` leaves out"
        )


def _run_iupac(args: argparse.Namespace, output: Path) -> int:
    """Read the IUPAC dataset: its own rules choose the rows, and every one that is left out is listed."""
    from qsar.curation.curate import write_clean
    from qsar.curation.iupac_table import curate_iupac, write_excluded

    say(f"acidity: note: {args.file.name} is read as the IUPAC Digitized pKa Dataset (CC BY-NC 4.0)")
    dataset = curate_iupac(args.file, args.limit)
    left = beside(output, "left")
    write_excluded(left, dataset)
    write_clean(output, dataset.curated)
    print(dataset.balance)
    print(f"{output}: {len(dataset.curated.kept)} steps to train on; the rows left out and why: {left}")
    return SOME_REFUSED if dataset.excluded else ALL_USED


def say(text: str) -> None:
    """Print a line for the user on standard error."""
    print(text, file=sys.stderr, flush=True)
