"""Bundles that somebody tampered with are refused in one line, and nothing in them is run.

The dangers are those of the Python documentation: "never unpickle data that could have come from an untrusted
source" (library reference, pickle), "decompression bombs" and "path traversal" (zipfile, Decompression pitfalls).
"""

from __future__ import annotations

import hashlib
import io
import json
import pickle
import shutil
import zipfile
from collections.abc import Callable
from pathlib import Path

import numpy as np
import pytest
from small_models import small_model

from qsar.errors import UserError
from qsar.model import load, load_model, save
from qsar.model.bundle import ARRAYS, CARD, MOST_BYTES, SCHEMA
from qsar.model.registry import Registry


@pytest.fixture(scope="module")
def good(tmp_path_factory: pytest.TempPathFactory) -> Path:
    folder = tmp_path_factory.mktemp("models") / "good"
    save(small_model(), folder)
    return folder


@pytest.fixture
def bundle(good: Path, tmp_path: Path) -> Path:
    return Path(shutil.copytree(good, tmp_path / "bundle"))


def refusal(folder: Path) -> str:
    with pytest.raises(UserError) as caught:
        load(folder)
    line = str(caught.value)
    assert "\n" not in line and len(line) < 500
    return line


def write_arrays(bundle: Path, entries: dict[str, bytes]) -> None:
    """Put other arrays into a bundle and make the card agree with them, as an attacker would."""
    buffer = io.BytesIO()
    with zipfile.ZipFile(buffer, "w", zipfile.ZIP_DEFLATED) as archive:
        for name, data in entries.items():
            archive.writestr(name, data)
    (bundle / ARRAYS).write_bytes(buffer.getvalue())
    change_card(bundle, arrays_sha256=hashlib.sha256(buffer.getvalue()).hexdigest())


def change_card(bundle: Path, **changes: object) -> None:
    card = json.loads((bundle / CARD).read_text(encoding="utf-8"))
    (bundle / CARD).write_text(json.dumps({**card, **changes}), encoding="utf-8")


def entries(bundle: Path) -> dict[str, bytes]:
    with zipfile.ZipFile(bundle / ARRAYS) as archive:
        return {name: archive.read(name) for name in archive.namelist()}


def as_npy(array: np.ndarray, *, pickled: bool = False) -> bytes:
    buffer = io.BytesIO()
    np.lib.format.write_array(buffer, array, allow_pickle=pickled)
    return buffer.getvalue()


def with_shape(data: bytes, shape: str) -> bytes:
    """An array whose header states another shape than its data have."""
    header_end = 10 + int.from_bytes(data[8:10], "little")
    header = data[10:header_end].decode("latin-1")
    start = header.index("(")
    changed = header[:start] + shape + header[header.index(")") + 1 :].rstrip()
    changed = changed.ljust(header_end - 11)[: header_end - 11] + "\n"
    return data[:10] + changed.encode("latin-1") + data[header_end:]


def test_the_untouched_bundle_loads_and_predicts_as_before(good: Path) -> None:
    before = small_model().predict(["CCC(=O)O"])[0].steps[0]
    after = load(good).predict(["CCC(=O)O"])[0].steps[0]
    assert (after.pka, after.low, after.high) == (before.pka, before.low, before.high)


class Payload:
    """Would write a file if it were unpickled."""

    def __init__(self, path: Path) -> None:
        self.path = path

    def __reduce__(self) -> tuple[Callable[..., object], tuple[object, ...]]:
        return Path.touch, (self.path,)


def test_pickled_array_is_refused_and_not_run(bundle: Path, tmp_path: Path) -> None:
    mark = tmp_path / "was_run"
    stored = entries(bundle)
    stored["points.npy"] = as_npy(np.array([Payload(mark)], dtype=object), pickled=True)
    write_arrays(bundle, stored)
    assert "pickle" in refusal(bundle)
    assert not mark.exists()
    pickle.loads(pickle.dumps(Payload(mark)))  # the payload does work where it is let in
    assert mark.exists()


def test_pickle_in_place_of_the_archive_is_refused(bundle: Path, tmp_path: Path) -> None:
    mark = tmp_path / "was_run"
    data = pickle.dumps(Payload(mark))
    (bundle / ARRAYS).write_bytes(data)
    change_card(bundle, arrays_sha256=hashlib.sha256(data).hexdigest())
    assert "not an archive of plain arrays" in refusal(bundle)
    assert not mark.exists()


@pytest.mark.parametrize("keep", [0, 1, 100, -1])
def test_truncated_arrays_are_refused(bundle: Path, keep: int) -> None:
    data = (bundle / ARRAYS).read_bytes()
    (bundle / ARRAYS).write_bytes(data[:keep])
    assert "altered or damaged" in refusal(bundle)
    change_card(bundle, arrays_sha256=hashlib.sha256(data[:keep]).hexdigest())
    assert "not an archive" in refusal(bundle)


@pytest.mark.parametrize("text", ["", "{", "[]", "null", '{"kind": "recipe"}', "[" * 100_000, "\x00\xff"])
def test_card_that_is_none_is_refused(bundle: Path, text: str) -> None:
    (bundle / CARD).write_text(text, encoding="latin-1")
    assert CARD in refusal(bundle)


def test_missing_files_are_refused(bundle: Path, tmp_path: Path) -> None:
    (bundle / ARRAYS).unlink()
    assert ARRAYS in refusal(bundle)
    assert "no model in" in refusal(tmp_path / "nowhere")


def test_altered_array_is_refused(bundle: Path) -> None:
    data = bytearray((bundle / ARRAYS).read_bytes())
    data[len(data) // 2] ^= 1
    (bundle / ARRAYS).write_bytes(bytes(data))
    assert "altered or damaged" in refusal(bundle)


def test_newer_schema_is_refused(bundle: Path) -> None:
    change_card(bundle, schema=SCHEMA + 1)
    assert "newer than this program" in refusal(bundle)


@pytest.mark.parametrize("schema", ["1", None, 1.5, [1]])
def test_schema_that_is_no_number_is_refused(bundle: Path, schema: object) -> None:
    change_card(bundle, schema=schema)
    assert "schema" in refusal(bundle)


@pytest.mark.parametrize("name", ["../points.npy", "/tmp/points.npy", "..\\points.npy", "x/../../points.npy"])
def test_entry_that_climbs_out_is_refused(bundle: Path, name: str) -> None:
    stored = entries(bundle)
    stored[name] = stored.pop("points.npy")
    write_arrays(bundle, stored)
    assert "does not hold the arrays" in refusal(bundle)
    assert not (bundle.parent / "points.npy").exists()


@pytest.mark.parametrize("file", [CARD, ARRAYS])
def test_link_that_leads_out_is_refused(bundle: Path, tmp_path: Path, file: str) -> None:
    elsewhere = tmp_path / "elsewhere"
    (bundle / file).rename(elsewhere)
    try:
        (bundle / file).symlink_to(elsewhere)
    except OSError:
        pytest.skip("this system lets nobody make links")
    assert "leads out of the folder" in refusal(bundle)


def test_decompression_bomb_is_refused_before_it_unpacks(bundle: Path) -> None:
    stored = entries(bundle)
    header = with_shape(as_npy(np.zeros(0)), f"({MOST_BYTES // 8 + 1},)")
    stored["tree_threshold.npy"] = header + bytes(MOST_BYTES + 8)
    write_arrays(bundle, stored)
    assert (bundle / ARRAYS).stat().st_size < MOST_BYTES // 100
    assert "unpacks to more than" in refusal(bundle)


def test_header_that_promises_terabytes_is_refused(bundle: Path) -> None:
    stored = entries(bundle)
    stored["offset.npy"] = with_shape(stored["offset.npy"], "(999999999999,)")
    write_arrays(bundle, stored)
    assert "another size" in refusal(bundle)


def test_entry_twice_is_refused(bundle: Path) -> None:
    with zipfile.ZipFile(bundle / ARRAYS, "a") as archive, pytest.warns(UserWarning, match="Duplicate"):
        archive.writestr("points.npy", b"x")
    change_card(bundle, arrays_sha256=hashlib.sha256((bundle / ARRAYS).read_bytes()).hexdigest())
    assert "one twice" in refusal(bundle)


def test_trees_that_point_outside_are_refused(bundle: Path) -> None:
    stored = entries(bundle)
    left = np.load(io.BytesIO(stored["tree_left.npy"]))
    left[0] = len(left) + 5
    stored["tree_left.npy"] = as_npy(left)
    write_arrays(bundle, stored)
    assert "does not fit together" in refusal(bundle)


@pytest.mark.parametrize(
    ("array", "value"),
    [
        ("offset", np.array([np.nan])),
        ("points", np.zeros((2, 2))),
        ("dual", np.zeros(3)),
        ("scores", np.zeros(2)),
        ("scale_coefficients", np.zeros(2)),
        ("tree_root", np.zeros((1, 1), dtype=np.int32)),
        ("library_text", np.frombuffer(b"one\x1ftwo", dtype=np.uint8)),
        ("library_text", np.frombuffer(b"\xff\xfe", dtype=np.uint8)),
        ("score_label", np.array(["a"])),
    ],
)
def test_arrays_that_do_not_fit_are_refused(bundle: Path, array: str, value: np.ndarray) -> None:
    stored = entries(bundle)
    stored[f"{array}.npy"] = as_npy(value)
    write_arrays(bundle, stored)
    assert "not loaded" in (line := refusal(bundle)) or "does not fit together" in line


@pytest.mark.parametrize(
    "changes",
    [
        {"settings": None},
        {"settings": {"folds": 3, "surprise": 1, "kernel": {}, "boosting": {}}},
        {"settings": []},
        {"tree_depth": 10**9},
        {"borderline_above": "high"},
        {"descriptors": ["a"]},
        {"name": "two\nlines"},
        {"name": 7},
    ],
)
def test_cards_that_do_not_fit_are_refused(bundle: Path, changes: dict[str, object]) -> None:
    change_card(bundle, **changes)
    assert refusal(bundle)


def test_hostile_bundle_is_not_adopted_and_breaks_no_other(
    bundle: Path, good: Path, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    registry = Registry(tmp_path / "own")
    monkeypatch.setenv("QSAR_MODELS", str(tmp_path / "own"))
    registry.adopt(good)
    registry.use("good")
    (bundle / ARRAYS).write_bytes(b"damaged")
    with pytest.raises(UserError, match="altered"):
        registry.adopt(bundle)
    shutil.copytree(bundle, tmp_path / "own" / "bad")
    with pytest.raises(UserError, match="altered"):
        registry.use("bad")
    assert registry.in_use() == "good"
    assert load_model().name == "good"
