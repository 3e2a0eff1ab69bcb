"""Private memory of a process and of all that it started, while it runs."""

from __future__ import annotations

import threading
from collections import defaultdict
from pathlib import Path
from types import TracebackType

_EVERY = 0.5  # seconds


class Watch:
    """Samples the private memory of a process and its descendants until the block ends.

    Attributes
    ----------
    peak : int
        Bytes, all processes together. Pages that processes share (libraries, mapped files) are not counted.
    processes : int
        Most processes seen at once.
    """

    def __init__(self, pid: int) -> None:
        self.peak = self.processes = 0
        self._pid, self._stop = pid, threading.Event()
        self._thread = threading.Thread(target=self._sample, daemon=True)

    def __enter__(self) -> Watch:
        self._thread.start()
        return self

    def __exit__(
        self, kind: type[BaseException] | None, error: BaseException | None, trace: TracebackType | None
    ) -> None:
        self._stop.set()
        self._thread.join()

    def _sample(self) -> None:
        while not self._stop.wait(_EVERY):
            own = family(self._pid)
            self.processes = max(self.processes, len(own))
            self.peak = max(self.peak, sum(private_bytes(pid) for pid in own))


def family(pid: int) -> list[int]:
    """A process and its descendants; those that end while they are looked for are left out."""
    children = defaultdict(list)
    for stat in Path("/proc").glob("[0-9]*/stat"):
        try:
            text = stat.read_text(encoding="utf-8", errors="replace")
        except (FileNotFoundError, ProcessLookupError):
            continue
        children[int(text.rpartition(")")[2].split()[1])].append(int(stat.parent.name))
    found = [pid]
    for one in found:
        found += children[one]
    return found


def private_bytes(pid: int) -> int:
    """Private memory of one process, 0 where it has ended."""
    try:
        lines = Path(f"/proc/{pid}/smaps_rollup").read_text(encoding="utf-8").splitlines()
    except (FileNotFoundError, ProcessLookupError):
        return 0
    return 1024 * sum(int(line.split()[1]) for line in lines if line.startswith("Private_"))
