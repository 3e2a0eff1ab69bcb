"""Training on a user's rows: weights, offset, resuming, what the bundle says and what it keeps to itself.

The offset is checked against shifts that the tests put in themselves; no published source.
"""

from __future__ import annotations

import csv
import json
from dataclasses import replace
from datetime import date
from pathlib import Path

import numpy as np
import pytest
import scipy.linalg  # noqa: F401 - loaded before the first fit, so that all fits run in one thread
from small_models import QUICK, reference_rows

from qsar import cli
from qsar.errors import UserError
from qsar.model import load
from qsar.model.bundle import arrays_of
from qsar.model.members import Settings, fit_members, fold_of_acids
from qsar.model.offset import estimate_offset, without_offset
from qsar.model.resumable import deal_folds, fingerprint, fit_members_resumably
from qsar.model.training import train
from qsar.model.training_set import training_set
from qsar.model.user_table import read_date, read_user_table, weights_of
from qsar.table import Measurement


@pytest.fixture(scope="module")
def some() -> list[Measurement]:
    return list(reference_rows()[::8])


def write_table(path: Path, rows: list[Measurement], dates: list[str] | None = None) -> Path:
    with path.open("w", encoding="utf-8", newline="") as handle:
        writer = csv.writer(handle)
        writer.writerow(("name", "smiles", "step", "pka", "uncertainty", "family", "source", "date"))
        for k, m in enumerate(rows):
            day = dates[k] if dates else ""
            writer.writerow((m.name, m.acid.smiles, m.step, m.pka, m.uncertainty, m.family, "ours", day))
    return path


def test_members_through_the_cache_are_the_same_bit_for_bit(some: list[Measurement], tmp_path: Path) -> None:
    data = training_set(some)
    plain, fold = fit_members(data, QUICK)
    for _ in range(2):  # fitted, then read
        cached, same_fold = fit_members_resumably(data, QUICK, tmp_path)
        assert np.array_equal(fold, same_fold)
        for name in ("dual", "slopes", "points", "offset"):
            assert np.array_equal(getattr(plain, name), getattr(cached, name)), name
        for name in ("feature", "threshold", "left", "right", "root", "baseline", "depth"):
            assert np.array_equal(getattr(plain.trees, name), getattr(cached.trees, name)), name


def test_an_interrupted_training_goes_on(some: list[Measurement], tmp_path: Path) -> None:
    data = training_set(some)
    finished = []

    def interrupt(n: int) -> None:
        finished.append(n)
        if len(finished) == 2:
            raise KeyboardInterrupt

    with pytest.raises(KeyboardInterrupt):
        fit_members_resumably(data, QUICK, tmp_path, interrupt)
    assert len(list(tmp_path.iterdir())) == 2
    damaged = sorted(tmp_path.iterdir())[0]
    damaged.write_bytes(damaged.read_bytes()[:100])
    notes: list[str] = []
    resumed, _ = fit_members_resumably(data, QUICK, tmp_path, note=notes.append)
    assert any("1 of 3 folds" in n for n in notes) and any("damaged" in n for n in notes)
    assert np.array_equal(resumed.dual, fit_members(data, QUICK)[0].dual)


def test_a_cache_that_cannot_be_written_stops_nothing(some: list[Measurement], tmp_path: Path) -> None:
    (tmp_path / "file").write_text("in the way", encoding="utf-8")
    notes: list[str] = []
    members, _ = fit_members_resumably(training_set(some), QUICK, tmp_path / "file" / "cache", note=notes.append)
    assert len(notes) == 3 and "cannot be kept" in notes[0]
    assert len(members.dual) == 3


def test_the_cache_of_another_table_or_setting_is_not_taken(some: list[Measurement]) -> None:
    def key(rows: list[Measurement], settings: Settings = QUICK, weights: list[float] | None = None) -> str:
        data = training_set(rows, weights)
        return fingerprint(data, settings, deal_folds(len(data.acids), settings))

    data = training_set(some)
    keys = {
        key(some),
        key(some, replace(QUICK, seed=2)),
        key(some[1:]),
        key([replace(some[0], pka=some[0].pka + 1e-6), *some[1:]]),
        key(some, weights=[0.5] * len(some)),
        fingerprint(data, QUICK, deal_folds(len(data.acids), QUICK, 50)),
    }
    assert len(keys) == 6


def test_acids_of_the_reference_keep_their_folds_when_others_are_added() -> None:
    alone, more = deal_folds(100, QUICK), deal_folds(130, QUICK, 100)
    assert np.array_equal(alone, more[:100])
    assert np.array_equal(alone, fold_of_acids(100, QUICK))
    assert np.ptp(np.bincount(more)) <= 2
    assert len(deal_folds(102, QUICK, 100)) == 102


def test_uncertain_rows_weigh_less(some: list[Measurement]) -> None:
    rows = [replace(some[0], uncertainty=u) for u in (0.0, 0.05, 0.15, 0.3, 0.6)]
    assert weights_of(rows) == pytest.approx([1, 1, 1, 1 / 4, 1 / 16])


def test_offset_over_shared_acids_is_found_with_its_interval(some: list[Measurement]) -> None:
    rng = np.random.default_rng(0)
    own = [replace(m, pka=m.pka + 0.12 + rng.normal(0, 0.03), uncertainty=0.03) for m in some[:40]]
    offset = estimate_offset(some, own)
    assert offset is not None and offset.method == "shared acids"
    assert offset.low < 0.12 < offset.high and offset.is_clear
    assert offset.high - offset.low < 0.05
    moved = without_offset(own, offset)
    again = estimate_offset(some, moved)
    assert again is not None and not again.is_clear


def test_offset_against_expectation_where_no_acid_is_shared() -> None:
    rows = reference_rows()
    reference, other = rows[::2], rows[1::2]
    known = {m.acid.smiles for m in reference}
    strangers = [m for m in other if m.acid.smiles not in known][:200]
    plain = estimate_offset(reference, strangers)
    shifted = estimate_offset(reference, [replace(m, pka=m.pka - 0.3) for m in strangers])
    assert plain is not None and shifted is not None
    assert plain.method == shifted.method == "expectation"
    assert shifted.value - plain.value == pytest.approx(-0.3, abs=1e-6)
    assert shifted.is_clear and shifted.high < -0.15


def test_too_few_rows_give_no_offset(some: list[Measurement]) -> None:
    assert estimate_offset(some, some[:4]) is None


@pytest.mark.parametrize("text", ["03/04/2024", "2024-13-01", "yesterday", "2024-02-30"])
def test_days_in_other_spellings_are_refused(text: str) -> None:
    with pytest.raises(UserError, match="YYYY-MM-DD"):
        read_date(text, "t.csv, row 2, column date")


def test_days_are_read() -> None:
    assert read_date("2024-03-05", "") == date(2024, 3, 5)
    assert read_date("2024-03-05 00:00:00", "") == date(2024, 3, 5)
    assert read_date("2024", "") == date(2024, 1, 1)
    assert read_date(" ", "") is None


def test_the_command_trains_on_own_rows_alone_and_says_what_went_in(
    some: list[Measurement], tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    dates = [f"2024-01-{1 + k % 28:02d}" for k in range(len(some))]
    table = write_table(tmp_path / "ours.csv", some, dates)
    argv = ["train", "--data", str(table), "--only", "--folds", "3", "--models", str(tmp_path / "m")]
    assert cli.main([*argv, "--until", "2024-01-20"]) == 0
    out = capsys.readouterr().out
    assert "structures, names and values" in out
    model = load(tmp_path / "m" / "ours")
    early = read_user_table(table).until(date(2024, 1, 20))
    assert model.card["steps"] == len(early.measurements) < len(some)
    assert model.card["tables"][0]["rows"] == len(early.measurements)
    assert model.card["newest_measurement"] == "2024-01-20"
    assert not list((tmp_path / "m").glob("*.folds"))
    assert cli.main(argv) == 2  # the name is taken
    assert "exists" in capsys.readouterr().err


def test_withheld_structures_are_nowhere_in_the_bundle(
    some: list[Measurement], tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    named = [replace(m, name=f"SECRET-{k}") for k, m in enumerate(some)]
    table = write_table(tmp_path / "ours.csv", named)
    folder = tmp_path / "bundle"
    argv = ["train", "--data", str(table), "--only", "--folds", "3", "--output", str(folder), "--withhold-structures"]
    assert cli.main(argv) == 0
    model = load(folder)
    assert model.card["structures_withheld"] is True
    stored = b"".join(a.tobytes() for a in arrays_of(model).values()) + json.dumps(model.card).encode()
    assert b"SECRET" not in stored
    for m in named:
        if len(m.acid.smiles) > 12:
            assert m.acid.smiles.encode() not in stored
    step = model.predict(["CCC(=O)O"])[0].steps[0]
    assert step.nearest == "" and step.nearest_pka is not None
    assert "not their structures" in capsys.readouterr().out


@pytest.mark.parametrize(
    ("argv", "words"),
    [
        (["--only"], "--data"),
        (["--correct-offset"], "--data"),
        (["--folds", "2"], "at least 3"),
        (["--seed", "-1"], "--seed"),
        (["--name", "../x"], "no name"),
        (["--data", "nowhere.csv"], "nowhere.csv"),
        (["--name", "carboxylic-1"], "choose another --name"),
        (["--output", __file__], "it is a file"),
    ],
)
def test_wrong_usage_is_one_line(argv: list[str], words: str, capsys: pytest.CaptureFixture[str]) -> None:
    assert cli.main(["train", *argv]) == 2
    err = capsys.readouterr().err
    assert words in err and err.count("\n") == 1
    assert "models delete carboxylic-1" not in err  # a shipped model cannot be deleted


def test_too_few_acids_alone_are_refused(
    some: list[Measurement], tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    table = write_table(tmp_path / "few.csv", some[:10])
    assert cli.main(["train", "--data", str(table), "--only", "--models", str(tmp_path / "m")]) == 2
    assert "at least 20" in capsys.readouterr().err


def test_a_table_of_analogues_alone_has_no_strangers() -> None:
    """Values that are all alike leave nothing to tell acids apart by; made up."""
    rows = [replace(m, pka=4.8) for m in reference_rows()[:40:2] if m.step == 1]
    model = train(rows, "alike", QUICK)
    np.testing.assert_array_equal(model.calibration.stranger_scores, model.calibration.scores)
    step = model.predict(["CCCCCCC(=O)O"])[0].steps[0]
    assert step.low <= 4.8 <= step.high
