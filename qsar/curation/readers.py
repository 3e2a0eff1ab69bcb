"""Rows of somebody's table of measurements, whatever the file: CSV, TSV, XLSX or SDF."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass, replace
from pathlib import Path
from typing import TYPE_CHECKING

from qsar.curation.columns import ALIASES, Columns, map_columns
from qsar.errors import UserError
from qsar.spreadsheets import TEXT_TABLES, WORKBOOKS, open_table

if TYPE_CHECKING:
    from rdkit import Chem

SD_FILES = frozenset((".sdf", ".sd"))
MOST_ROWS = 200_000
#: Columns by which a download of the IUPAC Digitized pKa Dataset, release 2.x, is known.
IUPAC_COLUMNS = frozenset(("unique_ID", "SMILES", "pka_type", "pka_value"))


class StepCell(int):
    """Number of a row that stands for one step of a wide table, such as ``4:pKa2``.

    As a number it sorts by row and step and is unlike any other cell's; as text it names both.

    Parameters
    ----------
    row : int
        Row as a spreadsheet counts it.
    step : int
        1 to 6.
    """

    row: int
    step: int

    def __new__(cls, row: int, step: int) -> StepCell:
        """Make the number of one cell."""
        cell = super().__new__(cls, 10 * row + step)
        cell.row, cell.step = row, step
        return cell

    def __reduce__(self) -> tuple[type[StepCell], tuple[int, int]]:
        return StepCell, (self.row, self.step)

    def __str__(self) -> str:
        return f"{self.row}:pKa{self.step}"

    def __format__(self, spec: str) -> str:
        return format(str(self), spec)


@dataclass(frozen=True)
class RawRow:
    """One row as it came.

    Attributes
    ----------
    number : int
        Row as a spreadsheet counts it (the header is row 1), or entry of an SD file, counted from 1; a `StepCell`
        where the table has a column for each step.
    cells : dict of str to str
        Text of each field that the table has (see :data:`qsar.curation.columns.ALIASES`).
    original : dict of str to str
        The row under its own headers.
    mol : rdkit.Chem.Mol or None
        The structure, where the file holds structures.
    error : str or None
        Why the row could not be read.
    """

    number: int
    cells: dict[str, str]
    original: dict[str, str]
    mol: Chem.Mol | None = None
    error: str | None = None


def is_iupac(path: Path) -> bool:
    """Whether a file has the header of the IUPAC Digitized pKa Dataset, release 2.x."""
    if path.suffix.lower() not in TEXT_TABLES or not path.is_file():
        return False
    try:
        with open_table(path, sorted(IUPAC_COLUMNS)) as table:
            return set(table.columns) >= IUPAC_COLUMNS
    except UserError:
        return False  # whoever reads the rows will say what is wrong with the file


def read_rows(
    path: Path,
    named: Mapping[str, str] | None = None,
    quantity: str | None = None,
    note: Callable[[str], None] = lambda _: None,
) -> tuple[list[RawRow], Columns]:
    """Read all rows of a table.

    Parameters
    ----------
    path : pathlib.Path
    named : mapping of field to header, optional
        Columns that the user names.
    quantity : {"pka", "ka", "pkb"}, optional
        What the value column holds, if the user says so.
    note : callable
        Told, in one line, what was guessed.

    Raises
    ------
    UserError
        If the file cannot be read, or has no structures or values.
    """
    kind = path.suffix.lower()
    try:
        if path.is_dir():
            raise UserError("is a folder; name a file in it")
        if not path.exists():
            raise UserError("no such file; check the name and the folder")
        if kind in TEXT_TABLES or kind in WORKBOOKS:
            rows, columns = _table(path, named, quantity, note)
        elif kind in SD_FILES:
            rows, columns = _structures(path, named, quantity, note)
        else:
            raise UserError("this kind of file is not read; save it as CSV, TSV, XLSX or SDF")
        if not rows:
            raise UserError("0 rows; there is nothing to read in it")
    except UserError as problem:
        raise UserError(f"{path}: {problem}") from problem
    except OSError as problem:
        raise UserError(f"{path}: cannot be read ({problem.strerror or problem})") from problem
    for line in columns.notes:
        note(f"{path.name}: {line}")
    return rows, columns


def _table(
    path: Path, named: Mapping[str, str] | None, quantity: str | None, note: Callable[[str], None]
) -> tuple[list[RawRow], Columns]:
    known = [*(named or {}).values(), *ALIASES["smiles"], *ALIASES["pka"]]
    rows: list[RawRow] = []
    with open_table(path, known, lambda text: note(f"{path.name}: {text}")) as table:
        columns = map_columns(table.columns, named, quantity)
        place = {field: table.columns.index(header) for field, header in columns.header.items()}
        for row in table.rows:
            if len(rows) >= MOST_ROWS:
                raise UserError(f"more than {MOST_ROWS:,} rows; split the file")
            cells = row.cells + [""] * (len(table.columns) - len(row.cells))
            error = row.error
            if error is None and any(cells[len(table.columns) :]):
                error = (
                    f"{len(cells)} cells under {len(table.columns)} headers; a decimal comma without quotation "
                    "marks, or a cell too many"
                )
            original = dict(zip(table.columns, cells, strict=False))
            one = RawRow(row.number, {field: cells[i] for field, i in place.items()}, original, None, error)
            rows.extend(_each_step(one, columns))
    return rows, columns


def _each_step(row: RawRow, columns: Columns) -> list[RawRow]:
    """A row for each filled step of a wide table; one row, without a value, where none is filled."""
    if not columns.steps or row.error:
        return [row if not columns.steps else replace(row, number=StepCell(row.number, min(columns.steps)))]
    filled = [k for k in sorted(columns.steps) if row.original.get(columns.steps[k], "").strip()]
    return [
        replace(
            row,
            number=StepCell(row.number, k),
            cells={**row.cells, "pka": row.original.get(columns.steps[k], ""), "step": str(k)},
        )
        for k in filled or [min(columns.steps)]
    ]


def _structures(
    path: Path, named: Mapping[str, str] | None, quantity: str | None, note: Callable[[str], None]
) -> tuple[list[RawRow], Columns]:
    from qsar.molfiles import data_items, record_of, sdf_entries
    from qsar.spreadsheets import bounded_lines, open_text

    entries = []
    with open_text(path, lambda text: note(f"{path.name}: {text}")) as handle:
        for number, entry in enumerate(sdf_entries(bounded_lines(handle)), start=1):
            if number > MOST_ROWS:
                raise UserError(f"more than {MOST_ROWS:,} entries; split the file")
            entries.append((number, record_of(entry, number, path.name), data_items(entry.lines)))
    headers = list(dict.fromkeys(name for _, _, items in entries for name in items))
    columns = map_columns(headers, named, quantity, has_structures=True)
    rows = []
    for number, record, items in entries:
        cells = {field: items.get(header, "") for field, header in columns.header.items()}
        cells["smiles"] = record.smiles
        cells.setdefault("name", record.id)
        one = RawRow(number, cells, {"smiles": record.smiles, **items}, record.mol, record.error)
        rows.extend(_each_step(one, columns))
    return rows, columns
