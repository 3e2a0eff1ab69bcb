"""Predicting a stream of structures: in chunks, in one process or several, with the answers in order."""

from __future__ import annotations

import os
import pickle
import signal
from collections import deque
from collections.abc import Callable, Iterable, Iterator
from contextlib import closing
from dataclasses import dataclass
from itertools import islice
from pathlib import Path
from threading import Lock
from typing import TYPE_CHECKING

from qsar.errors import UserError
from qsar.reading import Record
from qsar.writing import Row, rows_of, unusable

if TYPE_CHECKING:
    from concurrent.futures import Future, ProcessPoolExecutor

    from qsar.model.model import Model
    from qsar.structures import Acid, StructureError

CHUNK = 256
"""Structures that are predicted together; their arrays stay small and workers stay busy."""

OpenModel = Callable[[], "Model"]
Answer = tuple[Record, list[Row]]


def open_model(folder: Path | None = None) -> Model:
    """Load the model of a folder, or the shipped one; to be given to `predict_records`."""
    from qsar.model import load_model

    return load_model(folder)


def predict_records(
    records: Iterable[Record],
    open_model: OpenModel,
    *,
    coverage: float = 0.9,
    jobs: int = 1,
    cluster: str | None = None,
    chunk: int = CHUNK,
    debug: bool = False,
) -> Iterator[list[Answer]]:
    """Predict records as they come.

    Parameters
    ----------
    records : iterable of Record
        The inputs; never more than a few chunks of them are held.
    open_model : callable
        Returns the model; called in each process, so it must be picklable where `jobs` > 1.
    coverage : float
        Fraction that the intervals are meant to hold.
    jobs : int
        Number of processes.
    cluster : str, optional
        Address of a Dask scheduler: the chunks are predicted there, and `jobs` does not matter.
    chunk : int
        Records that are predicted together.
    debug : bool
        Let a failure inside the model raise; otherwise it is said in the row of the input.

    Yields
    ------
    list of (Record, list of Row)
        The answers to one chunk, in the order of the input.

    Raises
    ------
    UserError
        If the model cannot be opened.
    """
    _one_thread()
    chunks = _chunks(records, chunk)
    if cluster is not None:
        from qsar.cluster import in_order

        open_model()
        yield from in_order(cluster, _OnCluster(open_model, coverage, debug), chunks)
        return
    if jobs == 1:
        model = open_model()
        for block in chunks:
            yield _predict_chunk(model, block, coverage, debug)
        return
    open_model()  # here as well, so that a model that cannot be read is said at once
    with closing(_Workers(open_model, coverage, jobs, debug)) as workers:
        yield from workers.answers(chunks)


def _one_thread() -> None:
    """Keep numpy, and that of processes to come, to one thread each, unless the user said otherwise.

    The matrices are small, so that more threads cost time; and sums come out alike to the last digit however
    many processes there are. A numpy that is loaded already stays as it is.
    """
    for name in ("OMP_NUM_THREADS", "OPENBLAS_NUM_THREADS", "MKL_NUM_THREADS"):
        os.environ.setdefault(name, "1")


def _chunks(records: Iterable[Record], size: int) -> Iterator[list[Record]]:
    stream = iter(records)
    while block := list(islice(stream, size)):
        yield block


def _predict_chunk(model: Model, records: list[Record], coverage: float, debug: bool) -> list[Answer]:
    """Answers to one chunk; a structure that makes the model fail costs its own answer only."""
    try:
        predictions = model.predict([_readable(record) for record in records], coverage=coverage)
    except UserError:
        raise
    except Exception as problem:
        if debug:
            raise
        if len(records) == 1:
            kind = type(problem).__name__
            return [(records[0], [unusable(records[0], f"the prediction failed ({kind}: {problem})")])]
        return [answer for record in records for answer in _predict_chunk(model, [record], coverage, debug)]
    return [
        (record, rows_of(record, prediction)) for record, prediction in zip(records, predictions, strict=True)
    ]


def _readable(record: Record) -> str | Acid | StructureError:
    """What the model takes: a SMILES, an acid, or the reason why there is neither."""
    from qsar.structures import StructureError, acid_from_mol

    if record.error is not None:
        return StructureError(record.error)
    if record.mol is None:
        return record.smiles
    try:
        return acid_from_mol(record.mol)
    except StructureError as reason:
        return reason


@dataclass(frozen=True)
class _OnCluster:
    """What a worker of a cluster does with a chunk; it keeps the model that it opened last."""

    open_model: OpenModel
    coverage: float
    debug: bool

    def __call__(self, block: list[Record]) -> list[Answer]:
        key = pickle.dumps(self.open_model)
        with _opening:
            if key not in _opened:
                _one_thread()
                _opened.clear()
                _opened[key] = self.open_model()
            model = _opened[key]
        return _predict_chunk(model, block, self.coverage, self.debug)


_opened: dict[bytes, Model] = {}
_opening = Lock()


class _Workers:
    """A pool of processes that survives the death of one of them."""

    def __init__(self, open_model: OpenModel, coverage: float, jobs: int, debug: bool) -> None:
        from multiprocessing import active_children

        self._start: tuple[OpenModel, float, bool] = (open_model, coverage, debug)
        self._jobs = jobs
        self._others = set(active_children())
        self._pool = self._new_pool(jobs)

    def _new_pool(self, jobs: int) -> ProcessPoolExecutor:
        from concurrent.futures import ProcessPoolExecutor
        from multiprocessing import get_context

        return ProcessPoolExecutor(
            jobs, mp_context=get_context("spawn"), initializer=_begin_worker, initargs=self._start
        )

    def answers(self, chunks: Iterator[list[Record]]) -> Iterator[list[Answer]]:
        """Answers to the chunks, in order; at most two chunks for each process are under way."""
        from concurrent.futures.process import BrokenProcessPool

        waiting: deque[tuple[list[Record], Future[list[Answer]]]] = deque()
        while True:
            for block in islice(chunks, 2 * self._jobs - len(waiting)):
                waiting.append((block, _submit(self._pool, block)))
            if not waiting:
                self._pool.shutdown()
                return
            block, future = waiting.popleft()
            try:
                yield future.result()
            except BrokenProcessPool:
                yield self._one_by_one(block)
                others = [block for block, _ in waiting]
                self._pool.shutdown(wait=False, cancel_futures=True)
                self._pool = self._new_pool(self._jobs)
                waiting = deque((block, _submit(self._pool, block)) for block in others)

    def _one_by_one(self, block: list[Record]) -> list[Answer]:
        """Answers to a chunk that was under way when a process ended, halved until the cause is alone."""
        from concurrent.futures.process import BrokenProcessPool

        with self._new_pool(1) as pool:
            try:
                return _submit(pool, block).result()
            except BrokenProcessPool:
                if len(block) == 1:
                    reason = "the process that worked on it was ended (too large a molecule for the memory?)"
                    return [(block[0], [unusable(block[0], reason)])]
        middle = len(block) // 2
        return self._one_by_one(block[:middle]) + self._one_by_one(block[middle:])

    def close(self) -> None:
        """End the processes, and do not wait for what they are working on."""
        from multiprocessing import active_children

        self._pool.shutdown(wait=False, cancel_futures=True)
        for process in set(active_children()) - self._others:
            process.terminate()


def _submit(pool: ProcessPoolExecutor, block: list[Record]) -> Future[list[Answer]]:
    """Hand a chunk to the pool, which starts its processes now.

    They inherit the signal mask: an interrupt reaches the parent alone, which decides what it means.
    """
    if not hasattr(signal, "pthread_sigmask"):  # Windows
        return pool.submit(_work, block)
    before = signal.pthread_sigmask(signal.SIG_BLOCK, {signal.SIGINT})
    try:
        return pool.submit(_work, block)
    finally:
        signal.pthread_sigmask(signal.SIG_SETMASK, before)


_worker: tuple[Model, float, bool]


def _begin_worker(open_model: OpenModel, coverage: float, debug: bool) -> None:
    global _worker
    _worker = (open_model(), coverage, debug)


def _work(block: list[Record]) -> list[Answer]:
    model, coverage, debug = _worker
    return _predict_chunk(model, block, coverage, debug)
