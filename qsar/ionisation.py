r"""Charge states of an acid, the closed network of its micro constants, and its macroscopic steps.

A model gives a micro pKa for each carboxyl group in each charge state of the others. Such numbers do not close
around a cycle by themselves, so the free energies of the states are the least-squares fit to all edges of the
deprotonation cube; macroscopic steps follow from the binding polynomial over the states
(Bjerrum 1923; Ullmann, J. Phys. Chem. B 2003, 107, 1263):

.. math:: pK_k = -\log_{10}\frac{\sum_{|q|=k} 10^{-G_q}}{\sum_{|q|=k-1} 10^{-G_q}}

with :math:`G_q` in pK units and :math:`|q|` the number of protons lost. Two equal, independent sites so differ by
:math:`\log_{10} 4` between their steps.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import cache

import numpy as np
from numpy.typing import NDArray

from qsar.descriptors import Molecule, SiteView, rounded, site_descriptors
from qsar.structures import Acid

Floats = NDArray[np.float64]


@dataclass(frozen=True, eq=False)
class Cube:
    """The deprotonation cube of n sites.

    Attributes
    ----------
    n : int
    start : ndarray of int, shape (n_edges,)
        State before the proton leaves; bit i is set when site i is ionised.
    site : ndarray of int, shape (n_edges,)
        Position (0..n-1) of the site whose proton leaves.
    level : ndarray of int, shape (2**n,)
        Protons lost in each state.
    solve : ndarray, shape (2**n, n_edges)
        Least-squares map from micro pKa of the edges to free energies of the states (fully protonated = 0).
    """

    n: int
    start: NDArray[np.int64]
    site: NDArray[np.int64]
    level: NDArray[np.int64]
    solve: Floats

    @property
    def end(self) -> NDArray[np.int64]:
        """State after the proton has left, for each edge."""
        return self.start | (1 << self.site)


@cache
def cube(n: int) -> Cube:
    """The deprotonation cube of `n` sites (1 to 6), edges ordered by state, then site."""
    edges = [(q, i) for q in range(2**n) for i in range(n) if not q >> i & 1]
    start = np.array([q for q, _ in edges])
    site = np.array([i for _, i in edges])
    incidence = np.zeros((len(edges), 2**n))
    rows = np.arange(len(edges))
    incidence[rows, start | (1 << site)] = 1.0
    incidence[rows, start] = -1.0
    solve = np.zeros((2**n, len(edges)))
    solve[1:] = np.linalg.pinv(incidence[:, 1:])
    level = np.array([bin(q).count("1") for q in range(2**n)])
    return Cube(n, start, site, level, solve)


def edge_descriptors(acid: Acid) -> Floats:
    """Descriptors of every edge of the acid's network.

    Returns
    -------
    ndarray, shape (n_edges, n_descriptors)
        In the order of :func:`cube`.
    """
    return rounded([site_descriptors(view) for view in edge_views(acid)])


def edge_views(acid: Acid) -> list[SiteView]:
    """Each edge of the acid's network as a view of the carboxyl group whose proton leaves, in the order of `cube`."""
    molecule = Molecule(acid.graph)
    sites = acid.sites
    if len(sites) == 1:
        return [SiteView(molecule, sites[0])]
    network = cube(len(sites))
    states = [frozenset(s for k, s in enumerate(sites) if q >> k & 1) for q in range(2 ** len(sites))]
    return [
        SiteView(molecule, sites[i], states[q])
        for q, i in zip(network.start.tolist(), network.site.tolist(), strict=True)
    ]


def free_energies(micro: Floats, n: int) -> Floats:
    """Free energies of the states, in pK units.

    Parameters
    ----------
    micro : ndarray, shape (..., n_edges)
        Micro pKa of the edges.
    n : int
        Number of sites.

    Returns
    -------
    ndarray, shape (..., 2**n)
    """
    return micro @ cube(n).solve.T


def closure_defect(micro: Floats, n: int) -> Floats:
    """Root mean square by which the micro constants miss closing, in pK units; shape (...)."""
    network = cube(n)
    energy = free_energies(micro, n)
    fitted = energy[..., network.end] - energy[..., network.start]
    defect: Floats = np.sqrt(np.mean((micro - fitted) ** 2, axis=-1))
    return defect


def macroscopic(micro: Floats, n: int) -> Floats:
    """Macroscopic pKa of steps 1..n from micro pKa of the edges.

    Parameters
    ----------
    micro : ndarray, shape (..., n_edges)
    n : int

    Returns
    -------
    ndarray, shape (..., n)
    """
    if n == 1:
        return micro.copy()
    network = cube(n)
    energy = free_energies(micro, n)
    levels = [_minus_log_sum(energy[..., network.level == k]) for k in range(n + 1)]
    return np.stack([levels[k + 1] - levels[k] for k in range(n)], axis=-1)


def flux(micro: Floats, n: int) -> Floats:
    """Share of each edge in the macroscopic constant of its step.

    Returns
    -------
    ndarray, shape (..., n_edges)
        Shares of the edges of one step add up to 1.
    """
    network = cube(n)
    energy = free_energies(micro, n)
    edge_level = network.level[network.start]
    share = np.zeros_like(micro)
    for k in range(n):
        edges = edge_level == k
        # an edge's flux is proportional to the population of the state that it leads to, divided among the
        # edges that lead there by the population of the states that they come from
        exponent = -energy[..., network.start[edges]] - (
            energy[..., network.end[edges]] - energy[..., network.start[edges]]
        )
        population = -energy[..., network.start[edges]]
        logs = exponent - exponent.max(axis=-1, keepdims=True)
        weight = 10.0**logs
        into = np.zeros((*weight.shape[:-1], 2**n))
        from_population = 10.0 ** (population - population.max(axis=-1, keepdims=True))
        ends = network.end[edges]
        for j, e in enumerate(ends):
            into[..., e] += from_population[..., j]
        weight = weight * from_population / into[..., ends]
        share[..., edges] = weight / weight.sum(axis=-1, keepdims=True)
    return share


def _minus_log_sum(energy: Floats) -> Floats:
    """-log10 of the sum of 10**-energy over the last axis, without overflow."""
    lowest = energy.min(axis=-1, keepdims=True)
    total = np.log10(np.sum(10.0 ** (lowest - energy), axis=-1))
    result: Floats = lowest[..., 0] - total
    return result
