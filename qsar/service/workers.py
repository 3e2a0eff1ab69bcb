"""Processes that do the chemistry, so that one structure or file can neither stall nor end the service.

Each process takes one task at a time over a pipe. One that exceeds its time, or dies, is ended and replaced; the
request that it worked on is told so, and the others do not notice.
"""

from __future__ import annotations

import asyncio
import contextlib
import heapq
import importlib
import itertools
import multiprocessing
import signal
from concurrent.futures import ThreadPoolExecutor
from dataclasses import dataclass, field
from multiprocessing.connection import Connection
from multiprocessing.process import BaseProcess
from pathlib import Path
from typing import Any

from qsar.service.settings import Refused, Settings

_START_SECONDS = 120.0
_READY, _UNUSABLE, _DONE, _REFUSED, _FAILED, _LATE, _ENDED = range(7)


class TimeExceeded(Refused):
    """A task that took longer than it may."""

    def __init__(self, seconds: float) -> None:
        super().__init__(
            503, f"this takes longer than {seconds:g} seconds and was stopped; give a smaller or simpler structure"
        )


class ProcessEnded(Refused):
    """A task whose process died."""

    def __init__(self) -> None:
        super().__init__(503, "the process that worked on this was ended (too much memory?); give less at once")


def serve_tasks(pipe: Connection, module: str, model: Path | None, memory_gib: float) -> None:
    """Body of a worker process: load the model, then answer tasks until the pipe closes."""
    signal.signal(signal.SIGINT, signal.SIG_IGN)  # Ctrl-C is for the parent, which ends this process
    _limit_memory(memory_gib)
    try:
        tasks = importlib.import_module(module)
        desk = tasks.open_desk(model)
    except Exception as problem:  # noqa: BLE001 - said to the parent, which says it to the user
        pipe.send((_UNUSABLE, str(problem)))
        return
    pipe.send((_READY, None))
    with contextlib.suppress(EOFError, OSError, KeyboardInterrupt):
        while True:
            name, arguments = pipe.recv()
            pipe.send(_answer(tasks.TASKS[name], desk, arguments))


def _answer(task: Any, desk: Any, arguments: dict[str, Any]) -> tuple[int, Any]:
    from qsar.errors import UserError

    try:
        return _DONE, task(desk, **arguments)
    except Refused as refusal:
        return _REFUSED, (refusal.status, refusal.sentence)
    except UserError as problem:
        return _REFUSED, (422, str(problem))
    except MemoryError:
        return _REFUSED, (503, "not enough memory for this; give fewer or smaller structures")
    except Exception as problem:  # noqa: BLE001 - the process goes on; the request is told
        return _FAILED, f"an error of the program ({type(problem).__name__}: {problem})"


def _limit_memory(gib: float) -> None:
    if gib <= 0:
        return
    with contextlib.suppress(ImportError, ValueError, OSError):  # no such limit on this system
        import resource

        size = int(gib * (1 << 30))
        resource.setrlimit(resource.RLIMIT_AS, (size, size))


@dataclass(eq=False)
class _Worker:
    process: BaseProcess
    pipe: Connection
    starting: asyncio.Future[Any]


@dataclass(order=True)
class _Waiting:
    rank: int
    turn: int
    background: bool = field(compare=False)
    given: asyncio.Future[_Worker] = field(compare=False)


class Workers:
    """A pool of worker processes.

    Short requests go before the parts of long lists, which never occupy all processes.

    Parameters
    ----------
    settings : Settings
    """

    def __init__(self, settings: Settings) -> None:
        self.settings = settings
        self.size = max(2, settings.workers)
        self.replaced = 0
        self.done = 0
        self.problem = ""
        self._context = multiprocessing.get_context("spawn")
        self._threads = ThreadPoolExecutor(2 * self.size + 2, thread_name_prefix="worker-pipe")
        self._idle: list[_Worker] = []
        self._all: set[_Worker] = set()
        self._queue: list[_Waiting] = []
        self._turns = itertools.count()
        self._background = 0
        self._tasks: set[asyncio.Task[Any]] = set()
        self._closing = False

    @property
    def waiting(self) -> int:
        """Requests that wait for a process."""
        return sum(not w.given.done() for w in self._queue)

    @property
    def busy(self) -> int:
        """Processes at work, or starting."""
        return len(self._all) - len(self._idle)

    def start(self) -> None:
        """Start the processes; they become ready by themselves."""
        for _ in range(self.size):
            self._keep(self._hire())

    def _keep(self, work: Any) -> asyncio.Task[Any]:
        task: asyncio.Task[Any] = asyncio.ensure_future(work)
        self._tasks.add(task)
        task.add_done_callback(self._tasks.discard)
        return task

    async def _hire(self) -> None:
        """Start one process and put it to use when it is ready."""
        ours, theirs = self._context.Pipe()
        process = self._context.Process(
            target=serve_tasks,
            args=(theirs, self.settings.tasks, self.settings.model, self.settings.memory_gib),
            daemon=True,
        )
        worker = _Worker(process, ours, asyncio.ensure_future(self._in_thread(process.start)))
        self._all.add(worker)
        await asyncio.shield(worker.starting)
        theirs.close()
        kind, content = await self._receive(worker, _START_SECONDS)
        if kind == _READY and not self._closing:
            self.problem = ""
            self._release(worker)
            return
        await self._dismiss(worker)
        if not self._closing:
            self.problem = content if kind == _UNUSABLE else "the processes that do the chemistry do not start"
            self._give_up_waiting()

    def _give_up_waiting(self) -> None:
        if self._all:
            return
        for waiting in self._queue:
            if not waiting.given.done():
                waiting.given.set_exception(Refused(503, self.problem))
        self._queue.clear()

    async def _in_thread(self, call: Any, *arguments: Any) -> Any:
        return await asyncio.get_running_loop().run_in_executor(self._threads, call, *arguments)

    async def _receive(self, worker: _Worker, seconds: float) -> tuple[int, Any]:
        """What a process says, or that it ran out of time, or that it died."""

        def wait() -> tuple[int, Any]:
            try:
                return worker.pipe.recv() if worker.pipe.poll(seconds) else (_LATE, None)
            except (EOFError, OSError):
                return _ENDED, None

        answer: tuple[int, Any] = await self._in_thread(wait)
        return answer

    async def _dismiss(self, worker: _Worker) -> None:
        def end() -> None:
            worker.process.kill()
            worker.process.join(10)
            worker.pipe.close()
            worker.process.close()

        self._all.discard(worker)
        with contextlib.suppress(OSError, ValueError):
            await asyncio.shield(worker.starting)  # one that is only about to start cannot be ended yet
            await self._in_thread(end)

    async def run(self, task: str, *, seconds: float, background: bool = False, **arguments: Any) -> Any:
        """Have a task done.

        A caller that is cancelled does not wait any more; the process finishes that one task and is free.

        Parameters
        ----------
        task : str
            Name among the tasks.
        seconds : float
            Time that it may take, once begun.
        background : bool
            Part of a long list: goes behind short requests.

        Raises
        ------
        Refused
            If the task refuses, takes too long, its process dies, or too many wait.
        """
        worker = await self._take(background)
        return await asyncio.shield(self._keep(self._work(worker, task, arguments, seconds, background)))

    async def _take(self, background: bool) -> _Worker:
        if not self._all and self.problem:
            problem, self.problem = self.problem, ""
            self.start()  # the next request finds out whether it is mended
            raise Refused(503, problem)
        if self.waiting >= self.settings.max_waiting:
            raise Refused(503, "too many requests at once; try again in a moment")
        waiting = _Waiting(int(background), next(self._turns), background, asyncio.get_running_loop().create_future())
        heapq.heappush(self._queue, waiting)
        self._assign()
        try:
            return await waiting.given
        except asyncio.CancelledError:
            if waiting.given.done() and not waiting.given.cancelled() and waiting.given.exception() is None:
                self._background -= background
                self._release(waiting.given.result())
            raise

    def _assign(self) -> None:
        later = []
        while self._idle and self._queue:
            waiting = heapq.heappop(self._queue)
            if waiting.given.done():
                continue
            if waiting.background and self._background >= self.size - 1:
                later.append(waiting)
                continue
            self._background += waiting.background
            waiting.given.set_result(self._idle.pop())
        for waiting in later:
            heapq.heappush(self._queue, waiting)

    def _release(self, worker: _Worker) -> None:
        self._idle.append(worker)
        self._assign()

    async def _work(
        self, worker: _Worker, task: str, arguments: dict[str, Any], seconds: float, background: bool
    ) -> Any:
        kind: int
        content: Any
        try:
            try:
                await self._in_thread(worker.pipe.send, (task, arguments))
            except OSError:
                kind, content = _ENDED, None
            else:
                kind, content = await self._receive(worker, seconds)
        finally:
            self._background -= background
        self.done += 1
        if kind in (_LATE, _ENDED):
            self.replaced += 1
            await self._dismiss(worker)
            if not self._closing:
                self._keep(self._hire())
            raise TimeExceeded(seconds) if kind == _LATE else ProcessEnded()
        self._release(worker)
        if kind == _REFUSED:
            status, sentence = content
            raise Refused(status, sentence)
        if kind == _FAILED:
            raise Refused(500, str(content))
        return content

    async def stop(self) -> None:
        """End all processes."""
        self._closing = True
        for worker in list(self._all):
            await self._dismiss(worker)
        for task in list(self._tasks):
            task.cancel()
        await asyncio.gather(*self._tasks, return_exceptions=True)
        self._threads.shutdown(wait=False, cancel_futures=True)
