"""The standard state that models predict in: constants at ionic strength 0."""

from __future__ import annotations

from qsar.conditions import Constant, to_thermodynamic
from qsar.structures import Acid

_MOST_POSITIVE = 2  # of the charges of a longer cation, most sit too far from the carboxyl group to count together


def charge_that_counts(acid: Acid) -> int:
    """Charge of the acid form that a correction for ionic strength reckons with, where its first proton leaves."""
    from qsar.decisions.acids import charge_beside_carboxyl  # slow to import, and few rows ask for it

    return min(charge_beside_carboxyl(acid), _MOST_POSITIVE)


def at_zero_ionic_strength(
    acid: Acid, step: int, pka: float, ionic_strength_m: float, constant: Constant, temperature_c: float = 25.0
) -> float:
    """A constant measured at an ionic strength as the thermodynamic constant of its step.

    Parameters
    ----------
    acid : Acid
    step : int
        Carboxyl protons lost, counted from 1.
    pka : float
    ionic_strength_m : float
        mol/L, 0 to 0.5.
    constant : {"thermodynamic", "mixed", "concentration"}
    temperature_c : float
        Degrees Celsius.

    Raises
    ------
    ValueError
        For an ionic strength or a temperature beyond the equation's range.

    Notes
    -----
    Davies, C. W. *Ion Association*; Butterworths, 1962; see :mod:`qsar.conditions`.
    """
    if constant == "thermodynamic" or not ionic_strength_m:
        return pka
    charge = charge_that_counts(acid) - (step - 1)
    return float(to_thermodynamic(pka, charge, ionic_strength_m, constant, temperature_c))
