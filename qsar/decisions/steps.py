"""An acid as its macroscopic steps, each with an interval read as a normal distribution."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass, replace
from statistics import NormalDist

import numpy as np
from numpy.typing import NDArray

from qsar.conditions import GAS_CONSTANT, REFERENCE_C, ZERO_CELSIUS, check_temperature, van_t_hoff
from qsar.errors import UserError

Floats = NDArray[np.float64]

MEASURED_SD = 0.05
"""Standard uncertainty given to a measured constant (common practice between laboratories, no source)."""

CARBOXYL_ENTHALPY_KJ_MOL = 0.0
CARBOXYL_ENTHALPY_SD_KJ_MOL = 3.5
"""Enthalpy of ionisation taken for a carboxyl step when none is given, with its spread.

Goldberg, Kishore & Lennen, J. Phys. Chem. Ref. Data 2002, 31, 231-370, doi:10.1063/1.1416902: acetic -0.4,
citric 4.1, 2.2 and -3.4, oxalic -3.9 and -7.0, phthalic -2.7 and -2.2, succinic 3.0 and -0.5, tartaric 3.2
and 0.9 kJ/mol (from memory); their root mean square is 3.4 kJ/mol.
"""

_SIMULATED_DRAWS = 2000


class UnusableAcid(UserError):
    """An acid that no decision can be made for; the message is one line that says why."""

    exit_status = 3


@dataclass(frozen=True)
class AcidSteps:
    """An acid as macroscopic dissociation steps with intervals.

    Attributes
    ----------
    name : str
        What the user calls it.
    smiles : str
        Structure; empty when only constants were given.
    pka, low, high : tuple of float
        Thermodynamic constants of the steps in the order in which protons leave, with the ends of their
        intervals.
    coverage : float
        Fraction of cases that the intervals are meant to hold, in (0, 1).
    charge_of_acid_form : int
        Charge of the form that still carries every proton counted here.
    origin : str
        ``"predicted"``, ``"measured"`` or ``"given"``.
    notes : tuple of str
        What the user should know about the numbers, a line each.

    Raises
    ------
    ValueError
        When the tuples differ in length, are empty, hold no finite numbers, or an interval does not hold
        its value.

    Notes
    -----
    The interval is read as a normal distribution around `pka` with standard deviation ``(high - low) / (2
    z)``, *z* the two-sided normal quantile of `coverage`.
    """

    name: str
    smiles: str
    pka: tuple[float, ...]
    low: tuple[float, ...]
    high: tuple[float, ...]
    coverage: float
    charge_of_acid_form: int
    origin: str = "predicted"
    notes: tuple[str, ...] = ()

    def __post_init__(self) -> None:
        if not self.pka or not len(self.pka) == len(self.low) == len(self.high):
            raise ValueError(f"{self.name}: pka, low and high need the same number of steps, at least one")
        if not 0.0 < self.coverage < 1.0:
            raise ValueError(f"{self.name}: coverage {self.coverage:g} is not between 0 and 1")
        for step, (low, value, high) in enumerate(zip(self.low, self.pka, self.high, strict=True), start=1):
            if not (all(map(math.isfinite, (low, value, high))) and low <= value <= high):
                raise ValueError(
                    f"{self.name}, step {step}: {low:g} <= {value:g} <= {high:g} is not an interval"
                )

    @property
    def sd(self) -> Floats:
        """Standard deviation of each step, shape (n_steps,)."""
        quantile = NormalDist().inv_cdf(0.5 + self.coverage / 2.0)
        return np.asarray((np.array(self.high) - np.array(self.low)) / (2.0 * quantile))

    @property
    def charges(self) -> NDArray[np.int_]:
        """Charge of each protonation state, most protonated first, shape (n_steps + 1,)."""
        return self.charge_of_acid_form - np.arange(len(self.pka) + 1)

    def draws(self, n: int = _SIMULATED_DRAWS, seed: int = 0) -> Floats:
        """Constants drawn from the intervals, shape (n, n_steps), each row in ascending order.

        Parameters
        ----------
        n : int
            Number of draws.
        seed : int
            Seed of the pairing of steps; the same seed gives the same draws.

        Notes
        -----
        Latin hypercube sampling (McKay, Beckman & Conover, *Technometrics* **1979**, 21, 239): each step is
        drawn at the *n* middle quantiles of its own distribution, so that one step alone is sampled without
        noise.  Steps vary independently.
        """
        normal = NormalDist()
        scores = np.array([normal.inv_cdf((i + 0.5) / n) for i in range(n)])
        random = np.random.default_rng(seed)
        columns = [scores if k == 0 else random.permutation(scores) for k in range(len(self.pka))]
        return np.sort(np.array(self.pka) + np.column_stack(columns) * self.sd, axis=1)

    def measured_at(self, step: int, sd: float) -> AcidSteps:
        """Return the acid after a measurement of `step` (from 0) confirms its value with deviation `sd`."""
        half = NormalDist().inv_cdf(0.5 + self.coverage / 2.0) * sd
        low, high = list(self.low), list(self.high)
        low[step], high[step] = self.pka[step] - half, self.pka[step] + half
        return replace(self, low=tuple(low), high=tuple(high))


def given_steps(
    name: str,
    pka: Sequence[float],
    sd: float = MEASURED_SD,
    coverage: float = 0.9,
    charge_of_acid_form: int = 0,
    smiles: str = "",
    origin: str = "given",
    notes: tuple[str, ...] = (),
) -> AcidSteps:
    """Steps from known constants with a common standard deviation.

    Parameters
    ----------
    name, smiles : str
        As in `AcidSteps`.
    pka : sequence of float
        Constants in any order.
    sd : float
        Standard deviation of each constant.
    coverage : float
        Coverage of the intervals to be formed.
    charge_of_acid_form : int
        Charge of the fully protonated form.
    origin, notes
        As in `AcidSteps`.

    Raises
    ------
    ValueError
        For a negative or infinite `sd`, or no constant.
    """
    if not (math.isfinite(sd) and sd >= 0.0):
        raise ValueError(f"{name}: a standard deviation of {sd:g} is not usable; give zero or more")
    half = NormalDist().inv_cdf(0.5 + coverage / 2.0) * sd
    values = tuple(sorted(float(p) for p in pka))
    low, high = tuple(p - half for p in values), tuple(p + half for p in values)
    return AcidSteps(name, smiles, values, low, high, coverage, charge_of_acid_form, origin, notes)


def at_temperature(
    acid: AcidSteps,
    temperature_c: float,
    enthalpy_kj_mol: Sequence[float] | None = None,
) -> AcidSteps:
    """The acid at another temperature by van 't Hoff, its interval widened by what the enthalpy leaves open.

    Parameters
    ----------
    acid : AcidSteps
        Constants at 25 degC.
    temperature_c : float
        Temperature [degC], 10 to 40.
    enthalpy_kj_mol : sequence of float, optional
        Enthalpy of each step [kJ/mol], or one for all; taken as exact.  Left out, a carboxyl step gets
        0 ± 3.5 kJ/mol (standard deviation).

    Raises
    ------
    ValueError
        Outside 10 to 40 degC, or where the number of enthalpies does not fit the number of steps.
    """
    check_temperature(temperature_c)
    n = len(acid.pka)
    if enthalpy_kj_mol is not None and len(enthalpy_kj_mol) not in (1, n):
        raise ValueError(
            f"{acid.name}: {len(enthalpy_kj_mol)} enthalpies for {n} steps; give one, or one a step"
        )
    if temperature_c == REFERENCE_C:
        return acid
    if enthalpy_kj_mol is None:
        values, spread = np.full(n, CARBOXYL_ENTHALPY_KJ_MOL), CARBOXYL_ENTHALPY_SD_KJ_MOL
        note = (
            f"{temperature_c:g} °C: enthalpy of ionisation not given, {CARBOXYL_ENTHALPY_KJ_MOL:g} ± "
            f"{spread:g} kJ/mol assumed for each carboxyl step (Goldberg, Kishore & Lennen 2002)"
        )
    else:
        values, spread = np.broadcast_to(np.array(enthalpy_kj_mol, dtype=float), (n,)), 0.0
        note = (
            f"{temperature_c:g} °C: van 't Hoff with {', '.join(f'{v:g}' for v in values)} kJ/mol as given"
        )
    inverse = 1.0 / (temperature_c + ZERO_CELSIUS) - 1.0 / (REFERENCE_C + ZERO_CELSIUS)
    extra = abs(1000.0 * spread / (GAS_CONSTANT * math.log(10.0)) * inverse)
    pka = van_t_hoff(acid.pka, values, temperature_c)
    half = NormalDist().inv_cdf(0.5 + acid.coverage / 2.0) * np.hypot(acid.sd, extra)
    return replace(
        acid,
        pka=tuple(pka.tolist()),
        low=tuple((pka - half).tolist()),
        high=tuple((pka + half).tolist()),
        notes=(*acid.notes, note),
    )
