"""Figures of attributions: steps from parent to acid, analogues side by side, contribution against distance."""

from __future__ import annotations

from collections.abc import Sequence
from io import BytesIO
from pathlib import Path
from typing import TYPE_CHECKING, Any

import numpy as np

from qsar.attribution.drawing import plain_png, signed, tint
from qsar.attribution.explanation import Contribution, Explanation
from qsar.files import atomic_path

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure

LOWERS_LINE, RAISES_LINE = "#B35900", "#005A8C"
MOST_ROWS, MOST_COLUMNS = 40, 14


def _figure(width: float, height: float) -> tuple[Figure, Axes]:
    from matplotlib.figure import Figure

    figure = Figure(figsize=(width, height), dpi=110)
    return figure, figure.add_subplot()


def _plain(text: str, limit: int = 44) -> str:
    """Text for a figure; ``$`` would begin a formula."""
    text = text.replace("$", r"\$")
    return text if len(text) <= limit else text[: limit - 1] + "…"


def _step_name(explanation: Explanation) -> str:
    return f"pKa{explanation.step}" if len(explanation.acid.sites) > 1 else "pKa"


def steps_figure(explanation: Explanation, title: str = "") -> Figure:
    """Steps from the pKa of the parent to that of the acid, one bar a contribution, with its interval.

    Parameters
    ----------
    explanation : Explanation
    title : str
        By default the SMILES of the acid.

    Returns
    -------
    matplotlib.figure.Figure
    """
    lines = explanation.contributions
    figure, ax = _figure(7.4, 1.35 + 0.36 * (len(lines) + 2))
    names = ["parent", *(_plain(line.substituent) for line in lines), _step_name(explanation)]
    starts = explanation.parent_pka + np.cumsum([0.0, *(line.contribution for line in lines)])
    rows = np.arange(1, len(lines) + 1)
    ends, low, high = starts[1:], *(starts[:-1] + [getattr(x, end) for x in lines] for end in ("low", "high"))
    # few artists, since a report of hundreds of acids draws as many figures
    ax.vlines(starts, [0, *rows], [*(rows + 0.28), len(lines) + 1], color="0.55", linewidth=0.8)
    colours = [tint(line.contribution) for line in lines]
    ax.barh(rows, ends - starts[:-1], left=starts[:-1], height=0.56, color=colours, edgecolor="0.25")
    ax.hlines(rows, low, high, color="black", linewidth=1.1)
    ax.plot([*low, *high], [*rows, *rows], "|", color="black", markersize=5)
    ax.plot([explanation.parent_pka], [0], "ko", markersize=6)
    ax.plot([explanation.pka], [len(lines) + 1], "kD", markersize=6)
    reach = [*starts, *low, *high, explanation.pka]
    span = max(max(reach) - min(reach), 0.5)
    right = max(reach) + 0.06 * span
    values = [f"{explanation.parent_pka:.2f}", *(signed(x.contribution) for x in lines), f"{explanation.pka:.2f}"]
    for row, text in enumerate(values):
        ax.text(right, row, text, va="center", ha="left", fontsize=9)
    ax.set(xlim=(min(reach) - 0.06 * span, right + 0.16 * span), ylim=(len(lines) + 1.6, -0.6))
    ax.set_xlabel(f"pKa; whiskers: {100 * explanation.coverage:g} % interval of the contribution")
    ax.set_yticks(range(len(names)), names, fontsize=9)
    figure.suptitle(_plain(title or explanation.smiles, 84), fontsize=10, x=0.02, ha="left")
    ax.grid(axis="x", color="0.92", linewidth=0.6)
    ax.set_axisbelow(True)
    ax.spines[["top", "right"]].set_visible(False)
    height = figure.get_figheight()
    figure.subplots_adjust(left=0.3, right=0.98, top=1 - 0.42 / height, bottom=0.55 / height)
    return figure


def _collected(explanation: Explanation) -> dict[str, list[Contribution]]:
    table: dict[str, list[Contribution]] = {}
    for line in explanation.contributions:
        table.setdefault(line.substituent, []).append(line)
    return table


def analogues_figure(explanations: Sequence[Explanation], names: Sequence[str]) -> Figure:
    """Table of structures and substituents: each cell the sum over equal substituents of the acid.

    Parameters
    ----------
    explanations : sequence of Explanation
        The first forty are shown.
    names : sequence of str

    Returns
    -------
    matplotlib.figure.Figure
    """
    shown = list(explanations)[:MOST_ROWS]
    tables = [_collected(e) for e in shown]
    weight: dict[str, float] = {}
    for table in tables:
        for name, lines in table.items():
            weight[name] = weight.get(name, 0.0) + 1 + 0.1 * abs(sum(x.contribution for x in lines))
    columns = sorted(weight, key=lambda name: (-weight[name], name))
    left_out = columns[MOST_COLUMNS:]
    places = {c: min(x.path_length or 99 for t in tables for x in t.get(c, [])) for c in columns[:MOST_COLUMNS]}
    columns = sorted(places, key=lambda c: (places[c], c))
    head = ["structure", "parent", *columns, *(["others"] if left_out else []), "pKa"]
    width = 3.2 + 0.78 * (len(head) - 1)
    figure, ax = _figure(width, 1.7 + 0.62 * len(shown))
    ax.set(xlim=(-3.2, 0.78 * (len(head) - 1) + 0.03), ylim=(len(shown) + 0.06, -1.9))
    ax.axis("off")
    for row, (explanation, name, table) in enumerate(zip(shown, names, tables, strict=False)):
        _row_head(ax, row, explanation, name)
        values: list[tuple[float, int] | None] = [
            (sum(x.contribution for x in table[c]), len(table[c])) if c in table else None for c in columns
        ]
        if left_out:
            rest = [x.contribution for c in left_out for x in table.get(c, [])]
            values.append((sum(rest), 1) if rest else None)
        _cell(ax, 0, row, f"{explanation.parent_pka:.2f}", None)
        for column, value in enumerate(values, start=1):
            if value is None:
                _cell(ax, column, row, "", None)
            else:
                count = f"\n({value[1]} of them)" if value[1] > 1 else ""
                _cell(ax, column, row, signed(value[0]) + count, value[0])
        _cell(ax, len(values) + 1, row, f"{explanation.pka:.2f}", None, bold=True)
    for column, text in enumerate(head[1:]):
        ax.text(0.78 * column + 0.39, -0.12, _plain(text, 30), rotation=38, ha="left", va="bottom", fontsize=8)
    if len(explanations) > len(shown):
        more = f"the first {len(shown)} of {len(explanations)}; all are in contributions.csv"
        ax.text(-3.2, -1.75, more, fontsize=8, va="top")
    figure.subplots_adjust(left=0.01, right=0.93, top=0.99, bottom=0.01)
    return figure


def _cell(ax: Axes, column: int, row: int, text: str, value: float | None, bold: bool = False) -> None:
    from matplotlib.patches import Rectangle

    face: Any = "white" if value is None else tint(value)
    ax.add_patch(Rectangle((0.78 * column, row), 0.78, 1, facecolor=face, edgecolor="0.7", linewidth=0.6))
    ax.text(
        0.78 * column + 0.39,
        row + 0.5,
        text,
        ha="center",
        va="center",
        fontsize=8,
        fontweight="bold" if bold else "normal",
    )


def _row_head(ax: Axes, row: int, explanation: Explanation, name: str) -> None:
    from matplotlib.image import imread

    picture = imread(BytesIO(plain_png(explanation.smiles, 420, 180)))
    ax.imshow(picture, extent=(-1.5, -0.05, row + 0.98, row + 0.02), aspect="auto", interpolation="bilinear")
    step = f", step {explanation.step}" if len(explanation.acid.sites) > 1 else ""
    ax.text(-3.18, row + 0.5, _plain(name + step, 26), ha="left", va="center", fontsize=8)


def on_chain(explanation: Explanation, line: Contribution) -> bool:
    """Whether a line is a substituent on the parent's alkanoic chain."""
    return bool(line.path) and line.carrier is None and explanation.decomposition.rule == "d"


def distance_figure(explanations: Sequence[Explanation], name: str) -> Figure:
    """Contribution of one substituent along the parent's chain against its distance, with the interval.

    Parameters
    ----------
    explanations : sequence of Explanation
    name : str
        Of the substituent, without place.

    Returns
    -------
    matplotlib.figure.Figure

    Raises
    ------
    ValueError
        If no explanation has such a substituent.
    """
    found = sorted(
        {
            (len(line.path) - 1, line.contribution, line.low, line.high)
            for e in explanations
            for line in e.contributions
            if on_chain(e, line) and line.name == name
        }
    )
    if not found:
        raise ValueError(f"no explanation has the substituent {name} on a chain")
    bonds, value, low, high = (np.array(column, dtype=float) for column in zip(*found, strict=True))
    figure, ax = _figure(5.6, 3.6)
    ax.axhline(0.0, color="0.4", linewidth=0.8)
    ax.errorbar(bonds, value, (value - low, high - value), fmt="none", ecolor="0.3", capsize=3, linewidth=1.1)
    for x, y in zip(bonds, value, strict=True):
        colour, marker = (LOWERS_LINE, "v") if y < 0 else (RAISES_LINE, "^")
        ax.plot([x], [y], marker, color=colour, markersize=7)
    distances = sorted(set(bonds))
    ax.plot(distances, [value[bonds == b].mean() for b in distances], color="0.5", linewidth=1.0, linestyle="--")
    for b in distances:
        at = bonds == b
        mean = float(value[at].mean())
        edge = float(low[at].min()) if mean < 0 else float(high[at].max())
        ax.annotate(
            signed(mean),
            (b, edge),
            xytext=(0, -4 if mean < 0 else 4),
            textcoords="offset points",
            ha="center",
            va="top" if mean < 0 else "bottom",
            fontsize=8,
        )
    ax.set(xlabel="bonds between the carboxyl carbon and the group", ylabel="contribution to the pKa")
    ax.set_xticks(range(int(min(bonds)), int(max(bonds)) + 1))
    ax.margins(x=0.08, y=0.16)
    coverage = 100 * explanations[0].coverage
    title = f"{_plain(name)}: contribution against distance, with {coverage:g} % intervals"
    ax.set_title(title, fontsize=9, loc="left")
    ax.spines[["top", "right"]].set_visible(False)
    figure.subplots_adjust(left=0.14, right=0.97, top=0.91, bottom=0.14)
    return figure


def save(figure: Figure, stem: Path) -> None:
    """Write a figure as PNG and SVG beside each other; the same figure makes the same files.

    Parameters
    ----------
    figure : matplotlib.figure.Figure
    stem : pathlib.Path
        File name without extension.

    Raises
    ------
    UserError
        If a file cannot be written.
    """
    from matplotlib import rc_context

    with atomic_path(stem.with_name(stem.name + ".png")) as temporary:
        figure.savefig(temporary, metadata={"Software": None}, pil_kwargs={"compress_level": 3})
    # text stays text: smaller files, which can be searched; a fixed salt and no date make them reproducible
    with (
        atomic_path(stem.with_name(stem.name + ".svg")) as temporary,
        rc_context({"svg.hashsalt": "acidity", "svg.fonttype": "none"}),
    ):
        figure.savefig(temporary, metadata={"Date": None})
