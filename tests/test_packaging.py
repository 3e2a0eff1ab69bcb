"""The wheel carries the table and the model, installs one package, and predicts away from the checkout."""

from __future__ import annotations

import ast
import csv
import os
import re
import subprocess
import sys
import tomllib
import zipfile
from pathlib import Path

import pytest

from qsar import paths


def test_data_are_found_in_the_checkout(checkout: Path) -> None:
    if paths.checkout() is None:
        pytest.skip("the tests run against an installed wheel")
    assert paths.reference_table() == checkout / "training_data" / "carboxylic_acids.csv"
    assert paths.reference_table().is_file()
    assert paths.sources_table().is_file()
    assert (paths.default_model() / "card.json").is_file()


@pytest.fixture(scope="module")
def wheel(checkout: Path, tmp_path_factory: pytest.TempPathFactory) -> Path:
    pytest.importorskip("hatchling", reason="needs hatchling to build the wheel")
    folder = tmp_path_factory.mktemp("wheel")
    subprocess.run(
        [sys.executable, "-m", "pip", "wheel", "--quiet", "--no-deps", "--no-build-isolation",
         "--wheel-dir", str(folder), str(checkout)],
        check=True, capture_output=True, text=True,
    )  # fmt: skip
    (path,) = folder.glob("*.whl")
    return path


def test_wheel_holds_one_package_with_its_data(wheel: Path, checkout: Path) -> None:
    with zipfile.ZipFile(wheel) as archive:
        names = archive.namelist()
        table = archive.read("qsar/data/carboxylic_acids.csv")
    assert {name.split("/")[0] for name in names if ".dist-info/" not in name} == {"qsar"}
    assert table == (checkout / "training_data" / "carboxylic_acids.csv").read_bytes()
    assert {"qsar/data/sources.csv", "qsar/data/LICENSE-DATA"} <= set(names)
    assert f"qsar/data/models/{paths.DEFAULT_MODEL}/card.json" in names
    assert not [name for name in names if "__pycache__" in name or name.endswith(".partial")]


def test_wheel_predicts_from_an_empty_folder(wheel: Path, tmp_path: Path) -> None:
    site, empty = tmp_path / "site", tmp_path / "empty"
    empty.mkdir()
    subprocess.run(
        [sys.executable, "-m", "pip", "install", "--quiet", "--no-deps", "--target", str(site), str(wheel)],
        check=True, capture_output=True, text=True,
    )  # fmt: skip
    environment = {**os.environ, "PYTHONPATH": str(site)}
    found = subprocess.run(
        [sys.executable, "-c", "import qsar; print(qsar.__file__)"],
        cwd=empty, env=environment, check=True, capture_output=True, text=True,
    )  # fmt: skip
    assert Path(found.stdout.strip()).is_relative_to(site)
    done = subprocess.run(
        [sys.executable, "-m", "qsar", "predict", "OC(=O)CC(=O)O", "--output", "out.csv"],
        cwd=empty, env=environment, check=False, capture_output=True, text=True,
    )  # fmt: skip
    assert done.returncode == 0, done.stderr
    with (empty / "out.csv").open(encoding="utf-8", newline="") as handle:
        rows = list(csv.DictReader(handle))
    assert [row["step"] for row in rows] == ["1", "2"]
    assert float(rows[0]["pka"]) < float(rows[1]["pka"])


def imported_packages(folder: Path) -> set[str]:
    found: set[str] = set()
    for path in folder.rglob("*.py"):
        for node in ast.walk(ast.parse(path.read_text(encoding="utf-8"))):
            if isinstance(node, ast.Import):
                found |= {alias.name.split(".")[0] for alias in node.names}
            elif isinstance(node, ast.ImportFrom) and node.module and not node.level:
                found.add(node.module.split(".")[0])
    return found - set(sys.stdlib_module_names) - {"qsar"}


def test_dependencies_are_those_that_are_imported(checkout: Path) -> None:
    project = tomllib.loads((checkout / "pyproject.toml").read_text(encoding="utf-8"))["project"]
    distributions = {"scikit-learn": "sklearn", "pillow": "PIL"}

    def modules(requirements: list[str]) -> set[str]:
        names = [re.split(r"[<>=~! \[]", text)[0] for text in requirements]
        return {distributions.get(name, name.replace("-", "_")) for name in names}

    core = modules(project["dependencies"])
    optional = {
        m for name, rows in project["optional-dependencies"].items() if name != "test" for m in modules(rows)
    }
    found = imported_packages(checkout / "qsar")
    assert found - optional - core == set(), "imported but not in pyproject.toml"
    assert core - found == set(), "in pyproject.toml but never imported"
