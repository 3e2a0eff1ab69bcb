"""A systematic offset between a user's measurements and the reference table."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from qsar.curation.duplicates import weighted_median
from qsar.descriptors import LOWERS
from qsar.model.kernel import KernelTrend, Scaling, fit_trend
from qsar.model.members import START_NEUTRAL, Settings
from qsar.model.training_set import TrainingSet, latent_targets, training_set
from qsar.table import Measurement

ENOUGH_SHARED = 5
REPEATS = 2000
COVERAGE = 0.95
_MODEL_ERROR = 0.15  # pKa units; standard deviation of the trend for an acid that it does not know


@dataclass(frozen=True)
class Offset:
    """In-house minus reference, pKa units.

    Attributes
    ----------
    value, low, high : float
        Weighted median and its 95 % interval, by resampling acids.
    method : str
        "shared acids" where enough acids are in both tables, else "expectation".
    acids : int
        Acids that it rests on.
    """

    value: float
    low: float
    high: float
    method: str
    acids: int

    @property
    def is_clear(self) -> bool:
        """Whether the interval leaves out zero."""
        return self.low > 0.0 or self.high < 0.0

    @property
    def sentence(self) -> str:
        """One line for the user."""
        how = (
            f"over {self.acids} acids that both tables hold"
            if self.method == "shared acids"
            else f"over {self.acids} acids, against what the reference table alone makes expect; a series that the "
            "model misjudges as a whole would look the same"
        )
        verdict = "the interval leaves out zero" if self.is_clear else "no offset is shown: the interval holds zero"
        return f"in-house minus reference {self.value:+.3f} ({self.low:+.3f} to {self.high:+.3f}) {how}; {verdict}"


def fit_plain_trend(data: TrainingSet, settings: Settings) -> KernelTrend:
    """Fit the trend alone on all measurements, which takes a second where a full training takes a minute."""
    free, lowers = data.x[:, ~LOWERS], data.x[:, LOWERS]
    scaling = Scaling.of(free)
    micro = np.full(len(data.x), START_NEUTRAL)
    wanted = np.ones(len(data.pka), dtype=bool)
    trend: KernelTrend | None = None
    for _ in range(max(settings.rounds, 1)):
        t = latent_targets(data, micro, wanted)
        trend = fit_trend(free[t.edge], lowers[t.edge], t.value, t.variance, settings.kernel, scaling)
        micro = trend.predict(free, lowers)
    assert trend is not None
    return trend


def estimate_offset(
    reference: Sequence[Measurement], own: Sequence[Measurement], settings: Settings | None = None, seed: int = 1
) -> Offset | None:
    """Estimate how far in-house rows lie from the reference as a whole.

    Parameters
    ----------
    reference, own : sequence of Measurement
    settings : Settings, optional
    seed : int
        For the resampling.

    Returns
    -------
    Offset or None
        None where `own` holds fewer than `ENOUGH_SHARED` acids.
    """
    known = {(m.acid.smiles, m.step): m for m in reference}
    pairs = [(m, known[m.acid.smiles, m.step]) for m in own if (m.acid.smiles, m.step) in known]
    shared = {m.acid.smiles for m, _ in pairs}
    if len(shared) >= ENOUGH_SHARED:
        difference = np.array([a.pka - b.pka for a, b in pairs])
        variance = np.array([a.uncertainty**2 + b.uncertainty**2 for a, b in pairs])
        return _offset(difference, variance, [a.acid.smiles for a, _ in pairs], "shared acids", seed)
    if len({m.acid.smiles for m in own}) < ENOUGH_SHARED:
        return None
    trend = fit_plain_trend(training_set(reference), settings or Settings())
    data = training_set(own)
    expected = data.steps(trend.predict(data.x[:, ~LOWERS], data.x[:, LOWERS]))
    return _offset(
        data.pka - expected,
        data.uncertainty**2 + _MODEL_ERROR**2,
        [data.acids[a].smiles for a in data.step_acid],
        "expectation",
        seed,
    )


def _offset(
    difference: NDArray[np.float64], variance: NDArray[np.float64], acid: Sequence[str], method: str, seed: int
) -> Offset:
    weight = 1.0 / (variance + 0.02**2)  # no row is trusted beyond 0.02
    names, position = np.unique(np.array(acid), return_inverse=True)
    rows = [np.flatnonzero(position == k) for k in range(len(names))]
    rng = np.random.default_rng(seed)
    values = np.empty(REPEATS)
    for r in range(REPEATS):
        drawn = np.concatenate([rows[k] for k in rng.integers(len(names), size=len(names))])
        values[r] = weighted_median(difference[drawn], weight[drawn])
    low, high = np.quantile(values, [(1.0 - COVERAGE) / 2.0, (1.0 + COVERAGE) / 2.0])
    return Offset(weighted_median(difference, weight), float(low), float(high), method, len(names))


def without_offset(measurements: Sequence[Measurement], offset: Offset) -> list[Measurement]:
    """The measurements with the offset taken off."""
    return [replace(m, pka=m.pka - offset.value) for m in measurements]
