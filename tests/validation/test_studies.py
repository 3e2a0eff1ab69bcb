"""Splits, fits and studies on a small table."""

from __future__ import annotations

from dataclasses import fields, replace
from functools import cache
from pathlib import Path

import numpy as np
import pytest
from rdkit.Chem.rdFingerprintGenerator import GetMorganGenerator
from small_models import QUICK, small_model

from qsar.descriptors import LOWERS
from qsar.errors import UserError
from qsar.model import inducing, members
from qsar.structures import read_acid
from qsar.validation import fits, splits, studies
from qsar.validation.cache import Cache
from qsar.validation.fits import Fit, Problem, problem_of, run
from qsar.validation.forest import count_fingerprints
from qsar.validation.judged import AMINO, FIRST, HIGHER, MONOBASIC, SECOND, Judged, family_of, judge, library_steps
from qsar.validation.judging import PARTS, judge_table
from qsar.validation.lines import line_predictions, places
from qsar.validation.open_rows import as_text

SMALL = studies.Scale(1, 3, "trend", (0.5, 1.0), 1, 2, 1)


@cache
def problem() -> Problem:
    return problem_of(small_model().library, QUICK)


def test_folds_keep_the_steps_of_an_acid_together() -> None:
    data = problem().data
    fold = splits.folds_of_acids(data, 4, 7)
    assert all(len(set(fold[data.step_acid == a])) == 1 for a in range(len(data.acids)))
    sizes = np.bincount([fold[data.step_acid == a][0] for a in range(len(data.acids))])
    assert sizes.max() - sizes.min() <= 1


def test_groups_left_out_take_whole_acids() -> None:
    data = problem().data
    groups = {**splits.families(data), **splits.substituents(data)}
    assert len(groups) > 10
    for own in groups.values():
        assert 0 < own.sum() < len(own)
        assert not set(data.step_acid[own]) & set(data.step_acid[~own])


def test_a_substituent_left_out_is_nowhere_in_training() -> None:
    data = problem().data
    own = splits.substituents(data)["chloro"]
    left = [data.acids[a].mol for a in set(data.step_acid[~own])]
    assert not any(atom.GetSymbol() == "Cl" for mol in left for atom in mol.GetAtoms())


def test_every_learner_answers_for_every_step_and_beats_nothing_but_itself() -> None:
    data = problem().data
    train = splits.folds_of_acids(data, 3, 1) != 0
    error = {}
    for learner in fits.LEARNERS:
        found = fits.predictions(problem(), Fit("x", learner, train))
        assert found.shape == data.pka.shape
        assert np.all(np.isfinite(found))
        error[learner] = np.abs(found - data.pka)[~train].mean()
    assert error["member"] < error["mean"]
    assert error["trend"] < error["mean"]
    assert error["lines"] < error["mean"]


def test_held_out_values_are_not_seen() -> None:
    data = problem().data
    train = splits.folds_of_acids(data, 3, 1) != 0
    moved = np.where(train, data.pka, 9.0)
    for learner in ("trend", "forest", "lines", "mean"):
        as_is = fits.predictions(problem(), Fit("a", learner, train))
        other = fits.predictions(problem(), Fit("b", learner, train, moved))
        assert np.array_equal(as_is, other), learner


def test_plain_lines_are_numpys() -> None:
    """Chloroacetic to acetic acid on the Taft line by hand: two points define it, the third is read from it."""
    acids = [read_acid(s) for s in ("CC(=O)O", "OC(=O)CCl", "OC(=O)C(Cl)Cl", "CCC(=O)O")]
    pka = np.array([4.76, 2.87, 1.30, 4.87])
    train = np.array([True, True, True, False])
    slope, offset = np.polyfit([0.0, 1.05, 1.94], pka[:3], 1)
    found = line_predictions(places(acids, np.ones(4, dtype=int)), pka, train)
    assert found[3] == pytest.approx(offset - 0.10 * slope, abs=1e-12)


def test_count_fingerprints_count() -> None:
    """Folding to 2048 columns loses no count of RDKit's unfolded fingerprint."""
    acid = read_acid("OC(=O)CC(=O)O")
    unfolded = GetMorganGenerator(radius=2).GetSparseCountFingerprint(acid.mol).GetNonzeroElements()
    (row,) = count_fingerprints([acid], np.array([2]))
    assert row[:-2].sum() == sum(unfolded.values())
    assert row[-2:].tolist() == [2.0, 2.0]  # step, COOH groups


def test_an_interrupted_run_goes_on(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    wanted = studies.cross_validation_fits(problem().data, SMALL)
    wanted = [fit for fit in wanted if fit.learner in ("lines", "mean", "trend")]
    cache_ = Cache(tmp_path / "cache")
    seen: list[int] = []

    def stop(done: int) -> None:
        seen.append(done)
        if len(seen) == 4:
            raise KeyboardInterrupt

    with pytest.raises(KeyboardInterrupt):
        run(problem(), wanted, cache_, 1, stop)
    made: list[str] = []
    real = fits.predictions
    monkeypatch.setattr(fits, "predictions", lambda p, f: made.append(f.name) or real(p, f))
    found = run(problem(), wanted, cache_)
    assert set(found) == {fit.name for fit in wanted}
    assert len(made) == len(wanted) - 4
    monkeypatch.undo()
    fresh = run(problem(), wanted)
    assert all(np.array_equal(found[name], fresh[name]) for name in fresh)


def test_a_damaged_part_is_made_again(tmp_path: Path) -> None:
    cache_ = Cache(tmp_path)
    cache_.put("part", np.arange(3.0))
    assert np.array_equal(cache_.get("part", 3), np.arange(3.0))
    assert cache_.get("part", 4) is None
    cache_.path("part").write_bytes(b"\x93NUMPY")
    assert cache_.get("part", 3) is None


def test_processes_do_not_change_the_numbers() -> None:
    wanted = [f for f in studies.cross_validation_fits(problem().data, SMALL) if f.learner in ("trend", "forest")]
    one, two = run(problem(), wanted), run(problem(), wanted, None, 2)
    assert all(np.array_equal(one[name], two[name]) for name in one)


@pytest.fixture
def large(monkeypatch: pytest.MonkeyPatch) -> Problem:
    """The small table, taken for a large one: 150 edges are as many as an exact fit may have."""
    for module in (fits, members, inducing, studies):
        monkeypatch.setattr(module, "MOST_EXACT", 150)
    for module in (fits, inducing):
        monkeypatch.setattr(module, "POINTS", 140)
    monkeypatch.setattr(fits, "_PIVOTS", 189)
    return Problem(problem().data, QUICK)


def test_fits_of_a_large_table_see_nothing_of_the_acids_left_out(large: Problem) -> None:
    """Neither values nor descriptors of other acids change the prediction of one that is left out."""
    data = large.data
    train = splits.folds_of_acids(data, 5, 1) != 0
    held = np.isin(data.owner, data.step_acid[~train])
    assert large.is_large
    assert np.sum(~held) > 150  # not an exact fit
    for learner in ("trend", "member"):
        found = fits.predictions(large, Fit("x", learner, train))
        moved = Problem(replace(data, pka=np.where(train, data.pka, 9.0)), QUICK)
        assert np.array_equal(found, fits.predictions(moved, Fit("x", learner, train))), learner
    part, wanted, scaling, points = fits._seen(large, data, train)
    assert wanted.all()
    assert len(part.pka) == train.sum()
    own = {row.tobytes() for row in scaling(part.x[:, ~LOWERS])}
    assert points is not None
    assert len(points) == 140
    assert all(p.tobytes() in own for p in np.ascontiguousarray(points))


def test_with_all_points_the_fits_of_a_large_table_are_the_exact_ones(
    large: Problem, monkeypatch: pytest.MonkeyPatch
) -> None:
    """The trend to 1e-5; of the member only the trend, since its booster draws inner folds of the acids it has."""
    data = large.data
    for name in ("POINTS", "_PIVOTS"):
        monkeypatch.setattr(fits, name, len(data.x))
    monkeypatch.setattr(inducing, "POINTS", len(data.x))
    train = splits.folds_of_acids(data, 5, 1) != 0
    over = {learner: fits.predictions(large, Fit("x", learner, train)) for learner in ("trend", "member")}
    assert studies.scale_of(data) is studies.LARGE
    monkeypatch.undo()
    assert studies.scale_of(data) is studies.FULL
    exact = {learner: fits.predictions(problem(), Fit("x", learner, train)) for learner in over}
    assert over["trend"] == pytest.approx(exact["trend"], abs=1e-5)
    error = {name: np.abs(found["member"] - data.pka)[~train].mean() for name, found in (("o", over), ("e", exact))}
    assert error["o"] == pytest.approx(error["e"], abs=0.02)


def test_parts_of_a_large_table_are_exact_or_have_points_of_their_own(large: Problem) -> None:
    data = large.data
    everything = np.ones(len(data.pka), dtype=bool)
    few, more = (splits.subset_of_acids(data, everything, n, 3) for n in (30, 100))
    part, _, _, points = fits._seen(large, data, few)
    assert len(part.x) <= 150
    assert points is None
    part, _, scaling, points = fits._seen(large, data, more)
    assert len(part.x) > 150
    assert points is not None
    assert 100 < len(points) <= 140  # fewer where what is left repeats other edges
    assert {p.tobytes() for p in np.ascontiguousarray(points)} <= {p.tobytes() for p in scaling(part.x[:, ~LOWERS])}


def test_of_many_families_the_largest_are_left_out() -> None:
    data = problem().data
    everything, three = splits.families(data), splits.families(data, most=3)
    assert list(three) == sorted(three)
    assert max(everything[n].sum() for n in set(everything) - set(three)) <= max(own.sum() for own in three.values())
    sizes = {n: len(np.unique(data.step_acid[own])) for n, own in everything.items()}
    assert min(sizes[n] for n in three) >= max(sizes[n] for n in set(everything) - set(three))


@pytest.mark.slow
def test_studies_on_a_small_table() -> None:
    data = problem().data
    results = run(problem(), studies.all_fits(problem(), SMALL))
    rows = studies.left_out(data, SMALL, results, "family")
    assert sum(r.out.n for r in rows) <= len(data.pka)
    assert all(r.forest is not None for r in rows)
    points = studies.learning_curve(data, SMALL, results)
    assert points[0].acids < points[1].acids
    measured, dealt = studies.randomisation(data, SMALL, results)
    assert measured.correlation == pytest.approx(1.0)
    assert max(p.r2 for p in dealt) < 0.2 < measured.r2
    robust = studies.robustness(data, SMALL, results)
    assert 0 < robust.moved < 0.2
    assert robust.uncertainty == pytest.approx(data.uncertainty.mean())


def test_a_model_without_structures_is_refused() -> None:
    library = small_model().library
    with pytest.raises(UserError, match="withholds its structures"):
        problem_of(replace(library, smiles=[""] * len(library.smiles)), QUICK)


def test_permuting_keeps_the_values() -> None:
    values = np.arange(20.0)
    assert sorted(studies.permuted(values, 1)) == sorted(values)
    assert not np.array_equal(studies.permuted(values, 1), values)


@pytest.mark.parametrize(
    ("smiles", "step", "family"),
    [
        ("CC(=O)O", 1, MONOBASIC),
        ("OC(=O)CC(=O)O", 1, FIRST),
        ("OC(=O)CC(=O)O", 2, SECOND),
        ("NCC(=O)O", 1, AMINO),
        ("NC(CC(=O)O)C(=O)O", 2, AMINO),
        ("OC(=O)CC(O)(C(=O)O)CC(=O)O", 3, HIGHER),
        ("CC(=O)NCC(=O)O", 1, MONOBASIC),
    ],
)
def test_family(smiles: str, step: int, family: str) -> None:
    assert family_of(read_acid(smiles), step) == family


def test_the_table_judged_in_processes_is_the_same() -> None:
    """To 1e-9 as all predictions: the last digits of a matrix product depend on the threads that a process has."""
    model = small_model()
    done: list[int] = []
    one, two = judge_table(model), judge_table(model, done.append, jobs=2)
    assert sum(done) == PARTS
    for field in fields(Judged):
        a, b = getattr(one, field.name), getattr(two, field.name)
        if isinstance(a, list) or a.dtype.kind in "USib":
            assert np.array_equal(a, b), field.name
        else:
            assert np.allclose(a, b, rtol=0.0, atol=1e-9), field.name


def test_the_table_judged_by_itself() -> None:
    model = small_model()
    judged = judge(model, library_steps(model.library))
    everything = np.ones(len(judged.measured), dtype=bool)
    assert judged.trained_on.all()
    assert judged.errors(everything).n == len(model.library.pka)
    assert np.all(np.diff(judged.high - judged.low, axis=0) >= -1e-9)  # a higher level is never narrower
    text = as_text(judged)
    assert f"{len(judged.measured)} measured steps" in text
    for name in (MONOBASIC, FIRST, SECOND, AMINO):
        assert name in text
