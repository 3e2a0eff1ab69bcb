"""Training and the full validation report of tables of 1,000 and 10,000 acids: time and memory of the real commands.

The pKa values are invented, see :mod:`benchmarks.invented_table`. No clock decides whether a test passes; memory does.
``-k 1000_acids`` makes the small measurement alone.
"""

from __future__ import annotations

import csv
import os
import resource
import subprocess
import sys
from collections.abc import Callable
from pathlib import Path
from time import perf_counter

import pytest
from benchmarks.invented_table import NOISE, write_table
from benchmarks.private_memory import Watch

PROCESSES = "2"
MOST_MEMORY = 4 * 2**30


@pytest.mark.skipif(not Path("/proc/self/smaps_rollup").is_file(), reason="reads the memory from Linux's /proc")
@pytest.mark.parametrize("count", [1000, 10_000], ids=lambda n: f"{n}_acids")
def test_train_and_validate(count: int, tmp_path: Path, tell: Callable[[str], None]) -> None:
    table, bundle, reports = tmp_path / "invented.csv", tmp_path / "invented", tmp_path / "reports"
    rows = write_table(table, count)
    tell(f"{count:,} acids, {rows:,} steps, pKa invented; {PROCESSES} processes")
    train = ("train", "--data", str(table), "--only", "--output", str(bundle), "--jobs", PROCESSES)
    validate = ("validate", "--model", str(bundle), "--output", str(reports), "--jobs", PROCESSES)
    peaks = [_measured(arguments, tmp_path, tell) for arguments in (train, validate)]
    with (reports / "invented.csv").open(encoding="utf-8", newline="") as handle:
        found = {(r["section"], r["row"], r["column"]): r["value"] for r in csv.DictReader(handle)}
    assert int(found["Predicted against measured", "all", "n"]) == rows
    error = float(found["Predicted against measured", "all", "mean absolute"])
    assert error > 0.75 * NOISE  # the mean absolute normal deviate is 0.80 NOISE: less would be a leak
    tell(f"mean absolute error of acids left out {error:.3f}, of the deviates that were added {0.798 * NOISE:.3f}")
    assert max(peaks) < MOST_MEMORY


def _measured(arguments: tuple[str, ...], folder: Path, tell: Callable[[str], None]) -> int:
    """Run the command, print its time and memory, and return the peak of the private memory in bytes."""
    environment = {**os.environ, "XDG_CACHE_HOME": str(folder / "cache"), "OMP_NUM_THREADS": "1"}
    before, begun = resource.getrusage(resource.RUSAGE_CHILDREN), perf_counter()
    with (folder / f"{arguments[0]}.log").open("w", encoding="utf-8") as log:
        process = subprocess.Popen(
            [sys.executable, "-c", "import sys; from qsar.cli import main; sys.exit(main())", *arguments],
            stdout=log, stderr=log, env=environment,
        )  # fmt: skip
        with Watch(process.pid) as watch:
            code = process.wait()
    took, after = perf_counter() - begun, resource.getrusage(resource.RUSAGE_CHILDREN)
    spent = after.ru_utime + after.ru_stime - before.ru_utime - before.ru_stime
    text = (folder / f"{arguments[0]}.log").read_text(encoding="utf-8")
    assert code == 0, text[-2000:]
    tell(
        f"acidity {arguments[0]}: {took:,.0f} s, {spent:,.0f} s of processor time, private memory of "
        f"{watch.processes} processes together at most {watch.peak / 2**20:,.0f} MiB"
    )
    return watch.peak
