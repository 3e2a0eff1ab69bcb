"""The reference table, read once."""

from __future__ import annotations

import csv
from pathlib import Path

import pytest

from qsar.checking.rows import TableRow, read_rows


@pytest.fixture(scope="session")
def table_path(checkout: Path) -> Path:
    """The reference table."""
    return checkout / "training_data" / "carboxylic_acids.csv"


@pytest.fixture(scope="session")
def cells(table_path: Path) -> list[dict[str, str]]:
    """Its rows as text."""
    with table_path.open(encoding="utf-8", newline="") as handle:
        return list(csv.DictReader(handle))


@pytest.fixture(scope="session")
def sources(table_path: Path) -> dict[str, dict[str, str]]:
    """The publications that it cites, by key."""
    with table_path.with_name("sources.csv").open(encoding="utf-8", newline="") as handle:
        return {row["source"]: row for row in csv.DictReader(handle)}


@pytest.fixture(scope="session")
def rows(table_path: Path) -> list[TableRow]:
    """Its rows as measured steps."""
    return read_rows(table_path)
