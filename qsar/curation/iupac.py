"""One value for each acid and carboxyl step from the IUPAC Digitized pKa Dataset.

Zheng, J. W.; Lafontant-Joseph, O. *IUPAC Digitized pKa Dataset*, doi:10.5281/zenodo.7236452 (CC BY-NC 4.0).
It digitises Serjeant and Dempsey 1979 and Perrin 1965 and 1972. The dataset is read from where the user keeps
it and is no part of this project.

Of the rows that measure one carboxyl step (see :mod:`qsar.curation.iupac_rules`) those of the best rank are
kept and their median is taken. Rank, in this order: 20 to 30 °C; the grade that the compilers gave; 24 to
26 °C; dilute solution or extrapolated to zero, before a constant in up to 0.2 mol/L salt, before one in more
or in a medium that is not stated.
"""

from __future__ import annotations

import csv
import statistics
from collections import defaultdict
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass, replace
from functools import lru_cache
from itertools import pairwise
from pathlib import Path

from qsar.conditions import CONSTANT_KINDS
from qsar.curation import iupac_rules as rules
from qsar.curation.isomer_labels import isomer, one_spelling
from qsar.errors import UserError
from qsar.standard_state import at_zero_ionic_strength
from qsar.structures import Acid, StructureError, read_acid

COLUMNS = ("SMILES", "pka_type", "pka_value", "T", "remarks", "assessment", "ref", "pressure", "cosolvent")
_GRADES = {"reliable": 0, "approximate": 1, "probably approximate": 1, "uncertain": 2}


@dataclass(frozen=True)
class OpenStep:
    """The value chosen for one carboxyl step of one acid.

    Attributes
    ----------
    smiles : str
        Canonical SMILES, mirror images under one spelling.
    step : int
        Carboxyl protons lost, counted from 1.
    pka : float
    temperature_c : float
        Median of the rows used, degrees Celsius.
    ionic_strength_m : float or None
        Median of the rows used, mol/L; None where none is stated.
    assessment : str
        Grade that the compilers gave the rows used; empty where they gave none.
    n_rows : int
        Rows used.
    note : str
        Kind of constant, and what else must be known; may be empty.
    """

    smiles: str
    step: int
    pka: float
    temperature_c: float
    ionic_strength_m: float | None
    assessment: str
    n_rows: int
    note: str


@dataclass(frozen=True)
class Excluded:
    """A row that is not used, and why.

    Attributes
    ----------
    line : int
        Line of the file, counted from 1 with the header.
    smiles, label : str
        As given.
    reason : str
    """

    line: int
    smiles: str
    label: str
    reason: str


@dataclass(frozen=True)
class OpenData:
    """What a file holds after the rules.

    Attributes
    ----------
    steps : list of OpenStep
        Sorted by structure and step.
    excluded : list of Excluded
        In the order of the file.
    """

    steps: list[OpenStep]
    excluded: list[Excluded]


@dataclass(frozen=True)
class _Row:
    line: int
    given: str
    text: str
    label: rules.Label
    acid: Acid
    value: float
    temperature: float
    ionic: float | None
    kind: str
    grade: str
    reference: str

    @property
    def salt(self) -> int:
        """0 for dilute solution, 1 up to 0.2 mol/L salt, 2 above or where a salt is meant but not stated."""
        if self.ionic is None:
            return 2 if self.kind else 0
        return 0 if self.ionic <= 0.01 else 1 if self.ionic <= 0.2 else 2


def in_standard_state(steps: Sequence[OpenStep]) -> list[OpenStep]:
    """The steps as thermodynamic constants, which is what a model predicts.

    Mixed and concentration constants at a stated ionic strength are brought to 0; see :mod:`qsar.standard_state`. What
    does not state both, its medium and one kind of constant, stays as it is: nothing is guessed about what judges.
    """
    moved = []
    for step in steps:
        kinds = [kind for kind in CONSTANT_KINDS if f"{kind} constant" in step.note]
        if step.ionic_strength_m and len(kinds) == 1:
            acid = read_acid(step.smiles)
            pka = at_zero_ionic_strength(
                acid, step.step, step.pka, step.ionic_strength_m, kinds[0], step.temperature_c
            )
            step = replace(step, pka=pka)
        moved.append(step)
    return moved


def read_iupac(path: Path) -> list[OpenStep]:
    """One value for each acid and carboxyl step.

    Parameters
    ----------
    path : pathlib.Path
        A CSV file under the header of release v2.4 of the dataset.

    Returns
    -------
    list of OpenStep

    Raises
    ------
    UserError
        If the file cannot be read or lacks a column.
    """
    return sort_iupac(path).steps


def sort_iupac(path: Path) -> OpenData:
    """As :func:`read_iupac`, together with the rows that are not used and why."""
    try:
        with path.open(encoding="utf-8-sig", newline="") as handle:
            reader = csv.DictReader(handle)
            missing = [name for name in COLUMNS if name not in (reader.fieldnames or ())]
            if missing:
                raise UserError(f"{path.name}: no column {', '.join(missing)}; this is not the IUPAC dataset")
            return sort_rows(list(reader))
    except OSError as error:
        raise UserError(f"cannot read {path}: {error.strerror}") from error
    except UnicodeDecodeError as error:
        raise UserError(f"{path.name}: not UTF-8 text; download it again") from error


def sort_rows(rows: Sequence[Mapping[str, str]]) -> OpenData:
    """Apply the rules to rows that are already in memory.

    Parameters
    ----------
    rows : sequence of mapping
        With the columns of the dataset, as text; the first stands in line 2.

    Returns
    -------
    OpenData
    """
    excluded: list[Excluded] = []
    by_acid: dict[str, list[_Row]] = defaultdict(list)
    for line, row in enumerate(rows, start=2):
        read = _read(line, row)
        if isinstance(read, str):
            excluded.append(Excluded(line, row["SMILES"], row["pka_type"], read))
        else:
            by_acid[read.acid.smiles].append(read)
    steps: list[OpenStep] = []
    for smiles, acid_rows in sorted(by_acid.items()):
        placed, refused = _place(acid_rows)
        excluded += refused
        chosen = [_choose(smiles, step, found) for step, found in sorted(placed.items())]
        if any(a.pka >= b.pka for a, b in pairwise(chosen)):
            reason = "the steps of this acid do not rise"
            excluded += [Excluded(r.line, r.given, r.text, reason) for found in placed.values() for r in found]
            continue
        steps += chosen
    return OpenData(steps, sorted(excluded, key=lambda e: e.line))


@lru_cache(maxsize=8192)
def _acid(smiles: str) -> Acid | str:
    try:
        return read_acid(smiles)
    except StructureError as error:
        return f"structure: {error}"


def _read(line: int, row: Mapping[str, str]) -> _Row | str:
    """A row with its acid, or the reason why it is left out."""
    label = rules.read_label(row["pka_type"])
    if isinstance(label, str):
        return label
    refusal = rules.condition_refusal(row)
    if refusal:
        return refusal
    smiles = row["SMILES"]
    if label.word:
        found = isomer(smiles, label.word)
        if found is None:
            return f"isomer ({label.word}) that the drawn structure does not settle"
        smiles = found
    acid = _acid(smiles)
    if isinstance(acid, str):
        return acid
    acid = _acid(one_spelling(acid.smiles))
    assert not isinstance(acid, str)
    refusal = rules.structure_refusal(acid)
    if refusal:
        return refusal
    value, temperature = rules.number(row["pka_value"]), rules.number(row["T"])
    assert value is not None and temperature is not None  # condition_refusal has seen to it
    remarks = row["remarks"]
    return _Row(
        line,
        row["SMILES"],
        row["pka_type"],
        label,
        acid,
        value,
        temperature,
        rules.ionic_strength(remarks),
        rules.kind_of_constant(remarks),
        row["assessment"].strip(),
        row["ref"],
    )


def _place(rows: list[_Row]) -> tuple[dict[int, list[_Row]], list[Excluded]]:
    """Give each row of one acid the carboxyl step that it measures."""
    acid = rows[0].acid
    counted = _zwitterion_steps(rows) if rules.count_bases(acid) else None
    placed: dict[int, list[_Row]] = defaultdict(list)
    refused = []
    for row in rows:
        step = _step(row, acid, counted)
        if isinstance(step, int):
            placed[step].append(row)
        else:
            refused.append(Excluded(row.line, row.given, row.text, step))
    return placed, refused


def _step(row: _Row, acid: Acid, counted: dict[int, int] | None) -> int | str:
    sites = len(acid.sites)
    if row.label.carboxyl and sites == 1:
        return 1
    if rules.unclear_nitrogen(acid):
        return "nitrogen that may hold the proton: which proton the constant belongs to is not stated"
    if counted is not None:
        other = "another proton of an amino acid, or a carboxyl step that cannot be counted"
        return counted.get(row.line, other)
    if row.label.base:
        return "constant of a protonated form, but the acid has no base that holds a proton"
    step = row.label.number or 1
    if step > sites:
        return "another proton than those of the carboxyl groups"
    if row.label.number is None and sites > 1:
        return "which of several carboxyl steps is not stated"
    if sites == 1 and row.value > rules.WEAKEST_SINGLE:
        return "too weak for a carboxyl group"
    return step


def _zwitterion_steps(rows: Iterable[_Row]) -> dict[int, int]:
    """Carboxyl step of rows of an amino acid, by line.

    Each laboratory counts in its own way, so the constants of one reference are looked at together: those
    below :data:`qsar.curation.iupac_rules.ZWITTERION_LIMIT` belong to the carboxyl groups, in rising order,
    provided that there are as many as there are carboxyl groups. With several bases the weaker one can come
    down to the carboxyl groups; a series of several carboxyl groups must then hold every proton.
    """
    series: dict[tuple[bool, str], dict[int | None, list[_Row]]] = defaultdict(lambda: defaultdict(list))
    for row in rows:
        series[row.label.base, row.reference][row.label.number].append(row)
    steps = {}
    for by_number in series.values():
        medians = sorted((statistics.median(r.value for r in found), n or 0) for n, found in by_number.items())
        low = [place for median, place in medians if median < rules.ZWITTERION_LIMIT]
        acid = next(iter(by_number.values()))[0].acid
        sites, bases = len(acid.sites), rules.count_bases(acid)
        complete = len(by_number) >= sites + bases
        if len(low) == sites and (complete or min(sites, bases) == 1):
            for step, place in enumerate(low, start=1):
                steps.update({row.line: step for row in by_number[place or None]})
    return steps


def _rank(row: _Row) -> tuple[bool, int, bool, int]:
    grade = _GRADES.get(row.grade.lower(), len(_GRADES))
    return not 20 <= row.temperature <= 30, grade, not 24 <= row.temperature <= 26, row.salt


def _choose(smiles: str, step: int, rows: list[_Row]) -> OpenStep:
    best = min(map(_rank, rows))
    used = [row for row in rows if _rank(row) == best]
    values = [row.value for row in used]
    ionic = [row.ionic for row in used if row.ionic is not None]
    notes = [f"{kind} constant" for kind in sorted({row.kind for row in used if row.kind})]
    if max(values) - min(values) > 0.2:
        notes.append(f"the rows used differ by {max(values) - min(values):.2f}")
    words = sorted({row.label.word for row in used if row.label.word})
    notes += [f"isomer by label: {', '.join(words)}"] if words else []
    return OpenStep(
        smiles,
        step,
        statistics.median(values),
        statistics.median(row.temperature for row in used),
        statistics.median(ionic) if ionic else None,
        used[0].grade,
        len(used),
        "; ".join(notes),
    )
