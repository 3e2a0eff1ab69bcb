"""Figures of the decisions, in colours that colour-blind readers tell apart.

Colours: Okabe, M.; Ito, K. *Color Universal Design*, 2008.  Line styles differ as well, and every curve has
its name beside it, so that nothing depends on colour alone.
"""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING

import numpy as np

from qsar.decisions.speciation import charge_label
from qsar.decisions.worth_measuring import say_probability

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure

    from qsar.decisions.buffer import BufferResult
    from qsar.decisions.speciation import Band, Speciation
    from qsar.decisions.window import Window
    from qsar.decisions.workup import Workup

COLOURS = ("#0072B2", "#D55E00", "#009E73", "#CC79A7", "#E69F00", "#56B4E9", "#000000")
STYLES: tuple[str | tuple[int, tuple[int, ...]], ...] = (
    "-",
    "--",
    "-.",
    ":",
    (0, (5, 1)),
    (0, (3, 1, 1, 1)),
    (0, (1, 1)),
)
FORMATS = (".png", ".svg")
_BAND = 0.22


def _figure(rows: int, width: float = 7.0, heights: tuple[float, ...] = (3.4,)) -> tuple[Figure, list[Axes]]:
    from matplotlib.figure import Figure

    figure = Figure(figsize=(width, sum(heights) + 0.6), layout="constrained", dpi=120)
    grid = figure.subplots(rows, 1, squeeze=False, height_ratios=list(heights), sharex=rows > 1)
    axes: list[Axes] = [grid[i, 0] for i in range(rows)]
    for ax in axes:
        ax.grid(True, color="0.9", linewidth=0.6)
        ax.spines[["top", "right"]].set_visible(False)
    return figure, axes


def _short(text: str, limit: int = 48) -> str:
    """Text for a title; ``$`` would begin a formula."""
    text = text.replace("$", r"\$")
    return text if len(text) <= limit else text[: limit - 1] + "…"


def _curve(ax: Axes, x: np.ndarray, band: Band, colour: str) -> None:
    ax.fill_between(x, band.low, band.high, color=colour, alpha=_BAND, linewidth=0)
    ax.plot(x, band.value, color=colour, linewidth=1.8)


def speciation_figure(result: Speciation) -> Figure:
    """Fractions, mean charge and, where there is one, log D against pH, with bands.

    Parameters
    ----------
    result : Speciation

    Returns
    -------
    matplotlib.figure.Figure
    """
    heights = (3.2, 1.5) if result.log_d is None else (3.2, 1.5, 1.5)
    figure, axes = _figure(len(heights), heights=heights)
    ax, acid, x = axes[0], result.acid, result.ph
    for lost, charge in enumerate(acid.charges):
        colour, value = COLOURS[lost % len(COLOURS)], result.fraction.value[:, lost]
        ax.fill_between(
            x,
            result.fraction.low[:, lost],
            result.fraction.high[:, lost],
            color=colour,
            alpha=_BAND,
            linewidth=0,
        )
        ax.plot(x, value, color=colour, linewidth=1.8, linestyle=STYLES[lost % len(STYLES)])
        middle = float(x[value >= value.max() - 0.005].mean())
        place = (middle - x[0]) / (x[-1] - x[0])
        ax.annotate(
            charge_label(int(charge)),
            (middle, float(result.fraction.high[:, lost].max())),
            xytext=(0, 4),
            textcoords="offset points",
            color=colour,
            ha="left" if place < 0.06 else "right" if place > 0.94 else "center",
            va="bottom",
            fontsize=8,
            annotation_clip=False,
        )
    ax.set(ylabel="fraction", ylim=(0, 1.12), yticks=np.linspace(0, 1, 6))
    ax.set_title(
        f"{_short(acid.name)}\n{result.temperature_c:g} °C, ionic strength {result.ionic_strength_m:g} "
        f"mol/L, bands {100 * acid.coverage:g} %",
        fontsize=10,
        loc="left",
    )
    _curve(axes[1], x, result.charge, COLOURS[-1])
    axes[1].set(ylabel="mean charge")
    if result.log_d is not None and result.log_p is not None:
        _curve(axes[2], x, result.log_d, COLOURS[0])
        low = max(float(result.log_d.value.min()), result.log_p.value - 6.0)
        axes[2].set(ylabel="log D", ylim=(low - 0.3, float(result.log_d.value.max()) + 0.5))
        axes[2].set_title(f"{result.log_p.label}: {result.log_p.value:.2f}", fontsize=8, loc="right")
    axes[-1].set(xlabel="pH", xlim=(float(x[0]), float(x[-1])))
    figure.align_ylabels(axes)
    return figure


def workup_figure(result: Workup) -> Figure:
    """Fraction of the acid in water for each base, gentlest on top, with the interval and the target."""
    outcomes = result.outcomes
    figure, (ax,) = _figure(1, heights=(0.42 * len(outcomes) + 1.0,))
    wanted = result.extraction.target if result.extraction.into == "water" else 1 - result.extraction.target
    for row, outcome in enumerate(outcomes):
        colour, marker = (COLOURS[0], "o") if outcome.sufficient else (COLOURS[1], "X")
        ax.plot(
            [outcome.in_water_low, outcome.in_water_high], [row, row], color=colour, linewidth=3, alpha=0.5
        )
        ax.plot([outcome.in_water], [row], marker, color=colour, markersize=7)
    ax.axvline(wanted, color="black", linewidth=1, linestyle="--")
    ax.set(xlim=(-0.02, 1.02), ylim=(len(outcomes) - 0.4, -0.6), xlabel="fraction of the acid in the water")
    ax.set_yticks(range(len(outcomes)), [f"{o.base.name} (pH {o.ph:.1f})" for o in outcomes], fontsize=8)
    side = "at least" if result.extraction.into == "water" else "at most"
    ax.set_title(
        f"{_short(result.acid.name)}: {side} {wanted:g} wanted (dashed); dots reach it, crosses do not",
        fontsize=9,
        loc="left",
    )
    return figure


def window_figure(window: Window) -> Figure:
    """Fraction of two acids in the water against pH, with bands and the window shaded where it is open."""
    figure, (ax,) = _figure(1)
    for layered, curve, colour, style in (
        (window.wet, window.wet_curve, COLOURS[0], "-"),
        (window.dry, window.dry_curve, COLOURS[1], "--"),
    ):
        ax.fill_between(window.ph, curve[1], curve[2], color=colour, alpha=_BAND, linewidth=0)
        label = _short(layered.acid.name, 30)
        ax.plot(window.ph, curve[0], color=colour, linewidth=1.8, linestyle=style, label=label)
    if window.exists:
        # The shade needs no colour of its own; its edges are drawn and its meaning is in the title.
        ax.axvspan(window.from_ph.ph, window.to_ph.ph, color="0.85", zorder=0)
    ax.axvline(window.best_ph, color="black", linewidth=1, linestyle=":")
    state = "open (grey)" if window.exists else "shut"
    ax.set_title(
        f"window {state}, exists with probability {say_probability(window.probability_exists)}; dotted: pH "
        f"{window.best_ph:.2f}",
        fontsize=9,
        loc="left",
    )
    ax.set(xlabel="pH", ylabel="fraction in the water", xlim=(0, 14), ylim=(-0.02, 1.02))
    ax.legend(frameon=False, fontsize=8, loc="center left")
    return figure


def buffer_figure(result: BufferResult) -> Figure:
    """Buffer capacity against pH with the useful range and the pH that the recipe makes, interval shaded."""
    figure, (ax,) = _figure(1)
    shown = result.curve_capacity <= 1.25 * max(
        result.capacity, float(np.median(result.curve_capacity)) * 4.0
    )
    ax.plot(result.curve_ph, np.where(shown, result.curve_capacity, np.nan), color=COLOURS[0], linewidth=1.8)
    for low, high in result.useful:
        ax.axvspan(max(low, 0.0), min(high, 14.0), color="0.9", zorder=0)
    ax.axvspan(result.ph_low, result.ph_high, color=COLOURS[1], alpha=_BAND, linewidth=0)
    ax.axvline(result.ph, color=COLOURS[1], linewidth=1.6, linestyle="--")
    ax.set(xlabel="pH", ylabel="capacity, mol/(L pH)", xlim=(0, 14), ylim=(0, None))
    ax.set_title(
        f"{_short(result.acid.name)}, {result.recipe.total_m:g} mol/L\n"
        f"dashed: pH {result.ph:.2f} with its {100 * result.acid.coverage:g} % interval; grey: useful range",
        fontsize=9,
        loc="left",
    )
    return figure


def save(figure: Figure, target: Path) -> None:
    """Write a figure as PNG or SVG by extension, whole or not at all.

    Raises
    ------
    UserError
        For another extension, or a place that cannot be written.
    """
    from matplotlib import rc_context

    from qsar.errors import UserError
    from qsar.files import atomic_path

    kind = target.suffix.lower()
    if kind not in FORMATS:
        raise UserError(f"cannot draw {target}: the extension must be one of {', '.join(FORMATS)}")
    # A fixed salt and no date make the same figure the same file.
    metadata = {"Date": None} if kind == ".svg" else {"Software": None}
    with atomic_path(target) as temporary, rc_context({"svg.hashsalt": "acidity"}):
        figure.savefig(temporary, format=kind[1:], metadata=metadata)
