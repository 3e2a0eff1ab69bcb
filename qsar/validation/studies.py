"""The studies that need fits of their own: which fits they ask for, and what comes out of them.

Every study draws its splits by acid, so that the steps of one acid are never on both sides, and every comparison
is made on the same splits.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from qsar.model.inducing import MOST_EXACT
from qsar.model.training_set import TrainingSet
from qsar.validation.fits import Fit, Problem
from qsar.validation.metrics import Errors
from qsar.validation.splits import families, folds_of_acids, subset_of_acids, substituents

Floats = NDArray[np.float64]
Flags = NDArray[np.bool_]
Results = Mapping[str, Floats]

BASELINES = ("forest", "lines", "mean")


@dataclass(frozen=True)
class Scale:
    """How much is done.

    Attributes
    ----------
    repeats, folds : int
        Of the cross-validation.
    left_out : str
        Learner for families left out.
    fractions : tuple of float
        Of the training acids, for the learning curve.
    draws : int
        Subsets drawn for each fraction.
    permutations : int
        Of the measured values.
    perturbations : int
        Of the table by its uncertainty.
    """

    repeats: int = 3
    folds: int = 5
    left_out: str = "member"
    fractions: tuple[float, ...] = (0.125, 0.25, 0.5, 0.75, 1.0)
    draws: int = 3
    permutations: int = 10
    perturbations: int = 3


FULL = Scale()
QUICK = Scale(1, 5, "trend", (0.25, 0.5, 1.0), 1, 3, 1)
#: For large tables: there a mean over the steps hardly depends on how the folds fall.
LARGE = replace(FULL, repeats=2, draws=2)


def scale_of(data: TrainingSet) -> Scale:
    """How much a full report does for a table."""
    return FULL if len(data.x) <= MOST_EXACT else LARGE


def cross_validation_fits(data: TrainingSet, scale: Scale) -> list[Fit]:
    """Repeated cross-validation grouped by acid, baselines in the same folds, and the trend alone in the first."""
    fits = []
    for repeat in range(scale.repeats):
        fold = folds_of_acids(data, scale.folds, 100 + repeat)
        learners = ("member", *BASELINES, *(("trend",) if repeat == 0 else ()))
        fits += [
            Fit(f"cv/{repeat}/{k}of{scale.folds}/{learner}", learner, fold != k)
            for k in range(scale.folds)
            for learner in learners
        ]
    return fits


def cross_validated(data: TrainingSet, scale: Scale, results: Results, learner: str, repeat: int) -> Floats:
    """Predictions of all measured steps, each by the fit that never saw its acid."""
    fold = folds_of_acids(data, scale.folds, 100 + repeat)
    stacked = np.array([results[f"cv/{repeat}/{k}of{scale.folds}/{learner}"] for k in range(scale.folds)])
    found: Floats = stacked[fold, np.arange(len(fold))]
    return found


def left_out_fits(data: TrainingSet, scale: Scale) -> list[Fit]:
    """Fits without a family, and fits of the trend without all acids that carry a kind of group."""
    fits = []
    for name, own in families(data).items():
        fits += [Fit(f"family/{name}/{learner}", learner, ~own) for learner in (scale.left_out, "forest")]
    for kind, own in substituents(data).items():
        fits.append(Fit(f"substituent/{kind}/trend", "trend", ~own))
    return fits


@dataclass(frozen=True)
class LeftOut:
    """Errors of a group of acids that was left out whole, beside those in ordinary cross-validation."""

    name: str
    acids: int
    out: Errors
    forest: Errors | None
    in_folds: Errors


def left_out(data: TrainingSet, scale: Scale, results: Results, study: str) -> list[LeftOut]:
    """Outcome of ``study``: "family" or "substituent"."""
    groups = families(data) if study == "family" else substituents(data)
    learner = scale.left_out if study == "family" else "trend"
    usual = cross_validated(data, scale, results, learner, 0)
    rows = []
    for name, own in groups.items():
        forest = results.get(f"{study}/{name}/forest")
        rows.append(
            LeftOut(
                name,
                len(np.unique(data.step_acid[own])),
                Errors.of(data.pka[own], results[f"{study}/{name}/{learner}"][own]),
                None if forest is None else Errors.of(data.pka[own], forest[own]),
                Errors.of(data.pka[own], usual[own]),
            )
        )
    return sorted(rows, key=lambda row: -row.out.mean_absolute)


def learning_curve_fits(data: TrainingSet, scale: Scale) -> list[Fit]:
    """Growing subsets of four fifths of the acids; the last fifth is predicted, another fifth in each draw."""
    fits = []
    for draw in range(scale.draws):
        fold = folds_of_acids(data, 5, 200)
        among = fold != draw % 5
        acids = len(np.unique(data.step_acid[among]))
        for fraction in scale.fractions:
            train = subset_of_acids(data, among, round(fraction * acids), 300 + draw)
            fits += [Fit(f"curve/{draw}/{fraction}/{le}", le, train) for le in ("member", "forest")]
    return fits


@dataclass(frozen=True)
class CurvePoint:
    """Mean and spread over the draws of the error after training on so many acids."""

    acids: int
    n: int
    model: float
    model_spread: float
    forest: float


def learning_curve(data: TrainingSet, scale: Scale, results: Results) -> list[CurvePoint]:
    """Error on acids left out against the number of training acids."""
    fold = folds_of_acids(data, 5, 200)
    points = []
    for fraction in scale.fractions:
        own = {fit.name: fit for fit in learning_curve_fits(data, scale) if f"/{fraction}/" in fit.name}
        errors: dict[str, list[float]] = {"member": [], "forest": []}
        n = 0
        for name, fit in own.items():
            test = fold == int(name.split("/")[1]) % 5
            errors[fit.learner].append(Errors.of(data.pka[test], results[name][test]).mean_absolute)
            n += int(test.sum()) if fit.learner == "member" else 0
        acids = [len(np.unique(data.step_acid[fit.train])) for fit in own.values()]
        model = np.array(errors["member"])
        points.append(
            CurvePoint(round(float(np.mean(acids))), n, model.mean(), model.std(), float(np.mean(errors["forest"])))
        )
    return points


def permuted(pka: Floats, seed: int) -> Floats:
    """The measured values dealt out anew."""
    values: Floats = np.random.default_rng(seed).permutation(pka)
    return values


def randomisation_fits(data: TrainingSet, scale: Scale) -> list[Fit]:
    """Fits of the trend to values dealt out at random, and to the measured ones."""
    train = folds_of_acids(data, 5, 200) != 0
    fits = [Fit("random/measured/trend", "trend", train)]
    for k in range(scale.permutations):
        fits.append(Fit(f"random/{k}/trend", "trend", train, permuted(data.pka, 400 + k)))
    return fits


@dataclass(frozen=True)
class Permuted:
    """Held-out R2 of the trend when the values are permuted; `correlation` is that of permuted and measured."""

    correlation: float
    r2: float
    n: int


def randomisation(data: TrainingSet, scale: Scale, results: Results) -> tuple[Permuted, list[Permuted]]:
    """Y-randomisation (Ruecker, Ruecker & Meringer, J. Chem. Inf. Model. 2007, 47, 2345).

    Returns
    -------
    measured : Permuted
        With the values as measured.
    permuted : list of Permuted
    """
    test = folds_of_acids(data, 5, 200) == 0

    def outcome(values: Floats, name: str) -> Permuted:
        errors = Errors.of(values[test], results[name][test])
        return Permuted(float(np.corrcoef(values, data.pka)[0, 1]), errors.r2, errors.n)

    dealt = [outcome(permuted(data.pka, 400 + k), f"random/{k}/trend") for k in range(scale.permutations)]
    return outcome(data.pka, "random/measured/trend"), dealt


def robustness_fits(data: TrainingSet, scale: Scale) -> list[Fit]:
    """Fits of the trend to the table perturbed by its stated uncertainty, in the folds of the first repeat."""
    fold = folds_of_acids(data, scale.folds, 100)
    fits = []
    for k in range(scale.perturbations):
        noise = np.random.default_rng(500 + k).normal(size=len(data.pka)) * data.uncertainty
        fits += [
            Fit(f"perturbed/{k}/{j}of{scale.folds}/trend", "trend", fold != j, data.pka + noise)
            for j in range(scale.folds)
        ]
    return fits


@dataclass(frozen=True)
class Robustness:
    """What perturbing the table by its stated uncertainty does to the trend's held-out predictions.

    Attributes
    ----------
    n, perturbations : int
    uncertainty : float
        Mean stated uncertainty.
    moved : float
        Mean standard deviation of a prediction over the perturbations.
    as_measured, perturbed : float
        Mean absolute error after training on the table as it is, and on the perturbed ones.
    """

    n: int
    perturbations: int
    uncertainty: float
    moved: float
    as_measured: float
    perturbed: float


def robustness(data: TrainingSet, scale: Scale, results: Results) -> Robustness:
    """Outcome of the perturbed fits."""
    fold = folds_of_acids(data, scale.folds, 100)
    rows = np.arange(len(fold))
    by_table = np.array(
        [
            np.array([results[f"perturbed/{k}/{j}of{scale.folds}/trend"] for j in range(scale.folds)])[fold, rows]
            for k in range(scale.perturbations)
        ]
    )
    base = cross_validated(data, scale, results, "trend", 0)
    return Robustness(
        len(rows),
        scale.perturbations,
        float(data.uncertainty.mean()),
        float(np.sqrt(np.mean((by_table - base) ** 2, axis=0)).mean()),
        float(np.abs(base - data.pka).mean()),
        float(np.abs(by_table - data.pka).mean()),
    )


def all_fits(problem: Problem, scale: Scale) -> list[Fit]:
    """Every fit that the studies ask for."""
    data = problem.data
    makers: Sequence[list[Fit]] = (
        cross_validation_fits(data, scale),
        left_out_fits(data, scale),
        learning_curve_fits(data, scale),
        randomisation_fits(data, scale),
        robustness_fits(data, scale),
    )
    return [fit for fits in makers for fit in fits]
