"""What makes a row usable: each rule either reads a value, refuses the row, or says what it changed.

A usable row ends as the thermodynamic pKa of one carboxyl step (ionic strength 0) with a standard uncertainty that
holds what the row does not say.
"""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass, field, replace

import numpy as np

from qsar.conditions import CONSTANT_KINDS, GAS_CONSTANT, ZERO_CELSIUS, pka_shift, water_pkw
from qsar.curation.cells import CellError, Quantity, read_quantity
from qsar.curation.columns import QUANTITIES
from qsar.curation.readers import RawRow
from qsar.standard_state import charge_that_counts
from qsar.structures import Acid, StructureError, acid_from_mol, read_acid

TEMPERATURES = (15.0, 40.0)  # °C
STRENGTHS = (0.0, 0.5)  # mol/L
KELVIN = (273.0, 373.0)  # numbers that can only be meant so
POSSIBLE = (-1.0, 12.0)  # pKa of a COOH in water; common practice, no source
KA_POSSIBLE = (1e-12, 10.0)
CERTAINLY_KA = 1e-3  # a smaller number in a column of pKa can only be a Ka
APPROXIMATE = 0.2  # standard uncertainty of a value given as "about"; common practice, no source
USUAL_STRENGTH = 0.15  # mol/L; the largest ionic strength expected where a row states none
TYPICAL_ENTHALPY = 3.0  # kJ/mol; carboxyl groups ionise with -5 to +5 (Goldberg, Kishore & Lennen 2002, from memory)


class Refusal(Exception):
    """A row that is not used; the message is the reason."""


@dataclass(frozen=True)
class Defaults:
    """What holds where a row does not say.

    Attributes
    ----------
    temperature_c, ionic_strength_m : float or None
    constant : str
        thermodynamic, mixed, concentration, or empty for not known.
    uncertainty : float
        Standard uncertainty of a measured value, pKa units.
    quantity : str
        pka, ka or pkb.
    """

    temperature_c: float | None = None
    ionic_strength_m: float | None = None
    constant: str = ""
    uncertainty: float = 0.05
    quantity: str = "pka"


@dataclass(frozen=True)
class Usable:
    """A row that passed the rules.

    Attributes
    ----------
    number : int
        Row of the source.
    acid : Acid
    step : int or None
        None for a polybasic acid whose row names no step (settled later, see `duplicates`).
    pka : float
        At ionic strength 0.
    uncertainty : float
    measured : float
        pKa before the correction for ionic strength.
    as_given : str
        The cell.
    temperature_c, ionic_strength_m : float or None
        As stated, or by the defaults; None where neither says.
    constant : str
        Kind as stated; empty where not known.
    charge : int
        Charge of the acid form beside the carboxyl groups, as far as a correction for ionic strength counts it.
    changes : tuple of str
        What was read otherwise than it stands, corrected or assumed.
    """

    number: int
    acid: Acid
    step: int | None
    pka: float
    uncertainty: float
    measured: float
    as_given: str
    temperature_c: float | None
    ionic_strength_m: float | None
    constant: str
    charge: int
    name: str = ""
    family: str = ""
    source: str = ""
    date: str = ""
    changes: tuple[str, ...] = field(default=())


def apply_rules(row: RawRow, defaults: Defaults) -> Usable:
    """Read one row.

    Raises
    ------
    Refusal
        With the reason.
    """
    if row.error:
        raise Refusal(row.error)
    cells = row.cells
    acid = _acid(row)
    changes = list(acid.notes)
    value = _quantity(row)
    temperature = _condition(cells, "temperature_c", "temperature", changes, value.temperature_c)
    strength = _condition(cells, "ionic_strength_m", "ionic strength", changes, value.ionic_strength_m)
    temperature = defaults.temperature_c if temperature is None else temperature
    strength = defaults.ionic_strength_m if strength is None else strength
    _check_exchanged(value, temperature)
    _check_conditions(temperature, strength)
    pka, spread = _as_pka(value, _kind_of_quantity(cells, value, defaults, changes), temperature, changes)
    changes.extend(value.notes)
    constant = _constant(cells, defaults)
    usable = Usable(
        row.number,
        acid,
        _step(cells, acid),
        pka,
        _uncertainty(cells, spread, defaults, value),
        pka,
        cells.get("pka", ""),
        temperature,
        strength,
        constant,
        charge_that_counts(acid),
        " ".join(cells.get("name", "").split()),
        cells.get("family", ""),
        cells.get("source", ""),
        cells.get("date", ""),
        tuple(changes),
    )
    return usable if usable.step is None else to_standard_state(usable)


def _acid(row: RawRow) -> Acid:
    text = row.cells.get("smiles", "")
    if not text and row.mol is None:
        raise Refusal("no structure: the cell is empty")
    try:
        return acid_from_mol(row.mol) if row.mol is not None else read_acid(text)
    except StructureError as problem:
        if _is_number(text) and _is_acid(row.cells.get("pka", "")):
            raise Refusal("structure and value stand in each other's column; exchange them") from problem
        raise Refusal(f"structure: {problem}") from problem


def _is_number(text: str) -> bool:
    try:
        read_quantity(text)
    except CellError:
        return False
    return True


def _is_acid(text: str) -> bool:
    try:
        read_acid(text)
    except StructureError:
        return False
    return True


def _quantity(row: RawRow) -> Quantity:
    try:
        return read_quantity(row.cells.get("pka", ""))
    except CellError as problem:
        raise Refusal(f"value: {problem}") from problem


def _condition(
    cells: Mapping[str, str], field_: str, label: str, changes: list[str], in_value: float | None
) -> float | None:
    text = cells.get(field_, "")
    if not text:
        return in_value
    try:
        quantity = read_quantity(text)
    except CellError as problem:
        raise Refusal(f"{label}: {problem}") from problem
    value, unit = quantity.value, quantity.unit.replace(" ", "").replace("°", "").replace("deg", "").casefold()
    if quantity.temperature_c is not None and field_ == "temperature_c":
        value = quantity.temperature_c
    factors = {"": 1.0, "c": 1.0, "m": 1.0, "mol/l": 1.0, "mm": 1e-3, "mmol/l": 1e-3}
    if field_ == "temperature_c" and (unit == "k" or (not unit and KELVIN[0] <= value <= KELVIN[1])):
        changes.append(f"{label} '{text}' converted from kelvin")
        return value - ZERO_CELSIUS
    if unit not in factors or (unit == "c") != (field_ == "temperature_c" and unit != ""):
        raise Refusal(f"{label}: '{text}' has a unit that is not known here; give °C and mol/L")
    if unit or quantity.notes:
        changes.append(f"{label} '{text}' read as {value * factors[unit]:g}")
    return value * factors[unit]


def _check_exchanged(value: Quantity, temperature: float | None) -> None:
    """Tell a value and a temperature in each other's column from values that are merely odd."""
    if temperature is None or value.unit:
        return
    looks_like_temperature = TEMPERATURES[0] <= value.value <= TEMPERATURES[1]
    if looks_like_temperature and value.value > POSSIBLE[1] and POSSIBLE[0] <= temperature <= POSSIBLE[1]:
        raise Refusal(
            f"value {value.value:g} and temperature {temperature:g} look exchanged; put them in their columns"
        )


def _check_conditions(temperature: float | None, strength: float | None) -> None:
    if temperature is not None and not TEMPERATURES[0] <= temperature <= TEMPERATURES[1]:
        raise Refusal(f"temperature {temperature:g} °C is outside {TEMPERATURES[0]:g} to {TEMPERATURES[1]:g} °C")
    if strength is not None and not STRENGTHS[0] <= strength <= STRENGTHS[1]:
        raise Refusal(f"ionic strength {strength:g} mol/L is outside {STRENGTHS[0]:g} to {STRENGTHS[1]:g} mol/L")


_MOLAR = {"m": 1.0, "mol/l": 1.0, "mm": 1e-3, "mmol/l": 1e-3, "µm": 1e-6, "μm": 1e-6, "um": 1e-6}
_WORDLESS = frozenset(("", "phunits", "phunit", "pkunits", "pkaunits", "units", "unit", "logunits"))


def _kind_of_quantity(cells: Mapping[str, str], value: Quantity, defaults: Defaults, changes: list[str]) -> str:
    """Whether the number is a pKa, a Ka or a pKb; a word in the cell or the row goes before the column's."""
    prefix, stated = value.prefix.casefold(), cells.get("quantity", "").replace(" ", "").casefold()
    unit = value.unit.replace(" ", "").casefold()
    if stated and stated not in QUANTITIES:
        raise Refusal(f"quantity '{cells['quantity']}' is none of pKa, Ka, pKb")
    if unit not in _WORDLESS and unit not in _MOLAR:
        raise Refusal(f"value: '{value.unit}' behind the number is not understood; leave the number alone in the cell")
    if unit in _WORDLESS and unit:
        changes.append(f"unit '{value.unit}' in the cell of the value left out")
    for word in (prefix, stated):
        if word in QUANTITIES:
            return word
    if unit in _MOLAR:
        return "ka"
    if defaults.quantity == "pka" and 0.0 < value.value < CERTAINLY_KA:
        return "ka"
    return defaults.quantity


def _as_pka(value: Quantity, kind: str, temperature: float | None, changes: list[str]) -> tuple[float, float | None]:
    """The pKa and what is stated of its spread."""
    number, spread = value.value, value.spread
    factor = _MOLAR.get(value.unit.replace(" ", "").casefold(), 1.0)
    if kind == "ka":
        number *= factor
        if not KA_POSSIBLE[0] <= number <= KA_POSSIBLE[1]:
            raise Refusal(f"Ka {number:g} mol/L is impossible for a carboxylic acid; give the pKa")
        pka = -math.log10(number)
        changes.append(f"Ka {number:.4g} mol/L converted to pKa {pka:.3f}")
        spread = None if spread is None else spread * factor / number / math.log(10.0)
    elif kind == "pkb":
        pkw = water_pkw(25.0 if temperature is None else temperature)
        pka = pkw - number
        changes.append(f"pKb {number:g} of the conjugate base converted to pKa {pka:.3f} with pKw {pkw:.3f}")
    else:
        pka = number
    if not POSSIBLE[0] <= pka <= POSSIBLE[1]:
        raise Refusal(f"pKa {pka:g} is impossible for a COOH in water ({POSSIBLE[0]:g} to {POSSIBLE[1]:g})")
    if kind == "pka" and 0.0 < number < 0.01:
        raise Refusal(f"{number:g} is neither a likely pKa nor certainly a Ka; say which in a column quantity")
    return pka, spread


def _constant(cells: Mapping[str, str], defaults: Defaults) -> str:
    text = cells.get("constant", "").strip().casefold() or defaults.constant
    if text in ("", "unknown", "?", "not stated"):
        return ""
    found = [kind for kind in CONSTANT_KINDS if kind.startswith(text[:4]) and len(text) >= 4]
    if not found:
        raise Refusal(f"constant '{cells.get('constant')}' is none of {', '.join(CONSTANT_KINDS)}")
    return found[0]


def _step(cells: Mapping[str, str], acid: Acid) -> int | None:
    text = cells.get("step", "").strip().casefold().removeprefix("pka").removeprefix("pk")
    n = len(acid.sites)
    if not text:
        return 1 if n == 1 else None
    try:
        number = float(text.replace(",", "."))
    except ValueError as problem:
        raise Refusal(f"step '{cells['step']}' is not a whole number from 1 to {n}") from problem
    if number != int(number) or not 1 <= number <= n:
        raise Refusal(f"step {text}: the acid has {n} COOH; carboxyl protons are counted from 1")
    return int(number)


def _uncertainty(cells: Mapping[str, str], spread: float | None, defaults: Defaults, value: Quantity) -> float:
    text = cells.get("uncertainty", "").strip()
    if text:
        try:
            stated = read_quantity(text.removeprefix("±").strip()).value
        except CellError as problem:
            raise Refusal(f"uncertainty: {problem}") from problem
        if not 0.0 <= stated <= 2.0:
            raise Refusal(f"uncertainty {stated:g}: give a standard uncertainty from 0 to 2 pKa units")
    else:
        stated = defaults.uncertainty if spread is None else spread
    return max(stated, APPROXIMATE) if value.approximate else max(stated, 0.001)


def to_standard_state(row: Usable) -> Usable:
    """Correct a row with a known step to ionic strength 0, and widen it by what it leaves open.

    Kinds are those of :mod:`qsar.conditions`, the correction is that of Davies (1962). Where the kind is not known
    the row is corrected as a mixed constant, which is what a glass electrode calibrated with buffers gives, and
    widened by the standard deviation among the three kinds.
    """
    assert row.step is not None
    z = row.charge - (row.step - 1)
    changes, variance, pka = list(row.changes), row.uncertainty**2, row.measured
    strength, constant = row.ionic_strength_m, row.constant
    degrees = 25.0 if row.temperature_c is None else row.temperature_c
    if strength is None and constant != "thermodynamic":
        spread = abs(float(pka_shift(z, USUAL_STRENGTH, "mixed"))) / math.sqrt(3.0)
        variance += spread**2
        changes.append(f"ionic strength not stated: taken as 0, uncertainty widened by {spread:.3f}")
    elif strength and constant != "thermodynamic":
        kinds = [float(pka_shift(z, strength, kind, degrees)) for kind in CONSTANT_KINDS]
        shift = kinds[CONSTANT_KINDS.index(constant or "mixed")]
        pka -= shift
        if constant:
            changes.append(
                f"{constant} constant at I = {strength:g} mol/L corrected to I = 0 by {-shift:+.3f} (Davies)"
            )
        else:
            variance += float(np.std(kinds)) ** 2
            changes.append(
                f"kind of constant not stated: corrected from I = {strength:g} mol/L as a mixed constant by "
                f"{-shift:+.3f} (Davies), uncertainty widened by {np.std(kinds):.3f}"
            )
    if row.temperature_c is None:
        changes.append("temperature not stated: taken as 25 °C, uncertainty widened by 0.020")
        variance += 0.02**2
    else:
        gap = abs(1.0 / (degrees + ZERO_CELSIUS) - 1.0 / (25.0 + ZERO_CELSIUS))
        drift = 1000.0 * TYPICAL_ENTHALPY / (GAS_CONSTANT * math.log(10.0)) * gap
        variance += drift**2
        if drift >= 0.005:
            changes.append(f"measured at {degrees:g} °C: taken for 25 °C, uncertainty widened by {drift:.3f}")
    return replace(row, pka=pka, uncertainty=math.sqrt(variance), changes=tuple(changes))
