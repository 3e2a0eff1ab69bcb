"""Predictions without the acid really are without it."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from small_models import QUICK, reference_rows, small_model

from qsar.errors import UserError
from qsar.model.training import train
from qsar.structures import read_acid
from qsar.validation.without import Judge


def test_the_part_without_a_fold_gives_the_stored_predictions() -> None:
    model = small_model()
    library = model.library
    smiles = list(dict.fromkeys(library.smiles))
    predictions, trained_on = Judge(model).predict([read_acid(s) for s in smiles])
    assert trained_on.all()
    for s, p in zip(smiles, predictions, strict=True):
        for step, row in library.rows_of(s).items():
            if len(p.steps) and "isomers" not in " ".join(p.steps[0].reasons):
                assert p.steps[step - 1].pka == pytest.approx(library.pka_without[row], abs=1e-9)


def test_a_strangers_prediction_is_that_of_the_whole_model() -> None:
    model = small_model()
    acid = read_acid("OC(=O)CCCCCCCCCC(F)(F)F")
    (prediction,), trained_on = Judge(model).predict([acid])
    assert not trained_on[0]
    assert prediction == replace(model.predict([acid])[0], acid=prediction.acid)


def test_another_value_of_the_acid_changes_nothing() -> None:
    """Train again with one value three units off: the prediction without that acid is the same to the last bit."""
    rows = list(reference_rows()[::4])
    wrong = [*rows]
    k = next(i for i, m in enumerate(rows) if len(m.acid.sites) == 1)
    wrong[k] = replace(rows[k], pka=rows[k].pka + 3.0)
    found = []
    for table in (rows, wrong):
        model = train(table, "small", QUICK, provenance={"tables": []})
        (prediction,), _ = Judge(model).predict([rows[k].acid])
        found.append(prediction.steps[0].pka)
        assert model.library.smiles.count(rows[k].acid.smiles) == 1
    assert found[0] == found[1]


def test_nothing_of_the_fold_is_left_as_evidence() -> None:
    model = small_model()
    judge = Judge(model)
    acid = read_acid(model.library.smiles[0])
    fold = judge.fold_of(acid)
    assert fold is not None
    part = judge.without(fold)
    gone = {s for s, m in zip(model.library.smiles, model.calibration.member, strict=True) if m == fold}
    assert acid.smiles in gone
    assert not gone & set(part.library.smiles)
    assert len(part.calibration.scores) == len(part.library.smiles) == len(part.neighbours.points)
    assert all(part.domain.counts[k] <= n for k, n in model.domain.counts.items() if k in part.domain.counts)
    groups = sum(n for key, n in part.domain.counts.items() if key[0] == "site")
    assert groups < sum(n for key, n in model.domain.counts.items() if key[0] == "site")


def test_mirror_images_and_open_drawings_count_as_the_same_acid() -> None:
    judge = Judge(small_model())
    with_centre = next(s for s in judge.model.library.smiles if s.count("@") and "/" not in s)
    flat = with_centre.replace("@", "").replace("[CH]", "C").replace("[C]", "C")
    mirror = with_centre.replace("@@", "\0").replace("@", "@@").replace("\0", "@")
    assert judge.fold_of(read_acid(flat)) is not None
    assert judge.fold_of(read_acid(mirror)) == judge.fold_of(read_acid(with_centre))


def test_a_model_without_structures_is_refused() -> None:
    model = small_model()
    blank = replace(model, library=replace(model.library, smiles=[""] * len(model.library.smiles)))
    with pytest.raises(UserError, match="withheld"):
        Judge(blank)


def test_intervals_hold_about_the_share_that_they_promise() -> None:
    model = small_model()
    acids = [read_acid(s) for s in model.library.smiles]
    predictions, _ = Judge(model).predict(acids, 0.8)
    at = [p.steps[k - 1] for p, k in zip(predictions, model.library.step, strict=True)]
    held = [s.low <= y <= s.high for s, y in zip(at, model.library.pka, strict=True)]
    assert 0.7 < np.mean(held) < 0.9
