"""Some hundred mixed requests leave a service as they found it; `tests/benchmarks` has a hundred thousand of them."""

from __future__ import annotations

import sys
from dataclasses import replace
from pathlib import Path

import pytest
from benchmarks.day_load import Load
from benchmarks.long_day import Day, Held, Sample, faults, live
from service.conftest import NEEDED, need_module

MEMORY_MIB = 32.0
"""Far more than what is loaded late or remembered, far less than a list or a table that is kept by mistake."""


@pytest.mark.skipif(not sys.platform.startswith("linux"), reason="reads /proc")
def test_a_short_day_leaves_no_file_process_or_memory_behind(shipped_model: Path) -> None:
    for name in NEEDED:
        need_module(name)
    day = live(300, parts=3)
    assert sum(day.asked.values()) == 300 and len(day.asked) > 10
    assert [len(sample.processes) for sample in day.samples] == [4] * 4  # parent, resource tracker, two workers
    assert not faults(day, 1, MEMORY_MIB)


def test_the_load_is_the_same_every_day() -> None:
    assert [Load(1).request(n) for n in range(50)] == [Load(1).request(n) for n in range(50)]
    assert Load(1).request(0) != Load(2).request(0)


def test_what_leaks_is_found() -> None:
    start = Sample(0, {1: Held(50.0, 14, 5), 2: Held(60.0, 8, 1)}, 0, 0, ("answer",))
    flat = Day([start, start, replace(start, processes={1: Held(53.0, 14, 6), 2: Held(60.0, 8, 1)})])
    assert faults(flat, 1, 8.0) == []
    for changed, said in (
        ({"processes": {1: Held(59.0, 14, 5), 2: Held(60.0, 8, 1)}}, "50.0 MiB became 59.0 MiB"),
        ({"processes": {1: Held(50.0, 15, 5), 2: Held(60.0, 8, 1)}}, "14 open files became 15"),
        ({"processes": {1: Held(50.0, 14, 9), 2: Held(60.0, 8, 1)}}, "5 threads became 9"),
        ({"processes": {1: Held(50.0, 14, 5)}}, "2 processes became 1"),
        ({"processes": {1: Held(50.0, 14, 5), 3: Held(60.0, 8, 1)}}, "1 new processes, 0 were replaced"),
        ({"temporary": 1}, "1 temporary files are left"),
        ({"answers": ("other",)}, "'answer' became 'other'"),
    ):
        (found,) = faults(Day([start, start, replace(start, **changed)]), 1, 8.0)
        assert said in found
