"""Is the acid ionised at a pH, and which pH is sure to ionise it: the choice behind a speciation curve."""

from __future__ import annotations

from statistics import NormalDist

import numpy as np

from qsar.conditions import REFERENCE_C, from_thermodynamic
from qsar.decisions.speciation import conditional, fractions, ph_at_fraction
from qsar.decisions.steps import AcidSteps
from qsar.decisions.worth_measuring import DEFAULT_RISK, Verdict, choice_verdict

_USUAL_MEASUREMENT = 0.10
_Z95 = NormalDist().inv_cdf(0.975)


def _flip(acid: AcidSteps, ph: float, fraction: float, step: int, strength: float, celsius: float) -> float:
    """Thermodynamic constant of `step` (from 1) at which exactly `fraction` has lost that proton at `ph`.

    With the other steps at their estimates, the states with fewer protons lost weigh ``1 + ...`` against
    those with more, and the constant of the step scales one side only.
    """
    z = acid.charge_of_acid_form
    mixed = conditional(np.array(acid.pka), z, strength, celsius)
    share = fractions(ph, mixed)
    lost, kept = float(share[step:].sum()), float(share[:step].sum())
    shift = np.log10(lost / kept) - np.log10(fraction / (1.0 - fraction))
    # A constant raised by `shift` divides the weight of every state beyond the step by 10**shift.
    flipped = mixed[step - 1] + shift
    return float(flipped - (from_thermodynamic(0.0, z - step + 1, strength, "mixed", celsius)))


def ionised_verdict(
    acid: AcidSteps,
    ph: float,
    fraction: float = 0.99,
    step: int = 1,
    ionic_strength_m: float = 0.0,
    temperature_c: float = REFERENCE_C,
    risk: float = DEFAULT_RISK,
) -> Verdict:
    """Verdict on whether at least `fraction` has lost `step` protons at `ph`.

    Parameters
    ----------
    acid : AcidSteps
        Constants at `temperature_c`.
    ph : float
    fraction : float
        Between 0 and 1.
    step : int
        Protons lost, from 1.
    ionic_strength_m : float
        Ionic strength [mol/L], 0 to 0.5.
    temperature_c : float
        Temperature [degC].
    risk : float
        Accepted probability of being wrong.

    Raises
    ------
    ValueError
        For a fraction, step or condition out of range.
    """
    ph_at_fraction(np.array(acid.pka), fraction, step)  # refuses what is out of range
    z = acid.charge_of_acid_form
    flip = _flip(acid, ph, fraction, step, ionic_strength_m, temperature_c)
    drawn = fractions(np.array(ph), conditional(acid.draws(), z, ionic_strength_m, temperature_c))
    enough = float(np.mean(drawn[:, step:].sum(axis=1) >= fraction))
    k = step - 1
    what = (
        f"{100 * fraction:g} % of {acid.name} has lost {step} proton{'s' if step > 1 else ''} at pH {ph:.2f}"
    )
    if acid.pka[k] <= flip:
        name, holds, wrong = f"That at least {what}", (-np.inf, flip), 1.0 - enough
    else:
        name, holds, wrong = f"That less than {what}", (flip, np.inf), enough
    ranges = [((-np.inf, np.inf),) for _ in acid.pka]
    ranges[k] = (holds,)
    return choice_verdict(name, acid.pka, acid.sd.tolist(), ranges, wrong, risk)


def safe_ph(
    acid: AcidSteps,
    fraction: float = 0.99,
    step: int = 1,
    ionic_strength_m: float = 0.0,
    temperature_c: float = REFERENCE_C,
    risk: float = DEFAULT_RISK,
) -> tuple[float, Verdict]:
    """The pH that is sure to ionise `fraction`, and what a measurement would save.

    Parameters
    ----------
    acid, fraction, step, ionic_strength_m, temperature_c, risk
        As in `ionised_verdict`.

    Returns
    -------
    tuple of (float, Verdict)
        The pH ionises `fraction` with a probability of ``1 - risk``.
    """
    z = acid.charge_of_acid_form

    def sure(steps: AcidSteps) -> float:
        draws = conditional(steps.draws(), z, ionic_strength_m, temperature_c)
        return float(np.quantile(ph_at_fraction(draws, fraction, step), 1.0 - risk))

    now = sure(acid)
    flip = _flip(acid, now, fraction, step, ionic_strength_m, temperature_c)
    pka, sd = acid.pka[step - 1], float(acid.sd[step - 1])
    after = sure(acid.measured_at(step - 1, _USUAL_MEASUREMENT / _Z95))
    if now - after < 0.05:
        saving = f"measuring to ± {_USUAL_MEASUREMENT:g} would move that pH by less than 0.05"
    else:
        saving = (
            f"a measurement to ± {_USUAL_MEASUREMENT:g} that confirms {pka:.2f} would let pH {after:.2f} do, "
            f"{now - after:.2f} lower"
        )
    sentence = (
        f"To be {100 * (1 - risk):g} % sure of {100 * fraction:g} %, set pH {now:.2f}, which does for any "
        f"pKa below {flip:.2f} (now {pka:.2f} ± {_Z95 * sd:.2f}, 95 %); {saving}."
    )
    return now, Verdict(f"pH {now:.2f}", step, pka, sd, ((-np.inf, flip),), risk, None, sentence)
