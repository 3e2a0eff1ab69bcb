"""Options and output that ``ionise``, ``workup`` and ``buffer`` share."""

from __future__ import annotations

import argparse
import csv
import json
import sys
import textwrap
from collections.abc import Callable, Iterable, Iterator, Sequence
from contextlib import contextmanager
from pathlib import Path
from typing import TYPE_CHECKING, Any

from qsar.commands.quantities import constants, counted, fraction, not_negative, numbers
from qsar.errors import UserError

if TYPE_CHECKING:
    from qsar.decisions.acids import Outcome
    from qsar.decisions.steps import AcidSteps
    from qsar.reading import Record

ALL_ANSWERED, SOME_UNUSABLE, UNREADABLE = 0, 3, 2
_WIDTH = 110

Row = dict[str, object]


def add_acid_arguments(parser: argparse.ArgumentParser) -> None:
    """Describe how acids, their constants and the conditions are given."""
    parser.add_argument(
        "sources",
        nargs="*",
        metavar="SOURCE",
        help="a SMILES string or a file of structures; none with --pka",
    )
    parser.add_argument(
        "--pka",
        type=constants,
        action="append",
        metavar="PKA",
        help="known pKa at 25 °C and zero ionic strength in place of the model's, once for each acid; "
        "several steps as 3.13,4.76,6.40",
    )
    parser.add_argument(
        "--pka-sd",
        type=not_negative,
        default=0.05,
        metavar="SD",
        help="standard deviation of a known pKa (default: 0.05)",
    )
    parser.add_argument(
        "--charge",
        type=int,
        default=0,
        metavar="Z",
        help="charge of the fully protonated form, where no structure is given (default: 0)",
    )
    parser.add_argument("--name", metavar="TEXT", help="name of the acid in the output")
    parser.add_argument(
        "--coverage",
        type=fraction,
        default=0.9,
        metavar="FRACTION",
        help="fraction of true values that the intervals are meant to hold (default: 0.9)",
    )
    parser.add_argument(
        "--risk",
        type=fraction,
        default=0.05,
        metavar="FRACTION",
        help="accepted probability that a choice is wrong (default: 0.05)",
    )
    parser.add_argument(
        "--temperature", type=float, default=25.0, metavar="CELSIUS", help="10 to 40 °C (default: 25)"
    )
    parser.add_argument(
        "--enthalpy",
        type=numbers,
        metavar="KJ_MOL",
        help="enthalpy of ionisation in kJ/mol, one or one a step as 4.0,44.2; needed away from 25 °C only "
        "(default: 0 ± 3.5 for a carboxyl step)",
    )
    parser.add_argument(
        "--model", type=Path, metavar="FOLDER", help="folder of another model than the shipped one"
    )
    parser.add_argument(
        "-o", "--output", type=Path, metavar="FILE", help="write the table as .csv, .xlsx or .json"
    )
    parser.add_argument(
        "--plot",
        type=Path,
        metavar="FILE",
        help="draw a .png or .svg; with several acids each gets its number in the name",
    )


@contextmanager
def refusals() -> Iterator[None]:
    """Turn a refusal of the calculation into an error of the user, in one line."""
    try:
        yield
    except ValueError as problem:
        raise UserError(str(problem)) from problem


class Acids:
    """The acids that a command was given.

    Parameters
    ----------
    args : argparse.Namespace
        With the arguments of `add_acid_arguments`.
    """

    def __init__(self, args: argparse.Namespace) -> None:
        self._args = args
        self._unread = 0
        self.unusable = 0

    def all(self) -> list[AcidSteps]:
        """Usable acids at the temperature that is asked for, in order; the others are said on standard error.

        Raises
        ------
        UserError
            When nothing is given, constants do not fit the inputs, or the model cannot be opened.
        """
        from qsar.decisions.steps import at_temperature, given_steps

        args = self._args
        given: Sequence[tuple[float, ...]] = args.pka or ()
        if not args.sources:
            if not given:
                raise UserError("no acid: give a SMILES string, a file, or --pka")
            named = [
                given_steps(_name(args, i, len(given)), pka, args.pka_sd, args.coverage, args.charge)
                for i, pka in enumerate(given)
            ]
        else:
            named = self._from_sources(given)
        with refusals():
            return [at_temperature(acid, args.temperature, args.enthalpy) for acid in named]

    def _from_sources(self, given: Sequence[tuple[float, ...]]) -> list[AcidSteps]:
        from dataclasses import replace

        from qsar.decisions.acids import steps_of_many
        from qsar.reading import read_sources

        args = self._args

        def failed(problem: UserError) -> None:
            self._unread += 1
            say(f"acidity: {problem}")

        records: list[Record] = []
        for record in read_sources(
            args.sources, on_error=failed, on_note=lambda t: say(f"acidity: note: {t}")
        ):
            # A SMILES on the command line has no name but itself.
            records.append(record if record.where else replace(record, id=record.smiles))
        if not records:
            return []
        if given and len(given) != len(records):
            raise UserError(
                f"--pka is given {counted(len(given), 'time')} for {counted(len(records), 'acid')}; give it once "
                "for each, in order"
            )
        if args.name and len(records) == 1:
            records[0] = replace(records[0], id=args.name)
        overrides: list[Sequence[float] | None] = list(given) or [None] * len(records)
        outcomes = steps_of_many(records, args.coverage, overrides, args.pka_sd, args.model)
        return [outcome.acid for outcome in outcomes if self._usable(outcome) and outcome.acid is not None]

    def _usable(self, outcome: Outcome) -> bool:
        if outcome.acid is None:
            self.refuse(outcome.record.where or outcome.record.id, outcome.error or "it cannot be used")
        return outcome.acid is not None

    def refuse(self, name: str, reason: str) -> None:
        """Count and say an acid that gets no answer."""
        self.unusable += 1
        say(f"acidity: {clean(reason if reason.startswith(name) else f'{name}: {reason}')}")

    @property
    def status(self) -> int:
        """Exit status of the command."""
        if self._unread:
            return UNREADABLE
        return SOME_UNUSABLE if self.unusable else ALL_ANSWERED


def _name(args: argparse.Namespace, position: int, total: int) -> str:
    if args.name and total == 1:
        return str(args.name)
    return "the acid" if total == 1 else f"acid {position + 1}"


def say(text: str) -> None:
    """Print a line on standard error."""
    print(text, file=sys.stderr, flush=True)


def clean(text: str) -> str:
    """Text that cannot steer the terminal."""
    return "".join(c if c.isprintable() else "?" for c in text)


def show(text: str, indent: str = "") -> None:
    """Print a sentence for people, wrapped."""
    print(
        "\n".join(
            textwrap.wrap(
                clean(text), _WIDTH, initial_indent=indent, subsequent_indent=" " * len(indent) or "  "
            )
        )
    )


def show_table(heading: Sequence[str], rows: Iterable[Sequence[str]]) -> None:
    """Print a table for people; the first column to the left, the others to the right."""
    lines = [list(heading), *(list(map(clean, row)) for row in rows)]
    widths = [max(len(line[i]) for line in lines) for i in range(len(heading))]
    for k, line in enumerate(lines):
        cells = [line[0].ljust(widths[0]), *(c.rjust(w) for c, w in zip(line[1:], widths[1:], strict=True))]
        print("  ".join(cells).rstrip())
        if k == 0:
            print("-" * (sum(widths) + 2 * (len(widths) - 1)))


def show_acid(acid: AcidSteps) -> None:
    """Print what is taken for an acid and where it comes from."""
    steps = ", ".join(
        f"{value:.2f} ({low:.2f} to {high:.2f})"
        for value, low, high in zip(acid.pka, acid.low, acid.high, strict=True)
    )
    show(f"{acid.name}: pKa {steps}, {acid.origin}, {100 * acid.coverage:g} % interval")
    for note in acid.notes:
        show(note, "  · ")


def check_outputs(args: argparse.Namespace) -> None:
    """Refuse outputs that cannot be written before any work is done.

    Raises
    ------
    UserError
        For an unknown extension or a folder that does not exist.
    """
    from qsar.files import check_target

    for target, known in ((args.output, tuple(_WRITERS)), (args.plot, (".png", ".svg"))):
        if target is None:
            continue
        if target.suffix.lower() not in known:
            raise UserError(f"cannot write {target}: the extension must be one of {', '.join(known)}")
        check_target(target)


def write_table(target: Path, columns: Sequence[str], rows: Sequence[Row]) -> None:
    """Write rows as CSV, XLSX or JSON by extension, whole or not at all; numbers keep every digit.

    Raises
    ------
    UserError
        For another extension, or a place that cannot be written.
    """
    from qsar.files import atomic_path

    write = _WRITERS.get(target.suffix.lower())
    if write is None:
        raise UserError(f"cannot write {target}: the extension must be one of {', '.join(_WRITERS)}")
    with atomic_path(target) as temporary:
        write(temporary, columns, rows)


def _finite(value: object) -> object:
    return None if isinstance(value, float) and not abs(value) < float("inf") else value


def _write_csv(path: Path, columns: Sequence[str], rows: Sequence[Row]) -> None:
    from qsar.writing import disarmed

    with path.open("w", encoding="utf-8", newline="") as handle:
        writer = csv.writer(handle, lineterminator="\n")
        writer.writerow(columns)
        for row in rows:
            cells = (_finite(row[c]) for c in columns)
            writer.writerow([disarmed(cell) if isinstance(cell, str) else cell for cell in cells])


def _write_json(path: Path, columns: Sequence[str], rows: Sequence[Row]) -> None:
    table = [{c: _finite(row[c]) for c in columns} for row in rows]
    path.write_text(json.dumps(table, ensure_ascii=False, indent=1, allow_nan=False) + "\n", encoding="utf-8")


def _write_xlsx(path: Path, columns: Sequence[str], rows: Sequence[Row]) -> None:
    import openpyxl
    from openpyxl.cell import WriteOnlyCell

    book = openpyxl.Workbook(write_only=True)
    sheet = book.create_sheet("decision")

    def cell(value: object) -> Any:
        stored = WriteOnlyCell(sheet, value=_finite(clean(value) if isinstance(value, str) else value))
        if isinstance(value, str):
            stored.data_type = "s"
        return stored

    sheet.append([cell(c) for c in columns])
    for row in rows:
        sheet.append([cell(row[c]) for c in columns])
    book.save(path)


_WRITERS: dict[str, Callable[[Path, Sequence[str], Sequence[Row]], None]] = {
    ".csv": _write_csv,
    ".json": _write_json,
    ".xlsx": _write_xlsx,
}


def numbered(target: Path, position: int, total: int) -> Path:
    """The file for one of several acids: ``plot.png`` becomes ``plot-2.png`` for the second."""
    return target if total == 1 else target.with_name(f"{target.stem}-{position + 1}{target.suffix}")
