"""Distance in units of pKa: slopes of the trend against finite differences, and the properties of a distance."""

from __future__ import annotations

import numpy as np
import pytest
from small_models import small_model

from qsar.descriptors import LOWERS
from qsar.ionisation import edge_descriptors
from qsar.model import Model
from qsar.model.neighbours import Neighbours, nearest, sensitivities
from qsar.paths import reference_table
from qsar.structures import read_acid
from qsar.table import read_table


def test_sensitivities_are_root_mean_square_slopes() -> None:
    model = small_model()
    m = model.members
    rows = [edge_descriptors(r.acid)[0] for r in read_table(reference_table())[:300:12]]
    x = np.array(rows)
    found = sensitivities(m, x[:, ~LOWERS], x[:, LOWERS])
    n_free = int((~LOWERS).sum())
    scaled = m.scaling(x[:, ~LOWERS])
    # central differences of the mean trend along each scaled descriptor
    from qsar.model.kernel import covariance

    dual, h = m.dual.mean(axis=0), 1e-5
    slopes = np.empty((len(x), n_free))
    for j in range(n_free):
        step = np.zeros(n_free)
        step[j] = h
        up, down = (covariance(scaled + s, m.points, m.settings.kernel) @ dual for s in (step, -step))
        slopes[:, j] = (up - down) / (2 * h)
    assert found[:n_free] == pytest.approx(np.sqrt(np.mean(slopes**2, axis=0)), rel=1e-3, abs=1e-6)
    assert found[n_free:] == pytest.approx(m.slopes.mean(axis=0))


def test_distance_is_a_distance() -> None:
    model = small_model()
    x = np.vstack([edge_descriptors(read_acid(s))[0] for s in ("CC(=O)O", "OC(=O)CCl", "OC(=O)c1ccccc1", "NCC(=O)O")])
    d = Neighbours.of(model.members, x).distances(model.members, x)
    assert np.diag(d) == pytest.approx(np.zeros(4), abs=1e-6)
    assert d == pytest.approx(d.T, abs=1e-9)
    for i in range(4):
        for j in range(4):
            for k in range(4):
                assert d[i, j] <= d[i, k] + d[k, j] + 1e-9
    assert np.all(d[~np.eye(4, dtype=bool)] > 0)


def test_a_measured_acid_is_its_own_nearest(model: Model) -> None:
    for row in (0, 1, 2, 50, 200):
        smiles = model.library.smiles[row]
        step = model.predict([smiles])[0].steps[int(model.library.step[row]) - 1]
        assert step.nearest_distance == pytest.approx(0.0, abs=1e-5)
        assert step.nearest_distance == step.neighbours[0].distance
        distances = [n.distance for n in step.neighbours]
        assert distances == sorted(distances)
        assert len(step.neighbours) == 5


@pytest.mark.parametrize("columns", [4, 5, 31, 160, 161, 192, 1177])
@pytest.mark.parametrize("decimals", [12, 1])
def test_nearest_are_those_of_a_full_sort(columns: int, decimals: int) -> None:
    """Against NumPy's stable sort, with and without ties, and with distances that must not be used."""
    rng = np.random.default_rng(columns)
    distances = rng.random((40, columns)).round(decimals)
    distances[rng.random(distances.shape) < 0.1] = np.inf
    distances[0] = np.inf
    wanted = np.argsort(distances, axis=1, kind="stable")[:, :5]
    np.testing.assert_array_equal(nearest(distances, 5), wanted)
