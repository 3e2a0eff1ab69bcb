"""``acidity predict``: pKa of each acid step, with its interval and the verdict on it."""

from __future__ import annotations

import argparse
import functools
import sys
from collections.abc import Callable, Iterable, Iterator, Sequence
from contextlib import AbstractContextManager
from dataclasses import dataclass, field
from pathlib import Path

from qsar.batch import Answer, open_model, predict_records
from qsar.errors import UserError
from qsar.files import atomic_path
from qsar.progress import progress
from qsar.reading import READABLE, Record, count_records, read_sources
from qsar.resuming import Finished, partial_path, take_over
from qsar.screen import ScreenTable
from qsar.writing import UNUSABLE, CsvWriter, writer_for

HELP = "predict pKa with an interval and a verdict"

ALL_PREDICTED, SOME_UNUSABLE, UNREADABLE = 0, 3, 2
_SHOWN_PROBLEMS = 10


def add_arguments(parser: argparse.ArgumentParser) -> None:
    """Describe the arguments of the command."""
    parser.add_argument(
        "sources",
        nargs="+",
        metavar="SOURCE",
        help=f"a SMILES string, a file ({READABLE}; a table needs a column smiles, a column id is kept), "
        "or - for SMILES lines on standard input",
    )
    parser.add_argument(
        "-o",
        "--output",
        type=Path,
        metavar="FILE",
        help="write a .csv, .xlsx, .json, .sdf or .parquet instead of a table on the screen; in a .csv an id that a "
        "spreadsheet would take for a formula gets an apostrophe in front",
    )
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
    parser.add_argument("--jobs", type=jobs, default=1, metavar="N", help="number of processes (default: 1)")
    parser.add_argument(
        "--cluster",
        metavar="ADDRESS",
        help="work on a running Dask cluster instead, such as tcp://host:8786 (needs the package distributed)",
    )
    parser.add_argument(
        "--resume", action="store_true", help="go on with a .csv that an interrupt cut short (FILE.partial)"
    )
    parser.add_argument(
        "--progress", action="store_true", help="show progress also where standard error is no terminal"
    )


def coverage(text: str) -> float:
    """Read the fraction of an interval.

    Raises
    ------
    argparse.ArgumentTypeError
        If it is not a fraction between 0 and 1.
    """
    try:
        value = float(text)
    except ValueError:
        value = -1.0
    if not 0 < value < 1:
        raise argparse.ArgumentTypeError(f"{text!r} is not a fraction between 0 and 1, such as 0.9 for 90 %")
    return value


def jobs(text: str) -> int:
    """Read a number of processes.

    Raises
    ------
    argparse.ArgumentTypeError
        If it is not a whole number from 1 up.
    """
    if not text.isascii() or not text.isdigit() or int(text) < 1:
        raise argparse.ArgumentTypeError(f"{text!r} is not a number of processes, such as 2")
    return int(text)


@dataclass
class Tally:
    """What was read, answered and refused."""

    inputs: int = 0
    rows: int = 0
    unusable: int = 0
    unread: int = 0
    problems: list[str] = field(default_factory=list)

    def source_failed(self, problem: UserError) -> None:
        """Say that a source could not be read; the others are still answered."""
        self.unread += 1
        say(f"acidity: {problem}")

    def add(self, answers: Iterable[Answer]) -> None:
        """Count the answers to a chunk, and keep the first reasons for refusal."""
        for record, rows in answers:
            self.inputs += 1
            self.rows += len(rows)
            if rows[0].domain == UNUSABLE:
                self.unusable += 1
                if len(self.problems) < _SHOWN_PROBLEMS:
                    place = f"{record.where}, id {record.id}" if record.where else f"input {record.id}"
                    self.problems.append(f"{place}: {rows[0].reasons}")

    def begin_with(self, finished: Finished) -> None:
        """Count what an interrupted run had done."""
        self.inputs, self.rows, self.unusable = finished.inputs, finished.rows, finished.unusable

    @property
    def status(self) -> int:
        """Exit status of the command."""
        if self.unread:
            return UNREADABLE
        return SOME_UNUSABLE if self.unusable else ALL_PREDICTED


def say(text: str) -> None:
    """Print a line for the user on standard error."""
    print(text, file=sys.stderr, flush=True)


def run(args: argparse.Namespace) -> int:
    """Run the command.

    Returns
    -------
    int
        0 if every input was predicted, 3 if some could not be used, 2 if a source could not be read.

    Raises
    ------
    UserError
        If the output cannot be written or the model cannot be read.
    """
    tally = Tally()
    records = read_sources(
        args.sources, on_error=tally.source_failed, on_note=lambda text: say(f"acidity: note: {text}")
    )
    if args.output is None:
        if args.resume:
            raise UserError("--resume goes on with a file: name it with --output FILE.csv")
        _to_screen(args, records, tally)
    else:
        _to_file(args, records, tally)
    return tally.status


def _answers(args: argparse.Namespace, records: Iterator[Record]) -> Iterator[list[Answer]]:
    return predict_records(
        records,
        functools.partial(open_model, args.model),
        coverage=args.coverage,
        jobs=args.jobs,
        cluster=args.cluster,
        debug=args.debug,
    )


def _to_screen(args: argparse.Namespace, records: Iterator[Record], tally: Tally) -> None:
    table = ScreenTable(args.coverage)
    with progress(lambda: count_records(args.sources), "acids", wanted=args.progress) as advance:
        for answers in _answers(args, records):
            for line in table.lines(answers):
                print(line)
            sys.stdout.flush()
            tally.add(answers)
            advance(len(answers))


def _to_file(args: argparse.Namespace, records: Iterator[Record], tally: Tally) -> None:
    target: Path = args.output
    new_writer = writer_for(target)
    is_csv = new_writer is CsvWriter
    if args.resume and not is_csv:
        raise UserError("--resume goes on with a .csv only; leave it out to start again")
    _check_not_a_source(target, args.sources)
    partial = partial_path(target)
    with atomic_path(target) as temporary:
        if is_csv:
            begun = args.resume and partial.exists()
            model = ""
            if begun:
                finished = take_over(partial, temporary, records, args.coverage)
                tally.begin_with(finished)
                model = finished.model
                say(f"acidity: going on after {tally.inputs:,} inputs of {partial}")
            _write_csv(args, records, tally, CsvWriter(temporary, append=begun), partial, model)
        else:
            with new_writer(temporary) as writer, _bar(args, tally) as advance:
                for answers in _answers(args, records):
                    writer.write(row for _, rows in answers for row in rows)
                    tally.add(answers)
                    advance(len(answers))
        if not tally.inputs:
            temporary.unlink()  # nothing could be read, which has been said
            return
    if is_csv:
        partial.unlink(missing_ok=True)
    _summarise(tally, target)


def _bar(args: argparse.Namespace, tally: Tally) -> AbstractContextManager[Callable[[int], object]]:
    def left() -> int | None:
        total = count_records(args.sources)
        return None if total is None else max(total - tally.inputs, 0)

    return progress(left, "acids", wanted=args.progress or None)


def _write_csv(
    args: argparse.Namespace,
    records: Iterator[Record],
    tally: Tally,
    writer: CsvWriter,
    partial: Path,
    model: str,
) -> None:
    """Write a table that an interrupt leaves in a valid state, whole inputs only, at `partial`."""
    try:
        with writer, _bar(args, tally) as advance:
            for answers in _answers(args, records):
                if model:
                    _check_same_model(model, answers, partial)
                writer.write(row for _, rows in answers for row in rows)
                writer.checkpoint()
                tally.add(answers)
                advance(len(answers))
    except KeyboardInterrupt:
        if tally.inputs:
            writer.keep_complete()
            writer.path.replace(partial)
            say(
                f"acidity: interrupted; the answers to the first {tally.inputs:,} inputs are in {partial}; "
                "the same command with --resume goes on from there"
            )
        raise


def _check_same_model(model: str, answers: Sequence[Answer], partial: Path) -> None:
    other = next((row.model for _, rows in answers for row in rows if row.model not in ("", model)), None)
    if other:
        raise UserError(
            f"{partial}: made with the model {model}, not {other}; give that one, or delete the file"
        )


def _check_not_a_source(target: Path, sources: Sequence[str]) -> None:
    for source in sources:
        try:
            same = target.exists() and target.samefile(Path(source).expanduser())
        except (OSError, ValueError):
            continue  # a SMILES, not a file
        if same:
            raise UserError(f"--output {target} is also a source; give the output another name")


def _summarise(tally: Tally, target: Path) -> None:
    for problem in tally.problems:
        say(f"acidity: {problem}")
    if tally.unusable > len(tally.problems) > 0:
        say(f"acidity: and {tally.unusable - len(tally.problems):,} more: the rows with domain {UNUSABLE}")
    refused = f"; {tally.unusable:,} could not be used" if tally.unusable else ""
    say(f"{target}: {_count(tally.inputs, 'input')} in {_count(tally.rows, 'row')}{refused}")


def _count(number: int, noun: str) -> str:
    return f"{number:,} {noun}" + ("" if number == 1 else "s")
