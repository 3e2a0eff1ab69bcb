"""A hundred thousand requests against `acidity serve` leave it as they found it."""

from __future__ import annotations

import sys
from collections.abc import Callable

import pytest
from benchmarks.long_day import PARTS, faults, live

REQUESTS = 100_000
MEMORY_MIB = 16.0
"""What a process may hold more at the end than after the second tenth: the explanations that a worker remembers are
bounded by their number, and that many come together only after tens of thousands of requests (common practice, no
source)."""


@pytest.mark.skipif(not sys.platform.startswith("linux"), reason="reads /proc")
def test_memory_files_and_processes_stay_flat(pytestconfig: pytest.Config, tell: Callable[[str], None]) -> None:
    for name in ("fastapi", "uvicorn", "jinja2", "python_multipart"):
        pytest.importorskip(name)
    tell("figures of: parent, resource tracker, worker, worker")
    day = live(pytestconfig.getoption("--requests", REQUESTS), tell=tell)
    tell(", ".join(f"{kind} {n:,}" for kind, n in sorted(day.asked.items())) + f"; late {len(day.late)}")
    assert not faults(day, PARTS // 5, MEMORY_MIB)
