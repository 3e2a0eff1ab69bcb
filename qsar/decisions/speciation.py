"""Fractions of the protonation states, charge and log D against pH, with a band from the pKa interval."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from qsar.conditions import REFERENCE_C, pka_shift
from qsar.decisions.steps import AcidSteps

Floats = NDArray[np.float64]

DEFAULT_PH = np.round(np.arange(0.0, 14.0 + 1e-9, 0.1), 10)
_SEARCH_PH = (-6.0, 20.0)


def conditional(
    pka: Floats, charge_of_acid_form: int, ionic_strength_m: float = 0.0, temperature_c: float = REFERENCE_C
) -> Floats:
    """Mixed constants at an ionic strength, to be used with a pH; last axis of `pka` is the step.

    Raises
    ------
    ValueError
        For an ionic strength outside 0 to 0.5 mol/L.
    """
    charges = charge_of_acid_form - np.arange(pka.shape[-1])
    return pka + pka_shift(charges, ionic_strength_m, "mixed", temperature_c)


def fractions(ph: ArrayLike, pka: ArrayLike) -> Floats:
    """Fraction of each protonation state from macroscopic constants.

    Parameters
    ----------
    ph : array_like, shape (...)
        pH.
    pka : array_like, shape (..., n_steps)
        Constants that belong to the medium; leading axes broadcast against `ph`.

    Returns
    -------
    ndarray, shape (..., n_steps + 1)
        Most protonated state first; sums to one.

    Notes
    -----
    Terms of the binding polynomial (Bjerrum 1923): the state that lost *j* protons has weight
    :math:`10^{j\\,pH - \\sum_{i \\le j} pK_i}`.

    Examples
    --------
    >>> fractions(4.76, [4.76]).tolist()
    [0.5, 0.5]
    """
    constants = np.asarray(pka, dtype=float)
    total = np.concatenate([np.zeros((*constants.shape[:-1], 1)), np.cumsum(constants, axis=-1)], axis=-1)
    exponent = np.arange(total.shape[-1]) * np.asarray(ph, dtype=float)[..., None] - total
    weight = 10.0 ** (exponent - exponent.max(axis=-1, keepdims=True))
    return np.asarray(weight / weight.sum(axis=-1, keepdims=True))


def average_charge(ph: ArrayLike, pka: ArrayLike, charge_of_acid_form: int) -> Floats:
    """Mean charge of all forms; arguments as in `fractions`."""
    share = fractions(ph, pka)
    return np.asarray(share @ (charge_of_acid_form - np.arange(share.shape[-1], dtype=float)))


def ph_at_fraction(pka: ArrayLike, fraction: float, step: int = 1) -> Floats:
    """The pH at which a given fraction has lost at least `step` protons.

    Parameters
    ----------
    pka : array_like, shape (..., n_steps)
        Constants that belong to the medium.
    fraction : float
        Between 0 and 1, both excluded.
    step : int
        Counts from 1.

    Returns
    -------
    ndarray, shape (...)

    Raises
    ------
    ValueError
        For a fraction or a step out of range.

    Examples
    --------
    >>> round(float(ph_at_fraction([4.76], 0.99)), 2)
    6.76
    """
    constants = np.asarray(pka, dtype=float)
    if not 0.0 < fraction < 1.0:
        raise ValueError(f"fraction {fraction:g}: a number between 0 and 1, both excluded, is expected")
    if not 1 <= step <= constants.shape[-1]:
        raise ValueError(f"step {step}: the acid has {constants.shape[-1]}")
    low = np.full(constants.shape[:-1], _SEARCH_PH[0])
    high = np.full(constants.shape[:-1], _SEARCH_PH[1])
    for _ in range(60):
        middle = 0.5 * (low + high)
        below = fractions(middle, constants)[..., step:].sum(axis=-1) < fraction
        low, high = np.where(below, middle, low), np.where(below, high, middle)
    return np.asarray(0.5 * (low + high))


def log_d(ph: ArrayLike, pka: ArrayLike, charge_of_acid_form: int, log_p: float) -> Floats:
    """log10 of the distribution ratio when only the form without net charge enters the organic phase.

    Parameters
    ----------
    ph, pka, charge_of_acid_form
        As in `average_charge`.
    log_p : float
        log10 of the partition coefficient of the form without net charge.

    Raises
    ------
    ValueError
        When no state is without net charge.

    Notes
    -----
    Ion pairs are left out; for carboxylates beside inorganic cations they set a floor about 3 to 4 units
    below log P in octanol (common practice, no source).
    """
    share = fractions(ph, pka)
    if not 0 <= charge_of_acid_form < share.shape[-1]:
        raise ValueError("no form of this acid is without charge, so it has no log D of this kind")
    with np.errstate(divide="ignore"):
        return np.asarray(log_p + np.log10(share[..., charge_of_acid_form]))


@dataclass(frozen=True)
class LogP:
    """A log P with where it comes from."""

    value: float
    label: str


def log_p_of(acid: AcidSteps, given: float | None) -> LogP | None:
    """The log P that the user gives, or RDKit's Crippen value, labelled as such.

    Returns None where neither applies (no structure, or a zwitterion, for which an atom-additive log P says
    nothing).

    Notes
    -----
    Wildman, S. A.; Crippen, G. M. *J. Chem. Inf. Comput. Sci.* **1999**, 39, 868-873,
    doi:10.1021/ci990307l; standard error 0.68 there.
    """
    if given is not None:
        return LogP(float(given), "log P as given")
    if not acid.smiles or acid.charge_of_acid_form != 0:
        return None
    from rdkit import Chem
    from rdkit.Chem import rdMolDescriptors

    mol = Chem.MolFromSmiles(acid.smiles)
    if mol is None:
        return None
    return LogP(
        float(rdMolDescriptors.CalcCrippenDescriptors(mol)[0]),
        "log P estimated by Crippen atom contributions, standard error 0.7",
    )


@dataclass(frozen=True)
class Band:
    """A curve over pH with the ends of its band; arrays of one shape, pH first."""

    value: Floats
    low: Floats
    high: Floats


@dataclass(frozen=True)
class Speciation:
    """Curves of an acid over pH.

    Attributes
    ----------
    acid : AcidSteps
        Constants at the temperature of the curves, zero ionic strength.
    ph : ndarray, shape (n,)
    fraction : Band
        Arrays of shape (n, n_steps + 1), most protonated state first.
    charge, log_d : Band
        Arrays of shape (n,); `log_d` is None without a log P.
    log_p : LogP or None
    ionic_strength_m, temperature_c : float
        Conditions [mol/L], [degC].
    """

    acid: AcidSteps
    ph: Floats
    fraction: Band
    charge: Band
    log_d: Band | None
    log_p: LogP | None
    ionic_strength_m: float
    temperature_c: float


def speciation(
    acid: AcidSteps,
    ph: ArrayLike = DEFAULT_PH,
    ionic_strength_m: float = 0.0,
    temperature_c: float = REFERENCE_C,
    log_p: LogP | None = None,
) -> Speciation:
    """Curves with bands that hold the acid's coverage at each pH.

    Parameters
    ----------
    acid : AcidSteps
        Constants at `temperature_c` (see `acids.at_temperature`).
    ph : array_like, shape (n,)
        pH values.
    ionic_strength_m : float
        Ionic strength [mol/L], 0 to 0.5.
    temperature_c : float
        Temperature [degC] for the activity coefficients.
    log_p : LogP, optional
        For the log D curve.

    Raises
    ------
    ValueError
        For an ionic strength outside 0 to 0.5 mol/L.
    """
    grid = np.asarray(ph, dtype=float)
    z = acid.charge_of_acid_form
    centre = conditional(np.array(acid.pka), z, ionic_strength_m, temperature_c)
    draws = conditional(acid.draws(1000), z, ionic_strength_m, temperature_c)[:, None, :]
    tails = [0.5 - acid.coverage / 2.0, 0.5 + acid.coverage / 2.0]

    def band(value: Floats, sample: Floats) -> Band:
        low, high = np.quantile(sample, tails, axis=0)
        return Band(value, np.minimum(low, value), np.maximum(high, value))

    share = band(fractions(grid, centre), fractions(grid, draws))
    charge = band(average_charge(grid, centre, z), average_charge(grid, draws, z))
    distribution = None
    if log_p is not None and 0 <= z <= len(acid.pka):
        distribution = band(log_d(grid, centre, z, log_p.value), log_d(grid, draws, z, log_p.value))
    return Speciation(acid, grid, share, charge, distribution, log_p, ionic_strength_m, temperature_c)


def ph_band_at_fraction(
    acid: AcidSteps,
    fraction: float,
    step: int = 1,
    ionic_strength_m: float = 0.0,
    temperature_c: float = REFERENCE_C,
) -> tuple[float, float, float]:
    """The pH at a fraction (`ph_at_fraction`) with the ends of its interval: value, low, high."""
    z = acid.charge_of_acid_form
    centre = conditional(np.array(acid.pka), z, ionic_strength_m, temperature_c)
    draws = conditional(acid.draws(1000), z, ionic_strength_m, temperature_c)
    tails = [0.5 - acid.coverage / 2.0, 0.5 + acid.coverage / 2.0]
    low, high = np.quantile(ph_at_fraction(draws, fraction, step), tails)
    return float(ph_at_fraction(centre, fraction, step)), float(low), float(high)


def charge_label(charge: int) -> str:
    """Charge in words.

    Examples
    --------
    >>> charge_label(-2)
    'charge -2'
    """
    return f"charge {charge:+d}" if charge else "charge 0"


def state_label(charge: int, lost: int) -> str:
    """Name of a protonation state by its charge and the protons lost.

    Examples
    --------
    >>> state_label(-2, 2)
    'charge -2 (2 protons lost)'
    """
    return f"{charge_label(charge)} ({lost} proton{'' if lost == 1 else 's'} lost)"
