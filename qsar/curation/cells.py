"""Numbers as people type them: decimal commas, units, ranges, ">8", powers of ten, several values in one cell."""

from __future__ import annotations

import re
from dataclasses import dataclass, field

_SUPERSCRIPTS = str.maketrans("⁰¹²³⁴⁵⁶⁷⁸⁹⁻⁺", "0123456789-+")
_NUMBER = r"[+-]?(?:\d+(?:[.,]\d+)?|[.,]\d+)(?:e[+-]?\d+)?"
_ONE = re.compile(_NUMBER, re.IGNORECASE)
_POWER = re.compile(r"(?<=\d)\s*[x×·*]\s*10\s*(?:\^|\*\*)?\s*\(?([+-]?\d+)\)?", re.IGNORECASE)
_PREFIX = re.compile(r"^(p\s*k\s*_?\s*[ab]?\d?|k\s*_?\s*a\d?)\s*[=:]?\s*(?=[-+<>≤≥~≈.\d])", re.IGNORECASE)
_TEMPERATURE = re.compile(rf"[(,;@]?\s*(?:at\s+|t\s*=\s*)?({_NUMBER})\s*°?\s*C\b\s*\)?", re.IGNORECASE)
_STRENGTH = re.compile(rf"[(,;@]?\s*\b(?:at\s+)?I\s*=\s*({_NUMBER})\s*(?:M|mol/L)?\s*\)?", re.IGNORECASE)
_SPREAD = re.compile(rf"(?:±|\+/-|\+-)\s*({_NUMBER})", re.IGNORECASE)
_IN_BRACKETS = re.compile(r"(\d+[.,](\d+))\((\d{1,2})\)")
_RANGE = re.compile(rf"^{_NUMBER}\s*(?:-|–|—|\bto\b)\s*\d", re.IGNORECASE)
_LIMIT = re.compile(r"^\s*(<|>|≤|≥|=<|>=|less than|more than|below|above|under|over)\s*", re.IGNORECASE)
_ABOUT = re.compile(r"^\s*(~|≈|ca\.?|about|approx\.?)\s*", re.IGNORECASE)


class CellError(ValueError):
    """A cell that holds no usable number; the message says why and how to mend it."""


@dataclass(frozen=True)
class Quantity:
    """A number read from a cell.

    Attributes
    ----------
    value : float
    unit : str
        What is written behind the number, without blanks; empty where nothing is.
    spread : float or None
        What is written behind ± or in brackets, in the unit of the value.
    prefix : str
        What is written before the number, such as "pKb"; empty where nothing is.
    temperature_c, ionic_strength_m : float or None
        Conditions written in the same cell.
    exponent : bool
        Whether the number is written with a power of ten.
    notes : tuple of str
        Everything that had to be interpreted.
    """

    value: float
    unit: str = ""
    spread: float | None = None
    prefix: str = ""
    temperature_c: float | None = None
    ionic_strength_m: float | None = None
    exponent: bool = False
    approximate: bool = False
    notes: tuple[str, ...] = field(default=())


def read_quantity(text: str) -> Quantity:
    """Read one number from a cell.

    Parameters
    ----------
    text : str
        As typed.

    Returns
    -------
    Quantity

    Raises
    ------
    CellError
        If the cell is empty, holds no number, a limit, a range, or several numbers.

    Examples
    --------
    >>> read_quantity("4,76 (25 °C)").value
    4.76
    >>> read_quantity("1.75 x 10^-5 M").value
    1.75e-05
    """
    given = text.strip()
    if not given:
        raise CellError("empty; fill it in or take the row out")
    notes: list[str] = []
    rest = _plain(given)
    if limit := _LIMIT.match(rest):
        raise CellError(f"'{_short(given)}' is a limit ({limit[1]}), not a value; measure it or leave it out")
    rest, prefix = _cut(_PREFIX, rest)
    if limit := _LIMIT.match(rest):
        raise CellError(f"'{_short(given)}' is a limit ({limit[1]}), not a value; measure it or leave it out")
    rest, about = _cut(_ABOUT, rest)
    if about:
        notes.append(f"'{_short(given)}' is approximate")
    rest, temperature = _condition(_TEMPERATURE, rest)
    rest, strength = _condition(_STRENGTH, rest)
    if temperature is not None or strength is not None:
        notes.append("conditions read from the cell of the value")
    rest, spread = _spread(rest)
    if _RANGE.match(rest):
        raise CellError(f"'{_short(given)}' is a range; give one value")
    numbers = _ONE.findall(rest)
    if not numbers:
        raise CellError(f"'{_short(given)}' holds no number")
    if len(numbers) > 1:
        raise CellError(f"'{_short(given)}' holds {len(numbers)} values; give each step a row of its own")
    unit = rest.replace(numbers[0], "", 1).strip(" ,;()")
    if "," in numbers[0]:
        notes.append(f"decimal comma in '{_short(given)}'")
    return Quantity(
        _float(numbers[0]),
        unit,
        spread,
        re.sub(r"[\s_=:]", "", prefix).rstrip("0123456789"),
        temperature,
        strength,
        "e" in numbers[0].lower(),
        bool(about),
        tuple(notes),
    )


def _plain(text: str) -> str:
    for dash in ("−", "‒"):
        text = text.replace(dash, "-")
    text = text.replace("\u00a0", " ").replace("\u202f", " ").translate(_SUPERSCRIPTS)
    return _POWER.sub(lambda m: f"e{m[1]}", text)


def _cut(pattern: re.Pattern[str], text: str) -> tuple[str, str]:
    found = pattern.match(text)
    return (text[found.end() :], found[1]) if found else (text, "")


def _condition(pattern: re.Pattern[str], text: str) -> tuple[str, float | None]:
    """Take a condition out of a text that holds more than it."""
    found = pattern.search(text)
    if found is None or not _ONE.search(text[: found.start()]):
        return text, None
    return text[: found.start()] + " " + text[found.end() :], _float(found[1])


def _spread(text: str) -> tuple[str, float | None]:
    if found := _SPREAD.search(text):
        return text[: found.start()] + text[found.end() :], abs(_float(found[1]))
    if found := _IN_BRACKETS.search(text):
        return text.replace(found[0], found[1], 1), int(found[3]) * 10.0 ** -len(found[2])
    return text, None


def _float(text: str) -> float:
    return float(text.replace(",", "."))


def _short(text: str, limit: int = 40) -> str:
    text = " ".join(text.split())
    return text if len(text) <= limit else text[: limit - 1] + "…"
