"""Predictions as rows of the fixed table, and the files that hold them: CSV, XLSX, JSON, SDF.

Files are written row by row. Numbers keep every digit: the shortest text that reads back to the same
number, in XLSX 16 significant digits. Text that a spreadsheet would take for a formula is disarmed: in XLSX
each text cell is stored as text; in CSV, where there is no such thing, an apostrophe is put in front of an
``id`` or ``smiles`` that begins with ``=``, ``+``, ``-``, ``@``, a tab or a line end and is not a plain
number. No valid SMILES begins with one of these.
"""

from __future__ import annotations

import csv
import json
import math
import os
import re
from collections.abc import Callable, Iterable, Sequence
from pathlib import Path
from types import TracebackType
from typing import IO, TYPE_CHECKING, Any, NamedTuple, Protocol, Self, cast

from qsar.errors import UserError
from qsar.reading import Record

if TYPE_CHECKING:
    from qsar.model.model import Prediction

UNUSABLE = "unusable"

_FORMULA_START = re.compile(r"[=+\-@\t\r\n]")
_NUMBER = re.compile(r"[+-]?(\d+([.,]\d*)?|[.,]\d+)([eE][+-]?\d+)?")
_CONTROL = re.compile(r"[\x00-\x08\x0b\x0c\x0e-\x1f\ufffe\uffff\ud800-\udfff]")
_MAX_SHEET_ROWS = 1_048_576


class Row(NamedTuple):
    """One row of the table: an acid step, or an input that could not be used."""

    id: str
    smiles: str
    structure: str = ""
    step: int | None = None
    pka: float | None = None
    low: float | None = None
    high: float | None = None
    coverage: float | None = None
    domain: str = UNUSABLE
    reasons: str = ""
    nearest: str = ""
    nearest_pka: float | None = None
    nearest_distance: float | None = None
    measured: float | None = None
    pka_without: float | None = None
    model: str = ""


COLUMNS = Row._fields


def rows_of(record: Record, prediction: Prediction) -> list[Row]:
    """Rows of one input: one for each acid step, or one that says why it could not be used."""
    if prediction.error is not None:
        return [unusable(record, prediction.error)]
    return [
        Row(
            record.id,
            record.smiles,
            prediction.structure,
            int(step.step),
            _number(step.pka),
            _number(step.low),
            _number(step.high),
            _number(step.coverage),
            step.domain,
            _one_line("; ".join(step.reasons)),
            step.nearest,
            _number(step.nearest_pka),
            _number(step.nearest_distance),
            _number(step.measured),
            _number(step.pka_without),
            step.model,
        )
        for step in prediction.steps
    ]


def unusable(record: Record, reason: str) -> Row:
    """Row of an input that could not be used."""
    return Row(record.id, record.smiles, reasons=_one_line(reason))


def _number(value: float | None) -> float | None:
    return None if value is None or not math.isfinite(value) else float(value)


def _one_line(text: str) -> str:
    return " ".join(text.split())


class RowWriter(Protocol):
    """A file that takes rows; to be used as a context manager."""

    def write(self, rows: Iterable[Row]) -> None:
        """Add rows."""

    def __enter__(self) -> Self: ...

    def __exit__(
        self, kind: type[BaseException] | None, problem: BaseException | None, trace: TracebackType | None
    ) -> None: ...


class _TextWriter:
    """What the writers of text files share."""

    def __init__(self, path: Path, mode: str = "w") -> None:
        self.path = path
        self._handle = cast(IO[str], path.open(mode, encoding="utf-8", newline=""))

    def __enter__(self) -> Self:
        return self

    def __exit__(
        self, kind: type[BaseException] | None, problem: BaseException | None, trace: TracebackType | None
    ) -> None:
        try:
            if kind is None:
                self._finish()
        finally:
            self._handle.close()

    def _finish(self) -> None:
        """Write what closes the file."""


class CsvWriter(_TextWriter):
    """Comma-separated table in UTF-8.

    Parameters
    ----------
    path : pathlib.Path
        The file.
    append : bool
        Add to a table that was begun earlier.
    """

    def __init__(self, path: Path, *, append: bool = False) -> None:
        super().__init__(path, "a" if append else "w")
        self._rows = csv.writer(self._handle, lineterminator="\n")
        if not append:
            self._rows.writerow(COLUMNS)
        self.checkpoint()

    def write(self, rows: Iterable[Row]) -> None:
        """Add rows."""
        self._rows.writerows((_cell(row.id), _cell(row.smiles), *row[2:]) for row in rows)

    def checkpoint(self) -> None:
        """Note that all that was written so far is complete."""
        self._handle.flush()
        self._complete = os.fstat(self._handle.fileno()).st_size

    def keep_complete(self) -> None:
        """Close the file after an interrupt and cut off what came after the last checkpoint."""
        self._handle.close()
        os.truncate(self.path, self._complete)


def _cell(text: str) -> str:
    """Text for a CSV cell; a lone carriage return becomes a line feed, which the csv module quotes."""
    return disarmed(text).replace("\r\n", "\n").replace("\r", "\n")


def disarmed(text: str) -> str:
    """Text for a CSV cell that no spreadsheet takes for a formula."""
    if _FORMULA_START.match(text) and not _NUMBER.fullmatch(text):
        return "'" + text
    return text


class JsonWriter(_TextWriter):
    """A JSON array with one object for each row; missing values are null."""

    _count = 0

    def write(self, rows: Iterable[Row]) -> None:
        """Add rows."""
        for row in rows:
            self._handle.write("[\n" if self._count == 0 else ",\n")
            json.dump(row._asdict(), self._handle, ensure_ascii=False, allow_nan=False)
            self._count += 1

    def _finish(self) -> None:
        self._handle.write("\n]\n" if self._count else "[]\n")


class SdfWriter(_TextWriter):
    """An SD file: one entry for each row, with the columns as data items; missing values are left out.

    The structure is drawn flat. The entry of an unusable input has no atoms.
    """

    _drawn: tuple[str, str] = ("", "")

    def write(self, rows: Iterable[Row]) -> None:
        """Add rows."""
        for row in rows:
            self._handle.write(self._block(row))
            for name, value in zip(COLUMNS, row, strict=True):
                if value is not None and value != "":
                    text = repr(value) if isinstance(value, float) else _one_line(str(value))
                    self._handle.write(f">  <{name}>\n{text}\n\n")
            self._handle.write("$$$$\n")

    def _block(self, row: Row) -> str:
        if self._drawn[0] != row.structure or not self._drawn[1]:
            self._drawn = (row.structure, _mol_block(row.structure))
        return _one_line(row.id)[:80] + "\n" + self._drawn[1].partition("\n")[2]


def _mol_block(smiles: str) -> str:
    from rdkit import Chem
    from rdkit.Chem import rdDepictor

    mol = Chem.MolFromSmiles(smiles)
    rdDepictor.Compute2DCoords(mol)
    return str(Chem.MolToMolBlock(mol))


class XlsxWriter:
    """An Excel workbook with one sheet; text is stored as text, never as a formula."""

    def __init__(self, path: Path) -> None:
        import openpyxl  # slow to import, and needed for this format only
        from openpyxl.cell import WriteOnlyCell

        self.path, self._count = path, 0
        self._book = openpyxl.Workbook(write_only=True)
        self._sheet = self._book.create_sheet("pKa")
        self._sheet.freeze_panes = "A2"
        self._cell: Callable[..., Any] = WriteOnlyCell
        self._add(COLUMNS)

    def write(self, rows: Iterable[Row]) -> None:
        """Add rows.

        Raises
        ------
        UserError
            When the sheet is full.
        """
        for row in rows:
            self._add(row)

    def _add(self, values: Sequence[object]) -> None:
        self._count += 1
        if self._count > _MAX_SHEET_ROWS:
            raise UserError(f"an Excel sheet holds {_MAX_SHEET_ROWS:,} rows at most; write a .csv instead")
        self._sheet.append([self._stored(value) for value in values])

    def _stored(self, value: object) -> object:
        if not isinstance(value, str):
            return value
        if not value:
            return None
        cell = self._cell(self._sheet, value=_CONTROL.sub("\ufffd", value))
        cell.data_type = "s"
        return cell

    def __enter__(self) -> Self:
        return self

    def __exit__(
        self, kind: type[BaseException] | None, problem: BaseException | None, trace: TracebackType | None
    ) -> None:
        if kind is None:
            self._book.save(self.path)
        else:
            self._sheet.close()


def _parquet_writer(path: Path) -> RowWriter:
    from qsar.parquet import ParquetWriter  # needs a package that not everyone has

    return ParquetWriter(path)


WRITERS: dict[str, Callable[[Path], RowWriter]] = {
    ".csv": CsvWriter,
    ".xlsx": XlsxWriter,
    ".json": JsonWriter,
    ".sdf": SdfWriter,
    ".parquet": _parquet_writer,
}


def writer_for(target: Path) -> Callable[[Path], RowWriter]:
    """Kind of writer for a file name.

    Raises
    ------
    UserError
        If the extension stands for no format that is written.
    """
    try:
        return WRITERS[target.suffix.lower()]
    except KeyError:
        raise UserError(
            f"cannot write {target}: the extension must be one of {', '.join(sorted(WRITERS))}"
        ) from None
