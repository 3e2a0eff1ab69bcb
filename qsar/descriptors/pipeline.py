"""All effects joined, as a function of one site and as a scikit-learn transformer."""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike, NDArray

from qsar.descriptors.charge import CHARGE
from qsar.descriptors.effect import Column, Effect
from qsar.descriptors.hydrogen_bond import HYDROGEN_BOND
from qsar.descriptors.inductive import INDUCTIVE
from qsar.descriptors.resonance import RESONANCE
from qsar.descriptors.skeleton import SKELETON
from qsar.descriptors.steric import STERIC
from qsar.descriptors.view import SiteView

#: The effects, in column order. A new effect is a new module and a new entry here.
EFFECTS: tuple[Effect, ...] = (INDUCTIVE, CHARGE, RESONANCE, STERIC, HYDROGEN_BOND, SKELETON)
COLUMNS: tuple[Column, ...] = tuple(column for effect in EFFECTS for column in effect.columns)
NAMES: tuple[str, ...] = tuple(column.name for column in COLUMNS)
#: Columns along which the model may only fall.
LOWERS: NDArray[np.bool_] = np.array([column.lowers for column in COLUMNS])


def site_descriptors(view: SiteView) -> list[float]:
    """Descriptors of one carboxyl group in one charge state.

    Parameters
    ----------
    view : SiteView

    Returns
    -------
    list of float, length ``len(NAMES)``
        As the effects give them; see `rounded`.
    """
    values: list[float] = []
    for effect in EFFECTS:
        values.extend(effect.compute(view))
    return values


def rounded(values: ArrayLike) -> NDArray[np.float64]:
    """Descriptors to ten decimals, so that the order of a sum never decides which side of a split a value is on."""
    result: NDArray[np.float64] = np.asarray(values, dtype=np.float64).round(10)
    return result
