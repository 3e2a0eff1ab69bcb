"""Measured steps as targets of edges: what one measurement says about the micro constants of its level."""

from __future__ import annotations

from math import log10

import numpy as np
import pytest

from qsar.model.training_set import dominant_edge, latent_targets, training_set
from qsar.structures import read_acid
from qsar.table import Measurement


def row(smiles: str, step: int, pka: float, uncertainty: float = 0.05) -> Measurement:
    return Measurement(read_acid(smiles), step, pka, uncertainty, "invented", "", "")


# invented values
ROWS = [
    row("CC(=O)O", 1, 4.8),
    row("OC(=O)CC(=O)O", 1, 2.9),
    row("OC(=O)CC(C)C(=O)O", 1, 4.0),
    row("[O-]C(=O)CC(=O)O.[Na+]", 2, 5.6, 0.0),
]


def test_rows_of_one_structure_are_one_acid() -> None:
    data = training_set(ROWS)
    assert [a.smiles for a in data.acids] == [ROWS[k].acid.smiles for k in (0, 1, 2)]
    assert data.step_acid.tolist() == [0, 1, 2, 1]
    assert data.step_number.tolist() == [1, 1, 1, 2]
    assert np.diff(data.first).tolist() == [1, 4, 4]
    assert data.owner.tolist() == [0] + [1] * 4 + [2] * 4
    assert data.weight.tolist() == [1.0] * 4
    assert data.uncertainty[3] > 0  # nobody measures without error


def test_steps_are_macroscopic_constants() -> None:
    data = training_set(ROWS)
    micro = np.concatenate([[4.7], [3.0, 3.0, 5.0, 5.0], [3.5, 4.5, 5.5, 4.5]])
    steps = data.steps(micro)
    assert steps[0] == pytest.approx(4.7)
    assert steps[1] == pytest.approx(3.0 - log10(2))
    assert steps[2] == pytest.approx(-log10(10**-3.5 + 10**-4.5))
    assert steps[3] == pytest.approx(5.0 + log10(2))
    assert data.steps(np.stack([micro, micro + 1])) == pytest.approx(np.stack([steps, steps + 1]))


def test_a_monobasic_acid_s_target_is_its_measurement() -> None:
    data = training_set(ROWS[:1])
    targets = latent_targets(data, np.array([3.0]), np.array([True]))
    assert targets.value.tolist() == pytest.approx([4.8])
    assert targets.variance.tolist() == pytest.approx([0.05**2])
    assert targets.share.tolist() == [1.0]


def test_a_symmetric_step_is_shared_in_halves_and_met_exactly() -> None:
    data = training_set([ROWS[1], ROWS[3]])
    micro = np.array([4.3] * 4)
    for _ in range(2):
        targets = latent_targets(data, micro, np.array([True, True]))
        assert targets.share == pytest.approx([0.5] * 4)
        assert sorted(targets.edge.tolist()) == [0, 1, 2, 3]
        micro = micro.copy()
        micro[targets.edge] = targets.value
    assert data.steps(micro) == pytest.approx([2.9, 5.6], abs=1e-9)
    assert micro[:2] == pytest.approx([2.9 + log10(2)] * 2, abs=1e-9)


def test_an_edge_that_carries_nothing_is_no_target() -> None:
    data = training_set([ROWS[2]])
    micro = np.array([3.0, 8.0, 9.0, 4.0])  # the first site is 10^5 times stronger
    targets = latent_targets(data, micro, np.array([True]))
    assert targets.edge.tolist() == [0]
    assert targets.value == pytest.approx([4.0], abs=1e-4)


def test_less_of_the_flux_and_less_weight_is_less_certain() -> None:
    data = training_set([ROWS[2]])
    micro = np.array([3.5, 4.5, 5.5, 4.5])
    targets = latent_targets(data, micro, np.array([True]))
    share = 10**-3.5 / (10**-3.5 + 10**-4.5)
    assert targets.share == pytest.approx([share, 1 - share])
    assert targets.variance[0] < targets.variance[1]
    half = latent_targets(training_set([ROWS[2]], weights=[0.5]), micro, np.array([True]))
    assert half.variance == pytest.approx(2 * targets.variance)


def test_rows_that_are_not_wanted_leave_no_trace() -> None:
    data = training_set(ROWS)
    micro = np.full(len(data.x), 4.3)
    wanted = np.array([True, False, True, False])
    targets = latent_targets(data, micro, wanted)
    assert set(data.owner[targets.edge]) == {0, 2}


def test_dominant_edge() -> None:
    micro = np.array([3.5, 4.5, 5.5, 4.5])
    assert dominant_edge(micro, 2, 1) == 0
    assert dominant_edge(micro, 2, 2) == 2  # the weaker site, the other one ionised
    assert dominant_edge(np.array([4.0, 4.0, 5.0, 5.0]), 2, 1) == 0  # the first of equals
