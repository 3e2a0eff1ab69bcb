"""What the tests share: the folder of open measurements, and tools that not every machine has."""

from __future__ import annotations

import csv
import os
import shutil
from pathlib import Path

import pytest

from qsar import paths

CHECKOUT = Path(__file__).resolve().parent.parent
OPEN_ROWS = "iupac_pka_acids_half.csv"


def pytest_addoption(parser: pytest.Parser) -> None:
    parser.addoption(
        "--open-data",
        metavar="DIR",
        default=os.environ.get("QSAR_OPEN_DATA", str(CHECKOUT.parent / "shared" / "open_data")),
        help="folder with measured pKa rows that the project may not hold (default: QSAR_OPEN_DATA, else "
        "../shared/open_data beside the checkout); tests that need them are skipped where it is absent",
    )
    parser.addoption("--benchmarks", action="store_true", help="make the measurements of tests/benchmarks")
    parser.addoption(
        "--structures", type=int, default=15_000, metavar="N", help="structures of the speed measurement (15000)"
    )
    parser.addoption("--requests", type=int, default=100_000, metavar="N", help="requests of the long day (100000)")
    parser.addoption("--plots", metavar="DIR", help="where measurements leave their plots (default: reports/)")


@pytest.fixture(scope="session")
def checkout() -> Path:
    """Top folder of the project."""
    return CHECKOUT


@pytest.fixture(scope="session")
def open_data_path(pytestconfig: pytest.Config) -> Path:
    """File of the open rows (IUPAC Digitized pKa Dataset, doi:10.5281/zenodo.7236452, CC BY-NC 4.0)."""
    path = Path(pytestconfig.getoption("--open-data")) / OPEN_ROWS
    if not path.is_file():
        pytest.skip(f"no open data: {path} is not there; name its folder with --open-data DIR")
    return path


@pytest.fixture(scope="session")
def open_data_rows(open_data_path: Path) -> list[dict[str, str]]:
    """The open rows, one dictionary each, as text."""
    with open_data_path.open(encoding="utf-8", newline="") as handle:
        return list(csv.DictReader(handle))


@pytest.fixture(scope="session")
def shipped_model() -> Path:
    """Folder of the shipped model."""
    folder = paths.default_model()
    if not folder.is_dir():
        pytest.skip(f"no model in {folder}: make it with `acidity train`")
    return folder


def need_program(name: str, package: str) -> str:
    """Path of a program; without it the test is skipped, and in CI, which must bring it, fails."""
    found = shutil.which(name)
    if found is None and os.environ.get("CI"):
        pytest.fail(f"{name} is missing in CI: .ci/run must install {package}")
    if found is None:
        pytest.skip(f"needs {name} (Debian: apt-get install {package})")
    return found


@pytest.fixture(scope="session")
def java() -> str:
    """Path of the Java runtime that py2opsin calls."""
    return need_program("java", "default-jre-headless")
