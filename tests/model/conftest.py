"""The shipped model, loaded once."""

from __future__ import annotations

from pathlib import Path

import pytest

from qsar.model import Model, load


@pytest.fixture(scope="session")
def model(shipped_model: Path) -> Model:
    return load(shipped_model)
