"""Which measured steps a fit may see; the steps of one acid always stay together."""

from __future__ import annotations

from collections import Counter
from collections.abc import Sequence
from dataclasses import replace

import numpy as np
from numpy.typing import NDArray

from qsar.groups import perceive
from qsar.model.training_set import TrainingSet

Flags = NDArray[np.bool_]
Ints = NDArray[np.int64]

MOST_FAMILIES = 30  # left out one after the other; each costs two fits


def folds_of_acids(data: TrainingSet, folds: int, seed: int) -> Ints:
    """Fold of each measured step, drawn by acid; shape (n_steps,)."""
    order = np.random.default_rng(seed).permutation(len(data.acids))
    fold = np.empty(len(data.acids), dtype=np.int64)
    fold[order] = np.arange(len(data.acids)) % folds
    return fold[data.step_acid]


def families(data: TrainingSet, least: int = 5, most: int = MOST_FAMILIES) -> dict[str, Flags]:
    """Steps of the acids of each family with at least `least` acids; an acid counts in the family of its first row.

    Of more than `most` families the largest are taken.
    """
    first: dict[int, str] = {}
    for acid, family in zip(data.step_acid, data.family, strict=True):
        first.setdefault(int(acid), family)
    sizes = Counter(first.values())
    own = np.array([first[int(a)] for a in data.step_acid])
    large = [name for name, n in sorted(sizes.items(), key=lambda pair: (-pair[1], pair[0])) if name and n >= least]
    return {name: own == name for name in sorted(large[:most])}


def substituents(data: TrainingSet, least: int = 5, most: float = 0.15) -> dict[str, Flags]:
    """Steps of the acids that carry a kind of functional group, for kinds neither rare nor everywhere.

    Parameters
    ----------
    data : TrainingSet
    least : int
        Acids that must carry it.
    most : float
        Fraction of the acids that may carry it; a kind that most acids carry cannot be left out.
    """
    kinds = [{g.kind for g in perceive(acid.graph)} - {"carboxyl", "other"} for acid in data.acids]
    counts = Counter(kind for own in kinds for kind in own)
    chosen = [k for k in sorted(counts) if least <= counts[k] <= most * len(data.acids)]
    return {kind: np.array([kind in kinds[a] for a in data.step_acid]) for kind in chosen}


def subset_of_acids(data: TrainingSet, among: Flags, n: int, seed: int) -> Flags:
    """Steps of `n` acids drawn from those with a step in `among`."""
    acids = np.unique(data.step_acid[among])
    drawn = np.random.default_rng(seed).permutation(acids)[:n]
    return among & np.isin(data.step_acid, drawn)


def subset(data: TrainingSet, acids: Sequence[int] | Ints) -> TrainingSet:
    """Some acids of a training set, in the order given."""
    acids = np.asarray(acids, dtype=np.int64)
    sizes = np.diff(data.first)[acids]
    edges = np.concatenate([np.arange(data.first[a], data.first[a + 1]) for a in acids])
    place = np.full(len(data.acids), -1)
    place[acids] = np.arange(len(acids))
    steps = np.flatnonzero(place[data.step_acid] >= 0)
    return replace(
        data,
        acids=[data.acids[a] for a in acids],
        x=data.x[edges],
        first=np.concatenate([[0], np.cumsum(sizes)]),
        step_acid=place[data.step_acid[steps]],
        step_number=data.step_number[steps],
        pka=data.pka[steps],
        uncertainty=data.uncertainty[steps],
        weight=data.weight[steps],
        name=[data.name[s] for s in steps],
        family=[data.family[s] for s in steps],
        source=[data.source[s] for s in steps],
    )
