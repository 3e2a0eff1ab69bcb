"""Ionic strength and temperature: what a pKa becomes in the solution at hand.

A tabulated constant belongs to a medium and a temperature.  This module moves it from one to another with the
Davies equation (0 to 0.5 mol/L) and the van 't Hoff equation (10 to 40 degC), and gives the ion product of
water.

Three kinds of constant are told apart, for ``HA(z) = H(+) + A(z-1)``:

* *thermodynamic*: activities throughout (zero ionic strength);
* *mixed*: activity of H+ (what a pH meter reports), concentrations of acid and base;
* *concentration*: concentrations throughout.

Molality and molarity are treated as equal; in water at these temperatures they differ by less than 1 %.
"""

from __future__ import annotations

import math
from typing import Literal

import numpy as np
from numpy.typing import ArrayLike, NDArray

Constant = Literal["thermodynamic", "mixed", "concentration"]
Floats = NDArray[np.float64]

GAS_CONSTANT = 8.314462618  # J/(mol K), CODATA 2018
ZERO_CELSIUS = 273.15
REFERENCE_C = 25.0
DAVIES_LIMIT_M = 0.5
DAVIES_B = 0.3
TEMPERATURE_RANGE_C = (10.0, 40.0)
CONSTANT_KINDS: tuple[Constant, ...] = ("thermodynamic", "mixed", "concentration")

_ELEMENTARY_CHARGE = 1.602176634e-19
_AVOGADRO = 6.02214076e23
_BOLTZMANN = 1.380649e-23
_VACUUM_PERMITTIVITY = 8.8541878128e-12


def check_temperature(temperature_c: float) -> float:
    """Return `temperature_c` when the corrections of this module hold there.

    Parameters
    ----------
    temperature_c : float
        Temperature [degC].

    Raises
    ------
    ValueError
        Outside 10 to 40 degC.
    """
    low, high = TEMPERATURE_RANGE_C
    if not low <= temperature_c <= high:
        raise ValueError(
            f"temperature {temperature_c:g} °C: the van 't Hoff correction is used from {low:g} to "
            f"{high:g} °C only"
        )
    return float(temperature_c)


def check_ionic_strength(ionic_strength_m: ArrayLike) -> Floats:
    """Return the ionic strength as an array when the Davies equation holds there.

    Parameters
    ----------
    ionic_strength_m : array_like
        Ionic strength [mol/L], any shape.

    Raises
    ------
    ValueError
        Below 0 or above 0.5 mol/L, or not a number.
    """
    strength = np.asarray(ionic_strength_m, dtype=float)
    if not np.all((strength >= 0.0) & (strength <= DAVIES_LIMIT_M)):
        stated = ", ".join(f"{value:g}" for value in np.ravel(strength))
        raise ValueError(
            f"ionic strength {stated} mol/L: the Davies equation is used "
            f"from 0 to {DAVIES_LIMIT_M:g} mol/L only"
        )
    return strength


def water_density(temperature_c: float) -> float:
    """Density of air-free water at 1 atm [kg/L].

    Notes
    -----
    Kell, G. S. *J. Chem. Eng. Data* **1975**, 20, 97-105, doi:10.1021/je60064a005, equation 16
    (coefficients from memory; checked in the tests against tabulated densities).

    Examples
    --------
    >>> round(water_density(25.0), 5)
    0.99704
    """
    t = temperature_c
    numerator = (
        999.83952
        + 16.945176 * t
        - 7.9870401e-3 * t**2
        - 46.170461e-6 * t**3
        + 105.56302e-9 * t**4
        - 280.54253e-12 * t**5
    )
    return numerator / (1.0 + 16.879850e-3 * t) / 1000.0


def water_permittivity(temperature_c: float) -> float:
    """Relative permittivity of water, 0 to 100 degC [dimensionless].

    Notes
    -----
    Malmberg, C. G.; Maryott, A. A. *J. Res. Natl. Bur. Stand.* **1956**, 56, 1-8, doi:10.6028/jres.056.001.

    Examples
    --------
    >>> round(water_permittivity(25.0), 2)
    78.3
    """
    t = temperature_c
    return 87.740 - 0.40008 * t + 9.398e-4 * t**2 - 1.410e-6 * t**3


def debye_huckel_slope(temperature_c: float = REFERENCE_C) -> float:
    r"""Limiting slope *A* of the Debye-Hueckel equation in water [(kg/mol)^1/2].

    .. math:: A = \frac{e^3 \sqrt{2 N_A \rho}}{8 \pi \ln(10) (\varepsilon_0 \varepsilon_r k T)^{3/2}}

    Parameters
    ----------
    temperature_c : float
        Temperature [degC].

    Returns
    -------
    float
        Slope for decadic logarithms.

    Examples
    --------
    >>> round(debye_huckel_slope(25.0), 3)
    0.511
    """
    kelvin = temperature_c + ZERO_CELSIUS
    screening = _VACUUM_PERMITTIVITY * water_permittivity(temperature_c) * _BOLTZMANN * kelvin
    density = 1000.0 * water_density(temperature_c)
    numerator = _ELEMENTARY_CHARGE**3 * math.sqrt(2.0 * _AVOGADRO * density)
    return float(numerator / (8.0 * math.pi * math.log(10.0) * screening**1.5))


def davies_term(ionic_strength_m: ArrayLike, temperature_c: float = REFERENCE_C) -> Floats:
    r"""Minus the decadic logarithm of the activity coefficient of a singly charged ion (Davies).

    .. math:: D = A \left( \frac{\sqrt{I}}{1 + \sqrt{I}} - 0.3 I \right), \qquad \log_{10}\gamma_z = -z^2 D

    Parameters
    ----------
    ionic_strength_m : array_like
        Ionic strength [mol/L], any shape, 0 to 0.5.
    temperature_c : float
        Temperature [degC].

    Returns
    -------
    ndarray
        Same shape as `ionic_strength_m`.

    Raises
    ------
    ValueError
        Where the ionic strength is outside 0 to 0.5 mol/L.

    Notes
    -----
    Davies, C. W. *Ion Association*; Butterworths: London, 1962 (0.3 in place of the 0.2 of *J. Chem. Soc.*
    **1938**, 2093-2098, doi:10.1039/JR9380002093).  For 1:1 salts the coefficient is good to about 3 % at
    0.1 mol/L and 8 % at 0.5 mol/L.

    Examples
    --------
    >>> round(float(davies_term(0.1)), 3)
    0.107
    """
    strength = check_ionic_strength(ionic_strength_m)
    root = np.sqrt(strength)
    return debye_huckel_slope(temperature_c) * (root / (1.0 + root) - DAVIES_B * strength)


def activity_coefficient(
    charge: ArrayLike, ionic_strength_m: ArrayLike, temperature_c: float = REFERENCE_C
) -> Floats:
    """Activity coefficient of an ion by the Davies equation; 1 for a neutral species.

    Parameters
    ----------
    charge : array_like
        Charge number, broadcast against `ionic_strength_m`.
    ionic_strength_m : array_like
        Ionic strength [mol/L], 0 to 0.5.
    temperature_c : float
        Temperature [degC].

    Raises
    ------
    ValueError
        Where the ionic strength is outside 0 to 0.5 mol/L.

    Examples
    --------
    >>> round(float(activity_coefficient(1, 0.1)), 2)
    0.78
    """
    return np.asarray(
        10.0 ** (-(np.asarray(charge, dtype=float) ** 2) * davies_term(ionic_strength_m, temperature_c))
    )


def pka_shift(
    charge_of_acid: ArrayLike,
    ionic_strength_m: ArrayLike,
    constant: Constant = "mixed",
    temperature_c: float = REFERENCE_C,
) -> Floats:
    r"""Conditional minus thermodynamic pKa of an acid of charge *z*.

    With *D* from `davies_term`: mixed constants shift by :math:`(2z - 1) D`, concentration constants by
    :math:`(2z - 2) D`.

    Parameters
    ----------
    charge_of_acid : array_like
        Charge *z* of the acid form that loses the proton: 0 for acetic acid, -1 for hydrogen oxalate, +1 for
        ammonium and for the glycine cation.
    ionic_strength_m : array_like
        Ionic strength [mol/L], 0 to 0.5.
    constant : {"thermodynamic", "mixed", "concentration"}
        Kind of the conditional constant.
    temperature_c : float
        Temperature [degC].

    Raises
    ------
    ValueError
        For an unknown kind or an ionic strength outside 0 to 0.5 mol/L.

    Notes
    -----
    Albert, A.; Serjeant, E. P. *The Determination of Ionization Constants*, 3rd ed.; Chapman and Hall, 1984,
    chapters 3 and 4.
    """
    z = np.asarray(charge_of_acid, dtype=float)
    factors = {"thermodynamic": 0.0 * z, "mixed": 2.0 * z - 1.0, "concentration": 2.0 * z - 2.0}
    if constant not in factors:
        raise ValueError(f"constant {constant!r}: one of {', '.join(CONSTANT_KINDS)} is expected")
    if constant == "thermodynamic":
        return np.zeros(np.broadcast_shapes(z.shape, np.shape(ionic_strength_m)))
    return np.asarray(factors[constant] * davies_term(ionic_strength_m, temperature_c))


def to_thermodynamic(
    pka: ArrayLike,
    charge_of_acid: ArrayLike,
    ionic_strength_m: ArrayLike,
    constant: Constant = "mixed",
    temperature_c: float = REFERENCE_C,
) -> Floats:
    """Thermodynamic pKa from one measured at an ionic strength; arguments as in `pka_shift`.

    Examples
    --------
    Acetic acid, 4.56 in concentrations at 0.1 mol/L:

    >>> round(float(to_thermodynamic(4.56, 0, 0.1, "concentration")), 2)
    4.77
    """
    return np.asarray(pka, dtype=float) - pka_shift(charge_of_acid, ionic_strength_m, constant, temperature_c)


def from_thermodynamic(
    pka: ArrayLike,
    charge_of_acid: ArrayLike,
    ionic_strength_m: ArrayLike,
    constant: Constant = "mixed",
    temperature_c: float = REFERENCE_C,
) -> Floats:
    """Conditional pKa at an ionic strength from the thermodynamic one; arguments as in `pka_shift`."""
    return np.asarray(pka, dtype=float) + pka_shift(charge_of_acid, ionic_strength_m, constant, temperature_c)


def van_t_hoff(
    pka: ArrayLike,
    enthalpy_kj_mol: ArrayLike,
    to_c: float,
    from_c: float = REFERENCE_C,
) -> Floats:
    r"""The pKa at another temperature, with an enthalpy of ionisation that does not vary.

    .. math:: pK(T) = pK(T_0) + \frac{\Delta H}{R \ln 10} \left( \frac{1}{T} - \frac{1}{T_0} \right)

    Parameters
    ----------
    pka : array_like
        Constant at `from_c`.
    enthalpy_kj_mol : array_like
        Standard enthalpy of ionisation [kJ/mol], broadcast against `pka`.
    to_c, from_c : float
        Temperatures [degC], 10 to 40.

    Raises
    ------
    ValueError
        For a temperature outside 10 to 40 degC.

    Notes
    -----
    The change of heat capacity (about -140 to -200 J/(mol K) for simple carboxylic acids) is left out: it
    bends the line by less than 0.02 between 10 and 40 degC.  Enthalpies: Goldberg, R. N.; Kishore, N.;
    Lennen, R. M. *J. Phys. Chem. Ref. Data* **2002**, 31, 231-370, doi:10.1063/1.1416902.

    Examples
    --------
    Ammonium, 51.95 kJ/mol, from 25 to 40 degC:

    >>> round(float(van_t_hoff(9.245, 51.95, 40.0)), 2)
    8.81
    """
    inverse = 1.0 / (check_temperature(to_c) + ZERO_CELSIUS) - 1.0 / (
        check_temperature(from_c) + ZERO_CELSIUS
    )
    slope = 1000.0 * np.asarray(enthalpy_kj_mol, dtype=float) / (GAS_CONSTANT * math.log(10.0))
    return np.asarray(pka, dtype=float) + slope * inverse


def water_pkw(temperature_c: float = REFERENCE_C) -> float:
    """Thermodynamic ion product of water as pKw, water at unit activity.

    Parameters
    ----------
    temperature_c : float
        Temperature [degC], 10 to 40.

    Raises
    ------
    ValueError
        For a temperature outside 10 to 40 degC.

    Notes
    -----
    Marshall, W. L.; Franck, E. U. *J. Phys. Chem. Ref. Data* **1981**, 10, 295-304, doi:10.1063/1.555643
    (coefficients from memory; checked in the tests against tabulated values).

    Examples
    --------
    >>> round(water_pkw(25.0), 1)
    14.0
    """
    kelvin = check_temperature(temperature_c) + ZERO_CELSIUS
    log_density = math.log10(water_density(temperature_c))
    log_kw = -4.098 - 3245.2 / kelvin + 2.2362e5 / kelvin**2 - 3.984e7 / kelvin**3
    log_kw += (13.957 - 1262.3 / kelvin + 8.5641e5 / kelvin**2) * log_density
    return -log_kw
