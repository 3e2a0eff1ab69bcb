"""The shipped model comes from the shipped table: one fold is fitted again and compared, the whole in a slow test."""

from __future__ import annotations

import platform
from pathlib import Path

import numpy as np
import pytest
import scipy
import sklearn

from qsar.descriptors import LOWERS, NAMES
from qsar.model import Model
from qsar.model.bundle import arrays_of, settings_from
from qsar.model.kernel import Scaling
from qsar.model.members import fit_member, fold_of_acids, join_members
from qsar.model.training import train
from qsar.model.training_set import TrainingSet, training_set
from qsar.model.user_table import weights_of
from qsar.paths import reference_table
from qsar.table import read_table, sha256

FOLD = 0


@pytest.fixture(scope="module")
def data() -> TrainingSet:
    rows = read_table(reference_table())
    return training_set(rows, weights_of(rows))


def test_the_card_names_the_shipped_table(model: Model) -> None:
    (table,) = model.card["tables"]
    assert table["name"] == reference_table().name
    assert table["sha256"] == sha256(reference_table())


def test_the_card_names_the_descriptors_of_this_program(model: Model) -> None:
    assert model.card["descriptors"] == list(NAMES)


def test_the_bundle_is_small(shipped_model: Path) -> None:
    assert sum(p.stat().st_size for p in shipped_model.iterdir()) <= 8 * 10**6


def test_the_library_is_the_table(model: Model, data: TrainingSet) -> None:
    library = model.library
    assert library.smiles == [data.acids[a].smiles for a in data.step_acid]
    assert np.array_equal(library.step, data.step_number)
    assert np.array_equal(library.pka, data.pka)
    assert library.source == data.source


def test_one_fold_fitted_again_gives_the_stored_values(model: Model, data: TrainingSet) -> None:
    settings = settings_from(model.card["settings"])
    fold = fold_of_acids(len(data.acids), settings)
    assert np.array_equal(fold[data.step_acid], model.calibration.member)
    scaling = Scaling.of(data.x[:, ~LOWERS])
    member = fit_member(data, scaling, fold[data.step_acid] != FOLD, settings, settings.seed + 1000 * FOLD)
    trend, boosted = join_members(data, scaling, [member], settings).predict(data.x)
    held = fold[data.step_acid] == FOLD
    assert held.sum() > 20
    again = data.steps((trend + boosted)[0])[held]
    assert np.abs(again - model.library.pka_without[held]).max() <= 1e-9


@pytest.mark.slow
def test_a_full_rebuild_is_the_same_bit_for_bit(model: Model) -> None:
    here = {
        "python": platform.python_version(),
        "numpy": np.__version__,
        "scipy": scipy.__version__,
        "scikit-learn": sklearn.__version__,
    }
    other = {k: v for k, v in here.items() if model.card["libraries"][k] != v}
    if other:
        pytest.skip(f"bits are promised for the library versions of the card only; here: {other}")
    rows = read_table(reference_table())
    rebuilt = train(rows, model.name, settings_from(model.card["settings"]), weights=weights_of(rows))
    stored, fresh = arrays_of(model), arrays_of(rebuilt)
    assert [name for name in stored if not np.array_equal(stored[name], fresh[name])] == []
    for key in ("acids", "steps", "metrics", "borderline_above", "outside_above", "tree_depth"):
        assert rebuilt.card[key] == model.card[key]
