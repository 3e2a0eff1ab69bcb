"""Training on the open rows besides the free table: what it adds, on acids that each model has not seen."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from typing import Protocol

import numpy as np

from qsar.model.model import Model
from qsar.model.training import train
from qsar.structures import read_acid
from qsar.table import Measurement
from qsar.validation.fits import problem_of
from qsar.validation.judged import FAMILIES, Judged, MeasuredStep, judge, library_steps
from qsar.validation.metrics import LEVELS
from qsar.validation.report import Section, Table

#: Standard uncertainty by the compilers' grade, pKa units: "reliable" is better than 0.02, "approximate" than
#: 0.06 (Serjeant & Dempsey 1979, from memory), the rest is worse.
UNCERTAINTY = {"reliable": 0.02, "approximate": 0.06}
_OTHERWISE = 0.12


class GradedStep(MeasuredStep, Protocol):
    """A measured step with the compilers' grade."""

    @property
    def assessment(self) -> str:
        """Grade in words; may be empty."""


def open_measurements(model: Model, steps: Sequence[GradedStep]) -> list[Measurement]:
    """The open steps that the model's table does not hold."""
    added = []
    for s in steps:
        if s.step in model.library.rows_of(s.smiles):
            continue
        uncertainty = UNCERTAINTY.get(s.assessment.lower(), _OTHERWISE)
        added.append(Measurement(read_acid(s.smiles), s.step, s.pka, uncertainty, "", "open rows", "IUPAC"))
    return added


def train_with(
    model: Model,
    steps: Sequence[GradedStep],
    done: Callable[[int], object] = lambda _: None,
    jobs: int = 1,
) -> Model:
    """Train with the model's settings on its table and the open steps that it does not hold.

    Returns
    -------
    Model
        Not to be shipped: its rows are licensed for non-commercial use.
    """
    table = problem_of(model.library, model.members.settings).data
    own = [
        Measurement(table.acids[a], int(k), float(p), float(u), n, f, c)
        for a, k, p, u, n, f, c in zip(
            table.step_acid,
            table.step_number,
            table.pka,
            table.uncertainty,
            table.name,
            table.family,
            table.source,
            strict=True,
        )
    ]
    return train(
        [*own, *open_measurements(model, steps)],
        f"{model.name} and open rows",
        model.members.settings,
        provenance={"licence": "trained on rows under CC BY-NC 4.0"},
        done=done,
        jobs=jobs,
    )


def compare(model: Model, richer: Model, steps: Sequence[MeasuredStep]) -> list[Section]:
    """Both models on the open steps and on the table's steps, every acid predicted without it."""
    sections = []
    table = library_steps(model.library)
    for title, rows in (("Open rows", steps), ("Steps of the free table", table)):
        before, after = judge(model, rows), judge(richer, rows)
        sections.append(Section(title, _summary(before, after), (_errors(before, after), _held(before, after))))
    return sections


def _summary(before: Judged, after: Judged) -> str:
    change = np.abs(after.error) - np.abs(before.error)
    spread = float(change.std(ddof=1) / np.sqrt(len(change)))
    return (
        f"Mean absolute error {np.abs(before.error).mean():.3f} without and {np.abs(after.error).mean():.3f} with the "
        f"open rows in the training table; "
        f"change {change.mean():+.3f} ± {spread:.3f} (standard error, n {len(change)})."
    )


def _errors(before: Judged, after: Judged) -> Table:
    groups = {name: before.family == name for name in FAMILIES} | {"all": np.ones(len(before.measured), dtype=bool)}
    return Table(
        ("acids", "n", "free table alone", "with open rows", "forest alone", "forest with open rows"),
        [
            (
                name,
                int(rows.sum()),
                before.errors(rows).mean_absolute,
                after.errors(rows).mean_absolute,
                before.errors(rows, forest=True).mean_absolute,
                after.errors(rows, forest=True).mean_absolute,
            )
            for name, rows in groups.items()
        ],
    )


def _held(before: Judged, after: Judged) -> Table:
    rows = np.ones(len(before.measured), dtype=bool)
    return Table(
        ("intervals", "n", "held, free table alone", "held, with open rows", "median width alone", "median width with"),
        [
            (
                f"{100 * level:.0f} %",
                len(rows),
                before.coverage(level, rows).share,
                after.coverage(level, rows).share,
                float(np.median(before.width(level))),
                float(np.median(after.width(level))),
            )
            for level in LEVELS
        ],
    )
