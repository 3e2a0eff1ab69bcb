"""Numbers on a command line: each kind says what is wrong with a text that is none."""

from __future__ import annotations

import argparse

LARGEST = 1e6
PKA_RANGE = (-5.0, 20.0)  # what can matter in water, whose own range is 0 to 14; common practice, no source
PH_RANGE = (-2.0, 16.0)  # of real aqueous solutions; common practice, no source
MOST_MOLAR = 20.0  # mol/L; pure acetic acid holds 17; common practice, no source


def _number(text: str) -> float:
    try:
        value = float(text)
    except ValueError:
        value = float("nan")
    if value != value:
        raise argparse.ArgumentTypeError(f"{text!r} is not a number")
    if not abs(value) < LARGEST:
        raise argparse.ArgumentTypeError(f"{text!r} is too large")
    return value


def constants(text: str) -> tuple[float, ...]:
    """Read the pKa values of an acid, first step first; raises ArgumentTypeError for anything else."""
    values = numbers(text)
    low, high = PKA_RANGE
    if not all(low <= value <= high for value in values):
        raise argparse.ArgumentTypeError(
            f"{text!r}: a pKa from {low:g} to {high:g} is expected; write 4.76 with a point, commas part the steps"
        )
    if list(values) != sorted(values):
        raise argparse.ArgumentTypeError(
            f"{text!r}: each step is weaker than the one before; write 4.76 with a point, commas part the steps"
        )
    return values


def ph(text: str) -> float:
    """Read a pH; raises ArgumentTypeError for anything that is none."""
    value = _number(text)
    low, high = PH_RANGE
    if not low <= value <= high:
        raise argparse.ArgumentTypeError(f"{text!r}: a pH from {low:g} to {high:g} is expected")
    return value


def concentration(text: str) -> float:
    """Read a concentration in mol/L, zero or more; raises ArgumentTypeError for anything else."""
    value = not_negative(text)
    if value > MOST_MOLAR:
        raise argparse.ArgumentTypeError(f"{text!r}: no solution holds more than {MOST_MOLAR:g} mol/L of a buffer")
    return value


def numbers(text: str) -> tuple[float, ...]:
    """Read numbers parted by commas; raises ArgumentTypeError for anything else."""
    return tuple(_number(part) for part in text.split(","))


def number(text: str) -> float:
    """Read a finite number; raises ArgumentTypeError for anything else."""
    return _number(text)


def not_negative(text: str) -> float:
    """Read a number that is zero or more; raises ArgumentTypeError for anything else."""
    value = _number(text)
    if value < 0:
        raise argparse.ArgumentTypeError(f"{text!r} is below zero")
    return value


def positive(text: str) -> float:
    """Read a number above zero; raises ArgumentTypeError for anything else."""
    value = _number(text)
    if value <= 0:
        raise argparse.ArgumentTypeError(f"{text!r} is not above zero")
    return value


def fraction(text: str) -> float:
    """Read a fraction between 0 and 1, both excluded; raises ArgumentTypeError for anything else."""
    value = _number(text)
    if not 0 < value < 1:
        raise argparse.ArgumentTypeError(f"{text!r} is not a fraction between 0 and 1, such as 0.9 for 90 %")
    return value


def counted(n: int, noun: str) -> str:
    """A number with its noun: "1 acid", "2 acids"."""
    return f"{n:,} {noun}" + ("" if n == 1 else "s")
