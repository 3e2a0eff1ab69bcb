"""What a physical effect has to say about itself."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

from qsar.descriptors.view import SiteView


@dataclass(frozen=True, slots=True)
class Column:
    """One descriptor.

    Attributes
    ----------
    name : str
    unit : str
        "1" for a pure number.
    lowers : bool
        Whether the model is constrained so that the pKa never rises with this column.
    """

    name: str
    unit: str = "1"
    lowers: bool = False


@dataclass(frozen=True, slots=True)
class Effect:
    """A physical effect: its columns, the function that computes them and the publications behind it."""

    name: str
    columns: tuple[Column, ...]
    compute: Callable[[SiteView], list[float]]
    citations: tuple[str, ...]


#: Bonds beyond which no molecule of the permitted size reaches.
FURTHEST = 1024


def decay(factor: float) -> tuple[float, ...]:
    """``factor ** max(n - 1, 0)`` for n = 0, 1, 2 ... bonds, as a table to look up."""
    return tuple(factor ** max(n - 1, 0) for n in range(FURTHEST))


def columns(names: str, unit: str = "1", lowers: bool = False) -> tuple[Column, ...]:
    """Columns from blank-separated names."""
    return tuple(Column(name, unit, lowers) for name in names.split())
