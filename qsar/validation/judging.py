"""The training table judged by itself, in processes or on a cluster."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import fields
from typing import Any

import numpy as np
from numpy.typing import NDArray

from qsar.model.model import Model
from qsar.validation.judged import Judged, LibraryStep, judge, library_steps
from qsar.validation.metrics import LEVELS
from qsar.validation.pieces import in_pieces

#: How often `judge_table` says that a part is done.
PARTS = len(LEVELS) + 1
_ON_A_CLUSTER = 5  # parts: every one of them counts once more what each acid showed the domain


def judge_table(
    model: Model, done: Callable[[int], object] = lambda _: None, jobs: int = 1, cluster: str | None = None
) -> Judged:
    """Every measured step of the training table, predicted without its acid.

    Parameters
    ----------
    model : Model
    done : callable
        Called with numbers that add up to `PARTS`.
    jobs, cluster
        As in :func:`qsar.validation.pieces.in_pieces`; the outcome does not depend on them, to 1e-9.

    Returns
    -------
    Judged
        In the order of the model's library.

    Raises
    ------
    UserError
        If the model withholds its structures.
    """
    steps = library_steps(model.library)
    count = min(jobs if cluster is None else _ON_A_CLUSTER, len(np.unique(model.calibration.member)))
    if count == 1:
        return judge(model, steps, done)
    # Whole folds, so that each fold is predicted in one go as it is in a single process.
    rows = [np.flatnonzero(model.calibration.member % count == part) for part in range(count)]
    pieces = [[steps[i] for i in own] for own in rows]
    parts = []
    for number, part in enumerate(in_pieces(judge, model, pieces, jobs, cluster)):
        parts.append(part)
        done(PARTS * (number + 1) // count - PARTS * number // count)
    return _joined(steps, rows, parts)


def _joined(steps: Sequence[LibraryStep], rows: Sequence[NDArray[np.int64]], parts: Sequence[Judged]) -> Judged:
    """The parts in the order of `steps`, acids numbered as they come."""
    order = np.argsort(np.concatenate(rows))
    values: dict[str, Any] = {}
    for name in (field.name for field in fields(Judged)):
        own = [getattr(part, name) for part in parts]
        if isinstance(own[0], list):
            flat = [value for part in own for value in part]
            values[name] = [flat[i] for i in order]
        else:
            values[name] = np.concatenate(own, axis=-1)[..., order]
    position: dict[str, int] = {}
    for step in steps:
        position.setdefault(step.smiles, len(position))
    values["acid"] = np.array([position[step.smiles] for step in steps])
    return Judged(**values)
