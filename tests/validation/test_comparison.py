"""Comparison of two models: the statistics against scipy, leakage, and the sentence.

The bootstrap interval and the randomisation test are checked against scipy.stats (bootstrap, permutation_test).
"""

from __future__ import annotations

import csv
from dataclasses import replace
from functools import cache
from pathlib import Path

import numpy as np
import pytest
from scipy import stats
from small_models import QUICK, reference_rows, small_model

from qsar import cli
from qsar.errors import UserError
from qsar.model import Model, save
from qsar.model.training import train
from qsar.validation.comparison import (
    LEAST_ACIDS,
    Pair,
    chance,
    compare,
    difference,
    held_out_pairs,
    leaked,
    shared_fold_pairs,
)


def made_up(first: np.ndarray, second: np.ndarray, family: str = "made up") -> list[Pair]:
    """Pairs whose errors are given; every acid is another one."""
    return [
        Pair(
            "C" * (k + 1), f"acid {k}", family, 1, 4.0, (4.0 + a, 4.0 + b), (3.0, 3.5), (5.0, 4.5), ("inside", "inside")
        )
        for k, (a, b) in enumerate(zip(first, second, strict=True))
    ]


@cache
def larger_model() -> Model:
    """Trained on what the small one holds and as much again."""
    rows = reference_rows()
    return train([*rows[::4], *rows[1::4]], "larger", QUICK)


RNG = np.random.default_rng(3)


def test_the_interval_is_that_of_scipy() -> None:
    a, b = np.abs(RNG.normal(0, 0.3, 80)), np.abs(RNG.normal(0, 0.25, 80))
    found = difference("all", made_up(a, b), repeats=4000)
    expected = stats.bootstrap((b - a,), np.mean, n_resamples=4000, method="percentile", rng=np.random.default_rng(1))
    assert found.value == pytest.approx(np.mean(b - a))
    assert found.low == pytest.approx(expected.confidence_interval.low, abs=0.006)
    assert found.high == pytest.approx(expected.confidence_interval.high, abs=0.006)


@pytest.mark.parametrize("shift", [0.0, 0.05, 0.2])
def test_the_randomisation_test_is_that_of_scipy(shift: float) -> None:
    a, b = np.abs(RNG.normal(0, 0.3, 40)), np.abs(RNG.normal(0, 0.3, 40)) + shift
    expected = stats.permutation_test(
        (a, b), lambda x, y: np.mean(x - y), permutation_type="samples", n_resamples=9999, rng=np.random.default_rng(1)
    )
    assert chance(made_up(a, b)) == pytest.approx(expected.pvalue, abs=0.02)


def test_steps_of_one_acid_are_resampled_together() -> None:
    """Copies of every row add no information: the interval stays as wide."""
    a, b = np.abs(RNG.normal(0, 0.3, 30)), np.abs(RNG.normal(0, 0.3, 30))
    once, thrice = made_up(a, b), made_up(a, b) * 3
    assert difference("", thrice).low == pytest.approx(difference("", once).low, abs=1e-9)
    assert chance(thrice) == pytest.approx(chance(once), abs=1e-9)


def test_the_verdict() -> None:
    base = np.abs(RNG.normal(0, 0.3, 100)) + 0.05
    names = ("old", "new")
    better = compare(made_up(base, base * 0.6), names)
    assert better.outcome == "second" and "new is better than old" in better.sentence
    worse = compare(made_up(base * 0.6, base), names)
    assert worse.outcome == "first" and "new is worse than old" in worse.sentence
    same = compare(made_up(base, base + RNG.normal(0, 0.01, 100)), names)
    assert same.outcome == "same" and "equally good" in same.sentence
    noise = compare(made_up(base[:30], np.abs(RNG.normal(0, 0.3, 30)) + 0.05), names)
    assert noise.outcome == "unknown" and "not enough data to tell" in noise.sentence
    for c in (better, worse, same, noise):
        assert "\n" not in c.sentence


def test_few_acids_never_give_a_verdict_however_clear() -> None:
    base = np.full(LEAST_ACIDS - 1, 0.5)
    few = compare(made_up(base, base / 10), ("old", "new"))
    assert few.outcome == "unknown"
    assert "not enough data to tell" in few.sentence


def test_false_alarms_are_as_rare_as_they_should_be() -> None:
    """Two equally good models: a verdict for one of them in about 5 % of tables; binomial bound from scipy."""
    rng = np.random.default_rng(11)
    outcomes = []
    for _ in range(200):
        a, b = np.abs(rng.normal(0, 0.3, 20)), np.abs(rng.normal(0, 0.3, 20))
        outcomes.append(compare(made_up(a, b), ("a", "b"), repeats=300).outcome in ("first", "second"))
    assert sum(outcomes) <= stats.binom.ppf(0.999, 200, 0.05)


def test_groups_and_coverage() -> None:
    a, b = np.abs(RNG.normal(0, 0.3, 40)), np.abs(RNG.normal(0, 0.3, 40))
    pairs = made_up(a[:30], b[:30], "one") + [replace(p, smiles=p.smiles + "O") for p in made_up(a[30:], b[30:], "two")]
    c = compare(pairs, ("a", "b"))
    assert [(d.label, d.steps) for d in c.by_family] == [("one", 30), ("two", 10)]
    weighted = sum(d.steps * d.errors[1] for d in c.by_family) / 40
    assert weighted == pytest.approx(c.overall.errors[1])
    assert c.held == (1.0, 1.0) and c.width == (2.0, 1.0)
    assert [p.change for p in c.pairs] == sorted(p.change for p in c.pairs)


def test_leakage_is_found_whatever_the_spelling() -> None:
    model = small_model()
    mine = [m.acid for m in reference_rows()[::4]]
    assert leaked(model, mine).all()
    known = {m.acid.smiles.replace("@", "") for m in reference_rows()[::4]}
    others = [m for m in reference_rows()[2::4] if m.acid.smiles.replace("@", "") not in known]
    flags = leaked(model, [m.acid for m in others])
    # What is left of the flags are other configurations of training acids (E/Z written or not).
    assert flags.mean() < 0.1


def test_leakage_is_found_where_structures_are_withheld() -> None:
    model = small_model()
    blind = replace(model, library=replace(model.library, smiles=[""] * len(model.library.smiles)))
    rows = reference_rows()[::4]
    assert leaked(blind, [m.acid for m in rows]).all()
    strangers = [m.acid for m in reference_rows()[2::4]]
    assert leaked(blind, strangers).mean() < 0.25  # regioisomers far from the COOH may share descriptors
    with pytest.raises(UserError, match="withheld"):
        shared_fold_pairs(model, blind)


def test_held_out_rows_leave_the_training_acids_of_both_out() -> None:
    rows = reference_rows()
    pairs, left_out = held_out_pairs(small_model(), larger_model(), [*rows[:40:4], *rows[1:40:4], *rows[2:40:4]])
    assert len(pairs) + len(left_out) == 30
    trained = {m.acid.smiles for m in [*rows[::4], *rows[1::4]]}
    assert not trained & {p.smiles for p in pairs}
    assert {m.acid.smiles for m in [*rows[:40:4], *rows[1:40:4]]} <= {m.acid.smiles for m in left_out}


def test_shared_folds_use_the_predictions_made_without_the_acid() -> None:
    a, b = small_model(), larger_model()
    pairs = shared_fold_pairs(a, b)
    assert {(p.smiles, p.step) for p in pairs} == {
        (s, int(k)) for m in (a, b) for s, k in zip(m.library.smiles, m.library.step, strict=True)
    }
    stored = {(s, int(k)): v for s, k, v in zip(b.library.smiles, b.library.step, b.library.pka_without, strict=True)}
    gaps = [abs(p.pka[1] - stored[p.smiles, p.step]) for p in pairs if (p.smiles, p.step) in stored]
    assert np.median(gaps) < 1e-9


def test_the_command(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    for model in (small_model(), larger_model()):
        save(model, tmp_path / model.name)
    table = tmp_path / "held_out.csv"
    rows = [*reference_rows()[2::8], *reference_rows()[:20:4]]
    with table.open("w", encoding="utf-8", newline="") as handle:
        writer = csv.writer(handle)
        writer.writerow(("name", "smiles", "step", "pka", "date"))
        writer.writerows((m.name, m.acid.smiles, m.step, m.pka, f"20{20 + k % 5}-06-01") for k, m in enumerate(rows))
    both = ["compare", "small", "larger", "--models", str(tmp_path)]
    data = ["--data", str(table)]
    assert cli.main([*both, *data, "--output", str(tmp_path / "pairs.csv")]) == 0
    out, err = capsys.readouterr()
    assert "0.0% of random swaps" not in out and "of random swaps" in out
    assert "by family" in out and "by verdict" in out and "inside the 90% interval" in out
    assert "left out" in err
    with (tmp_path / "pairs.csv").open(encoding="utf-8", newline="") as handle:
        written = list(csv.DictReader(handle))
    assert f"over {len(written)} steps" in out.splitlines()[0]
    assert cli.main([*both, *data, "--output", str(tmp_path / "nowhere" / "pairs.csv")]) == 2
    assert capsys.readouterr().err.count("\n") == 1  # said before anything is computed
    assert cli.main([*both, *data, "--by-date", "2022-12-31"]) == 0
    assert "after 2022-12-31" in capsys.readouterr().err
    assert cli.main([*both, *data, "--by-date"]) == 2
    assert "name the DAY" in capsys.readouterr().err
    assert cli.main([*both, *data, "--refuse-leakage"]) == 2
    assert "training table" in capsys.readouterr().err
    assert cli.main(["compare", "small", "small", "--models", str(tmp_path)]) == 2
    assert "same model" in capsys.readouterr().err
