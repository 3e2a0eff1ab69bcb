"""Tables that people keep: CSV and TSV in whatever dialect, and Excel workbooks, one row at a time.

Nothing here knows chemistry. A file is never held in memory, and a row that cannot be read comes out as a
row with an error, so that the others are still answered.
"""

from __future__ import annotations

import codecs
import csv
import re
import zipfile
from collections import deque
from collections.abc import Callable, Iterable, Iterator, Sequence
from contextlib import contextmanager
from dataclasses import dataclass
from pathlib import Path
from typing import IO, Any

from qsar.errors import UserError

TEXT_TABLES = frozenset((".csv", ".tsv", ".tab"))
WORKBOOKS = frozenset((".xlsx", ".xlsm"))

MAX_LINE = 1_000_000
MAX_QUOTED_LINES = 50
MAX_UNPACKED = 2 << 30

_DELIMITERS = (",", ";", "\t", "|")
_END = ""  # no line is empty: each has its end
_BYTE_ORDER_MARKS = (
    (codecs.BOM_UTF8, "utf-8-sig"),
    (codecs.BOM_UTF32_LE, "utf-32"),
    (codecs.BOM_UTF32_BE, "utf-32"),
    (codecs.BOM_UTF16_LE, "utf-16"),
    (codecs.BOM_UTF16_BE, "utf-16"),
)


@dataclass(frozen=True, slots=True)
class TableRow:
    """One row of a table.

    Attributes
    ----------
    number : int
        Row as a spreadsheet counts it: the first line of the file is row 1.
    cells : list of str
        One text for each column, without outer blanks; missing cells are empty.
    error : str or None
        Why the row could not be read; then `cells` are empty.
    """

    number: int
    cells: list[str]
    error: str | None = None


@dataclass(frozen=True)
class Table:
    """A table that is open for reading.

    Attributes
    ----------
    columns : tuple of str
        Headers as written, without outer blanks.
    rows : iterator of TableRow
        The rows below the header; wholly empty ones are left out.
    """

    columns: tuple[str, ...]
    rows: Iterator[TableRow]

    def find(self, name: str) -> int | None:
        """Position of the column called `name`, whatever its case, or None.

        Raises
        ------
        UserError
            If two columns have that name.
        """
        wanted = name.casefold()
        found = [i for i, column in enumerate(self.columns) if column.casefold() == wanted]
        if len(found) > 1:
            raise UserError(f"two columns are called {name} ({found[0] + 1} and {found[1] + 1}); rename one")
        return found[0] if found else None


def _ignore(_: str) -> None:
    """Default for notes that nobody asked for."""


@contextmanager
def open_table(path: Path, wanted: Sequence[str], note: Callable[[str], None] = _ignore) -> Iterator[Table]:
    """Open a CSV, TSV or Excel table.

    Parameters
    ----------
    path : pathlib.Path
        The file; its extension says what it is.
    wanted : sequence of str
        Column names that tell the header, the delimiter or the sheet of the workbook from the others.
    note : callable
        Told, in one line, what had to be guessed.

    Yields
    ------
    Table

    Raises
    ------
    UserError
        If the file is empty, is not what its extension says, or cannot be read.
    """
    names = frozenset(name.casefold() for name in wanted)
    if path.suffix.lower() in WORKBOOKS:
        with _open_workbook(path, names, note) as table:
            yield table
        return
    with open_text(path, note) as handle:
        yield _text_table(handle, names, "\t" if path.suffix.lower() in (".tsv", ".tab") else None)


@contextmanager
def open_text(path: Path, note: Callable[[str], None] = _ignore) -> Iterator[IO[str]]:
    """Open a text file in the encoding that its bytes show; line ends are kept.

    Raises
    ------
    UserError
        If the file is not text.
    """
    encoding = text_encoding(path)
    if encoding in ("cp1252", "latin-1"):
        note("not UTF-8; read as Western European (Windows-1252): check names with accents")
    with path.open(encoding=encoding, errors="replace", newline="") as handle:
        yield handle


def text_encoding(path: Path) -> str:
    """Encoding of a text file: by its byte order mark, else UTF-8 if all of it is, else Windows-1252.

    Raises
    ------
    UserError
        If the file is a workbook or another binary file.
    """
    with path.open("rb") as handle:
        head = handle.read(1 << 16)
        for mark, name in _BYTE_ORDER_MARKS:
            if head.startswith(mark):
                return name
        if head.startswith(b"PK\x03\x04"):
            raise UserError("not text but a zip or Excel file; give it its own extension, such as .xlsx")
        if head.startswith(b"\xd0\xcf\x11\xe0"):
            raise UserError("not text but an old or protected Office file; save it as .xlsx or CSV")
        if head.count(0) > len(head) // 10:
            raise UserError("not text in UTF-8: binary, or UTF-16 without its mark; save it as CSV UTF-8")
        return _fallback_encoding(head, handle)


def _fallback_encoding(head: bytes, handle: IO[bytes]) -> str:
    utf8, windows = codecs.getincrementaldecoder("utf-8")(), True
    is_utf8, block = True, head
    while block:
        if is_utf8:
            try:
                utf8.decode(block)
            except UnicodeDecodeError:
                is_utf8 = False
        if windows and any(block.count(byte) for byte in (b"\x81", b"\x8d", b"\x8f", b"\x90", b"\x9d")):
            windows = False  # bytes that Windows-1252 does not define
        block = handle.read(1 << 20)
    if is_utf8:
        try:
            utf8.decode(b"", final=True)
        except UnicodeDecodeError:
            is_utf8 = False
    return "utf-8" if is_utf8 else "cp1252" if windows else "latin-1"


def bounded_lines(handle: IO[str], limit: int = MAX_LINE) -> Iterator[str | None]:
    """Lines of a text file with their ends; None in place of a line longer than `limit` characters."""
    while line := handle.readline(limit):
        if len(line) < limit or line[-1] in "\r\n":
            yield line
            continue
        while (rest := handle.readline(limit)) and rest[-1] not in "\r\n":
            pass
        yield None


def _text_table(handle: IO[str], wanted: frozenset[str], delimiter: str | None) -> Table:
    records = _Records(bounded_lines(handle))
    number = 0
    for block in records:
        number += 1
        if block is None:
            raise UserError(f"row {number} is longer than {MAX_LINE:,} characters: not a table")
        if mark := re.fullmatch(r"sep=([,;|\t])\s*", block[0], re.IGNORECASE):
            delimiter = mark[1]
            continue
        if block[0].strip():
            break
    else:
        raise UserError("the file is empty")
    choices = (delimiter, *_DELIMITERS) if delimiter in (None, "\t") else (delimiter,)
    try:
        headers = [(d, _strip(_parse(block, d)[0])) for d in choices if d]
    except csv.Error as problem:
        raise UserError(f"row {number}: {_broken_row(block[0], problem)}") from problem
    best, columns = max(headers, key=lambda h: (any(name.casefold() in wanted for name in h[1]), len(h[1])))
    return Table(tuple(columns), _text_rows(records, best, number, len(columns)))


def _text_rows(records: _Records, delimiter: str, number: int, width: int) -> Iterator[TableRow]:
    for block in records:
        if block is None:
            number += 1
            yield TableRow(number, [], f"the row is longer than {MAX_LINE:,} characters")
            continue
        try:
            rows = _parse(block, delimiter)
        except csv.Error as problem:
            records.give_back(block[1:])
            number += 1
            yield TableRow(number, [], _broken_row(block[0], problem))
            continue
        for cells in rows:
            number += 1
            filled = _strip(cells)
            if any(filled):
                yield TableRow(number, filled + [""] * (width - len(filled)))


def _broken_row(line: str, problem: csv.Error) -> str:
    if line.count('"') % 2:
        return 'a quotation mark (") is opened and not closed; close it or take it out'
    return f"not a row of a table ({problem})"


def _parse(block: list[str], delimiter: str) -> list[list[str]]:
    """Cells of a block of lines: strictly where a quotation mark is open at a line's end."""
    strict = len(block) > 1 or block[0].count('"') % 2 == 1
    return list(csv.reader(block, delimiter=delimiter, strict=strict)) or [[]]


def _strip(cells: Iterable[str]) -> list[str]:
    return [cell.strip() for cell in cells]


class _Records:
    """Groups the lines of a table so that a quoted cell with line breaks stays in one group.

    A quotation mark that is never closed would swallow the rest of the file; here it may reach over
    `MAX_QUOTED_LINES` lines at most, and lines that turn out not to belong are given back.
    """

    def __init__(self, lines: Iterator[str | None]) -> None:
        self._lines = lines
        self._returned: deque[str | None] = deque()

    def __iter__(self) -> Iterator[list[str] | None]:
        for line in iter(self._next, _END):
            yield None if line is None else self._closed(line)

    def _next(self) -> str | None:
        """Next line, None for one that is too long, `_END` after the last."""
        return self._returned.popleft() if self._returned else next(self._lines, _END)

    def give_back(self, lines: Sequence[str | None]) -> None:
        """Put lines back, to be read next."""
        self._returned.extendleft(reversed(lines))

    def _closed(self, first: str) -> list[str]:
        block, marks = [first], first.count('"')
        while marks % 2 and len(block) < MAX_QUOTED_LINES:
            line = self._next()
            if not line:  # the end, or a line that is too long
                self.give_back([] if line == _END else [line])
                break
            block.append(line)
            marks += line.count('"')
        if marks % 2:
            self.give_back(block[1:])
            return block[:1]
        return block


@contextmanager
def _open_workbook(path: Path, wanted: frozenset[str], note: Callable[[str], None]) -> Iterator[Table]:
    import openpyxl  # slow to import, and most inputs are text
    from openpyxl.utils.exceptions import InvalidFileException

    try:
        with zipfile.ZipFile(path) as archive:
            if sum(item.file_size for item in archive.infolist()) > MAX_UNPACKED:
                raise UserError(f"unpacks to more than {MAX_UNPACKED >> 30} GiB; save it as CSV")
        book = openpyxl.load_workbook(path, read_only=True, data_only=True)
    except (zipfile.BadZipFile, InvalidFileException, KeyError, ValueError) as problem:
        raise UserError("not an Excel workbook, damaged or protected; save it as .xlsx or CSV") from problem
    try:
        yield _choose_sheet(book, wanted, note)
    finally:
        book.close()


def _choose_sheet(book: Any, wanted: frozenset[str], note: Callable[[str], None]) -> Table:
    """The first sheet with a wanted column, else the first that is not empty; the others are said to be left aside."""
    chosen: Table | None = None
    fitting: list[str] = []
    for sheet in book.worksheets:
        sheet.reset_dimensions()  # some programs write a wrong size
        rows = _sheet_rows(sheet)
        header = next(rows, None)
        if header is None:
            continue
        table = Table(tuple(header.cells), _padded(rows, len(header.cells)))
        if wanted.intersection(name.casefold() for name in table.columns):
            chosen = chosen if fitting else table
            fitting.append(sheet.title)
        chosen = chosen or table
    if chosen is None:
        raise UserError("the workbook is empty")
    if len(fitting) > 1:
        others = ", ".join(f"'{title}'" for title in fitting[1:])
        note(f"sheet '{fitting[0]}' is read; {others} left aside: save a sheet as a file of its own to read it")
    return chosen


def _sheet_rows(sheet: Any) -> Iterator[TableRow]:
    for number, values in enumerate(sheet.iter_rows(values_only=True), start=1):
        cells = [_cell_text(value) for value in values]
        if any(cells):
            yield TableRow(number, cells)


def _padded(rows: Iterator[TableRow], width: int) -> Iterator[TableRow]:
    for row in rows:
        yield TableRow(row.number, row.cells + [""] * (width - len(row.cells)))


def _cell_text(value: object) -> str:
    if value is None:
        return ""
    if isinstance(value, float) and value.is_integer():
        return str(int(value))  # Excel keeps whole numbers, such as ids, as floats
    return str(value).strip()
