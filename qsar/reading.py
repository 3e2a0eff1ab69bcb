"""Structures from SMILES strings and files, one record at a time.

A source is a SMILES string, a file, or ``-`` for SMILES lines on standard input. Files are read as a stream;
whatever goes wrong with one record is said in that record, and the next one follows.
"""

from __future__ import annotations

import re
import sys
import unicodedata
from collections.abc import Callable, Iterator, Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import IO, TYPE_CHECKING

from qsar.errors import UserError
from qsar.spreadsheets import MAX_LINE, TEXT_TABLES, WORKBOOKS, bounded_lines, open_table, open_text

if TYPE_CHECKING:
    from rdkit import Chem

SMILES_LISTS = frozenset((".smi", ".smiles", ".ism", ".txt"))
MOL_FILES = frozenset((".sdf", ".sd", ".mol"))
PARQUET = frozenset((".parquet", ".pq"))
READABLE = "CSV, TSV, XLSX, Parquet, SMI, SDF or MOL"
MAX_SMILES = 10_000
"""Characters of one SMILES. An acid within the limit of 200 heavy atoms needs far fewer."""

_FILE_ENDING = re.compile(
    r"\.(csv|tsv|tab|txt|smi|smiles|ism|sdf|sd|mol|mol2|xlsx|xlsm|xls|ods|json|parquet|pq|pdf|docx?|xml|html?|"
    r"cdxml?|rdf|pdb|py|gz|zip|bz2|xz|7z)$",
    re.IGNORECASE,
)
_PLACE = re.compile(r"(\.{0,2}[/~]|\.{1,2}\\|[A-Za-z]:[\\/])")


@dataclass(frozen=True, slots=True)
class Record:
    """One input structure.

    Attributes
    ----------
    id : str
        The ``id`` of the row, else its name, else its position in the source, counted from 1.
    smiles : str
        SMILES as given, without outer blanks; of a MOL block the SMILES that it stands for.
    where : str
        Place for messages, such as "acids.csv, row 5"; empty for a SMILES string.
    mol : rdkit.Chem.Mol or None
        The molecule, where the input was a MOL block.
    error : str or None
        Why there is no structure, in one line.
    """

    id: str
    smiles: str
    where: str = ""
    mol: Chem.Mol | None = None
    error: str | None = None


Note = Callable[[str], None]


def _ignore(_: object) -> None:
    """Default for notes that nobody asked for."""


def read_sources(
    sources: Sequence[str],
    *,
    on_error: Callable[[UserError], None] | None = None,
    on_note: Note = _ignore,
) -> Iterator[Record]:
    """Read structures from SMILES strings and files, in order.

    Parameters
    ----------
    sources : sequence of str
        SMILES strings, names of files (CSV, TSV, XLSX, SMI, SDF, MOL), or ``-`` for standard input.
    on_error : callable, optional
        Told of each source that cannot be read at all; the others are still read. Without it, such a
        source raises.
    on_note : callable, optional
        Told, in one line, what had to be guessed.

    Yields
    ------
    Record

    Raises
    ------
    UserError
        If a source cannot be read and there is no `on_error`: a missing file, a folder, an unknown kind of
        file, no ``smiles`` column, no rows.
    """
    for position, source in enumerate(sources, start=1):
        try:
            if source == "-":
                yield from _checked_smiles_lines(sys.stdin, "standard input")
            elif is_file_name(source):
                yield from _read_file(Path(source).expanduser(), on_note)
            else:
                yield _record(str(position), source, "")
        except UserError as problem:
            if on_error is None:
                raise
            on_error(problem)


def is_file_name(source: str) -> bool:
    """Whether a source names a file (present or missing) and is not a SMILES string."""
    if not source.strip():
        return False
    try:
        if Path(source).exists():
            return True
    except (OSError, ValueError):
        return False  # too long or not a name at all: a SMILES
    return bool(_FILE_ENDING.search(source) or _PLACE.match(source))


def count_records(sources: Sequence[str]) -> int | None:
    """Count the records of the sources without parsing them, for a progress bar.

    Returns
    -------
    int or None
        About how many records will come; None where that cannot be told cheaply.
    """
    total = 0
    for source in sources:
        path = Path(source).expanduser()
        if source == "-" or (is_file_name(source) and path.suffix.lower() in WORKBOOKS):
            return None
        if not is_file_name(source):
            total += 1
        elif path.suffix.lower() in PARQUET:
            from qsar.parquet import count_rows

            rows = count_rows(path)
            if rows is None:
                return None
            total += rows
        elif path.is_file():
            mark = b"$$$$" if path.suffix.lower() in MOL_FILES else b"\n"
            total += _count(path, mark) - (path.suffix.lower() in TEXT_TABLES)
    return max(total, 1)


def _count(path: Path, mark: bytes) -> int:
    total = 0
    with path.open("rb") as handle:
        while block := handle.read(1 << 20):
            total += block.count(mark)
    return total


def _read_file(path: Path, on_note: Note) -> Iterator[Record]:
    kind = path.suffix.lower()
    try:
        if path.is_dir():
            raise UserError("is a folder; name the files in it")
        if not path.exists():
            raise UserError("no such file; check the name and the folder")

        def note(text: str) -> None:
            on_note(f"{path}: {text}")

        if kind in TEXT_TABLES or kind in WORKBOOKS:
            yield from _at_least_one(_read_table(path, note))
        elif kind in PARQUET:
            yield from _at_least_one(_read_parquet(path))
        elif kind in MOL_FILES:
            from qsar.molfiles import read_mol_file

            yield from _at_least_one(read_mol_file(path, note))
        elif kind in SMILES_LISTS:
            with open_text(path, note) as handle:
                yield from _at_least_one(_smiles_lines(handle, path.name))
        else:
            raise UserError(f"this kind of file is not read; save it as {READABLE}, with that extension")
    except UserError as problem:
        raise UserError(f"{path}: {problem}") from problem
    except OSError as problem:
        raise UserError(f"{path}: cannot be read ({problem.strerror or problem})") from problem


def _at_least_one(records: Iterator[Record]) -> Iterator[Record]:
    empty = True
    for record in records:
        empty = False
        yield record
    if empty:
        raise UserError("0 rows; there is nothing to read in it")


def _record(identity: str, smiles: str, where: str) -> Record:
    """Record of a SMILES text, refused here only where it is no use to parse it."""
    smiles = smiles.strip()
    error = None
    if not smiles:
        error = "no SMILES: the cell is empty; fill it in or take the row out"
    elif len(smiles) > MAX_SMILES:
        error = f"the SMILES is longer than {MAX_SMILES:,} characters: too large a molecule"
        smiles = smiles[:60] + "…"
    else:
        error = _foreign_character(smiles)
    return Record(identity, smiles, where, None, error)


def _foreign_character(smiles: str) -> str | None:
    """What is wrong with a character that no SMILES holds; None if there is none.

    RDKit stops at such a character, at times without a word, and returns the acid written before it.
    """
    structure = smiles.partition(" |")[0]
    if "\n" in structure or "\r" in structure:
        return "a line break is inside the SMILES; write the structure in one line"
    for character in structure:
        if not " " <= character <= "~" and character not in "\t\0":  # RDKit refuses these two itself
            what = unicodedata.name(character, f"U+{ord(character):04X}").lower()
            return f"the SMILES holds a character that no SMILES has ({what}); type that place again"
    return None


def _read_table(path: Path, note: Note) -> Iterator[Record]:
    with open_table(path, ("smiles",), note) as table:
        column = table.find("smiles")
        if column is None:
            raise UserError(f"no column smiles among its columns ({_listed(table.columns)}); rename one")
        labels = [i for i in (table.find("id"), table.find("name")) if i is not None]
        moved = False
        for position, row in enumerate(table.rows, start=1):
            where = f"{path.name}, row {row.number}"
            if row.error:
                yield Record(str(position), "", where, None, row.error)
                continue
            identity = next((row.cells[i] for i in labels if row.cells[i]), str(position))
            if not moved and any(row.cells[len(table.columns) :]):
                moved = True  # said once: the column smiles may then hold what belongs to another column
                count = f"{len(row.cells)} cells where the header has {len(table.columns)}"
                note(f"row {row.number} has {count}; quote a cell that holds the separator, here and below")
            yield _record(identity, row.cells[column], where)


def _read_parquet(path: Path) -> Iterator[Record]:
    from qsar.parquet import columns_of, read_columns

    columns = columns_of(path)
    by_name = {name.strip().casefold(): name for name in reversed(columns)}
    if "smiles" not in by_name:
        raise UserError(f"no column smiles among its columns ({_listed(columns)}); rename one")
    labels = [by_name[name] for name in ("id", "name") if name in by_name]
    for position, (smiles, *given) in enumerate(read_columns(path, [by_name["smiles"], *labels]), start=1):
        identity = next((text for text in given if text), str(position))
        yield _record(identity, smiles, f"{path.name}, row {position}")


def _listed(columns: Sequence[str], limit: int = 8) -> str:
    shown = ", ".join(name[:30] or "(no name)" for name in columns[:limit])
    return shown + (f" and {len(columns) - limit} more" if len(columns) > limit else "")


def _checked_smiles_lines(handle: IO[str], name: str) -> Iterator[Record]:
    try:
        yield from _at_least_one(_smiles_lines(handle, name))
    except (UserError, UnicodeDecodeError) as problem:
        raise UserError(f"{name}: {problem}") from problem


def _smiles_lines(handle: IO[str], name: str) -> Iterator[Record]:
    """Lines of a SMILES list: the structure, then, after a blank or tab, a name."""
    position = 0
    for number, line in enumerate(bounded_lines(handle), start=1):
        where = f"{name}, line {number}"
        if line is None:
            position += 1
            yield Record(str(position), "", where, None, f"the line is longer than {MAX_LINE:,} characters")
            continue
        smiles, _, rest = line.strip().replace("\t", " ", 1).partition(" ")
        if not smiles or (position == 0 and smiles.casefold() == "smiles"):
            continue
        if rest.startswith("|") and "|" in rest[1:]:  # the extension between bars belongs to the structure
            extension, _, rest = rest[1:].partition("|")
            smiles = f"{smiles} |{extension}|"
        position += 1
        yield _record(rest.strip() or str(position), smiles, where)
