"""Output files appear whole or not at all."""

from __future__ import annotations

import os
import stat
from pathlib import Path

import pytest

from qsar.errors import UserError
from qsar.files import atomic_path, check_folder


def test_new_file_takes_its_name_at_the_end(tmp_path: Path) -> None:
    target = tmp_path / "out.csv"
    with atomic_path(target) as temporary:
        temporary.write_text("whole")
        assert not target.exists()
        assert temporary.parent == target.parent
        assert temporary.suffix == target.suffix
    assert target.read_text() == "whole"
    assert list(tmp_path.iterdir()) == [target]


@pytest.mark.parametrize("kind", [ValueError, KeyboardInterrupt, SystemExit])
def test_failure_leaves_the_old_file_and_nothing_else(tmp_path: Path, kind: type[BaseException]) -> None:
    target = tmp_path / "out.csv"
    target.write_text("old")
    with pytest.raises(kind), atomic_path(target) as temporary:
        temporary.write_text("half")
        raise kind
    assert target.read_text() == "old"
    assert list(tmp_path.iterdir()) == [target]


def test_block_may_move_the_file_away(tmp_path: Path) -> None:
    target, elsewhere = tmp_path / "out.csv", tmp_path / "kept"
    with atomic_path(target) as temporary:
        temporary.replace(elsewhere)
    assert list(tmp_path.iterdir()) == [elsewhere]


def test_permissions_are_those_of_any_new_file(tmp_path: Path) -> None:
    plain = tmp_path / "plain"
    plain.touch()
    with atomic_path(tmp_path / "new") as temporary:
        temporary.write_text("")
    assert stat.S_IMODE((tmp_path / "new").stat().st_mode) == stat.S_IMODE(plain.stat().st_mode)
    plain.chmod(0o640)
    with atomic_path(plain) as temporary:
        temporary.write_text("")
    assert stat.S_IMODE(plain.stat().st_mode) == 0o640


def test_symbolic_link_is_followed(tmp_path: Path) -> None:
    (tmp_path / "real").mkdir()
    real, link = tmp_path / "real" / "out.csv", tmp_path / "link.csv"
    link.symlink_to(real)
    with atomic_path(link) as temporary:
        temporary.write_text("x")
    assert link.is_symlink()
    assert real.read_text() == "x"


@pytest.mark.parametrize(
    ("name", "message"),
    [
        ("absent/out.csv", "does not exist"),
        (".", "is a folder"),
        (os.devnull, "not a regular file"),
        ("x" * 300, "cannot write"),
        ("nul\0byte", "cannot write"),
    ],
)
def test_unwritable_place_is_one_line(tmp_path: Path, name: str, message: str) -> None:
    with pytest.raises(UserError, match=message) as caught, atomic_path(tmp_path / name):
        pytest.fail("the block must not run")
    assert len(str(caught.value).splitlines()) == 1
    assert not list(tmp_path.iterdir())


def test_a_folder_is_made_and_left_empty(tmp_path: Path) -> None:
    assert check_folder(tmp_path / "a" / "b").is_dir()
    assert not list((tmp_path / "a" / "b").iterdir())


def test_a_file_in_place_of_a_folder_is_one_line(tmp_path: Path) -> None:
    (tmp_path / "f").write_text("x", encoding="utf-8")
    for place in (tmp_path / "f", tmp_path / "f" / "below"):
        with pytest.raises(UserError, match="cannot write to"):
            check_folder(place)
