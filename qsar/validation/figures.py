"""Figures of the validation report: small PNG files, colours that colour-blind readers can tell apart."""

from __future__ import annotations

import io
from collections.abc import Sequence
from typing import Any

import numpy as np
from numpy.typing import NDArray

from qsar.model.domain import VERDICTS
from qsar.validation.judged import Judged
from qsar.validation.leverage import Leverage
from qsar.validation.metrics import LEVELS, Errors
from qsar.validation.studies import CurvePoint, LeftOut, Permuted

Floats = NDArray[np.float64]

# Okabe & Ito, Color Universal Design, 2008
BLUE, ORANGE, GREEN, VERMILION, GREY = "#0072B2", "#E69F00", "#009E73", "#D55E00", "#777777"
VERDICT_STYLE = {"inside": (BLUE, "o"), "borderline": (ORANGE, "^"), "outside": (VERMILION, "x")}


def _axes(width: float = 6.0, height: float = 4.2) -> tuple[Any, Any]:
    from matplotlib.backends.backend_agg import FigureCanvasAgg
    from matplotlib.figure import Figure

    figure = Figure(figsize=(width, height), dpi=110, layout="constrained")
    FigureCanvasAgg(figure)
    axes = figure.add_subplot()
    axes.spines[["top", "right"]].set_visible(False)
    return figure, axes


def _png(figure: Any) -> bytes:
    """PNG with a palette of 48 colours, a third of the size of a full-colour one."""
    from PIL import Image

    raw, small = io.BytesIO(), io.BytesIO()
    figure.savefig(raw, format="png")
    image = Image.open(raw).convert("RGB").quantize(48, dither=Image.Dither.NONE)
    image.save(small, format="png", optimize=True)
    return small.getvalue()


def predicted_against_measured(judged: Judged) -> bytes:
    """Each measured step with the prediction made without its acid."""
    figure, axes = _axes(5.6, 5.2)
    for verdict in VERDICTS:
        rows, (colour, marker) = judged.verdict == verdict, VERDICT_STYLE[verdict]
        axes.scatter(
            judged.measured[rows],
            judged.predicted[rows],
            s=13,
            c=colour,
            marker=marker,
            linewidths=0.8,
            alpha=0.7,
            label=f"{verdict} (n {rows.sum()})",
        )
    ends = [min(judged.measured.min(), judged.predicted.min()), max(judged.measured.max(), judged.predicted.max())]
    axes.plot(ends, ends, color="black", lw=0.8)
    axes.set(xlabel="measured pKa", ylabel="pKa predicted without the acid")
    axes.legend(frameon=False)
    return _png(figure)


def residuals_by_family(judged: Judged, family: Sequence[str]) -> bytes:
    """Boxes of predicted - measured for each family of the table."""
    names = np.array(family)
    groups = [(name, judged.error[names == name]) for name in np.unique(names)]
    groups.sort(key=lambda pair: float(np.abs(pair[1]).mean()))
    figure, axes = _axes(6.8, 0.27 * len(groups) + 1.1)
    axes.axvline(0.0, color="black", lw=0.8)
    axes.boxplot(
        [error for _, error in groups],
        orientation="horizontal",
        widths=0.6,
        flierprops={"marker": ".", "markersize": 3, "markeredgecolor": VERMILION},
        medianprops={"color": BLUE, "lw": 1.6},
        boxprops={"color": GREY},
    )
    axes.set_yticklabels([f"{name.replace('_', ' ')} (n {len(error)})" for name, error in groups], fontsize=8)
    axes.set(xlabel="predicted without the acid − measured, pKa")
    return _png(figure)


def calibration(judged: Judged) -> bytes:
    """Share of steps that the intervals hold against the level asked for, with the binomial band."""
    figure, axes = _axes(5.2, 4.4)
    everything = np.ones(len(judged.measured), dtype=bool)
    found = [judged.coverage(level, everything) for level in LEVELS]
    level = np.array(LEVELS)
    axes.plot([0.45, 1.0], [0.45, 1.0], color="black", lw=0.8)
    axes.fill_between(
        level, [c.low for c in found], [c.high for c in found], color=GREY, alpha=0.3, label="binomial 95 % band"
    )
    axes.plot(level, [c.share for c in found], "o-", color=BLUE, label=f"held (n {found[0].n})")
    axes.set(xlabel="level asked for", ylabel="share held", xticks=level)
    axes.legend(frameon=False)
    return _png(figure)


def domain_against_error(means: dict[str, tuple[float, float, float, int]]) -> bytes:
    """Mean absolute error by verdict with its bootstrap 90 % interval."""
    figure, axes = _axes(5.2, 3.8)
    for k, (verdict, (mean, low, high, n)) in enumerate(means.items()):
        axes.bar(k, mean, color=VERDICT_STYLE[verdict][0], width=0.6)
        axes.plot([k, k], [low, high], color="black", lw=1.5)
        axes.text(k, high, f" {mean:.2f} (n {n})", ha="center", va="bottom")
    axes.set(ylabel="mean absolute error, pKa", xticks=range(len(means)), xticklabels=list(means))
    axes.margins(y=0.12)
    return _png(figure)


def expected_against_found(judged: Judged) -> bytes:
    """Expected error against the error found, in ten groups of equal size."""
    figure, axes = _axes(5.2, 4.2)
    groups = np.array_split(np.argsort(judged.expected, kind="stable"), 10)
    x = [judged.expected[g].mean() for g in groups]
    y = [np.abs(judged.error[g]).mean() for g in groups]
    axes.plot([0, max(x)], [0, max(x)], color="black", lw=0.8)
    axes.plot(x, y, "o", color=BLUE, label=f"tenths of the steps (n {len(groups[-1])} each)")
    axes.set(xlabel="expected error, pKa", ylabel="mean absolute error found, pKa")
    axes.legend(frameon=False)
    return _png(figure)


def learners(rows: dict[str, tuple[float, float]], n: int) -> bytes:
    """Error of the model and the baselines in the same folds; bars over the repeats."""
    figure, axes = _axes(5.6, 3.2)
    for k, (mean, spread) in enumerate(rows.values()):
        axes.barh(k, mean, color=BLUE if k == 0 else GREY, height=0.6)
        axes.plot([mean - spread, mean + spread], [k, k], color="black", lw=1.5)
        axes.text(mean + spread, k, f"  {mean:.3f}", va="center")
    axes.set(yticks=range(len(rows)), yticklabels=list(rows), xlabel=f"mean absolute error, pKa (n {n} steps)")
    axes.invert_yaxis()
    axes.margins(x=0.12)
    return _png(figure)


def left_out(rows: Sequence[LeftOut], what: str) -> bytes:
    """Error of groups left out whole, beside the same acids in ordinary folds."""
    figure, axes = _axes(6.8, 0.24 * len(rows) + 1.1)
    for k, row in enumerate(rows):
        axes.plot([row.in_folds.mean_absolute, row.out.mean_absolute], [k, k], color=GREY, lw=1)
    position = range(len(rows))
    axes.plot([r.out.mean_absolute for r in rows], position, "o", color=BLUE, label=f"{what} never seen")
    axes.plot(
        [r.in_folds.mean_absolute for r in rows], position, "|", color="black", ms=9, mew=2, label="ordinary folds"
    )
    forest = [(k, r.forest.mean_absolute) for k, r in enumerate(rows) if r.forest is not None]
    if forest:
        axes.plot([e for _, e in forest], [k for k, _ in forest], "x", color=ORANGE, label="forest, never seen")
    labels = [f"{r.name.replace('_', ' ')} (n {r.out.n})" for r in rows]
    axes.set_yticks(position, labels, fontsize=8)
    axes.set(xlabel="mean absolute error, pKa", xlim=(0, None))
    axes.invert_yaxis()
    axes.legend(frameon=False, loc="lower right")
    return _png(figure)


def learning_curve(points: Sequence[CurvePoint]) -> bytes:
    """Error on acids left out against the number of training acids."""
    figure, axes = _axes(5.6, 3.8)
    acids = [p.acids for p in points]
    axes.errorbar(
        acids, [p.model for p in points], [p.model_spread for p in points], fmt="o-", color=BLUE, label="model"
    )
    axes.plot(acids, [p.forest for p in points], "x--", color=ORANGE, label="fingerprint forest")
    axes.set(xlabel="training acids", ylabel="mean absolute error, pKa", ylim=(0, None))
    axes.legend(frameon=False)
    return _png(figure)


def randomised(measured: Permuted, dealt: Sequence[Permuted]) -> bytes:
    """R2 on acids left out against the correlation of the values learnt with the measured ones."""
    figure, axes = _axes(5.4, 3.6)
    axes.axhline(0.0, color="black", lw=0.8)
    axes.plot(
        [abs(p.correlation) for p in dealt],
        [p.r2 for p in dealt],
        "x",
        color=VERMILION,
        label=f"permuted ({len(dealt)})",
    )
    axes.plot([measured.correlation], [measured.r2], "o", color=BLUE, label=f"measured, {measured.r2:.3f}")
    axes.set(
        xlabel="|correlation| of the values learnt with the measured ones",
        ylabel=f"R² on acids left out (n {measured.n})",
    )
    axes.legend(frameon=False)
    return _png(figure)


def williams(judged: Judged, leverage: Leverage) -> bytes:
    """Standardised residual against leverage, with the warning level and three standard deviations."""
    figure, axes = _axes(6.0, 4.2)
    residual = judged.error / Errors.of(judged.measured, judged.predicted).root_mean_square
    for verdict in VERDICTS:
        rows, (colour, marker) = judged.verdict == verdict, VERDICT_STYLE[verdict]
        axes.scatter(
            leverage.values[rows],
            residual[rows],
            s=12,
            c=colour,
            marker=marker,
            linewidths=0.8,
            alpha=0.7,
            label=verdict,
        )
    axes.axvline(leverage.warning, color="black", ls="--", lw=1)
    for y in (-3, 3):
        axes.axhline(y, color="black", ls=":", lw=1)
    axes.set(
        xlabel=f"leverage (warning level {leverage.warning:.2f})",
        ylabel="residual without the acid / RMS residual",
    )
    axes.legend(frameon=False)
    return _png(figure)
