"""Pictures of a table: its pKa by family, and which groups it has at which distance from COOH."""

from __future__ import annotations

from collections import Counter, defaultdict
from collections.abc import Sequence
from pathlib import Path

import numpy as np
from matplotlib.figure import Figure

from qsar.checking.rows import TableRow
from qsar.errors import UserError
from qsar.files import atomic_path
from qsar.graph import Graph
from qsar.groups import perceive
from qsar.structures import read_acid

#: Colours of Okabe and Ito, told apart also with a colour vision deficiency, and shapes.
_STEPS = (("step 1", "#0072B2", "o"), ("step 2", "#E69F00", "^"), ("step 3 and on", "#009E73", "s"))
_FARTHEST = 8
_DOTS_PER_INCH = 150


def draw(rows: Sequence[TableRow], folder: Path) -> list[Path]:
    """Draw all pictures of a table.

    Parameters
    ----------
    rows : sequence of TableRow
    folder : pathlib.Path
        Made if it is not there.

    Returns
    -------
    list of pathlib.Path
        The files written.

    Raises
    ------
    UserError
        If the folder or a file cannot be written.
    """
    try:
        folder.mkdir(parents=True, exist_ok=True)
    except OSError as error:
        raise UserError(f"cannot make the folder {folder}: {error.strerror}") from error
    figures = {"table_families.png": families(rows), "table_coverage.png": coverage(rows)}
    written = []
    for name, figure in figures.items():
        with atomic_path(folder / name) as temporary:
            figure.savefig(temporary, dpi=_DOTS_PER_INCH, metadata={"Software": None})
        written.append(folder / name)
    return written


def families(rows: Sequence[TableRow]) -> Figure:
    """PKa of every step against the family of its acid, families by rising median of the first step."""
    by_family: dict[str, list[TableRow]] = defaultdict(list)
    for row in rows:
        by_family[row.family].append(row)
    names = sorted(by_family, key=lambda name: _median_first(by_family[name]))
    figure = Figure(figsize=(9, 0.36 * len(names) + 1.6), layout="constrained")
    axes = figure.add_subplot()
    random = np.random.default_rng(0)  # only spreads the points; the same picture every time
    for height, name in enumerate(names):
        members = by_family[name]
        for step, (_, colour, marker) in enumerate(_STEPS, start=1):
            values = [r.pka for r in members if min(r.step, len(_STEPS)) == step]
            spread = height + random.uniform(-0.28, 0.28, len(values))
            axes.scatter(values, spread, s=13, c=colour, marker=marker, alpha=0.65, linewidths=0)
        median = _median_first(members)
        axes.plot([median, median], [height - 0.4, height + 0.4], color="black", linewidth=1.5)
    acids = {name: len({row.smiles for row in by_family[name]}) for name in names}
    axes.set_yticks(range(len(names)), [f"{name.replace('_', ' ')} ({acids[name]})" for name in names])
    axes.set_ylabel("family (number of acids)")
    axes.set_ylim(-0.7, len(names) - 0.3)
    axes.set_xlabel("pKa in water, 20 to 30 °C (bar: median of the first step)")
    axes.grid(axis="x", color="#d0d0d0", linewidth=0.6)
    axes.set_axisbelow(True)
    handles = [axes.scatter([], [], c=colour, marker=marker, label=label) for label, colour, marker in _STEPS]
    figure.legend(handles=handles, loc="outside lower center", ncols=len(_STEPS), frameon=False)
    axes.set_title(f"{len(rows)} measured steps of {sum(acids.values())} acids")
    return figure


def _median_first(rows: Sequence[TableRow]) -> float:
    return float(np.median([row.pka for row in rows if row.step == 1] or [row.pka for row in rows]))


def coverage(rows: Sequence[TableRow]) -> Figure:
    """Number of acids that carry a group at a distance from COOH; empty fields are gaps of the table."""
    counts = group_distances({row.smiles for row in rows})
    kinds = sorted({kind for kind, _ in counts}, key=lambda kind: sum(counts[kind, d] for d in range(1, _FARTHEST + 1)))
    grid = np.array([[counts[kind, d] for d in range(1, _FARTHEST + 1)] for kind in kinds], dtype=float)
    figure = Figure(figsize=(7.5, 0.26 * len(kinds) + 1.6), layout="constrained")
    axes = figure.add_subplot()
    shades = np.ma.masked_equal(np.log10(np.where(grid > 0, grid, 1)) + (grid > 0) * 0.15, 0)
    axes.imshow(shades, cmap="cividis", aspect="auto", origin="lower")
    light = float(shades.max()) * 0.6
    for y, x in np.argwhere(grid > 0):
        axes.text(x, y, f"{grid[y, x]:.0f}", ha="center", va="center", fontsize=7.5,
                  color="black" if shades[y, x] > light else "white")  # fmt: skip
    labels = [str(d) for d in range(1, _FARTHEST)] + [f"{_FARTHEST} and more"]
    axes.set_xticks(range(_FARTHEST), labels)
    axes.set_yticks(range(len(kinds)), [kind.replace("_", " ") for kind in kinds], fontsize=8)
    axes.set_xlabel("bonds from the carboxyl carbon to the nearest atom of the group")
    axes.set_title("acids with a group at a distance")
    return figure


def group_distances(structures: set[str]) -> Counter[tuple[str, int]]:
    """How many acids have a kind of group at a distance.

    Parameters
    ----------
    structures : set of str
        SMILES of acids.

    Returns
    -------
    collections.Counter
        By kind of group (see :mod:`qsar.groups`) and bonds from a carboxyl carbon, the last distance standing
        for all further ones. An acid counts once for a kind and distance; the carboxyl group that the
        distance is counted from does not.
    """
    counts: Counter[tuple[str, int]] = Counter()
    for smiles in structures:
        acid = read_acid(smiles)
        groups = perceive(acid.graph)
        found = set()
        for site in acid.sites:
            bonds = _bonds_from(acid.graph, site)
            for group in groups:
                if site not in group.atoms:
                    found.add((group.kind, min(min(bonds[a] for a in group.atoms), _FARTHEST)))
        counts.update(found)
    return counts


def _bonds_from(graph: Graph, start: int) -> dict[int, int]:
    bonds = {start: 0}
    queue = [start]
    for atom in queue:
        for neighbour in graph.neighbours[atom]:
            if neighbour not in bonds:
                bonds[neighbour] = bonds[atom] + 1
                queue.append(neighbour)
    return bonds
