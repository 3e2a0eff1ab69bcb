"""Tables of measured acids: the reference table and clean in-house tables of the same layout."""

from __future__ import annotations

import csv
import hashlib
import math
from dataclasses import dataclass
from pathlib import Path
from typing import cast, get_args

from qsar.conditions import DAVIES_LIMIT_M, Constant
from qsar.errors import UserError
from qsar.sources import as_printed
from qsar.standard_state import at_zero_ionic_strength
from qsar.structures import Acid, StructureError, read_acid

COLUMNS = (
    "name",
    "smiles",
    "step",
    "pka",
    "temperature_c",
    "ionic_strength_m",
    "constant",
    "uncertainty",
    "family",
    "source",
    "from_memory",
    "checked",
)


@dataclass(frozen=True)
class Measurement:
    """One measured step of one acid.

    Attributes
    ----------
    acid : Acid
    step : int
        Carboxyl protons lost, counted from 1.
    pka : float
        At ionic strength 0.
    uncertainty : float
        Standard uncertainty, pKa units.
    name, family, source : str
        The source says what is printed there, where that was brought to ionic strength 0.
    """

    acid: Acid
    step: int
    pka: float
    uncertainty: float
    name: str
    family: str
    source: str


def read_table(path: Path, default_uncertainty: float = 0.05) -> list[Measurement]:
    """Read a clean table of measured acids.

    Parameters
    ----------
    path : pathlib.Path
        A CSV file with at least the columns ``smiles`` and ``pka``.
    default_uncertainty : float
        For rows that state none.

    Returns
    -------
    list of Measurement
        In the order of the file. Mixed and concentration constants at a stated ionic strength are brought to ionic
        strength 0 (Davies 1962; see :mod:`qsar.conditions`), as curating a table does; a constant whose kind is not
        stated counts as mixed there.

    Raises
    ------
    UserError
        With file, row and column of the first cell that is wrong.
    """
    try:
        with path.open(encoding="utf-8-sig", newline="") as file:
            reader = csv.DictReader(file)
            missing = {"smiles", "pka"} - set(reader.fieldnames or ())
            if missing:
                raise UserError(
                    f"{path.name}: no column {' or '.join(sorted(missing))}; there are: "
                    f"{', '.join(reader.fieldnames or ['none'])}"
                )
            rows = [_measurement(path, reader.line_num, row, default_uncertainty) for row in reader]
    except OSError as error:
        raise UserError(f"cannot read {path}: {error.strerror}") from error
    except UnicodeDecodeError as error:
        raise UserError(f"{path.name}: not UTF-8 text; save it as CSV in UTF-8") from error
    if not rows:
        raise UserError(f"{path.name}: no rows below the header")
    return rows


def _measurement(path: Path, line: int, row: dict[str, str], default_uncertainty: float) -> Measurement:
    def number(column: str, default: float) -> float:
        text = (row.get(column) or "").strip()
        if not text:
            return default
        try:
            value = float(text)
        except ValueError as error:
            raise UserError(f"{path.name}, row {line}, column {column}: '{text}' is not a number") from error
        if not math.isfinite(value):
            raise UserError(f"{path.name}, row {line}, column {column}: '{text}' is not a finite number")
        return value

    try:
        acid = read_acid(row["smiles"] or "")
    except StructureError as error:
        raise UserError(f"{path.name}, row {line}, column smiles: {error}") from error
    step, uncertainty = number("step", 1), number("uncertainty", default_uncertainty)
    if step != int(step):
        raise UserError(f"{path.name}, row {line}, column step: {step:g} is not a whole number")
    if uncertainty <= 0.0:
        raise UserError(f"{path.name}, row {line}, column uncertainty: {uncertainty:g}, must be above 0")
    step = int(step)
    if not 1 <= step <= len(acid.sites):
        raise UserError(f"{path.name}, row {line}, column step: {step}, but the acid has {len(acid.sites)} COOH")
    if not (row["pka"] or "").strip():
        raise UserError(f"{path.name}, row {line}, column pka: empty")
    strength = number("ionic_strength_m", 0.0)
    if not 0.0 <= strength <= DAVIES_LIMIT_M:
        raise UserError(
            f"{path.name}, row {line}, column ionic_strength_m: {strength:g} mol/L; the value can be brought to ionic "
            f"strength 0 from at most {DAVIES_LIMIT_M:g} mol/L, so leave the row out"
        )
    kind = (row.get("constant") or "").strip().casefold()
    if kind not in ("", *get_args(Constant)):
        raise UserError(f"{path.name}, row {line}, column constant: '{kind}'; give {', '.join(get_args(Constant))}")
    pka, source = number("pka", 0.0), (row.get("source") or "").strip()
    if strength and kind != "thermodynamic":
        source = as_printed(source, pka, strength)
        pka = at_zero_ionic_strength(acid, step, pka, strength, cast(Constant, kind or "mixed"))
    return Measurement(
        acid,
        step,
        pka,
        uncertainty,
        (row.get("name") or "").strip(),
        (row.get("family") or "").strip(),
        source,
    )


def sha256(path: Path) -> str:
    """SHA-256 of a file, as hexadecimal text."""
    return hashlib.sha256(path.read_bytes()).hexdigest()
