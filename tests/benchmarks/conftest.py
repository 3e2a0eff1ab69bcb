"""Measurements are made only when asked for, and their printed results are shown."""

from __future__ import annotations

from collections.abc import Callable

import pytest


@pytest.fixture(autouse=True)
def only_when_asked(pytestconfig: pytest.Config) -> None:
    if not pytestconfig.getoption("--benchmarks"):
        pytest.skip("a measurement; asked for with --benchmarks")


@pytest.fixture
def tell(capsys: pytest.CaptureFixture[str]) -> Callable[[str], None]:
    """Print a result past pytest's capture."""

    def show(text: str) -> None:
        with capsys.disabled():
            print(f"\n    {text}", flush=True)

    return show
