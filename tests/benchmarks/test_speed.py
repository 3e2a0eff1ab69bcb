"""Structures per second of the whole prediction beside two measures of RDKit's, in one run on the same structures.

The two measures are RDKit's full list of 2D descriptors, and its own parsing, standardising and fingerprinting: what
any program for structures has to do. They take turns, so that a busy machine is busy for all. No clock decides whether
a test passes; the answers do.
"""

from __future__ import annotations

from collections.abc import Callable
from concurrent.futures import ProcessPoolExecutor
from multiprocessing import get_context
from os import environ

import pytest
from benchmarks.side_by_side import BLOCK, begin, measure


def pytest_generate_tests(metafunc: pytest.Metafunc) -> None:
    if "count" in metafunc.fixturenames:
        metafunc.parametrize("count", [metafunc.config.getoption("--structures")])


def _rate(pairs: list[tuple[int, float]]) -> float:
    return sum(n for n, _ in pairs) / sum(t for _, t in pairs)


@pytest.mark.parametrize("processes", [1, 2])
def test_prediction_beside_rdkit(count: int, processes: int, tell: Callable[[str], None], monkeypatch) -> None:  # type: ignore[no-untyped-def]
    monkeypatch.setitem(environ, "OMP_NUM_THREADS", "1")
    monkeypatch.setitem(environ, "OPENBLAS_NUM_THREADS", "1")
    with ProcessPoolExecutor(processes, mp_context=get_context("spawn"), initializer=begin) as pool:
        timings = list(pool.map(measure, range(0, count, BLOCK)))
    predicted, described, fingerprinted = (
        _rate([getattr(t, name) for t in timings]) for name in ("predicted", "described", "fingerprinted")
    )
    tell(
        f"{processes} process(es), {BLOCK * len(timings):,} structures: predicted {predicted:,.0f}/s a process; "
        f"CalcMolDescriptors {described:,.0f}/s (ratio {predicted / described:.1f}); "
        f"parse, Cleanup and Morgan fingerprint {fingerprinted:,.0f}/s (ratio {predicted / fingerprinted:.2f})"
    )
    assert all(t.complete for t in timings)
