"""The same output from a Dask cluster as from this machine, also where a worker ends in the middle."""

from __future__ import annotations

import csv
import math
import sys
from collections.abc import Iterator, Sequence
from pathlib import Path
from subprocess import PIPE, Popen

import numpy as np
import pytest
from benchmarks.many_acids import acids

from qsar import cli, paths
from qsar.batch import open_model, predict_records
from qsar.cluster import in_order
from qsar.errors import UserError
from qsar.reading import Record

distributed = pytest.importorskip("distributed", reason="needs the package distributed (extra cluster)")
pytestmark = pytest.mark.slow


def _started(*arguments: str, until: str) -> Popen[str]:
    process = Popen([sys.executable, "-m", *arguments], stderr=PIPE, text=True)
    assert process.stderr is not None
    for line in process.stderr:
        if until in line:
            return process
    raise AssertionError(f"{arguments} ended with {process.wait()}")


@pytest.fixture
def cluster(tmp_path: Path) -> Iterator[tuple[str, list[Popen[str]]]]:
    """Address of a scheduler in a process of its own, and its two worker processes."""
    place = tmp_path / "scheduler.json"
    scheduler = _started(
        "distributed.cli.dask_scheduler", "--host", "127.0.0.1", "--port", "0", "--no-dashboard",
        "--scheduler-file", str(place), until="Scheduler at",
    )  # fmt: skip
    options = ("--nthreads", "1", "--no-nanny", "--no-dashboard", "--local-directory", str(tmp_path))
    workers = [
        _started("distributed.cli.dask_worker", "--scheduler-file", str(place), *options, until="Registered to")
        for _ in range(2)
    ]
    import json

    yield str(json.loads(place.read_text(encoding="utf-8"))["address"]), workers
    for process in (*workers, scheduler):
        process.kill()
        process.wait()
        assert process.stderr is not None
        process.stderr.close()


def test_a_worker_that_ends_in_the_middle_changes_nothing(
    cluster: tuple[str, list[Popen[str]]], shipped_model: Path
) -> None:
    address, workers = cluster
    records = [Record(str(i), smiles) for i, smiles in enumerate(acids(600))]
    local = [rows for block in predict_records(records, open_model, chunk=20) for _, rows in block]
    remote = []
    for number, block in enumerate(predict_records(records, open_model, cluster=address, chunk=20)):
        remote += [rows for _, rows in block]
        if number == 3:
            workers[0].kill()
    assert workers[0].wait() != 0
    assert [len(rows) for rows in remote] == [len(rows) for rows in local]
    flat = [(a, b) for one, other in zip(remote, local, strict=True) for a, b in zip(one, other, strict=True)]
    assert all(same_cells(a, b) for a, b in flat)


def same_cells(one: Sequence[object], other: Sequence[object]) -> bool:
    """Whether two rows agree: numbers to 1e-9, since a worker may sum on another number of threads, text exactly."""
    for a, b in zip(one, other, strict=True):
        try:
            near = math.isclose(float(str(a)), float(str(b)), rel_tol=0.0, abs_tol=1e-9)
        except ValueError:
            near = a == b
        if not near:
            return False
    return True


def test_the_command_writes_the_same_file(
    cluster: tuple[str, list[Popen[str]]], shipped_model: Path, tmp_path: Path
) -> None:
    source = tmp_path / "acids.smi"
    source.write_text("\n".join([*acids(40), "no acid"]), encoding="utf-8")
    here, there = tmp_path / "here.csv", tmp_path / "there.csv"
    assert cli.main(["predict", str(source), "--output", str(here)]) == 3
    assert cli.main(["predict", str(source), "--output", str(there), "--cluster", cluster[0]]) == 3
    with here.open(encoding="utf-8") as a, there.open(encoding="utf-8") as b:
        assert all(same_cells(x, y) for x, y in zip(csv.reader(a), csv.reader(b), strict=True))


def test_folds_fitted_on_a_cluster_are_the_same(cluster: tuple[str, list[Popen[str]]], tmp_path: Path) -> None:
    from qsar.model.boosting import BoostingSettings
    from qsar.model.members import Settings
    from qsar.model.resumable import fit_members_resumably
    from qsar.model.training_set import training_set
    from qsar.paths import reference_table
    from qsar.table import read_table

    data = training_set(read_table(reference_table())[:120])
    settings = Settings(folds=3, rounds=1, boosting=BoostingSettings(max_iter=20))
    here, fold = fit_members_resumably(data, settings, tmp_path / "here")
    there, same = fit_members_resumably(data, settings, tmp_path / "there", cluster=cluster[0])
    assert np.array_equal(fold, same)
    for name in ("dual", "slopes", "points"):
        assert np.array_equal(getattr(here, name), getattr(there, name)), name
    assert np.array_equal(here.trees.threshold, there.trees.threshold)


def test_train_and_validate_give_the_same_from_a_cluster(
    cluster: tuple[str, list[Popen[str]]], tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    """The whole commands, here and there: one bundle to the last bit, one report to the last figure."""
    from qsar.model import load_model
    from qsar.validation import studies

    monkeypatch.setattr("platformdirs.user_cache_dir", lambda *_: str(tmp_path / "cache"))
    monkeypatch.setattr(studies, "QUICK", studies.Scale(1, 3, "trend", (0.5, 1.0), 1, 2, 1))
    rows = paths.reference_table().read_text(encoding="utf-8").splitlines()
    (tmp_path / "own.csv").write_text("\n".join([rows[0], *rows[1::9]]) + "\n", encoding="utf-8")
    sums, reports = [], []
    for name, where in (("here", ["--jobs", "2"]), ("there", ["--cluster", cluster[0]])):
        own = ["--data", str(tmp_path / "own.csv"), "--only", "--folds", "3", "--name", "own"]
        assert cli.main(["train", *own, "--output", str(tmp_path / name), *where]) == 0
        sums.append(load_model(tmp_path / name).card["arrays_sha256"])
        out = ["--model", str(tmp_path / name), "--output", str(tmp_path / f"{name}-report"), "--quick", "--again"]
        assert cli.main(["validate", *out, *where]) == 0
        reports.append((tmp_path / f"{name}-report" / "own.csv").read_text(encoding="utf-8"))
    assert sums[0] == sums[1]
    assert reports[0] == reports[1]
    assert len(reports[0].splitlines()) > 100


def test_fits_of_a_validation_survive_the_end_of_a_worker(cluster: tuple[str, list[Popen[str]]]) -> None:
    """The table goes to each worker once, and the one that is left still has it."""
    from small_models import QUICK, small_model

    from qsar.validation.fits import Fit, problem_of, run
    from qsar.validation.splits import folds_of_acids

    address, workers = cluster
    problem = problem_of(small_model().library, QUICK)
    fold = folds_of_acids(problem.data, 6, 1)
    wanted = [Fit(f"{k}/{learner}", learner, fold != k) for k in range(6) for learner in ("trend", "forest", "lines")]
    finished: list[int] = []

    def one_more(count: int) -> None:
        finished.append(count)
        if len(finished) == 2:
            workers[0].kill()

    there = run(problem, wanted, cluster=address, done=one_more)
    assert workers[0].wait() != 0
    here = run(problem, wanted)
    assert list(there) == list(here)
    assert all(np.array_equal(there[name], here[name]) for name in here)


def test_no_scheduler_is_said_in_one_line(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr("qsar.cluster.WAIT_SECONDS", 1)
    with pytest.raises(UserError, match="no scheduler answers there"):
        next(in_order("tcp://127.0.0.1:1", len, ["a"]))
