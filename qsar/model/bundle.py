"""A model on disk: a folder of ``card.json`` and plain arrays, loaded without running any code.

The card says what went in; ``arrays.npz`` holds trees, trend, calibration, neighbours and the measured acids. The
card carries the SHA-256 of the arrays; loading refuses what was altered, is foreign, or is newer than this program.
"""

from __future__ import annotations

import hashlib
import io
import json
import math
import zipfile
import zlib
from dataclasses import asdict
from pathlib import Path
from typing import Any

import numpy as np
from numpy.typing import NDArray

from qsar.descriptors.pipeline import LOWERS, NAMES
from qsar.errors import UserError
from qsar.files import atomic_path
from qsar.model.boosting import BoostingSettings, Trees
from qsar.model.domain import Domain
from qsar.model.intervals import CLASSES, EVIDENCE, Calibration
from qsar.model.kernel import KernelSettings, Scaling
from qsar.model.library import Library
from qsar.model.members import Members, Settings
from qsar.model.model import Model
from qsar.model.neighbours import Neighbours

SCHEMA = 1
KIND = "carboxylic acidity model"
CARD, ARRAYS = "card.json", "arrays.npz"
MOST_BYTES = 256 << 20  # unpacked; a model of 10,000 acids stays well below
_SEPARATOR = "\x1f"

#: Every array of a bundle with the kind and number of dimensions it must have.
ARRAY_TYPES: dict[str, tuple[str, int]] = {
    "scaling_mean": ("f", 1),
    "scaling_scale": ("f", 1),
    "points": ("f", 2),
    "dual": ("f", 2),
    "slopes": ("f", 2),
    "offset": ("f", 1),
    "tree_feature": ("i", 1),
    "tree_threshold": ("f", 1),
    "tree_left": ("i", 1),
    "tree_right": ("i", 1),
    "tree_root": ("i", 2),
    "tree_baseline": ("f", 1),
    "neighbour_weights": ("f", 1),
    "neighbour_points": ("f", 2),
    "scale_coefficients": ("f", 1),
    "scores": ("f", 1),
    "stranger_scores": ("f", 1),
    "score_member": ("i", 1),
    "score_label": ("i", 1),
    "library_step": ("i", 1),
    "library_pka": ("f", 1),
    "library_uncertainty": ("f", 1),
    "library_without": ("f", 1),
    "library_expected": ("f", 1),
    "library_text": ("u", 1),
    "domain_counts": ("i", 1),
    "domain_text": ("u", 1),
}


def arrays_of(model: Model) -> dict[str, NDArray[Any]]:
    """All arrays of a model, by the names of `ARRAY_TYPES`."""
    m, library = model.members, model.library
    text = [library.smiles, library.name, library.family, library.source]
    counts = sorted(model.domain.counts.items())
    return {
        "scaling_mean": m.scaling.mean,
        "scaling_scale": m.scaling.scale,
        "points": m.points,
        "dual": m.dual,
        "slopes": m.slopes,
        "offset": np.array([m.offset]),
        "tree_feature": m.trees.feature,
        "tree_threshold": m.trees.threshold,
        "tree_left": m.trees.left,
        "tree_right": m.trees.right,
        "tree_root": m.trees.root,
        "tree_baseline": m.trees.baseline,
        "neighbour_weights": model.neighbours.weights,
        "neighbour_points": model.neighbours.points,
        "scale_coefficients": model.calibration.coefficients,
        "scores": model.calibration.scores,
        "stranger_scores": model.calibration.stranger_scores,
        "score_member": model.calibration.member,
        "score_label": model.calibration.label,
        "library_step": library.step,
        "library_pka": library.pka,
        "library_uncertainty": library.uncertainty,
        "library_without": library.pka_without,
        "library_expected": library.expected_error,
        "library_text": _pack(["\t".join(row) for row in zip(*text, strict=True)]),
        "domain_counts": np.array([n for _, n in counts]),
        "domain_text": _pack(["\t".join(key) for key, _ in counts]),
    }


def _pack(lines: list[str]) -> NDArray[np.uint8]:
    """Text as bytes, so that no array of objects is ever stored."""
    return np.frombuffer(_SEPARATOR.join(lines).encode("utf-8"), dtype=np.uint8)


def _unpack(array: NDArray[np.uint8]) -> list[list[str]]:
    text = array.tobytes().decode("utf-8")
    return [line.split("\t") for line in text.split(_SEPARATOR)] if text else []


def save(model: Model, folder: Path) -> None:
    """Write a bundle; the card is written last, so that a folder without one is no bundle.

    Raises
    ------
    UserError
        If the folder cannot be written.
    """
    try:
        folder.mkdir(parents=True, exist_ok=True)
    except OSError as error:
        raise UserError(f"cannot create {folder}: {error.strerror}") from error
    buffer = io.BytesIO()
    np.savez_compressed(buffer, **arrays_of(model))  # type: ignore[arg-type]
    data = buffer.getvalue()
    card = {**model.card, "arrays_sha256": hashlib.sha256(data).hexdigest()}
    with atomic_path(folder / ARRAYS) as path:
        path.write_bytes(data)
    with atomic_path(folder / CARD) as path:
        path.write_text(json.dumps(card, indent=2, ensure_ascii=False) + "\n", encoding="utf-8")


def read_card(folder: Path) -> dict[str, Any]:
    """Read and check the card of a bundle; nothing else is opened.

    Raises
    ------
    UserError
        If there is no card, it is no card of this program, or it is newer than this program.
    """
    path = folder / CARD
    try:
        _check_inside(folder, path)
        if path.stat().st_size > 4 << 20:
            raise UserError(f"{path}: larger than any card; not a model of this program")
        card = json.loads(path.read_text(encoding="utf-8"))
    except OSError as error:
        raise UserError(f"no model in {folder}: {CARD} cannot be read ({error.strerror})") from error
    except (ValueError, RecursionError) as error:
        raise UserError(f"{path}: damaged, not JSON; copy the bundle again") from error
    if not isinstance(card, dict) or card.get("kind") != KIND:
        raise UserError(f"{path}: not a model of this program")
    schema = card.get("schema")
    if not isinstance(schema, int):
        raise UserError(f"{path}: the card names no schema; not a model of this program")
    if schema > SCHEMA:
        raise UserError(f"{path}: schema {schema} is newer than this program knows ({SCHEMA}); update the program")
    return card


def load(folder: Path) -> Model:
    """Load a bundle.

    Raises
    ------
    UserError
        With one line if it is missing, damaged, altered, foreign or too new.
    """
    card = read_card(folder)
    _check_inside(folder, folder / ARRAYS)
    arrays = _read_arrays(folder / ARRAYS, str(card.get("arrays_sha256", "")))
    try:
        return _assemble(card, arrays)
    except (KeyError, TypeError, ValueError, IndexError, AttributeError, OverflowError) as error:
        raise UserError(f"{folder}: the bundle does not fit together ({error}); train or copy it again") from error


def _check_inside(folder: Path, path: Path) -> None:
    """Refuse a file of a bundle that is a link to somewhere else."""
    if path.resolve().parent != folder.resolve():
        raise UserError(f"{path}: leads out of the folder of the bundle; not loaded")


def _check_archive(path: Path, archive: zipfile.ZipFile) -> None:
    """Refuse other names, and contents larger than they say, before anything is unpacked."""
    names = [name.removesuffix(".npy") for name in archive.namelist()]
    if sorted(names) != sorted(ARRAY_TYPES):
        odd = ", ".join(sorted(set(names) ^ set(ARRAY_TYPES))[:3]) or "one twice"
        raise UserError(f"{path}: does not hold the arrays of this schema ({odd}); not loaded")
    if sum(info.file_size for info in archive.infolist()) > MOST_BYTES:
        raise UserError(f"{path}: unpacks to more than {MOST_BYTES >> 20} MiB; not loaded")
    for info in archive.infolist():
        with archive.open(info) as entry:
            if np.lib.format.read_magic(entry) != (1, 0):
                raise UserError(f"{path}: {info.filename} is not a plain array; not loaded")
            shape, _, dtype = np.lib.format.read_array_header_1_0(entry)
            if dtype.hasobject:
                raise UserError(f"{path}: {info.filename} holds pickled objects, which are never loaded")
            if math.prod(shape) * dtype.itemsize != info.file_size - entry.tell():
                raise UserError(f"{path}: {info.filename} says another size than it has; not loaded")


def _read_arrays(path: Path, digest: str) -> dict[str, NDArray[Any]]:
    try:
        if path.stat().st_size > MOST_BYTES:
            raise UserError(f"{path}: {path.stat().st_size >> 20} MiB; no model of this program is that large")
        data = path.read_bytes()
    except OSError as error:
        raise UserError(f"{path}: cannot be read ({error.strerror}); copy the bundle again") from error
    if hashlib.sha256(data).hexdigest() != digest:
        raise UserError(f"{path}: altered or damaged (SHA-256 differs from the card); copy the bundle again")
    try:
        with zipfile.ZipFile(io.BytesIO(data)) as archive:
            _check_archive(path, archive)
        with np.load(io.BytesIO(data), allow_pickle=False) as stored:
            arrays = {name: stored[name] for name in ARRAY_TYPES}
    except (
        zipfile.BadZipFile,
        zlib.error,
        ValueError,
        EOFError,
        KeyError,
        NotImplementedError,
        RuntimeError,
    ) as error:
        raise UserError(f"{path}: not an archive of plain arrays ({error}); not loaded") from error
    for name, (kind, dimensions) in ARRAY_TYPES.items():
        array = arrays[name]
        if array.dtype.kind != kind or array.ndim != dimensions:
            raise UserError(f"{path}: array {name} has the wrong type or shape; not loaded")
        if kind == "f" and not np.all(np.isfinite(array)):
            raise UserError(f"{path}: array {name} holds values that are not finite; not loaded")
    return arrays


def _assemble(card: dict[str, Any], a: dict[str, NDArray[Any]]) -> Model:
    if not isinstance(card["name"], str) or not card["name"].isprintable() or len(card["name"]) > 200:
        raise ValueError("its name is not a line of text")
    if card["descriptors"] != list(NAMES):
        raise UserError(f"{card.get('name')}: made with other descriptors than this program has; train it again")
    settings = settings_from(card["settings"])
    trees = Trees(
        a["tree_feature"],
        a["tree_threshold"],
        a["tree_left"],
        a["tree_right"],
        a["tree_root"],
        a["tree_baseline"],
        int(card["tree_depth"]),
    )
    members = Members(
        settings,
        Scaling(a["scaling_mean"], a["scaling_scale"]),
        a["points"],
        a["dual"],
        a["slopes"],
        float(a["offset"][0]),
        trees,
    )
    _check_shapes(a, trees)
    smiles, name, family, source = ([row[k] for row in _unpack(a["library_text"])] for k in range(4))
    library = Library(
        smiles,
        name,
        family,
        source,
        a["library_step"],
        a["library_pka"],
        a["library_uncertainty"],
        a["library_without"],
        a["library_expected"],
    )
    if len(smiles) != len(library.pka):
        raise ValueError("its list of measured acids has another length than their values")
    counts = {tuple(key): int(n) for key, n in zip(_unpack(a["domain_text"]), a["domain_counts"], strict=True)}
    domain = Domain(counts, float(card["borderline_above"]), float(card["outside_above"]))
    calibration = Calibration(
        a["scale_coefficients"], a["scores"], a["stranger_scores"], a["score_member"], a["score_label"]
    )
    neighbours = Neighbours(a["neighbour_weights"], a["neighbour_points"])
    return Model(card, members, neighbours, calibration, domain, library)


def _check_shapes(a: dict[str, NDArray[Any]], trees: Trees) -> None:
    """Refuse arrays that do not fit one another, so that evaluation never reads outside them."""
    free, lowers = int((~LOWERS).sum()), int(LOWERS.sum())
    members, nodes, steps = len(a["dual"]), len(trees.feature), len(a["library_pka"])
    expected = {
        "scaling_mean": (free,),
        "scaling_scale": (free,),
        "points": (a["dual"].shape[1], free),
        "slopes": (members, lowers),
        "tree_threshold": (nodes,),
        "tree_left": (nodes,),
        "tree_right": (nodes,),
        "tree_root": (members, a["tree_root"].shape[1]),
        "tree_baseline": (members,),
        "scale_coefficients": (len(EVIDENCE),),
        "neighbour_weights": (free + lowers,),
        "neighbour_points": (steps, free + lowers),
        "scores": (steps,),
        "stranger_scores": (steps,),
        "score_member": (steps,),
        "score_label": (steps,),
        "library_step": (steps,),
        "library_uncertainty": (steps,),
        "library_without": (steps,),
        "library_expected": (steps,),
    }
    for name, shape in expected.items():
        if a[name].shape != shape:
            raise ValueError(f"{name} has shape {a[name].shape}, expected {shape}")
    pointers = (trees.left, trees.right, trees.root)
    if any(p.size and (p.min() < 0 or p.max() >= nodes) for p in pointers):
        raise ValueError("a tree points outside its nodes")
    if trees.feature.max() >= len(LOWERS) or not 0 <= trees.depth <= 64:
        raise ValueError("a tree splits on a column that does not exist")
    if a["score_member"].min() < 0 or a["score_member"].max() >= members:
        raise ValueError("a score belongs to no member")
    if a["score_label"].min() < 0 or a["score_label"].max() >= len(CLASSES):
        raise ValueError("a score belongs to no class of acids")


def settings_from(stored: dict[str, Any]) -> Settings:
    """Settings from the card."""
    plain = {k: v for k, v in stored.items() if k not in ("kernel", "boosting")}
    return Settings(**plain, kernel=KernelSettings(**stored["kernel"]), boosting=BoostingSettings(**stored["boosting"]))


def settings_to(settings: Settings) -> dict[str, Any]:
    """Settings for the card."""
    return asdict(settings)
