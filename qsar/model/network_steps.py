"""Macroscopic steps of many acids at once, from the micro constants of all their edges."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from qsar.ionisation import closure_defect, cube, macroscopic
from qsar.model.training_set import dominant_edges

Floats = NDArray[np.float64]


@dataclass(frozen=True)
class Steps:
    """The steps of all cases, case by case; all arrays but `by_member` have shape (n_steps,).

    Attributes
    ----------
    case, step, edge : ndarray of int
        Case, step from 1, and the edge that carries most of its flux.
    pka, defect : ndarray
        The whole model's pKa, and by how much the case's network misses closing.
    by_member : ndarray, shape (n_members, n_steps)
        Each member's pKa.
    """

    case: NDArray[np.int64]
    step: NDArray[np.int64]
    edge: NDArray[np.int64]
    pka: Floats
    defect: Floats
    by_member: Floats


def steps_of(sites: list[int], micro: Floats) -> Steps:
    """Steps of cases with so many sites from the micro pKa (n_members, n_edges) of all their edges, in order."""
    counts = np.array(sites)
    first = np.concatenate([[0], np.cumsum([len(cube(n).start) for n in sites])])
    mean = micro.mean(axis=0)
    parts: list[tuple[NDArray[Any], ...]] = []
    for n in sorted(set(sites)):  # cases with the same number of sites together
        own = np.flatnonzero(counts == n)
        edges = first[own][:, None] + np.arange(len(cube(n).start))
        local = dominant_edges(mean[edges], n)
        defect = closure_defect(mean[edges], n) if n > 1 else np.zeros(len(own))
        parts.append(
            (
                np.repeat(own, n),
                np.tile(np.arange(1, n + 1), len(own)),
                (first[own][:, None] + local).ravel(),
                macroscopic(mean[edges], n).ravel(),
                np.repeat(defect, n),
                macroscopic(micro[:, edges], n).reshape(len(micro), -1),
            )
        )
    joined = [np.concatenate(same, axis=-1) for same in zip(*parts, strict=True)]
    order = np.argsort(joined[0], kind="stable")
    return Steps(*(part[..., order] for part in joined))
