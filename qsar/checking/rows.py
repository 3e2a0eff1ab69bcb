"""The rows of a reference table, and what its column ``checked`` says."""

from __future__ import annotations

import csv
import re
from collections import defaultdict
from collections.abc import Iterable
from dataclasses import dataclass
from pathlib import Path

from qsar.errors import UserError
from qsar.groups import CATIONIC, perceive
from qsar.structures import StructureError, read_acid
from qsar.table import COLUMNS

KINDS = {
    "open rows": r"^open rows: (within|beyond)",
    "OBIGT": r"^OBIGT: (within|beyond)",
    "second publication": r"^(second (handbook|table|source) \([\w&, ]+\)|"
    r"[A-Z]+\d* prints the same primary work): (within|beyond)",
    "Hammett or Taft line": r"^(Hammett line|Taft line|sigma_I line|fall-off)[^;:]*: (within|beyond)",
    "sum of single-group shifts": r"^sum of the single-group shifts[^;:]*: (within|beyond)",
}
"""Kinds of check and how an entry of ``checked`` that reports one begins."""


@dataclass(frozen=True)
class TableRow:
    """One measured step as the table has it.

    Attributes
    ----------
    line : int
        Line of the file, counted from 1 with the header.
    smiles : str
        Canonical SMILES.
    step : int
        Carboxyl protons lost, counted from 1.
    pka, uncertainty, temperature_c, ionic_strength_m : float
        Units: pKa units, degrees Celsius, mol/L.
    name, constant, family, source, checked : str
    """

    line: int
    name: str
    smiles: str
    step: int
    pka: float
    temperature_c: float
    ionic_strength_m: float
    constant: str
    uncertainty: float
    family: str
    source: str
    checked: str

    @property
    def label(self) -> str:
        """Name and step for people."""
        return self.name if self.step == 1 else f"{self.name}, step {self.step}"

    def kinds(self) -> set[str]:
        """Kinds of check that the row carries, keys of :data:`KINDS`."""
        entries = self.checked.split("; ")
        return {kind for kind, form in KINDS.items() if any(re.search(form, entry) for entry in entries)}

    def entry(self, beginning: str) -> str:
        """Entries of ``checked`` from the first that begins so up to the next kind of check."""
        found: list[str] = []
        for entry in self.checked.split("; "):
            begins_check = any(re.search(form, entry) for form in KINDS.values())
            if entry.startswith(beginning) or (found and not begins_check):
                found.append(entry)
            elif found:
                break
        return "; ".join(found)


def read_rows(path: Path) -> list[TableRow]:
    """Read a table that has every column of the reference table.

    Parameters
    ----------
    path : pathlib.Path

    Returns
    -------
    list of TableRow

    Raises
    ------
    UserError
        With file, row and column of the first cell that is wrong.
    """
    try:
        with path.open(encoding="utf-8-sig", newline="") as handle:
            reader = csv.DictReader(handle)
            missing = [column for column in COLUMNS if column not in (reader.fieldnames or ())]
            if missing:
                raise UserError(f"{path.name}: no column {', '.join(missing)}; the table needs {', '.join(COLUMNS)}")
            return [_row(path.name, line, row) for line, row in enumerate(reader, start=2)]
    except OSError as error:
        raise UserError(f"cannot read {path}: {error.strerror}") from error
    except UnicodeDecodeError as error:
        raise UserError(f"{path.name}: not UTF-8 text; save it as CSV in UTF-8") from error


def _row(file: str, line: int, row: dict[str, str]) -> TableRow:
    if None in row or None in row.values():
        raise UserError(f"{file}, row {line}: not {len(COLUMNS)} cells; put quotes around text with commas")

    def number(column: str) -> float:
        try:
            return float(row[column])
        except ValueError:
            raise UserError(f"{file}, row {line}, column {column}: '{row[column]}' is not a number") from None

    try:
        smiles = read_acid(row["smiles"]).smiles
    except StructureError as error:
        raise UserError(f"{file}, row {line}, column smiles: {error}") from error
    return TableRow(
        line=line,
        name=row["name"],
        smiles=smiles,
        step=int(number("step")),
        pka=number("pka"),
        temperature_c=number("temperature_c"),
        ionic_strength_m=number("ionic_strength_m"),
        constant=row["constant"],
        uncertainty=number("uncertainty"),
        family=row["family"],
        source=row["source"],
        checked=row["checked"],
    )


def acids(rows: Iterable[TableRow]) -> dict[str, dict[int, TableRow]]:
    """The rows by structure and step."""
    found: dict[str, dict[int, TableRow]] = defaultdict(dict)
    for row in rows:
        found[row.smiles][row.step] = row
    return dict(found)


def _is_ammonium(smiles: str) -> bool:
    """Whether an acid is a cation where its first proton leaves: in strong acid, where few have measured it."""
    return any(group.kind in CATIONIC for group in perceive(read_acid(smiles).graph))


def faults(rows: Iterable[TableRow]) -> list[str]:
    """What the table contradicts itself in: steps that stand twice, are missing or do not rise.

    Returns
    -------
    list of str
        One line for each fault; empty for a sound table.
    """
    rows = list(rows)
    seen: dict[tuple[str, int], int] = {}
    found = []
    for row in rows:
        first = seen.setdefault((row.smiles, row.step), row.line)
        if first != row.line:
            found.append(f"row {row.line}: {row.label} stands in row {first} already; keep one")
    for steps in acids(rows).values():
        ordered = [steps[number] for number in sorted(steps)]
        for weaker, stronger in zip(ordered[1:], ordered, strict=False):
            if weaker.pka <= stronger.pka:
                found.append(f"row {weaker.line}: {weaker.label} is not weaker than the step before it")
        if ordered[0].step != 1 and not _is_ammonium(ordered[0].smiles):
            found.append(f"row {ordered[0].line}: {ordered[0].name} has no step 1")
    return found
