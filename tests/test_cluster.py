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

from qsar import cli
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


def test_no_scheduler_is_said_in_one_line(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr("qsar.cluster.WAIT_SECONDS", 1)
    with pytest.raises(UserError, match="no scheduler answers there"):
        next(in_order("tcp://127.0.0.1:1", len, ["a"]))
