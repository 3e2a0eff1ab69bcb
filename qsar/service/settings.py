"""Limits of the service, and the sentences that say so."""

from __future__ import annotations

import os
from dataclasses import dataclass
from pathlib import Path

LOCAL_HOSTS = ("127.0.0.1", "localhost", "[::1]")


@dataclass(frozen=True)
class Settings:
    """How a service is set up.

    Attributes
    ----------
    hosts : tuple of str
        Names under which the service may be asked, without port; IPv6 addresses in brackets.
    model : pathlib.Path or None
        Folder of the model; None for the one in use.
    workers : int
        Processes that do the chemistry.
    max_body : int
        Bytes of one request.
    max_rows : int
        Structures of one list or file.
    max_structures : int
        Structures of one request that is answered at once.
    max_report : int
        Acids of one HTML report.
    max_waiting : int
        Requests that may wait for a process.
    seconds : float
        Time for one structure.
    file_seconds : float
        Time to read a file.
    body_seconds : float
        Time for a request to arrive.
    slow_rows : int
        Structures of one list that may exceed the time before the rest is refused.
    memory_gib : float
        Address space of one process; 0 for no limit.
    tasks : str
        Module of the tasks, for tests.
    """

    hosts: tuple[str, ...] = LOCAL_HOSTS
    model: Path | None = None
    workers: int = 2
    max_body: int = 20 << 20
    max_rows: int = 20_000
    max_structures: int = 500
    max_report: int = 100
    max_waiting: int = 200
    seconds: float = 10.0
    file_seconds: float = 60.0
    body_seconds: float = 60.0
    slow_rows: int = 3
    memory_gib: float = 6.0
    tasks: str = "qsar.service.tasks"


def default_workers() -> int:
    """Two processes at least, so that a slow structure never holds up the rest; four at most."""
    return max(2, min(4, os.cpu_count() or 2))


class Refused(Exception):
    """A request that is not answered.

    Parameters
    ----------
    status : int
        HTTP status.
    sentence : str
        Why, and how to mend it.
    """

    def __init__(self, status: int, sentence: str) -> None:
        super().__init__(sentence)
        self.status = status
        self.sentence = "".join(c if c.isprintable() else "?" for c in sentence)
