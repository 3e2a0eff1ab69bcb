"""Models by name: listing, choosing, deleting, and what damage or a second process must not do.

Requirements of the user; no published source.
"""

from __future__ import annotations

import json
import multiprocessing
import subprocess
import sys
from pathlib import Path

import pytest
from small_models import small_model

from qsar import cli
from qsar.errors import UserError
from qsar.model import load, load_model, save
from qsar.model.registry import IN_USE, Registry, check_name, resolve
from qsar.paths import DEFAULT_MODEL, default_model


@pytest.fixture
def registry(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Registry:
    monkeypatch.setenv("QSAR_MODELS", str(tmp_path / "own"))
    return Registry()


def names(registry: Registry) -> list[str]:
    return [e.name for e in registry.entries() if not e.shipped]


def test_without_a_choice_the_shipped_model_is_in_use(registry: Registry) -> None:
    assert registry.in_use() == DEFAULT_MODEL
    assert resolve() == default_model()
    assert not registry.folder.exists()  # reading makes no folders


def test_use_switches_and_delete_goes_back(registry: Registry, capsys: pytest.CaptureFixture[str]) -> None:
    registry.add(small_model(), "ours")
    assert registry.in_use() == DEFAULT_MODEL
    assert cli.main(["models", "use", "ours"]) == 0
    assert load_model().name == "ours"
    assert cli.main(["models"]) == 0
    line = next(t for t in capsys.readouterr().out.splitlines() if "ours" in t and t.startswith("*"))
    card = small_model().card
    for shown in (card["date"], str(card["steps"]), "a quarter"):
        assert shown in line
    assert cli.main(["models", "delete", "ours"]) == 0
    assert registry.in_use() == DEFAULT_MODEL
    assert names(registry) == []


def test_a_name_that_is_taken_gets_a_number(registry: Registry) -> None:
    assert registry.add(small_model(), "ours").name == "ours"
    second = registry.add(small_model(), "ours")
    assert second.name == "ours-2"
    assert load(second.folder).name == "ours-2"


def test_the_shipped_model_is_never_deleted(registry: Registry, shipped_model: Path) -> None:
    with pytest.raises(UserError, match="came with the program"):
        registry.delete(DEFAULT_MODEL)
    assert shipped_model.is_dir()


@pytest.mark.parametrize("name", ["../up", "a/b", "", ".hidden", "/etc", "a\\b", "x" * 65, "a\nb", ".."])
def test_names_that_lead_out_of_the_folder_are_refused(registry: Registry, name: str) -> None:
    for action in (check_name, registry.path, registry.delete, registry.use):
        with pytest.raises(UserError, match="no name for a model"):
            action(name)
    with pytest.raises(UserError, match="no name for a model"):
        registry.add(small_model(), name)


def test_a_damaged_bundle_is_listed_and_breaks_no_other(registry: Registry, capsys: pytest.CaptureFixture[str]) -> None:
    registry.add(small_model(), "good")
    for name, card in (("bad", "{"), ("foreign", "[]")):
        (registry.folder / name).mkdir()
        (registry.folder / name / "card.json").write_text(card, encoding="utf-8")
    (registry.folder / "empty").mkdir()
    registry.use("good")
    assert {e.name for e in registry.entries() if e.problem} == {"bad", "foreign", "empty"}
    assert cli.main(["models"]) == 0
    assert "bad" in capsys.readouterr().out
    assert load_model().name == "good"
    registry.delete("bad")
    assert load_model().name == "good"


def test_a_model_in_use_that_is_gone_is_said_and_not_replaced(registry: Registry) -> None:
    registry.add(small_model(), "ours")
    registry.use("ours")
    (registry.folder / "ours").rename(registry.folder / "theirs")
    with pytest.raises(UserError, match="gone"):
        load_model()
    registry.use("theirs")
    assert load_model().card["date"] == small_model().card["date"]


@pytest.mark.parametrize("text", ["", "{", "[]", '{"name": 3}', '{"name": "../../x"}', '{"other": 1}'])
def test_a_damaged_choice_is_said_and_mended_by_use(registry: Registry, text: str) -> None:
    registry.add(small_model(), "ours")
    (registry.folder / IN_USE).write_text(text, encoding="utf-8")
    with pytest.raises(UserError, match="damaged"):
        load_model()
    assert "ours" in names(registry)
    registry.use("ours")
    assert load_model().name == "ours"


def test_load_model_takes_a_name_or_a_folder(registry: Registry, tmp_path: Path) -> None:
    registry.add(small_model(), "ours")
    save(small_model(), tmp_path / "elsewhere")
    assert load_model("ours").name == "ours"
    assert load_model(tmp_path / "elsewhere").name == "small"
    with pytest.raises(UserError, match="no model nothing"):
        load_model("nothing")


def _add_several(folder: str, count: int) -> None:
    for _ in range(count):
        Registry(Path(folder)).add(small_model(), "ours")


def test_two_processes_that_add_at_the_same_time_lose_nothing(tmp_path: Path) -> None:
    small_model()  # trained before the processes fork
    context = multiprocessing.get_context("fork") if sys.platform != "win32" else multiprocessing.get_context()
    workers = [context.Process(target=_add_several, args=(str(tmp_path), 4)) for _ in range(2)]
    for worker in workers:
        worker.start()
    for worker in workers:
        worker.join()
        assert worker.exitcode == 0
    registry = Registry(tmp_path)
    found = [e for e in registry.entries() if not e.shipped]
    assert sorted(e.name for e in found) == sorted(["ours", *(f"ours-{k}" for k in range(2, 9))])
    for entry in found:
        assert load(entry.folder).name == entry.name
    assert not list(tmp_path.glob(".unfinished-*"))


def test_an_unfinished_bundle_is_no_model(registry: Registry) -> None:
    registry.folder.mkdir(parents=True)
    (registry.folder / ".unfinished-x" / "ours").mkdir(parents=True)
    assert names(registry) == []


def test_the_card_of_a_stranger_cannot_steer_the_terminal(
    registry: Registry, capsys: pytest.CaptureFixture[str]
) -> None:
    folder = registry.add(small_model(), "ours").folder
    card = json.loads((folder / "card.json").read_text(encoding="utf-8"))
    card |= {"date": "\x1b[31mred", "metrics": "none", "tables": [{"name": "\x1b]0;x\x07" + "y" * 500}, 3]}
    (folder / "card.json").write_text(json.dumps(card), encoding="utf-8")
    assert cli.main(["models"]) == 0
    out = capsys.readouterr().out
    assert "\x1b" not in out and "\x07" not in out
    assert max(map(len, out.splitlines())) < 200


def test_loading_a_model_imports_no_training_library(shipped_model: Path) -> None:
    code = "import sys, qsar.model; assert not {'sklearn', 'pandas', 'scipy'} & set(sys.modules), sorted(sys.modules)"
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=False)
    assert done.returncode == 0, done.stderr
