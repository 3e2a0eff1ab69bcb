"""Training that an interrupt does not lose: each finished member is kept as plain arrays until all are there."""

from __future__ import annotations

import hashlib
import json
import shutil
import zipfile
from collections.abc import Callable, Iterable, Sequence
from dataclasses import replace
from functools import partial
from pathlib import Path
from typing import Any

import numpy as np
from numpy.typing import NDArray

from qsar.descriptors import LOWERS
from qsar.errors import UserError
from qsar.files import atomic_path
from qsar.model.boosting import Trees, trees_of
from qsar.model.bundle import settings_to
from qsar.model.kernel import Scaling, basis_points
from qsar.model.members import Members, Settings, fit_member, fold_of_acids
from qsar.model.training_set import Floats, Ints, TrainingSet

_TREES = ("feature", "threshold", "left", "right", "root", "baseline")
_PLAIN = ("dual", "slopes", "offset", "depth")
Arrays = dict[str, NDArray[Any]]


def deal_folds(acids: int, settings: Settings, first_part: int | None = None) -> Ints:
    """Fold of each acid, dealt out for two parts of the table apart.

    The acids of the reference table so keep their folds when others are added, and two models of one seed can be
    compared acid by acid on predictions made without the acid.

    Parameters
    ----------
    acids : int
    settings : Settings
    first_part : int, optional
        Acids of the first part; all where not given.

    Returns
    -------
    ndarray of int, shape (acids,)
    """
    first = acids if first_part is None else first_part
    rest = fold_of_acids(acids - first, replace(settings, seed=settings.seed + 1))
    return np.concatenate([fold_of_acids(first, settings), rest])


def fingerprint(data: TrainingSet, settings: Settings, fold: Ints) -> str:
    """Hexadecimal SHA-256 of everything that decides the members: descriptors, values, folds, settings, libraries."""
    import scipy
    import sklearn

    digest = hashlib.sha256()
    versions = [np.__version__, scipy.__version__, sklearn.__version__]
    digest.update(json.dumps([settings_to(settings), versions], sort_keys=True).encode())
    arrays = (data.x, data.first, data.step_acid, data.step_number, data.pka, data.uncertainty, data.weight, fold)
    for array in arrays:
        digest.update(repr((array.shape, array.dtype.str)).encode() + np.ascontiguousarray(array).tobytes())
    return digest.hexdigest()


def fit_members_resumably(
    data: TrainingSet,
    settings: Settings,
    cache: Path,
    done: Callable[[int], object] = lambda _: None,
    note: Callable[[str], None] = lambda _: None,
    first_part: int | None = None,
    cluster: str | None = None,
    jobs: int = 1,
) -> tuple[Members, Ints]:
    """Fit the ensemble as :func:`qsar.model.members.fit_members` does, member by member through a cache.

    Parameters
    ----------
    data : TrainingSet
    settings : Settings
    cache : pathlib.Path
        Folder for the finished members; made if need be, and left for the caller to remove. Where nothing can be
        written there, the training goes on without it and says so.
    done : callable
        Called with 1 after each member, found or fitted.
    note : callable
        Told, in one line, what was found.
    first_part : int, optional
        Acids, at the beginning, whose folds are dealt out apart; see `deal_folds`.
    cluster : str, optional
        Address of a Dask scheduler: the folds are fitted there.
    jobs : int
        Processes on this machine, where no cluster is named; the outcome does not depend on it.

    Returns
    -------
    members : Members
    fold : ndarray of int, shape (n_acids,)
        Member that never saw each acid.
    """
    fold = deal_folds(len(data.acids), settings, first_part)
    scaling = Scaling.of(data.x[:, ~LOWERS])
    key = fingerprint(data, settings, fold)[:24]
    paths = [cache / f"{key}-{k}.npz" for k in range(settings.folds)]
    stored = [_read(path, note) for path in paths]
    missing = [k for k, arrays in enumerate(stored) if arrays is None]
    found = settings.folds - len(missing)
    for _ in range(found):
        done(1)
    points = basis_points(data.x[:, ~LOWERS], settings.kernel, scaling)
    fit = partial(_fit, data, scaling, fold, settings, points)
    fresh: Iterable[Arrays]
    if cluster is not None:
        from qsar.cluster import in_order

        fresh = in_order(cluster, fit, missing)
    elif jobs > 1 and len(missing) > 1:
        from joblib import Parallel, delayed

        fresh = Parallel(n_jobs=jobs, return_as="generator")(delayed(fit)(k) for k in missing)
    else:
        fresh = map(fit, missing)
    for k, arrays in zip(missing, fresh, strict=True):
        _write(paths[k], arrays, note)
        stored[k] = arrays
        done(1)
    fitted = [arrays for arrays in stored if arrays is not None]
    if found:
        note(f"{found} of {settings.folds} folds were finished by an earlier run and taken from {cache}")
    members = Members(
        settings,
        scaling,
        points,
        np.array([a["dual"] for a in fitted]),
        np.array([a["slopes"] for a in fitted]),
        float(fitted[0]["offset"]),
        join_trees(fitted),
    )
    return members, fold


def _fit(data: TrainingSet, scaling: Scaling, fold: Ints, settings: Settings, points: Floats, k: int) -> Arrays:
    """Member `k` as plain arrays."""
    import scipy.linalg  # noqa: F401 - loaded first, or the limit to one thread in `fit_member` does not reach it

    member = fit_member(data, scaling, fold[data.step_acid] != k, settings, settings.seed + 1000 * k, points)
    trees = trees_of([member.booster])
    arrays = {name: getattr(trees, name) for name in _TREES}
    arrays |= {"dual": member.dual, "slopes": member.slopes}
    return arrays | {"offset": np.array(member.offset), "depth": np.array(trees.depth)}


def _read(path: Path, note: Callable[[str], None]) -> Arrays | None:
    """A finished member, or None where there is none that can be read."""
    if not path.exists():
        return None
    try:
        with np.load(path, allow_pickle=False) as stored:
            return {name: stored[name] for name in (*_TREES, *_PLAIN)}
    except (OSError, ValueError, KeyError, EOFError, zipfile.BadZipFile) as problem:
        note(f"{path.name} is damaged ({type(problem).__name__}) and is fitted again")
        return None


def _write(path: Path, arrays: Arrays, note: Callable[[str], None]) -> None:
    """Keep a finished member; where that is impossible the training goes on without."""
    try:
        # Each time anew: another training of the same name may have ended and removed the folder.
        path.parent.mkdir(parents=True, exist_ok=True)
        with atomic_path(path) as temporary:
            np.savez(temporary, **arrays)  # type: ignore[arg-type]
    except (OSError, UserError) as problem:
        note(f"the finished fold cannot be kept ({problem}); an interrupt would lose it")


def join_trees(parts: Sequence[Arrays]) -> Trees:
    """Several ensembles of one as one of several, nodes in the order of :func:`qsar.model.boosting.trees_of`."""
    base = np.cumsum([0, *(len(p["feature"]) for p in parts)])

    def moved(name: str) -> NDArray[np.int32]:
        joined = np.concatenate([p[name] + b for p, b in zip(parts, base[:-1], strict=True)])
        return joined.astype(np.int32)

    return Trees(
        np.concatenate([p["feature"] for p in parts]),
        np.concatenate([p["threshold"] for p in parts]),
        moved("left"),
        moved("right"),
        moved("root"),
        np.concatenate([p["baseline"] for p in parts]),
        max(int(p["depth"]) for p in parts),
    )


def remove_cache(cache: Path) -> None:
    """Delete the finished members of a training that has ended well."""
    shutil.rmtree(cache, ignore_errors=True)  # what stays is overwritten by the next training of that name
