"""A simulated campaign: does choosing acids by what they teach beat choosing them at random.

The reference table is dealt out, anew for each seed, to a start, a pool and a test. In each round both ways choose the
same number of acids from the pool without looking at their values, the trend is fitted again, and the error on the
test acids is measured.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from qsar.descriptors import LOWERS
from qsar.estimators import first_edge
from qsar.model.members import Settings
from qsar.model.offset import fit_plain_trend
from qsar.model.suggestion import Space, choose
from qsar.model.training_set import TrainingSet, training_set
from qsar.table import Measurement
from qsar.validation.splits import subset

Floats = NDArray[np.float64]
Ints = NDArray[np.int64]


@dataclass(frozen=True)
class Plan:
    """Size of a campaign: acids at the start, for the test, and chosen in each round."""

    start: int = 100
    test: int = 300
    batch: int = 25
    rounds: int = 4
    seeds: int = 8


@dataclass(frozen=True)
class Outcome:
    """Mean absolute errors, each of shape (n_seeds, n_rounds + 1).

    Attributes
    ----------
    acids : ndarray of int, shape (n_rounds + 1,)
        Acids trained on.
    """

    acids: Ints
    suggested: Floats
    random: Floats

    @property
    def difference(self) -> tuple[float, float]:
        """Suggested minus random after the last round: mean over seeds and its standard error."""
        d = self.suggested[:, -1] - self.random[:, -1]
        return float(d.mean()), float(d.std(ddof=1) / np.sqrt(len(d)))

    @property
    def sentence(self) -> str:
        """The outcome in one line."""
        value, error = self.difference
        first, last = int(self.acids[0]), int(self.acids[-1])
        ends = (
            f"{self.suggested[:, -1].mean():.3f} with suggested and {self.random[:, -1].mean():.3f} with random acids"
        )
        return (
            f"from {first} to {last} acids, {len(self.random)} seeds: error {self.random[:, 0].mean():.3f} at the "
            f"start, {ends}; difference {value:+.3f}, standard error {error:.3f}"
        )


def simulate(
    measurements: Sequence[Measurement],
    plan: Plan | None = None,
    settings: Settings | None = None,
    done: Callable[[int], object] = lambda _: None,
) -> Outcome:
    """Run the campaign for every seed and both ways of choosing.

    Parameters
    ----------
    measurements : sequence of Measurement
    plan : Plan, optional
    settings : Settings, optional
    done : callable
        Called with 1 after each seed.
    """
    plan, settings = plan or Plan(), settings or Settings()
    data = training_set(measurements)
    x = data.x[[data.first[a] + first_edge(acid) for a, acid in enumerate(data.acids)]]
    suggested, by_chance = [], []
    for seed in range(plan.seeds):
        rng = np.random.default_rng(seed)
        order = rng.permutation(len(data.acids))
        test, rest = order[: plan.test], order[plan.test :]
        suggested.append(_run(data, x, test, rest, plan, settings, None))
        by_chance.append(_run(data, x, test, rest, plan, settings, rng))
        done(1)
    acids = plan.start + plan.batch * np.arange(plan.rounds + 1)
    return Outcome(acids, np.array(suggested), np.array(by_chance))


def _run(
    data: TrainingSet,
    x: Floats,
    test: Ints,
    rest: Ints,
    plan: Plan,
    settings: Settings,
    rng: np.random.Generator | None,
) -> list[float]:
    """Errors after each round; at random where there is a generator."""
    train, pool = list(rest[: plan.start]), list(rest[plan.start :])
    exam = subset(data, test)
    errors = []
    for round_ in range(plan.rounds + 1):
        trend = fit_plain_trend(subset(data, train), settings)
        predicted = exam.steps(trend.predict(exam.x[:, ~LOWERS], exam.x[:, LOWERS]))
        errors.append(float(np.mean(np.abs(predicted - exam.pka))))
        if round_ == plan.rounds:
            break
        if rng is not None:
            new = [pool[i] for i in rng.permutation(len(pool))[: plan.batch]]
        else:
            here = Space(trend.scaling(x[:, ~LOWERS]), x[:, LOWERS])
            picks = choose(here.rows(train), here.rows(pool), here.rows(pool), plan.batch, settings.kernel)
            new = [pool[p.index] for p in picks]
        train += new
        taken = set(new)
        pool = [a for a in pool if a not in taken]
    return errors


def plot(outcome: Outcome, path: Path) -> None:
    """Draw the errors against the number of acids, every seed thin and the means thick.

    The two ways differ in line style and marker as well as in colour (Okabe & Ito's palette for all readers).
    """
    import matplotlib

    matplotlib.use("Agg")
    from matplotlib import pyplot as plt

    from qsar.files import atomic_path

    figure, axes = plt.subplots(figsize=(6.0, 4.0), layout="constrained")
    ways = (("random", outcome.random, "#D55E00", "--", "s"), ("suggested", outcome.suggested, "#0072B2", "-", "o"))
    for label, errors, colour, style, marker in ways:
        axes.plot(outcome.acids, errors.T, style, color=colour, alpha=0.25, linewidth=0.8)
        axes.plot(outcome.acids, errors.mean(axis=0), style, color=colour, marker=marker, label=label, linewidth=2)
    axes.set_xlabel("acids trained on")
    axes.set_ylabel("mean absolute error of test acids, pKa units")
    axes.legend(title=f"{len(outcome.random)} seeds and their mean")
    with atomic_path(path) as temporary:
        figure.savefig(temporary, dpi=150)
    plt.close(figure)
