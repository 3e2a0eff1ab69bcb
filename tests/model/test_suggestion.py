"""Which acids to measure next: the arithmetic against scikit-learn's Gaussian process, and a simulated campaign."""

from __future__ import annotations

import csv
from pathlib import Path

import numpy as np
import pytest
from sklearn.gaussian_process import GaussianProcessRegressor
from sklearn.gaussian_process.kernels import ConstantKernel, DotProduct, Matern
from small_models import reference_rows, small_model

from qsar import cli
from qsar.model import save
from qsar.model.kernel import KernelSettings
from qsar.model.suggestion import MEASUREMENT, SLOPE, Space, choose, suggest
from qsar.model.training_set import training_set
from qsar.validation.campaign import Plan, plot, simulate, subset

SETTINGS = KernelSettings(length=2.0, amplitude=0.5, linear=0.1, noise=0.1)
RNG = np.random.default_rng(5)


def some(n: int) -> Space:
    return Space(RNG.normal(size=(n, 4)), np.abs(RNG.normal(size=(n, 2))))


def variances(measured: Space, at: Space) -> np.ndarray:
    """Posterior variances by scikit-learn, with the columns of both kinds side by side and a kernel for each."""

    class OnFree(Matern):
        def __call__(self, X, Y=None, eval_gradient=False):  # type: ignore[no-untyped-def]
            return super().__call__(X[:, :4], None if Y is None else Y[:, :4])

        def diag(self, X):  # type: ignore[no-untyped-def]
            return super().diag(X[:, :4])

    def side_by_side(s: Space) -> np.ndarray:
        # A dot product of scaled columns stands for both linear parts.
        return np.hstack([s.free, s.free * SETTINGS.linear, s.lowers * SLOPE])

    class OnLinear(DotProduct):
        def __call__(self, X, Y=None, eval_gradient=False):  # type: ignore[no-untyped-def]
            return super().__call__(X[:, 4:], None if Y is None else Y[:, 4:])

        def diag(self, X):  # type: ignore[no-untyped-def]
            return super().diag(X[:, 4:])

    kernel = ConstantKernel(SETTINGS.amplitude**2) * OnFree(SETTINGS.length, nu=1.5) + OnLinear(1.0)
    process = GaussianProcessRegressor(kernel, alpha=SETTINGS.noise**2 + MEASUREMENT**2, optimizer=None)
    process.fit(side_by_side(measured), np.zeros(len(measured)))
    return np.asarray(process.predict(side_by_side(at), return_std=True)[1]) ** 2


def joined(a: Space, b: Space) -> Space:
    return Space(np.vstack([a.free, b.free]), np.vstack([a.lowers, b.lowers]))


def test_each_pick_takes_off_most_variance_of_all_that_are_left() -> None:
    known, candidates, targets = some(12), some(8), some(15)
    measured, left = known, list(range(8))
    for pick in choose(known, candidates, targets, 4, SETTINGS):
        before = variances(measured, targets)
        gains = {c: float(np.mean(before - variances(joined(measured, candidates.rows([c])), targets))) for c in left}
        assert pick.index == max(left, key=gains.__getitem__)
        assert pick.gain**2 == pytest.approx(gains[pick.index], rel=1e-6)
        assert pick.spread**2 == pytest.approx(float(variances(measured, candidates.rows([pick.index]))[0]), rel=1e-6)
        measured = joined(measured, candidates.rows([pick.index]))
        left.remove(pick.index)


def test_a_twin_of_a_pick_teaches_little_and_no_acid_is_picked_twice() -> None:
    known, base = some(12), some(5)
    twins = joined(base, base)
    picks = choose(known, twins, base, 10, SETTINGS)
    assert sorted(p.index for p in picks) == list(range(10))
    assert len({p.index % 5 for p in picks[:4]}) == 4


def test_the_chemistry_that_is_named_decides() -> None:
    """Asked for benzoic acids it picks one, asked for amino acids an amino acid."""
    benzoic = [m.acid for m in reference_rows() if m.family == "benzoic_meta_para"][2:40:4]
    amino = [m.acid for m in reference_rows() if m.family == "amino_acid" and len(m.acid.sites) == 1][2:80:8]
    both = [*benzoic, *amino]
    model = small_model()
    assert suggest(model, both, benzoic, 1)[0].index < len(benzoic)
    assert suggest(model, both, amino, 1)[0].index >= len(benzoic)


def test_a_subset_is_the_same_as_a_set_of_those_rows() -> None:
    rows = list(reference_rows()[:60])
    data = training_set(rows)
    acids = [5, 2, 40]
    part = subset(data, acids)
    again = training_set([r for r in rows if r.acid.smiles in {data.acids[a].smiles for a in acids}])
    assert sorted(part.pka) == sorted(again.pka)
    for k, acid in enumerate(part.acids):
        other = [a.smiles for a in again.acids].index(acid.smiles)
        assert np.array_equal(part.x[part.edges(k)], again.x[again.edges(other)])


@pytest.mark.slow
def test_suggested_acids_beat_random_ones_in_a_simulated_campaign(tmp_path: Path) -> None:
    outcome = simulate(reference_rows(), Plan(start=80, test=300, batch=30, rounds=2, seeds=6))
    assert np.array_equal(outcome.suggested[:, 0], outcome.random[:, 0])  # the same start
    value, error = outcome.difference
    assert value < 0.0 and value + error < 0.0, outcome.sentence
    plot(outcome, tmp_path / "campaign.png")
    assert (tmp_path / "campaign.png").read_bytes().startswith(b"\x89PNG")


def test_the_command(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    save(small_model(), tmp_path / "small")
    source = tmp_path / "candidates.csv"
    measured = reference_rows()[0].acid.smiles
    rows = [
        ("a", "OC(=O)CCc1ccc(OC(F)F)cc1"),
        ("b", "OC(=O)C1CC1c1ccncc1"),
        ("c", "CCO"),
        ("d", measured),
        ("e", "OC(=O)CCc1ccc(OC(F)F)cc1"),
        ("f", "OC(=O)CP(C)(C)=O"),
    ]
    with source.open("w", encoding="utf-8", newline="") as handle:
        csv.writer(handle).writerows([("id", "smiles"), *rows])
    argv = ["suggest", str(source), "--model", str(tmp_path / "small"), "--count", "5"]
    assert cli.main([*argv, "--output", str(tmp_path / "next.csv")]) == 3
    err = capsys.readouterr().err
    assert "no carboxyl" in err and "1 candidates are measured already" in err
    with (tmp_path / "next.csv").open(encoding="utf-8", newline="") as handle:
        written = list(csv.DictReader(handle))
    assert sorted(r["id"] for r in written) == ["a", "b", "f"]
    assert [r["rank"] for r in written] == ["1", "2", "3"]
    assert cli.main(argv) == 3
    assert "gain" in capsys.readouterr().out
    assert cli.main(["suggest"]) == 2
    assert cli.main(["suggest", "CCC(=O)O", "--count", "0"]) == 2
