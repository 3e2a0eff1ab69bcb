"""The ensemble: folds by acid, and out-of-fold values that owe nothing to the acid itself."""

from __future__ import annotations

from collections import Counter
from dataclasses import replace

import numpy as np
import pytest
from small_models import QUICK, reference_rows

from qsar.model.members import Settings, fit_members, fold_of_acids, out_of_fold
from qsar.model.training_set import training_set

ROWS = reference_rows()[::9]


def test_folds_are_balanced_and_drawn_from_the_seed() -> None:
    settings = Settings(folds=10, seed=3)
    fold = fold_of_acids(107, settings)
    assert set(Counter(fold.tolist()).values()) == {10, 11}
    assert np.array_equal(fold, fold_of_acids(107, settings))
    assert not np.array_equal(fold, fold_of_acids(107, replace(settings, seed=4)))


def test_an_acid_s_own_measurement_does_not_reach_its_out_of_fold_value() -> None:
    data = training_set(ROWS)
    members, fold = fit_members(data, QUICK)
    mine = data.steps(out_of_fold(data, members, fold)[0])
    row = next(i for i, n in enumerate(data.step_number) if n == 1)
    acid = data.step_acid[row]
    falsified = [replace(r, pka=r.pka - 2.0) if data.step_acid[i] == acid else r for i, r in enumerate(ROWS)]
    other = training_set(falsified)
    changed_members, same_fold = fit_members(other, QUICK)
    assert np.array_equal(fold, same_fold)
    changed = other.steps(out_of_fold(other, changed_members, fold)[0])
    of_acid = data.step_acid == acid
    in_fold = fold[data.step_acid] == fold[acid]
    assert np.array_equal(mine[of_acid], changed[of_acid])  # it never saw itself
    assert np.array_equal(mine[in_fold], changed[in_fold])  # nor did its fold
    assert not np.array_equal(mine[~in_fold], changed[~in_fold])  # the others did


def test_all_steps_of_an_acid_are_in_one_fold() -> None:
    data = training_set(reference_rows())
    fold = fold_of_acids(len(data.acids), QUICK)
    for acid in np.unique(data.step_acid[data.step_number > 1]):
        assert len(set(fold[data.step_acid[data.step_acid == acid]])) == 1
    smiles = [a.smiles for a in data.acids]
    assert len(set(smiles)) == len(smiles)


def test_progress_is_told_once_a_member() -> None:
    told: list[int] = []
    fit_members(training_set(ROWS[:40]), QUICK, told.append)
    assert told == [1] * QUICK.folds


def test_members_of_the_shipped_model_agree_with_its_arrays(model) -> None:  # type: ignore[no-untyped-def]
    m = model.members
    x = np.zeros((1, len(model.card["descriptors"])))
    trend, boosted = m.predict(x)
    assert trend.shape == boosted.shape == (m.settings.folds, 1)
    assert model.micro(x) == pytest.approx(trend + boosted)
