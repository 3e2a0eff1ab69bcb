"""Mass, charge and distribution balance of a mixture, solved for pH with activities by Davies.

Every case of a batch (a draw of the constants, a point of a scan) is solved at once as one row of an array.
Water has unit activity throughout, so its constant is pKw = 14.0 at 25 degC.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray

from qsar.conditions import DAVIES_LIMIT_M, REFERENCE_C, davies_term, water_pkw

Floats = NDArray[np.float64]

_LN10 = float(np.log(10.0))
_PH_RANGE = (-3.0, 17.0)
_BISECTIONS = 16
_POLISHINGS = 60
_NEIGHBOURHOOD = 0.1
_STEP = 1e-13
_ROUNDS = 200
_TOLERANCE = 1e-10


class NotConverged(RuntimeError):
    """The balance was not met within the allowed number of rounds."""


@dataclass(frozen=True)
class Solute:
    """Something dissolved, with its proton steps; a strong ion has none.

    Attributes
    ----------
    name : str
        For messages and tables.
    concentration_m : ndarray, shape (n_cases,) or (1,)
        Total amount over all phases per litre of water [mol/L].
    pka : ndarray, shape (n_cases or 1, n_steps)
        Thermodynamic constants; no column for a strong ion.
    charge : int
        Charge of the most protonated form.
    partition : float
        Amount in the other phase (organic layer, gas) per amount of the uncharged form in water: partition
        coefficient times ratio of volumes.
    ceiling_m : float
        Highest concentration of the uncharged form in water [mol/L]; what exceeds it has left (a vented gas).
    """

    name: str
    concentration_m: Floats
    pka: Floats
    charge: int
    partition: float = 0.0
    ceiling_m: float = float("inf")

    @property
    def charges(self) -> NDArray[np.int_]:
        """Charge of each protonation state, shape (n_steps + 1,)."""
        return self.charge - np.arange(self.pka.shape[1] + 1)

    def in_water(self, ph: Floats, davies: Floats) -> Floats:
        """Concentration of each state in water [mol/L], shape (n_cases, n_steps + 1)."""
        charges = self.charges
        lost = np.arange(charges.size)
        constants = np.concatenate([np.zeros((self.pka.shape[0], 1)), np.cumsum(self.pka, axis=1)], axis=1)
        exponent = lost * ph[:, None] - constants + davies[:, None] * (charges**2 - charges[0] ** 2)
        weight = 10.0 ** (exponent - exponent.max(axis=1, keepdims=True))
        total = weight.sum(axis=1)
        neutral = np.flatnonzero(charges == 0)
        if neutral.size:
            total = total + self.partition * weight[:, neutral[0]]
        states = weight * (self.concentration_m / total)[:, None]
        if neutral.size and np.isfinite(self.ceiling_m):
            excess = np.maximum(states[:, neutral[0]] / self.ceiling_m, 1.0)
            states = states / excess[:, None]
        return np.asarray(states)


def solute(
    name: str,
    concentration_m: float | Floats,
    pka: Sequence[float] | Floats = (),
    charge: int = 0,
    partition: float = 0.0,
    ceiling_m: float = float("inf"),
) -> Solute:
    """A `Solute` from plain numbers; constants as (n_steps,) or (n_cases, n_steps).

    Raises
    ------
    ValueError
        For a negative concentration or partition ratio.
    """
    concentration = np.atleast_1d(np.asarray(concentration_m, dtype=float))
    if not (np.all(concentration >= 0.0) and np.all(np.isfinite(concentration)) and partition >= 0.0):
        raise ValueError(f"{name}: concentration and partition ratio must be zero or more")
    constants = np.asarray(pka, dtype=float)
    return Solute(name, concentration, np.atleast_2d(constants), charge, float(partition), float(ceiling_m))


@dataclass(frozen=True)
class Equilibrium:
    """A solved batch.

    Attributes
    ----------
    ph : ndarray, shape (n_cases,)
        Minus the decadic logarithm of the activity of H+.
    ionic_strength_m : ndarray, shape (n_cases,)
        Ionic strength of the water [mol/L]: the one prescribed, or that of the ions present.
    own_ionic_strength_m : ndarray, shape (n_cases,)
        Ionic strength of the ions of the balance alone [mol/L].
    in_water : dict of str to ndarray
        Concentration of each state of each solute in water [mol/L], shape (n_cases, n_states).
    hydrogen_m, hydroxide_m : ndarray, shape (n_cases,)
        Concentrations [mol/L].
    beyond_davies : ndarray of bool, shape (n_cases,)
        True where the ionic strength exceeds 0.5 mol/L, so that the coefficients are those at 0.5 mol/L.
    """

    ph: Floats
    ionic_strength_m: Floats
    own_ionic_strength_m: Floats
    in_water: dict[str, Floats] = field(repr=False)
    hydrogen_m: Floats = field(repr=False)
    hydroxide_m: Floats = field(repr=False)

    @property
    def beyond_davies(self) -> NDArray[np.bool_]:
        """Where activity coefficients are held at their values for 0.5 mol/L."""
        return np.asarray(self.ionic_strength_m > DAVIES_LIMIT_M)


def _water_ions(ph: Floats, davies: Floats, pkw: float) -> tuple[Floats, Floats]:
    return 10.0 ** (davies - ph), 10.0 ** (davies + ph - pkw)


def _net_charge(solutes: Sequence[Solute], ph: Floats, davies: Floats, pkw: float) -> Floats:
    hydrogen, hydroxide = _water_ions(ph, davies, pkw)
    net = hydrogen - hydroxide
    for item in solutes:
        net = net + item.in_water(ph, davies) @ item.charges
    return np.asarray(net)


def _root(solutes: Sequence[Solute], davies: Floats, pkw: float, near: Floats | None) -> Floats:
    """The pH at which the charges cancel; the net charge falls steadily with pH at fixed ionic strength.

    Bisection to a narrow bracket, or the neighbourhood of an earlier solution, then the Illinois variant of
    the false position (Dowell & Jarratt, *BIT* **1971**, 11, 168), which never leaves the bracket.
    """

    def net(ph: Floats) -> Floats:
        return _net_charge(solutes, ph, davies, pkw)

    low, high = (np.full(davies.shape, edge) for edge in _PH_RANGE)
    halvings = _BISECTIONS
    if near is not None:
        left, right = near - _NEIGHBOURHOOD, near + _NEIGHBOURHOOD
        inside = (net(left) > 0.0) & (net(right) <= 0.0)
        low, high = np.where(inside, left, low), np.where(inside, right, high)
        halvings = 0 if bool(inside.all()) else _BISECTIONS
    for _ in range(halvings):
        middle = 0.5 * (low + high)
        positive = net(middle) > 0.0
        low, high = np.where(positive, middle, low), np.where(positive, high, middle)
    above, below, ph, side = net(low), net(high), low, np.zeros(low.shape)
    for _ in range(_POLISHINGS):
        span = above - below
        share = np.where(span > 0.0, above / np.where(span > 0.0, span, 1.0), 0.5)
        previous, ph = ph, low + share * (high - low)
        if float(np.max(np.abs(ph - previous))) < _STEP:
            break
        value = net(ph)
        positive = value > 0.0
        # The end that stays put twice is given half its weight, or it would never move.
        below = np.where(positive & (side > 0), 0.5 * below, below)
        above = np.where(~positive & (side < 0), 0.5 * above, above)
        low, above = np.where(positive, ph, low), np.where(positive, value, above)
        high, below = np.where(positive, high, ph), np.where(positive, below, value)
        side = np.where(positive, 1.0, -1.0)
    return ph


def solve(
    solutes: Sequence[Solute],
    temperature_c: float = REFERENCE_C,
    ionic_strength_m: float | None = None,
) -> Equilibrium:
    """The pH of a mixture from its full charge balance.

    Parameters
    ----------
    solutes : sequence of Solute
        Everything dissolved with strong ions included; names differ.
    temperature_c : float
        Temperature [degC], 10 to 40; constants are taken as given.
    ionic_strength_m : float, optional
        Ionic strength held by an inert salt [mol/L], 0 to 0.5; left out, that of the ions present.

    Returns
    -------
    Equilibrium

    Raises
    ------
    ValueError
        Where two solutes share a name, or the prescribed ionic strength or temperature is out of range.
    NotConverged
        Where pH and ionic strength do not settle together.

    Notes
    -----
    Butler, J. N. *Ionic Equilibrium: Solubility and pH Calculations*; Wiley, 1998.  Activities:
    `qsar.conditions`.
    """
    if len({item.name for item in solutes}) != len(solutes):
        raise ValueError("two solutes share a name")
    n = max(max(item.concentration_m.size, item.pka.shape[0]) for item in solutes)
    pkw = water_pkw(temperature_c)
    fixed = None if ionic_strength_m is None else np.full(n, float(ionic_strength_m))
    strength = np.zeros(n) if fixed is None else fixed
    near: Floats | None = None
    for _ in range(_ROUNDS):
        # Beyond the reach of Davies the coefficients stay at the limit; `beyond_davies` tells.
        davies = davies_term(
            strength if fixed is not None else np.minimum(strength, DAVIES_LIMIT_M), temperature_c
        )
        ph = _root(solutes, davies, pkw, near)
        hydrogen, hydroxide = _water_ions(ph, davies, pkw)
        states = {item.name: item.in_water(ph, davies) for item in solutes}
        own = 0.5 * (hydrogen + hydroxide + sum(states[item.name] @ item.charges**2 for item in solutes))
        settled = near is not None and bool(np.all(np.abs(ph - near) < _TOLERANCE))
        if fixed is not None or settled:
            return Equilibrium(ph, strength if fixed is not None else own, own, states, hydrogen, hydroxide)
        near, strength = ph, own
    raise NotConverged("pH and ionic strength did not settle; check the amounts")


def buffer_capacity(result: Equilibrium, solutes: Sequence[Solute]) -> Floats:
    r"""Buffer capacity of a solved batch [mol/(L pH)], shape (n_cases,).

    .. math::

        \beta = \ln 10 \, \Big( [H^+] + [OH^-]
            + \sum_i C_i (\langle z^2 \rangle_i - \langle z \rangle_i^2) \Big)

    Notes
    -----
    Van Slyke, D. D. *J. Biol. Chem.* **1922**, 52, 525-570, written for any number of steps through the
    variance of the charge; at constant ionic strength, solutes in one phase.
    """
    total = result.hydrogen_m + result.hydroxide_m
    for item in solutes:
        states = result.in_water[item.name]
        amount = states.sum(axis=1)
        share = states / np.where(amount > 0.0, amount, 1.0)[:, None]
        mean = share @ item.charges
        total = total + amount * (share @ item.charges**2 - mean**2)
    return np.asarray(_LN10 * total)
