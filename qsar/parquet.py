"""Parquet in and out, row group by row group, with the optional package ``pyarrow``."""

from __future__ import annotations

from collections.abc import Iterable, Iterator, Sequence
from pathlib import Path
from types import TracebackType
from typing import Any, Self

from qsar.errors import UserError
from qsar.writing import COLUMNS, Row

PARQUET = frozenset((".parquet", ".pq"))
ROWS_AT_ONCE = 10_000
_INTEGERS = ("step",)
_NUMBERS = ("pka", "low", "high", "coverage", "nearest_pka", "nearest_distance", "measured", "pka_without")


def _pyarrow() -> tuple[Any, Any]:
    try:
        import pyarrow
        import pyarrow.parquet
    except ImportError as problem:
        raise UserError("needs the package pyarrow: pip install 'qsar[parquet]'") from problem
    return pyarrow, pyarrow.parquet


def columns_of(path: Path) -> list[str]:
    """Names of the columns of a Parquet file.

    Raises
    ------
    UserError
        If it is no Parquet file, or ``pyarrow`` is not installed.
    """
    pyarrow, parquet = _pyarrow()
    try:
        return [str(name) for name in parquet.read_schema(path).names]
    except pyarrow.ArrowInvalid as problem:
        raise UserError("not a Parquet file, or damaged") from problem


def count_rows(path: Path) -> int | None:
    """Rows of a Parquet file, from its footer; None where that cannot be read."""
    try:
        _, parquet = _pyarrow()
        return int(parquet.read_metadata(path).num_rows)
    except (UserError, OSError, ValueError):  # said when the file is read; ArrowInvalid is a ValueError
        return None


def read_columns(path: Path, names: Sequence[str]) -> Iterator[tuple[str, ...]]:
    """Rows of some columns as text, missing values empty; never more than `ROWS_AT_ONCE` of them are held."""
    _, parquet = _pyarrow()
    with parquet.ParquetFile(path) as file:
        for batch in file.iter_batches(batch_size=ROWS_AT_ONCE, columns=list(dict.fromkeys(names))):
            table = batch.to_pydict()
            for cells in zip(*(table[name] for name in names), strict=True):
                yield tuple("" if cell is None else str(cell) for cell in cells)


class ParquetWriter:
    """A Parquet file with one row group for every `ROWS_AT_ONCE` rows; missing numbers are null."""

    def __init__(self, path: Path) -> None:
        pyarrow, parquet = _pyarrow()
        kinds = {name: pyarrow.string() for name in COLUMNS}
        kinds |= {name: pyarrow.float64() for name in _NUMBERS} | {name: pyarrow.int64() for name in _INTEGERS}
        self._schema = pyarrow.schema(list(kinds.items()))
        self._table = pyarrow.table
        self._file = parquet.ParquetWriter(path, self._schema)
        self._waiting: list[Row] = []

    def write(self, rows: Iterable[Row]) -> None:
        """Add rows."""
        self._waiting.extend(rows)
        if len(self._waiting) >= ROWS_AT_ONCE:
            self._flush()

    def _flush(self) -> None:
        cells = zip(*self._waiting, strict=True)
        table = dict(zip(COLUMNS, map(list, cells), strict=True))
        self._file.write_table(self._table(table, schema=self._schema))
        self._waiting.clear()

    def __enter__(self) -> Self:
        return self

    def __exit__(
        self, kind: type[BaseException] | None, problem: BaseException | None, trace: TracebackType | None
    ) -> None:
        if kind is None and self._waiting:
            self._flush()
        self._file.close()
