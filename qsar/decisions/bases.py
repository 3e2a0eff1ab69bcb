"""Bases that a work-up is done with: constants, counter-ions and what each brings along."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from qsar.conditions import GAS_CONSTANT, REFERENCE_C, ZERO_CELSIUS, van_t_hoff

WATER_NOTE = (
    "Water counts as pKa 14.0 (water at unit activity); the 15.74 that is also taught divides by 55.5 "
    "mol/L, mixes two standard states and enters no calculation here."
)
CARBONIC_NOTE = (
    "Carbonic acid counts as pKa 6.35 (also taught as 6.4), the apparent constant of all dissolved CO2; "
    "true H2CO3 is stronger (about 3.5) but only some 0.2 % of it."
)

_HENRY_CO2_25C = 0.0334  # mol/(L bar), Sander, Atmos. Chem. Phys. 2015, 15, 4399-4981
_HENRY_CO2_SLOPE = 2400.0  # K, d ln(kH)/d(1/T), same source
_BAR_LITRES = 0.01  # one joule in bar litres
ATMOSPHERE_BAR = 1.01325


@dataclass(frozen=True)
class Base:
    """A base as it is added.

    Attributes
    ----------
    name : str
        Key on the command line and in tables.
    pka : tuple of float
        Constants of its conjugate acid at 25 degC, zero ionic strength, ascending; empty for a hydroxide.
    charge : int
        Charge of the fully protonated form.
    sodium : int
        Strong monovalent cations for each formula unit.
    enthalpy_kj_mol : tuple of float
        Enthalpies of ionisation, one for each constant.
    log_p : float or None
        log P of the uncharged base between octanol and water; None when it stays in water.
    source : str
        Where the constants come from.
    """

    name: str
    pka: tuple[float, ...]
    charge: int
    sodium: int
    enthalpy_kj_mol: tuple[float, ...]
    log_p: float | None
    source: str

    @property
    def is_carbonate(self) -> bool:
        """True for hydrogencarbonate and carbonate, which give off CO2."""
        return self.sodium > 0 and bool(self.pka)

    @property
    def is_amine(self) -> bool:
        """True for ammonia and amines."""
        return self.charge > 0

    def pka_at(self, temperature_c: float) -> tuple[float, ...]:
        """Constants at a temperature [degC] by van 't Hoff; raises ValueError outside 10 to 40 degC."""
        return tuple(van_t_hoff(self.pka, self.enthalpy_kj_mol, temperature_c).tolist())


_GOLDBERG = "Goldberg, Kishore & Lennen, J. Phys. Chem. Ref. Data 2002, 31, 231 (from memory)"
_CRC = "CRC Handbook, Dissociation Constants of Organic Acids and Bases (from memory)"
_HANSCH = "log P: Hansch, Leo & Hoekman, Exploring QSAR, 1995 (from memory)"

BASES: tuple[Base, ...] = (
    Base("pyridine", (5.23,), 1, 0, (20.1,), 0.65, f"{_CRC}; {_HANSCH}"),
    Base("sodium hydrogencarbonate", (6.351, 10.329), 0, 1, (9.15, 14.70), None, _GOLDBERG),
    Base("triethanolamine", (7.762,), 1, 0, (33.6,), None, _GOLDBERG),
    Base("ammonia", (9.245,), 1, 0, (51.95,), None, _GOLDBERG),
    Base("ethanolamine", (9.498,), 1, 0, (50.52,), None, _GOLDBERG),
    Base("triethylamine", (10.72,), 1, 0, (43.1,), 1.45, f"{_CRC}; {_HANSCH}"),
    Base("sodium carbonate", (6.351, 10.329), 0, 2, (9.15, 14.70), None, _GOLDBERG),
    Base("sodium hydroxide", (), 0, 1, (), None, "strong base, fully dissociated"),
)
"""Offered by default, roughly from gentle to strong."""

_SHORT = {
    "hydrogencarbonate": "sodium hydrogencarbonate",
    "bicarbonate": "sodium hydrogencarbonate",
    "carbonate": "sodium carbonate",
    "hydroxide": "sodium hydroxide",
}


def base_named(text: str) -> Base:
    """A base by name, or ``NAME:pKa`` for an amine of one's own.

    Parameters
    ----------
    text : str
        For instance ``ammonia``, ``carbonate`` or ``N-methylmorpholine:7.38``.  An own base stays in water
        and its constant does not vary with temperature.

    Raises
    ------
    ValueError
        For an unknown name, or a constant that is unreadable or not from 0 to 14.
    """
    name, separator, constant = text.rpartition(":")
    if separator:
        try:
            pka = float(constant)
        except ValueError:
            raise ValueError(f"base {text!r}: the part after the colon is not a pKa") from None
        if not 0.0 <= pka <= 14.0:
            raise ValueError(f"base {text!r}: give the pKa of the protonated amine in water, from 0 to 14")
        return Base(name.strip(), (pka,), 1, 0, (0.0,), None, "as given")
    wanted = _SHORT.get(text.strip().lower(), text.strip().lower())
    for base in BASES:
        if base.name == wanted:
            return base
    known = ", ".join(base.name for base in BASES)
    raise ValueError(f"base {text!r} is not known; one of {known}, or NAME:pKa for an amine of your own")


def henry_co2(temperature_c: float = REFERENCE_C) -> float:
    """Solubility of CO2 in water [mol/(L bar)] (Sander 2015, doi:10.5194/acp-15-4399-2015).

    Examples
    --------
    >>> round(henry_co2(25.0), 4)
    0.0334
    """
    kelvin, reference = temperature_c + ZERO_CELSIUS, REFERENCE_C + ZERO_CELSIUS
    return float(_HENRY_CO2_25C * np.exp(_HENRY_CO2_SLOPE * (1.0 / kelvin - 1.0 / reference)))


def co2_gas_to_water(temperature_c: float = REFERENCE_C) -> float:
    """Concentration of CO2 in the gas over that in water at equilibrium [dimensionless], ideal gas."""
    kelvin = temperature_c + ZERO_CELSIUS
    return 1.0 / (henry_co2(temperature_c) * GAS_CONSTANT * _BAR_LITRES * kelvin)
