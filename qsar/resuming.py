"""Going on with a table that an interrupt cut short."""

from __future__ import annotations

import csv
import shutil
from collections.abc import Iterator
from dataclasses import dataclass
from pathlib import Path

from qsar.errors import UserError
from qsar.reading import Record
from qsar.writing import COLUMNS, disarmed


@dataclass(frozen=True)
class Finished:
    """What an interrupted run had written.

    Attributes
    ----------
    inputs, rows, unusable : int
        How many inputs were answered, in how many rows, and how many of them could not be used.
    model : str
        Name of the model, empty if nothing could be predicted.
    """

    inputs: int = 0
    rows: int = 0
    unusable: int = 0
    model: str = ""


def partial_path(target: Path) -> Path:
    """Where an interrupted run leaves its rows."""
    return target.with_name(target.name + ".partial")


def take_over(partial: Path, temporary: Path, records: Iterator[Record], coverage: float) -> Finished:
    """Copy the rows of an interrupted run, and skip the inputs that they answer.

    Parameters
    ----------
    partial : pathlib.Path
        What the interrupted run left.
    temporary : pathlib.Path
        File that gets the copy.
    records : iterator of Record
        The inputs from the beginning; those already answered are consumed.
    coverage : float
        Must be that of the interrupted run.

    Returns
    -------
    Finished

    Raises
    ------
    UserError
        If the file is damaged, or was made from other inputs or with another coverage.
    """
    try:
        shutil.copyfile(partial, temporary)
        return _compare(partial, records, coverage)
    except OSError as problem:
        raise UserError(f"{partial}: cannot be read ({problem.strerror or problem})") from problem
    except (csv.Error, UnicodeDecodeError) as problem:
        raise UserError(f"{partial}: damaged ({problem}); delete it and start again") from problem


def _compare(partial: Path, records: Iterator[Record], coverage: float) -> Finished:
    inputs = rows = unusable = 0
    model = ""
    with partial.open(encoding="utf-8", newline="") as handle:
        table = csv.reader(handle)
        if tuple(next(table, ())) != COLUMNS:
            raise UserError(f"{partial}: not a table of this command; delete it and start again")
        for number, cells in enumerate(table, start=2):
            if len(cells) != len(COLUMNS):
                raise UserError(f"{partial}, row {number}: damaged; delete the file and start again")
            row = dict(zip(COLUMNS, cells, strict=True))
            rows += 1
            if row["step"] not in ("", "1"):
                continue
            inputs += 1
            unusable += row["step"] == ""
            model = model or row["model"]
            record = next(records, None)
            if record is None or (row["id"], row["smiles"]) != (disarmed(record.id), disarmed(record.smiles)):
                raise UserError(
                    f"{partial}, row {number}: made from other input than this; name the same sources in the "
                    "same order, or delete it and start again"
                )
            if row["coverage"] and float(row["coverage"]) != coverage:
                raise UserError(
                    f"{partial}: made with --coverage {row['coverage']}; give the same, or delete it"
                )
    return Finished(inputs, rows, unusable, model)
