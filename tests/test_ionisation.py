"""The closed network of micro constants against closed formulas and brute force.

Bjerrum 1923; Adams, J. Am. Chem. Soc. 1916, 38, 1503 (K1 = k1 + k2, 1/K2 = 1/k12 + 1/k21); Ullmann, J. Phys. Chem. B
2003, 107, 1263 (decoupled sites). All arithmetic is done again here in another way.
"""

from __future__ import annotations

from itertools import product
from math import comb, log10

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from qsar.descriptors import NAMES
from qsar.ionisation import closure_defect, cube, edge_descriptors, flux, free_energies, macroscopic
from qsar.structures import read_acid

ALL = range(1, 7)
MANY = settings(max_examples=60, deadline=None, derandomize=True)


def closed(n: int, rng: np.random.Generator) -> tuple[np.ndarray, np.ndarray]:
    """Free energies of all states, drawn at random, and the micro constants that follow from them."""
    network = cube(n)
    energy = np.concatenate([[0.0], rng.uniform(-2, 12, 2**n - 1)])
    return energy, energy[network.end] - energy[network.start]


@pytest.mark.parametrize("n", ALL)
def test_the_cube_has_all_states_and_edges(n: int) -> None:
    network = cube(n)
    assert len(network.level) == 2**n
    assert len(network.start) == n * 2 ** (n - 1)
    assert len({(int(q), int(i)) for q, i in zip(network.start, network.site, strict=True)}) == len(network.start)
    assert np.array_equal(network.level[network.end], network.level[network.start] + 1)
    for k in range(n + 1):
        assert np.sum(network.level == k) == comb(n, k)


@pytest.mark.parametrize("n", ALL)
def test_constants_that_close_are_reproduced(n: int) -> None:
    energy, micro = closed(n, np.random.default_rng(n))
    assert free_energies(micro, n) == pytest.approx(energy, abs=1e-9)
    assert closure_defect(micro, n) == pytest.approx(0.0, abs=1e-9)


def test_a_cycle_that_does_not_close_is_fitted_by_least_squares() -> None:
    # Two sites, micro constants 3 and 4 from the acid, 5 and 6 to the dianion. Over A (site 0 first): 3 + 6 = 9; over
    # B: 4 + 5 = 9 would close. Raise the last by 0.4: each of the four edges takes a quarter, 0.1.
    network = cube(2)
    assert [(int(q), int(i)) for q, i in zip(network.start, network.site, strict=True)] == [
        (0, 0),
        (0, 1),
        (1, 1),
        (2, 0),
    ]
    micro = np.array([3.0, 4.0, 6.4, 5.0])
    assert free_energies(micro, 2) == pytest.approx([0.0, 2.9, 4.1, 9.2], abs=1e-9)
    assert closure_defect(micro, 2) == pytest.approx(0.1, abs=1e-9)


def test_two_sites_follow_adams() -> None:
    k1, k2, k12 = 10**-3.1, 10**-3.9, 10**-5.2
    k21 = k1 * k12 / k2  # closes: k1 k12 = k2 k21
    micro = -np.log10([k1, k2, k12, k21])
    first, second = macroscopic(micro, 2)
    assert first == pytest.approx(-log10(k1 + k2), abs=1e-9)
    assert second == pytest.approx(-log10(1 / (1 / k12 + 1 / k21)), abs=1e-9)


def test_a_symmetric_dibasic_acid_gets_log_two_exactly() -> None:
    first, second = macroscopic(np.array([4.0, 4.0, 5.0, 5.0]), 2)
    assert first == pytest.approx(4.0 - log10(2), abs=1e-12)
    assert second == pytest.approx(5.0 + log10(2), abs=1e-12)


@pytest.mark.parametrize("n", ALL)
def test_equal_independent_sites_follow_binomial_statistics(n: int) -> None:
    # K_k = k (n - k + 1) / k: pK_k = pk + log10(k / (n - k + 1)) (Bjerrum 1923)
    micro = np.full(len(cube(n).start), 4.7)
    expected = [4.7 + log10(k / (n - k + 1)) for k in range(1, n + 1)]
    assert macroscopic(micro, n) == pytest.approx(expected, abs=1e-9)


def titration(pka: np.ndarray, ph: float) -> float:
    """Protons lost, from macroscopic constants."""
    beta = np.concatenate([[0.0], np.cumsum(pka)])
    weight = 10.0 ** (np.arange(len(beta)) * ph - beta - max(np.arange(len(beta)) * ph - beta))
    return float((np.arange(len(beta)) * weight).sum() / weight.sum())


@pytest.mark.parametrize("n", ALL)
def test_independent_sites_titrate_as_a_sum_of_single_ones(n: int) -> None:
    # Sites that do not see one another: the curve is the sum of Henderson-Hasselbalch curves, whatever their pk
    # (Ullmann 2003).
    own = np.linspace(2.5, 6.0, n)
    micro = own[cube(n).site]
    pka = macroscopic(micro, n)
    for ph in (2.0, 3.3, 4.5, 7.0):
        assert titration(pka, ph) == pytest.approx(float(np.sum(1 / (1 + 10 ** (own - ph)))), abs=1e-9)


@MANY
@given(st.integers(2, 6), st.integers(0, 10**6))
def test_steps_are_those_of_the_state_populations(n: int, seed: int) -> None:
    energy, micro = closed(n, np.random.default_rng(seed))
    pka = macroscopic(micro, n)
    states = [sum(bits) for bits in product((0, 1), repeat=n)]
    assert sorted(states) == sorted(cube(n).level.tolist())
    for ph in (1.0, 4.2, 8.0):
        logs = cube(n).level * ph - energy
        weight = 10.0 ** (logs - logs.max())
        assert titration(pka, ph) == pytest.approx(float((cube(n).level * weight).sum() / weight.sum()), abs=1e-9)


@MANY
@given(st.integers(1, 6), st.integers(0, 10**6))
def test_flux_of_each_step_adds_up_to_one(n: int, seed: int) -> None:
    micro = np.random.default_rng(seed).uniform(0, 12, len(cube(n).start))
    share = flux(micro, n)
    level = cube(n).level[cube(n).start]
    assert np.all(share >= 0)
    for k in range(n):
        assert share[level == k].sum() == pytest.approx(1.0, abs=1e-9)


def test_flux_follows_the_stronger_group() -> None:
    # two independent sites of pk 3 and 5: first step K1 = 10^-3 + 10^-5, the stronger site has 1/1.01 of it, and the
    # same share of the second step is that of the weaker site
    micro = np.array([3.0, 5.0])[cube(2).site]
    share = flux(micro, 2)
    assert share == pytest.approx([1 / 1.01, 0.01 / 1.01, 1 / 1.01, 0.01 / 1.01], abs=1e-9)


def test_flux_of_equal_sites_is_equal() -> None:
    for n in ALL:
        share = flux(np.full(len(cube(n).start), 4.0), n)
        level = cube(n).level[cube(n).start]
        for k in range(n):
            assert share[level == k] == pytest.approx(1 / np.sum(level == k), abs=1e-9)


@MANY
@given(st.integers(1, 6), st.floats(-3, 3), st.integers(0, 10**6))
def test_shifting_every_micro_constant_shifts_every_step(n: int, shift: float, seed: int) -> None:
    micro = np.random.default_rng(seed).uniform(0, 10, len(cube(n).start))
    assert macroscopic(micro + shift, n) == pytest.approx(macroscopic(micro, n) + shift, abs=1e-9)


def test_many_members_at_once_are_the_same_as_one_by_one() -> None:
    micro = np.random.default_rng(3).uniform(2, 8, (4, 5, len(cube(3).start)))
    for function in (macroscopic, flux, free_energies, closure_defect):
        together = function(micro, 3)
        for i, j in product(range(4), range(5)):
            assert together[i, j] == pytest.approx(function(micro[i, j], 3), abs=1e-12)


def test_constants_far_apart_do_not_overflow() -> None:
    micro = np.array([-400.0, 400.0, 500.0, -300.0])
    assert np.all(np.isfinite(macroscopic(micro, 2)))
    assert np.all(np.isfinite(flux(micro, 2)))


def test_edges_of_a_symmetric_acid_have_equal_descriptors_in_pairs() -> None:
    for smiles in ("OC(=O)CC(=O)O", "OC(=O)CCCC(=O)O", "OC(=O)/C=C/C(=O)O", "OC(=O)c1ccc(C(=O)O)cc1"):
        x = edge_descriptors(read_acid(smiles))
        assert x.shape == (4, len(NAMES))
        assert np.array_equal(x[0], x[1])
        assert np.array_equal(x[2], x[3])
        assert not np.array_equal(x[0], x[2])


def test_edges_are_the_sites_in_the_state_of_the_others() -> None:
    acid = read_acid("OC(=O)CC(O)(C(=O)O)CC(=O)O")
    x = edge_descriptors(acid)
    network = cube(3)
    anions, carboxyls = NAMES.index("anions"), NAMES.index("carboxyls")
    assert x[:, anions] == pytest.approx(network.level[network.start])
    assert x[:, carboxyls] == pytest.approx(2 - network.level[network.start])
