"""Measured steps as targets for the edges of each acid's network."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from qsar.ionisation import cube, edge_descriptors, flux, macroscopic
from qsar.structures import Acid
from qsar.table import Measurement

Floats = NDArray[np.float64]
Ints = NDArray[np.int64]


@dataclass(frozen=True, eq=False)
class TrainingSet:
    """Acids, their edges and their measured steps.

    Attributes
    ----------
    acids : list of Acid
        One for each structure.
    x : ndarray, shape (n_edges, n_descriptors)
    first : ndarray of int, shape (n_acids + 1,)
        Edges of acid i are ``first[i]:first[i + 1]``.
    step_acid, step_number : ndarray of int, shape (n_steps,)
        Acid and step (from 1) of each measurement.
    pka, uncertainty : ndarray, shape (n_steps,)
    weight : ndarray, shape (n_steps,)
        1, or less for rows that count less.
    name, family, source : list of str, length n_steps
    """

    acids: list[Acid]
    x: Floats
    first: Ints
    step_acid: Ints
    step_number: Ints
    pka: Floats
    uncertainty: Floats
    weight: Floats
    name: list[str]
    family: list[str]
    source: list[str]

    @property
    def owner(self) -> Ints:
        """Acid that each edge belongs to, shape (n_edges,)."""
        return np.repeat(np.arange(len(self.acids)), np.diff(self.first))

    def edges(self, acid: int) -> slice:
        """Edges of one acid."""
        return slice(int(self.first[acid]), int(self.first[acid + 1]))

    def steps(self, micro: Floats) -> Floats:
        """Macroscopic pKa of the measured steps from micro pKa (..., n_edges); shape (..., n_steps)."""
        result = np.empty((*micro.shape[:-1], len(self.pka)))
        single = np.diff(self.first) == 1
        lone = single[self.step_acid]
        result[..., lone] = micro[..., self.first[self.step_acid[lone]]]
        for acid in np.unique(self.step_acid[~lone]):
            rows = np.flatnonzero(self.step_acid == acid)
            macro = macroscopic(micro[..., self.edges(acid)], len(self.acids[acid].sites))
            result[..., rows] = macro[..., self.step_number[rows] - 1]
        return result

    def dominant_edges(self, micro: Floats) -> Ints:
        """For each measured step the edge that carries most of its flux; shape (n_steps,)."""
        result = np.empty(len(self.pka), dtype=np.int64)
        for row, (acid, step) in enumerate(zip(self.step_acid, self.step_number, strict=True)):
            edges = self.edges(acid)
            n = len(self.acids[acid].sites)
            result[row] = edges.start + dominant_edge(micro[edges], n, int(step))
        return result


def dominant_edge(micro: Floats, n: int, step: int) -> int:
    """Position of the edge with the largest flux of a step; the first one where several are equal."""
    network = cube(n)
    at_level = np.flatnonzero(network.level[network.start] == step - 1)
    share = flux(micro, n)[at_level]
    return int(at_level[np.flatnonzero(share >= share.max() - 1e-9)[0]])


def dominant_edges(micro: Floats, n: int) -> Ints:
    """`dominant_edge` of each step of several acids with `n` sites.

    Parameters
    ----------
    micro : ndarray, shape (n_acids, n_edges)
    n : int

    Returns
    -------
    ndarray of int, shape (n_acids, n)
    """
    result = np.zeros((len(micro), n), dtype=np.int64)
    if n == 1:
        return result
    network = cube(n)
    edge_level = network.level[network.start]
    shares = flux(micro, n)
    for step in range(n):
        at_level = np.flatnonzero(edge_level == step)
        share = shares[:, at_level]
        result[:, step] = at_level[np.argmax(share >= share.max(axis=1, keepdims=True) - 1e-9, axis=1)]
    return result


def training_set(measurements: Sequence[Measurement], weights: Sequence[float] | None = None) -> TrainingSet:
    """Join measurements of the same structure and compute the descriptors of all edges."""
    position: dict[str, int] = {}
    acids: list[Acid] = []
    for m in measurements:
        if m.acid.smiles not in position:
            position[m.acid.smiles] = len(acids)
            acids.append(m.acid)
    blocks = [edge_descriptors(acid) for acid in acids]
    first = np.concatenate([[0], np.cumsum([len(b) for b in blocks])])
    return TrainingSet(
        acids,
        np.vstack(blocks),
        first,
        np.array([position[m.acid.smiles] for m in measurements]),
        np.array([m.step for m in measurements]),
        np.array([m.pka for m in measurements]),
        np.array([max(m.uncertainty, 0.01) for m in measurements]),
        np.ones(len(measurements)) if weights is None else np.asarray(weights, dtype=float),
        [m.name for m in measurements],
        [m.family for m in measurements],
        [m.source for m in measurements],
    )


@dataclass(frozen=True)
class Targets:
    """Latent micro pKa of the edges that measured steps say something about.

    Attributes
    ----------
    edge : ndarray of int, shape (n,)
    value : ndarray, shape (n,)
        Present prediction + (measured - predicted) of the step the edge belongs to.
    variance : ndarray, shape (n,)
        From the measurement's uncertainty; larger where the edge carries little of the flux.
    share : ndarray, shape (n,)
        Share of the flux times the weight of the row.
    """

    edge: Ints
    value: Floats
    variance: Floats
    share: Floats


_LEAST_SHARE = 0.02  # an edge with less of the flux says nothing about its micro constant
_SLACK = 0.1  # pKa units by which the split of a step among its edges may be wrong


def latent_targets(data: TrainingSet, micro: Floats, wanted: NDArray[np.bool_]) -> Targets:
    """Spread the measured steps over the edges of their level.

    Parameters
    ----------
    data : TrainingSet
    micro : ndarray, shape (n_edges,)
        Present micro pKa.
    wanted : ndarray of bool, shape (n_steps,)
        Measurements that may be used.

    Returns
    -------
    Targets
    """
    predicted = data.steps(micro)
    edges, values, variances, shares = [], [], [], []
    for row in np.flatnonzero(wanted):
        acid, step = int(data.step_acid[row]), int(data.step_number[row])
        n = len(data.acids[acid].sites)
        own = data.edges(acid)
        network = cube(n)
        at_level = np.flatnonzero(network.level[network.start] == step - 1)
        share = flux(micro[own], n)[at_level] if n > 1 else np.ones(1)
        kept = share > _LEAST_SHARE
        at_level, share = at_level[kept], share[kept]
        edges.append(own.start + at_level)
        values.append(micro[own][at_level] + data.pka[row] - predicted[row])
        variances.append((data.uncertainty[row] ** 2 + _SLACK**2 * (1.0 - share)) / (share * data.weight[row]))
        shares.append(share * data.weight[row])
    return Targets(np.concatenate(edges), np.concatenate(values), np.concatenate(variances), np.concatenate(shares))
