r"""Which acids to measure next: those that would tell the model most about a chemistry.

The trend of a model is a Gaussian process, so that the variance of what it says is known, and so is how much a new
measurement would take off it anywhere, whatever its outcome. Candidates are picked one after another by the variance
that each would take off the target acids on average (Cohn, Neural Networks 1996, 9, 1071; Seo, Wallat, Graepel &
Obermayer, IJCNN 2000):

.. math:: g(c) = \frac{1}{|T|} \sum_{t \in T} \frac{\mathrm{cov}(t, c)^2}{\mathrm{var}(c) + \sigma^2}

A candidate scores high where it is uncertain itself, resembles many targets, and says what those picked before it do
not say.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from qsar.descriptors import LOWERS
from qsar.ionisation import edge_descriptors
from qsar.model.kernel import KernelSettings, Scaling, covariance
from qsar.model.model import Model
from qsar.structures import Acid

Floats = NDArray[np.float64]

MOST_CANDIDATES = 20_000
MOST_TARGETS = 1_000
SLOPE = 0.3  # pKa units; prior standard deviation of the slope along one constrained column
MEASUREMENT = 0.05  # pKa units; standard uncertainty of the new measurement


@dataclass(frozen=True)
class Space:
    """Acids as the trend sees them.

    Attributes
    ----------
    free : ndarray, shape (n, n_free)
        Scaled free descriptors.
    lowers : ndarray, shape (n, n_lowers)
        Constrained descriptors.
    """

    free: Floats
    lowers: Floats

    def __len__(self) -> int:
        return len(self.free)

    def rows(self, chosen: Sequence[int] | NDArray[np.int64]) -> Space:
        """Some of the acids."""
        return Space(self.free[chosen], self.lowers[chosen])

    def covariance(self, other: Space, settings: KernelSettings) -> Floats:
        """Prior covariance with other acids, shape (n, n_other)."""
        result: Floats = covariance(self.free, other.free, settings) + SLOPE**2 * self.lowers @ other.lowers.T
        return result


@dataclass(frozen=True)
class Pick:
    """A candidate that was chosen.

    Attributes
    ----------
    index : int
        Among the candidates.
    spread : float
        Standard deviation of the trend there after the picks before it, pKa units.
    gain : float
        Root of the mean variance that it takes off the targets, pKa units.
    """

    index: int
    spread: float
    gain: float


def choose(
    known: Space,
    candidates: Space,
    targets: Space,
    count: int,
    settings: KernelSettings,
    done: Callable[[int], object] = lambda _: None,
) -> list[Pick]:
    """Pick candidates one after another.

    Parameters
    ----------
    known : Space
        Measured steps.
    candidates : Space
    targets : Space
        The chemistry that the model shall be good at.
    count : int
        How many to pick.
    settings : KernelSettings
    done : callable
        Called with 1 after each pick.

    Returns
    -------
    list of Pick
        Best first; at most as many as there are candidates.
    """
    from scipy.linalg import cho_factor, cho_solve

    noise = settings.noise**2 + MEASUREMENT**2
    factor = cho_factor(known.covariance(known, settings) + noise * np.eye(len(known)), lower=True)
    of_candidates = candidates.covariance(known, settings)
    solved = cho_solve(factor, of_candidates.T)
    joint = targets.covariance(candidates, settings) - targets.covariance(known, settings) @ solved
    prior = np.array(
        [float(candidates.rows([i]).covariance(candidates.rows([i]), settings)[0, 0]) for i in range(len(candidates))]
    )
    variance = np.maximum(prior - np.einsum("ij,ji->i", of_candidates, solved), 1e-9)
    open_ = np.ones(len(candidates), dtype=bool)
    earlier: list[Floats] = []
    picks = []
    for _ in range(min(count, len(candidates))):
        gain = (joint**2).mean(axis=0) / (variance + noise)
        best = int(np.argmax(np.where(open_, gain, -np.inf)))
        picks.append(Pick(best, math.sqrt(variance[best]), math.sqrt(gain[best])))
        one = candidates.rows([best])
        with_best = (candidates.covariance(one, settings) - of_candidates @ solved[:, [best]])[:, 0]
        for u in earlier:
            with_best -= u * u[best]
        scale = math.sqrt(variance[best] + noise)
        own = with_best / scale
        joint -= np.outer(joint[:, best] / scale, own)
        variance = np.maximum(variance - own**2, 1e-9)
        earlier.append(own)
        open_[best] = False
        done(1)
    return picks


def space_of(acids: Sequence[Acid], scaling: Scaling) -> Space:
    """Acids at the proton that leaves first (see :func:`qsar.estimators.first_edge`)."""
    from qsar.estimators import first_edge

    x = np.array([edge_descriptors(a)[first_edge(a)] for a in acids])
    return Space(scaling(x[:, ~LOWERS]), x[:, LOWERS])


def measured_space(model: Model) -> tuple[Space, NDArray[np.bool_]]:
    """The measured steps of a model, and which columns the model responds to (the others are not stored)."""
    weights = model.neighbours.weights
    used = weights > 1e-9
    points = np.where(used, model.neighbours.points / np.where(used, weights, 1.0), 0.0)
    free = int((~LOWERS).sum())
    return Space(points[:, :free], points[:, free:]), used


def suggest(
    model: Model,
    candidates: Sequence[Acid],
    targets: Sequence[Acid] = (),
    count: int = 10,
    seed: int = 1,
    done: Callable[[int], object] = lambda _: None,
) -> list[Pick]:
    """Pick acids to measure next.

    Parameters
    ----------
    model : Model
    candidates : sequence of Acid
        At most `MOST_CANDIDATES`; none that the model was trained on.
    targets : sequence of Acid
        The chemistry that the model shall be good at; the candidates where empty. Beyond `MOST_TARGETS` a random
        sample is taken.
    count : int
    seed : int
        Of that sample.
    done : callable
        Called with 1 after each pick.

    Returns
    -------
    list of Pick
    """
    known, used = measured_space(model)
    free = int((~LOWERS).sum())

    def seen(acids: Sequence[Acid]) -> Space:
        space = space_of(acids, model.members.scaling)
        return Space(space.free * used[:free], space.lowers * used[free:])

    pool = seen(candidates)
    aim = seen(targets) if targets else pool
    if len(aim) > MOST_TARGETS:
        aim = aim.rows(np.sort(np.random.default_rng(seed).permutation(len(aim))[:MOST_TARGETS]))
    return choose(known, pool, aim, count, model.members.settings.kernel, done)
