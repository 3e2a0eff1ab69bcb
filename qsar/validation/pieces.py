"""Work on one thing in many pieces: here, in processes, or on a cluster; the outcome is the same."""

from __future__ import annotations

from collections.abc import Callable, Iterator, Sequence
from functools import lru_cache
from pathlib import Path
from tempfile import TemporaryDirectory
from typing import Any, TypeVar

S = TypeVar("S")
P = TypeVar("P")
R = TypeVar("R")


def in_pieces(
    work: Callable[[S, P], R], shared: S, pieces: Sequence[P], jobs: int = 1, cluster: str | None = None
) -> Iterator[R]:
    """Do the pieces; results come in their order.

    Parameters
    ----------
    work : callable
        Does one piece; a function of a module.
    shared : object
        What every piece needs. It is handed to each process once, and its large arrays are mapped from one file, so
        that they are in memory once however many processes there are.
    pieces : sequence
    jobs : int
        Processes on this machine, where no cluster is named.
    cluster : str, optional
        Address of a Dask scheduler.

    Yields
    ------
    result of one piece
    """
    if cluster is not None:
        from qsar.cluster import in_order

        yield from in_order(cluster, work, pieces, shared)
        return
    if jobs == 1 or len(pieces) < 2:
        for piece in pieces:
            yield work(shared, piece)
        return
    from joblib import Parallel, delayed, dump

    # Where a mapped file cannot be deleted (Windows), the system's own cleaning does it later.
    with TemporaryDirectory(prefix="acidity-", ignore_cleanup_errors=True) as folder:
        path = Path(folder) / "shared.joblib"
        dump(shared, path)
        parallel = Parallel(n_jobs=jobs, return_as="generator", inner_max_num_threads=1, backend="loky")
        yield from parallel(delayed(_one)(work, str(path), piece) for piece in pieces)


def _one(work: Callable[[Any, P], R], path: str, piece: P) -> R:
    return work(_loaded(path), piece)


@lru_cache(maxsize=1)
def _loaded(path: str) -> Any:
    from joblib import load

    return load(path, mmap_mode="r")
