"""A bundle on disk: bit for bit what was saved, the same from two trainings, and nothing that does not belong."""

from __future__ import annotations

import hashlib
import io
import json
import zipfile
from pathlib import Path

import numpy as np
import pytest
from small_models import QUICK, reference_rows, small_model

from qsar.errors import UserError
from qsar.model import Model, load, read_card, save
from qsar.model.bundle import ARRAY_TYPES, ARRAYS, CARD, SCHEMA, arrays_of, settings_from, settings_to
from qsar.model.members import Settings
from qsar.model.training import train

ACIDS = ["CC(=O)O", "OC(=O)CC(O)(C(=O)O)CC(=O)O", "NCC(=O)O", "OC(=O)C=CC", "Oc1ccccc1C(=O)O", "OC(=O)C(F)(F)F", "CC"]


@pytest.fixture(scope="module")
def folder(tmp_path_factory: pytest.TempPathFactory) -> Path:
    folder = tmp_path_factory.mktemp("bundle") / "small"
    save(small_model(), folder)
    return folder


def steps(model: Model) -> list[object]:
    return [(p.structure, p.error, p.steps) for p in model.predict(ACIDS)]


def test_round_trip_bit_for_bit(folder: Path) -> None:
    model, again = small_model(), load(folder)
    before, after = arrays_of(model), arrays_of(again)
    assert set(before) == set(after) == set(ARRAY_TYPES)
    for name in before:
        assert before[name].dtype == after[name].dtype, name
        assert np.array_equal(before[name], after[name]), name
    assert steps(model) == steps(again)
    assert {k: v for k, v in again.card.items() if k != "arrays_sha256"} == model.card


def test_saved_twice_is_the_same_model(folder: Path, tmp_path: Path) -> None:
    save(load(folder), tmp_path / "copy")
    with np.load(folder / ARRAYS) as a, np.load(tmp_path / "copy" / ARRAYS) as b:
        assert all(np.array_equal(a[name], b[name]) for name in ARRAY_TYPES)


def test_two_trainings_are_identical() -> None:
    rows = reference_rows()[::7]
    first, second = (train(rows, "twin", QUICK) for _ in range(2))
    one, two = arrays_of(first), arrays_of(second)
    for name in one:
        assert np.array_equal(one[name], two[name]), name
    assert steps(first) == steps(second)
    assert {k: v for k, v in first.card.items() if k != "date"} == {k: v for k, v in second.card.items() if k != "date"}


def test_another_seed_is_another_model() -> None:
    from dataclasses import replace

    rows = reference_rows()[::7]
    first, second = (train(rows, "twin", replace(QUICK, seed=s)) for s in (1, 2))
    assert not np.array_equal(first.members.dual, second.members.dual)


def test_nothing_but_a_card_and_plain_arrays(folder: Path) -> None:
    assert {p.name for p in folder.iterdir()} == {CARD, ARRAYS}
    with np.load(folder / ARRAYS, allow_pickle=False) as stored:
        assert all(stored[name].dtype.kind in "fiu" for name in stored.files)


def test_the_card_says_what_went_in(folder: Path) -> None:
    card = read_card(folder)
    model = small_model()
    assert card["schema"] == SCHEMA
    assert card["name"] == "small"
    assert card["acids"] == len(set(model.library.smiles))
    assert card["steps"] == len(model.library.pka)
    assert {"numpy", "scikit-learn", "rdkit", "python"} <= set(card["libraries"])
    assert card["arrays_sha256"] == hashlib.sha256((folder / ARRAYS).read_bytes()).hexdigest()
    error = np.abs(model.library.pka - model.library.pka_without)
    assert card["metrics"]["out_of_fold_mean_absolute_error"] == pytest.approx(error.mean())


def test_settings_survive_the_card() -> None:
    for settings in (Settings(), QUICK):
        assert settings_from(json.loads(json.dumps(settings_to(settings)))) == settings


def repack(folder: Path, target: Path, drop: str = "", add: str = "") -> Path:
    """The bundle with one array missing or one too many, and a card that agrees with it."""
    target.mkdir()
    with np.load(folder / ARRAYS) as stored:
        arrays = {name: stored[name] for name in stored.files if name != drop}
    if add:
        arrays[add] = np.zeros(3)
    buffer = io.BytesIO()
    np.savez_compressed(buffer, **arrays)
    (target / ARRAYS).write_bytes(buffer.getvalue())
    card = {**read_card(folder), "arrays_sha256": hashlib.sha256(buffer.getvalue()).hexdigest()}
    (target / CARD).write_text(json.dumps(card), encoding="utf-8")
    return target


def test_repacked_without_change_loads(folder: Path, tmp_path: Path) -> None:
    assert steps(load(repack(folder, tmp_path / "same"))) == steps(small_model())


@pytest.mark.parametrize("name", sorted(ARRAY_TYPES))
def test_a_missing_array_is_refused(folder: Path, tmp_path: Path, name: str) -> None:
    with pytest.raises(UserError, match=name):
        load(repack(folder, tmp_path / "missing", drop=name))


def test_an_unknown_array_is_refused(folder: Path, tmp_path: Path) -> None:
    with pytest.raises(UserError, match="extra_array"):
        load(repack(folder, tmp_path / "extra", add="extra_array"))


def test_no_bundle(tmp_path: Path) -> None:
    with pytest.raises(UserError, match="no model"):
        load(tmp_path / "nowhere")


def test_the_archive_is_a_plain_zip(folder: Path) -> None:
    with zipfile.ZipFile(folder / ARRAYS) as archive:
        assert archive.testzip() is None


def test_withheld_structures_are_not_in_the_bundle(tmp_path: Path) -> None:
    rows = reference_rows()[::11]
    model = train(rows, "withheld", QUICK, withhold_structures=True)
    save(model, tmp_path / "withheld")
    with np.load(tmp_path / "withheld" / ARRAYS) as stored:
        text = b"".join(stored[name].tobytes() for name in stored.files if name.endswith("_text"))
    for row in rows:
        if len(row.acid.smiles) > 12:
            assert row.acid.smiles.encode() not in text
        if len(row.name) > 12:
            assert row.name.encode() not in text
    (step,) = load(tmp_path / "withheld").predict([rows[0].acid.smiles])[0].steps
    assert step.nearest == ""
    assert step.nearest_pka is not None
    assert step.measured is None
