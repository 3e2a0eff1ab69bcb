"""Draws the plots of many acids, in a second process where there are many."""

from __future__ import annotations

import os
import re
import signal
from collections.abc import Callable
from pathlib import Path
from types import TracebackType
from typing import TYPE_CHECKING, Self

from qsar.files import atomic_path

if TYPE_CHECKING:
    from concurrent.futures import Future, ProcessPoolExecutor

    from qsar.attribution.explain import Explained
    from qsar.attribution.explanation import Explanation
    from qsar.reading import Record

_ALONE = 24  # acids that one process draws before it is worth starting others
_PROCESSES = 2
_WAITING = 200  # drawings that may wait for the others


def safe_name(text: str) -> str:
    """A text as part of a file name."""
    return re.sub(r"[^\w.-]+", "_", text).strip("._")[:40] or "acid"


class Painter:
    """Draws structure and steps of acids into a folder; use it as a context manager.

    Parameters
    ----------
    folder : pathlib.Path
    wanted : str
        "all", "structures" or "none".
    done : callable
        Called with 1 after each acid.
    """

    def __init__(self, folder: Path, wanted: str, done: Callable[[int], object]) -> None:
        self._folder, self._wanted, self._done = folder, wanted, done
        self._count = 0
        self._pool: ProcessPoolExecutor | None = None
        self._waiting: list[Future[None]] = []

    def paint(self, position: int, record: Record, answer: Explained) -> None:
        """Draw one acid, now or soon.

        Parameters
        ----------
        position : int
            Of the input, from 1; the file names begin with it.
        record : Record
        answer : Explained
        """
        if self._wanted == "none" or not answer.steps:
            self._done(1)
            return
        self._count += 1
        stem = self._folder / f"{position:03d}-{safe_name(record.id)}"
        work = (answer.steps, stem, record.id, self._wanted == "all")
        if self._count <= _ALONE or (os.cpu_count() or 1) < _PROCESSES:
            paint(*work)
            self._done(1)
            return
        if self._pool is None:
            from concurrent.futures import ProcessPoolExecutor
            from multiprocessing import get_context

            self._pool = ProcessPoolExecutor(
                _PROCESSES, mp_context=get_context("spawn"), initializer=_leave_interrupts_to_the_parent
            )
        self._waiting.append(self._pool.submit(paint, *work))
        while len(self._waiting) > _WAITING:
            self._collect()

    def _collect(self) -> None:
        self._waiting.pop(0).result()
        self._done(1)

    def __enter__(self) -> Self:
        return self

    def __exit__(
        self, kind: type[BaseException] | None, problem: BaseException | None, trace: TracebackType | None
    ) -> None:
        try:
            while kind is None and self._waiting:
                self._collect()
        finally:
            if self._pool is not None:
                self._pool.shutdown(cancel_futures=True)


def _leave_interrupts_to_the_parent() -> None:
    signal.signal(signal.SIGINT, signal.SIG_IGN)


def paint(steps: tuple[Explanation, ...], stem: Path, name: str, with_steps: bool) -> None:
    """Draw the steps of one acid as PNG and SVG.

    Parameters
    ----------
    steps : tuple of Explanation
    stem : pathlib.Path
        Beginning of the file names.
    name : str
        Of the acid.
    with_steps : bool
        Whether the steps from the parent are drawn, besides the structure.
    """
    from qsar.attribution.drawing import structure_png, structure_svg
    from qsar.attribution.plots import save, steps_figure

    for e in steps:
        place = stem.with_name(f"{stem.name}-step{e.step}")
        with atomic_path(place.with_name(f"{place.name}-structure.svg")) as temporary:
            temporary.write_text(structure_svg(e), encoding="utf-8")
        with atomic_path(place.with_name(f"{place.name}-structure.png")) as temporary:
            temporary.write_bytes(structure_png(e, 780, 570))
        if with_steps:
            save(steps_figure(e, f"{name}: {e.smiles}"), place.with_name(f"{place.name}-steps"))
