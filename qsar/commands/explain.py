"""``acidity explain``: what each substituent contributed, as table, pictures and report."""

from __future__ import annotations

import argparse
from collections.abc import Iterator, Sequence
from contextlib import nullcontext
from dataclasses import dataclass, field
from itertools import islice
from pathlib import Path
from typing import TYPE_CHECKING

from qsar.commands.predict import coverage, say
from qsar.commands.quantities import counted
from qsar.errors import UserError
from qsar.files import atomic_path
from qsar.progress import progress
from qsar.reading import READABLE, Record, count_records, read_sources

if TYPE_CHECKING:
    from qsar.attribution import Explained
    from qsar.model import Model
    from qsar.structures import Acid, StructureError

HELP = "show what each substituent contributed to a pKa"

_CHUNK = 25
_SHOWN_PROBLEMS = 10
_MOST_DISTANCES = 6


def add_arguments(parser: argparse.ArgumentParser) -> None:
    """Describe the arguments of the command."""
    parser.add_argument(
        "sources",
        nargs="+",
        metavar="SOURCE",
        help=f"a SMILES string, a file ({READABLE}), or - for SMILES lines on standard input",
    )
    parser.add_argument(
        "-o",
        "--output",
        type=Path,
        metavar="FOLDER",
        help="write contributions.csv, witnesses.csv and the plots there instead of a table on the screen",
    )
    parser.add_argument(
        "--report",
        action="store_true",
        help="write one HTML file with dossier, figures and a statement for each acid: FOLDER/report.html, "
        "or reports/NAME.html in the current folder",
    )
    parser.add_argument("--report-file", type=Path, metavar="FILE", help="the same, to a file of this name")
    parser.add_argument(
        "--plots",
        choices=("all", "structures", "none"),
        default="all",
        help="which plots go to FOLDER (default: all)",
    )
    parser.add_argument(
        "--coverage",
        type=coverage,
        default=0.9,
        metavar="FRACTION",
        help="fraction of true values that the intervals are meant to hold (default: 0.9)",
    )
    parser.add_argument("--model", type=Path, metavar="FOLDER", help="folder of another model than the shipped one")
    parser.add_argument(
        "--progress", action="store_true", help="show progress also where standard error is no terminal"
    )


@dataclass
class _Answers:
    """What was read and explained."""

    records: list[Record] = field(default_factory=list)
    answers: list[Explained] = field(default_factory=list)
    unread: int = 0

    def source_failed(self, problem: UserError) -> None:
        self.unread += 1
        say(f"acidity: {problem}")

    def each(self) -> Iterator[tuple[Record, Explained]]:
        yield from zip(self.records, self.answers, strict=True)

    @property
    def unusable(self) -> list[tuple[Record, str]]:
        return [(r, a.error) for r, a in self.each() if a.error is not None]

    @property
    def status(self) -> int:
        return 2 if self.unread else 3 if self.unusable else 0


def run(args: argparse.Namespace) -> int:
    """Run the command.

    Returns
    -------
    int
        0 if every input was explained, 3 if some could not be used, 2 if a source could not be read.

    Raises
    ------
    UserError
        If an output cannot be written or the model cannot be read.
    """
    from qsar.attribution.painter import Painter
    from qsar.model import load_model

    folder: Path | None = args.output
    if folder is not None:
        _make_folder(folder)
    report = _report_path(args)
    model = load_model(args.model)
    found = _Answers()
    wanted = True if args.progress else None
    if folder is None and report is None:
        wanted = args.progress
    with (
        progress(lambda: count_records(args.sources), "acids", wanted=wanted) as advance,
        nullcontext() if folder is None else Painter(folder, args.plots, advance) as painter,
    ):
        for records, answers in _explained(model, args, found):
            found.records += records
            found.answers += answers
            if folder is None and report is None:
                _to_screen(records, answers)
            if painter is None:
                advance(len(records))
            else:
                for position, (record, answer) in enumerate(
                    zip(records, answers, strict=True), start=len(found.records) - len(records) + 1
                ):
                    painter.paint(position, record, answer)
    if folder is not None and found.records:
        _tables(folder, found)
        if args.plots == "all":
            _series(folder, found)
    if report is not None and found.records:
        from qsar.report import write_report

        own = len({s for s in model.library.smiles if s})
        with progress(lambda: own, "acids of the model's own table", wanted=wanted) as advance:
            write_report(report, model, found.records, found.answers, args.coverage, done=advance)
        say(f"{report}: report on {counted(len(found.records), 'input')}")
    _summarise(found, folder)
    return found.status


def _make_folder(folder: Path) -> None:
    try:
        folder.mkdir(parents=True, exist_ok=True)
    except OSError as problem:
        if folder.exists():
            raise UserError(f"cannot write to {folder}: it is a file; give the name of a folder") from problem
        raise UserError(f"cannot write to the folder {folder}: {problem.strerror or problem}") from problem


def _report_path(args: argparse.Namespace) -> Path | None:
    if args.report_file is not None:
        path: Path = args.report_file
        if path.suffix.lower() not in (".html", ".htm"):
            raise UserError(f"cannot write {path}: a report is an .html file")
        return path
    if not args.report:
        return None
    if args.output is not None:
        return Path(args.output) / "report.html"
    from qsar.attribution.painter import safe_name

    source = Path(args.sources[0])
    stem = source.stem if source.is_file() else "explanation"
    _make_folder(Path("reports"))
    return Path("reports") / f"{safe_name(stem)}.html"


def _explained(
    model: Model, args: argparse.Namespace, found: _Answers
) -> Iterator[tuple[list[Record], list[Explained]]]:
    from qsar.attribution import explain_many

    stream = read_sources(
        args.sources, on_error=found.source_failed, on_note=lambda text: say(f"acidity: note: {text}")
    )
    while records := list(islice(stream, _CHUNK)):
        yield records, explain_many(model, [readable(r) for r in records], args.coverage)


def readable(record: Record) -> str | Acid | StructureError:
    """What the model takes: a SMILES, an acid, or the reason why there is neither."""
    from qsar.structures import StructureError, acid_from_mol

    if record.error is not None:
        return StructureError(record.error)
    if record.mol is None:
        return record.smiles
    try:
        return acid_from_mol(record.mol)
    except StructureError as reason:
        return reason


def _to_screen(records: Sequence[Record], answers: Sequence[Explained]) -> None:
    from qsar.attribution.tables import screen_lines

    for record, answer in zip(records, answers, strict=True):
        for line in screen_lines(record.id, answer.steps):
            print("".join(c if c.isprintable() else "?" for c in line), flush=True)


def _tables(folder: Path, found: _Answers) -> None:
    from qsar.attribution.tables import (
        CONTRIBUTIONS,
        WITNESSES,
        contribution_rows,
        witness_rows,
        write_table,
    )

    with atomic_path(folder / "contributions.csv") as temporary:
        rows = (row for r, a in found.each() for row in contribution_rows(r, a.steps))
        write_table(temporary, CONTRIBUTIONS, rows)
    with atomic_path(folder / "witnesses.csv") as temporary:
        rows = (row for r, a in found.each() for row in witness_rows(r, a.steps))
        write_table(temporary, WITNESSES, rows)


def _series(folder: Path, found: _Answers) -> None:
    """What only several acids show together: the table of analogues, and contribution against distance."""
    from qsar.attribution.painter import safe_name
    from qsar.attribution.plots import analogues_figure, distance_figure, on_chain, save

    shown = [(r.id, e) for r, a in found.each() for e in a.steps]
    if len(shown) < 2:
        return
    save(analogues_figure([e for _, e in shown], [name for name, _ in shown]), folder / "analogues")
    distances: dict[str, set[int]] = {}
    for _, e in shown:
        for line in e.contributions:
            if on_chain(e, line):
                distances.setdefault(line.name, set()).add(len(line.path))
    often = sorted((name for name, d in distances.items() if len(d) >= 3), key=lambda n: (-len(distances[n]), n))
    for name in often[:_MOST_DISTANCES]:
        save(distance_figure([e for _, e in shown], name), folder / f"distance-{safe_name(name)}")


def _summarise(found: _Answers, folder: Path | None) -> None:
    problems = found.unusable
    for record, reason in problems[:_SHOWN_PROBLEMS]:
        place = f"{record.where}, id {record.id}" if record.where else f"input {record.id}"
        say(f"acidity: {place}: {reason}")
    if len(problems) > _SHOWN_PROBLEMS:
        say(f"acidity: and {len(problems) - _SHOWN_PROBLEMS:,} more: the rows without a step")
    if folder is not None and found.records:
        refused = f"; {len(problems):,} could not be used" if problems else ""
        say(f"{folder / 'contributions.csv'}: {counted(len(found.records), 'input')}{refused}")
