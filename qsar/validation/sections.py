"""The sections of the validation report, from the outcomes of the studies."""

from __future__ import annotations

from collections.abc import Mapping

import numpy as np
from numpy.typing import NDArray

from qsar.model.domain import VERDICTS
from qsar.model.model import Model
from qsar.model.training_set import TrainingSet
from qsar.validation import figures, studies
from qsar.validation.judged import FAMILIES, Judged
from qsar.validation.leverage import leverage_of
from qsar.validation.metrics import LEVELS, Errors, bootstrap, ratio_of_means
from qsar.validation.report import Picture, Section, Table
from qsar.validation.splits import MOST_FAMILIES, families
from qsar.validation.studies import Scale

Floats = NDArray[np.float64]
Results = Mapping[str, Floats]

NAMES = {
    "member": "model, one member",
    "trend": "its linear free-energy trend alone",
    "forest": "count-fingerprint random forest",
    "lines": "plain Hammett and Taft lines",
    "mean": "mean of the table",
}
_ERRORS = ("mean absolute", "median absolute", "root mean square", "bias", "R²")


def _cells(e: Errors) -> tuple[int, float, float, float, float, float]:
    return e.n, e.mean_absolute, e.median_absolute, e.root_mean_square, e.bias, e.r2


def accuracy(judged: Judged, family: list[str]) -> Section:
    """Predicted against measured, each acid by the member that never saw it."""
    rows: list[tuple[str, int, float, float, float, float, float]] = []
    for name in FAMILIES:
        rows.append((name, *_cells(judged.errors(judged.family == name))))
    everything = np.ones(len(judged.measured), dtype=bool)
    rows.append(("all", *_cells(judged.errors(everything))))
    rows.append(("all, fingerprint forest", *_cells(judged.errors(everything, forest=True))))
    names = np.array(family)
    by_family = [(n or "no family", *_cells(judged.errors(names == n))) for n in np.unique(names)]
    return Section(
        "Predicted against measured",
        "Every measured step of the training table, predicted by the member of the ensemble that never saw its acid. "
        "The forest is trained on the same table in the same folds. The unit of all errors is one pKa unit.",
        (Table(("acids", "n", *_ERRORS), rows), Table(("family", "n", *_ERRORS), by_family)),
        (
            Picture(
                "predicted", figures.predicted_against_measured(judged), "Predicted without the acid against measured."
            ),
            Picture("families", figures.residuals_by_family(judged, family), "Residuals by family of the table."),
        ),
    )


def intervals(judged: Judged) -> Section:
    """Calibration of the intervals."""
    everything = np.ones(len(judged.measured), dtype=bool)
    groups = {name: judged.family == name for name in FAMILIES} | {"all": everything}
    rows = []
    for name, flags in groups.items():
        for level in LEVELS:
            c = judged.coverage(level, flags)
            width = float(np.median(judged.width(level)[flags])) if flags.any() else float("nan")
            rows.append((f"{name}, {100 * level:.0f} %", c.n, c.share, c.low, c.high, width))
    error, order = np.abs(judged.error), np.argsort(judged.width(0.9), kind="stable")
    third = max(len(order) // 3, 1)
    thirds = [
        ("narrowest third of the 90 % intervals", third, float(error[order[:third]].mean())),
        ("widest third", third, float(error[order[-third:]].mean())),
    ]
    return Section(
        "Intervals",
        "Share of the steps that their interval holds. Each interval was made without the step's acid and without "
        "its fold's scores. The guarantee of the method is marginal: at least 1 − 2α of exchangeable acids at level "
        "1 − α. The band is what chance alone allows at that level with n steps (95 %).",
        (
            Table(("acids, level", "n", "held", "band, low", "band, high", "median width"), rows),
            Table(("steps", "n", "mean absolute error"), thirds),
        ),
        (
            Picture("calibration", figures.calibration(judged), "Share held against the level asked for."),
            Picture("expected", figures.expected_against_found(judged), "Expected error against the error found."),
        ),
    )


def domain(judged: Judged) -> Section:
    """Domain against error, with bootstrap intervals."""
    error = np.abs(judged.error)
    means: dict[str, tuple[float, float, float, int]] = {}
    rows = []
    for verdict in VERDICTS:
        flags = judged.verdict == verdict
        n = int(flags.sum())
        if not n:
            continue
        own = np.flatnonzero(flags)
        drawn = bootstrap(lambda r, own=own: float(error[own[r]].mean()), judged.acid[own])  # type: ignore[misc]
        low, high = (float(q) for q in np.quantile(drawn, (0.05, 0.95)))
        means[verdict] = (float(error[flags].mean()), low, high, n)
        rows.append((verdict, n, n / len(error), *means[verdict][:3], float(np.median(error[flags]))))
    warned = judged.verdict != VERDICTS[0]
    ratios = bootstrap(lambda r: ratio_of_means(judged.error, warned, r), judged.acid)
    ratio = ratio_of_means(judged.error, warned, np.arange(len(warned)))
    bound = float(np.quantile(ratios, 0.05)) if len(ratios) else float("nan")
    return Section(
        "Domain",
        f"Verdict against error. Warned steps err {ratio:.2f} times as much as those inside (bootstrap 5 % bound "
        f"{bound:.2f}, {len(ratios)} resamples of acids, n {len(error)} steps).",
        (Table(("verdict", "n", "share", "mean absolute error", "5 %", "95 %", "median"), rows),),
        (Picture("domain", figures.domain_against_error(means), "Error by verdict, bootstrap 90 % interval."),),
    )


def cross_validation(data: TrainingSet, scale: Scale, results: Results) -> Section:
    """Repeated cross-validation with the baselines in the same folds."""
    rows, bars = [], {}
    for learner in ("member", *studies.BASELINES):
        each = [
            Errors.of(data.pka, studies.cross_validated(data, scale, results, learner, r)) for r in range(scale.repeats)
        ]
        mean = [e.mean_absolute for e in each]
        rms, r2 = [e.root_mean_square for e in each], [e.r2 for e in each]
        rows.append((NAMES[learner], each[0].n, float(np.mean(mean)), float(np.std(mean)), np.mean(rms), np.mean(r2)))
        bars[NAMES[learner]] = (float(np.mean(mean)), float(np.std(mean)))
    return Section(
        "Repeated cross-validation and baselines",
        f"{scale.repeats} times {scale.folds} folds, drawn by acid so that the steps of one acid stay together; the "
        "baselines see the same folds. A member fitted to four fifths of the acids is judged here; the ensemble "
        f"that predicts new acids has seen more.{_capped(data, scale, results)}",
        (
            Table(
                ("learner", "n", "mean absolute", "spread over repeats", "root mean square", "R²"),
                [tuple(float(c) if isinstance(c, np.floating) else c for c in row) for row in rows],
            ),
        ),
        (Picture("baselines", figures.learners(bars, len(data.pka)), "Model and baselines in the same folds."),),
    )


def _capped(data: TrainingSet, scale: Scale, results: Results) -> str:
    """What a large table is spared, and why that costs no precision."""
    if scale != studies.LARGE:
        return ""
    full = studies.FULL
    error = np.abs(studies.cross_validated(data, scale, results, "member", 0) - data.pka)
    return (
        f" {scale.repeats} repeats here and {scale.draws} draws for the learning curve instead of {full.repeats} and "
        f"{full.draws}: the mean over {len(error)} steps has a standard error of "
        f"{error.std() / np.sqrt(len(error)):.4f} in a single repeat already."
    )


def _largest(data: TrainingSet) -> str:
    everything = len(families(data, most=len(data.acids)))
    return f" The {MOST_FAMILIES} largest of {everything} families." if everything > MOST_FAMILIES else ""


def left_out(data: TrainingSet, scale: Scale, results: Results) -> list[Section]:
    """Families and substituents left out whole."""
    sections = []
    for study, what in (("family", "family"), ("substituent", "group")):
        found = studies.left_out(data, scale, results, study)
        learner = NAMES[scale.left_out if study == "family" else "trend"]
        rows = [
            (
                r.name.replace("_", " "),
                r.acids,
                r.out.n,
                r.out.mean_absolute,
                r.in_folds.mean_absolute,
                r.forest.mean_absolute if r.forest else float("nan"),
            )
            for r in found
        ]
        n = sum(r.out.n for r in found)
        mean = sum(r.out.n * r.out.mean_absolute for r in found) / max(n, 1)
        sections.append(
            Section(
                f"Leave one {what if study == 'family' else 'substituent'} out",
                f"All acids of a {what} left out at once ({learner}); mean absolute error over all {n} steps "
                f"{mean:.3f}. “Ordinary folds” are the same steps in cross-validation."
                + (_largest(data) if study == "family" else ""),
                (Table((what, "acids", "n", "never seen", "ordinary folds", "forest, never seen"), rows),),
                (Picture(f"without-{study}", figures.left_out(found, what), f"Error on a {what} never seen."),),
            )
        )
    return sections


def learning_curve(data: TrainingSet, scale: Scale, results: Results) -> Section:
    """Error against the number of training acids."""
    points = studies.learning_curve(data, scale, results)
    rows = [(f"{p.acids} acids", p.n, p.model, p.model_spread, p.forest) for p in points]
    return Section(
        "Learning curve",
        f"One fifth of the acids is predicted after training on growing parts of the rest ({scale.draws} draws; n "
        "counts the predicted steps over all draws).",
        (Table(("trained on", "n", "model", "spread over draws", "forest"), rows),),
        (Picture("curve", figures.learning_curve(points), "Error against the number of training acids."),),
    )


def randomisation(data: TrainingSet, scale: Scale, results: Results) -> Section:
    """Y-randomisation."""
    measured, dealt = studies.randomisation(data, scale, results)
    best = max(p.r2 for p in dealt)
    rows: list[tuple[str, int, float, float]] = [("as measured", measured.n, measured.correlation, measured.r2)]
    rows += [(f"permutation {k + 1}", p.n, p.correlation, p.r2) for k, p in enumerate(dealt)]
    return Section(
        "Y-randomisation",
        f"The trend fitted to values dealt out at random explains nothing of acids left out: R² at most {best:.3f} in "
        f"{len(dealt)} permutations, against {measured.r2:.3f} with the measured values.",
        (Table(("values learnt", "n", "correlation with the measured", "R² on acids left out"), rows),),
        (Picture("randomised", figures.randomised(measured, dealt), "R² on acids left out, measured and permuted."),),
    )


def robustness(data: TrainingSet, scale: Scale, results: Results) -> Section:
    """The table perturbed by its stated uncertainty."""
    r = studies.robustness(data, scale, results)
    return Section(
        "Robustness",
        f"Each value of the training folds was moved by a normal deviate of its stated uncertainty "
        f"({r.perturbations} tables); the trend's predictions of acids left out are compared with the values as "
        "they are.",
        (
            Table(
                ("quantity", "n", "pKa units"),
                [
                    ("mean stated uncertainty", r.n, r.uncertainty),
                    ("mean movement of a prediction", r.n, r.moved),
                    ("mean absolute error, table as it is", r.n, r.as_measured),
                    ("mean absolute error, table perturbed", r.n * r.perturbations, r.perturbed),
                ],
            ),
        ),
    )


def leverages(model: Model, data: TrainingSet, judged: Judged) -> Section:
    """Williams plot."""
    found = leverage_of(model, data)
    high = found.values > found.warning
    far = np.abs(judged.error) > 3.0 * judged.errors(np.ones(len(high), dtype=bool)).root_mean_square
    rows = [
        (name, int(flags.sum()), float(np.abs(judged.error[flags]).mean()) if flags.any() else float("nan"))
        for name, flags in {
            "leverage below the warning level": ~high,
            "leverage above it": high,
            "residual beyond three times the RMS": far,
            "both": high & far,
        }.items()
    ]
    return Section(
        "Leverage (Williams plot)",
        f"Leverage of each step in the scaled descriptors (rank {found.rank}, warning level {found.warning:.3f} = 3 × "
        f"rank / {len(high)}) against its residual, predicted without the acid.",
        (Table(("steps", "n", "mean absolute error"), rows),),
        (Picture("williams", figures.williams(judged, found), "Residual against leverage."),),
    )
