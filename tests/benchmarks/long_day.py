"""A long day of `acidity serve` in miniature: a mixed load, and what the processes hold between its parts.

The load is fixed by a seed: request number n is always the same. Between two parts all clients leave and the service
comes to rest; then the memory of each process that no other shares (anonymous pages), its open files, its threads,
and the files in the folder for temporary ones are noted. Run as a script it prints them::

    python tests/benchmarks/long_day.py --requests 100000

The structures are invented (see `many_acids`).
"""

from __future__ import annotations

import argparse
import http.client
import json
import os
import re
import subprocess
import sys
import tempfile
import threading
import time
from collections import Counter
from collections.abc import Iterator
from concurrent.futures import ThreadPoolExecutor
from contextlib import contextmanager
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any

if __name__ == "__main__":
    sys.path.insert(0, str(Path(__file__).resolve().parents[1]))

from benchmarks.day_load import Load, Request

CLIENTS = 4
PARTS = 20
MOST_THREADS = 7
"""Of the parent: its own, and the six that talk to two workers, each started when it is first needed."""
ROOT = Path(__file__).resolve().parents[2]
_REST_SECONDS = 30.0
_LATE = "503 b'{\"detail\":\"this takes longer than"


@dataclass(frozen=True)
class Held:
    """What one process holds: anonymous memory in MiB, open files, threads."""

    memory: float
    files: int
    threads: int


@dataclass(frozen=True)
class Sample:
    """The service at rest after some requests, its processes by their number, the parent first."""

    requests: int
    processes: dict[int, Held]
    temporary: int
    replaced: int
    answers: tuple[str, ...]

    def line(self) -> str:
        """One line of figures."""
        memory = " ".join(f"{h.memory:6.1f}" for h in self.processes.values())
        files = " ".join(f"{h.files}" for h in self.processes.values())
        threads = " ".join(f"{h.threads}" for h in self.processes.values())
        return (
            f"{self.requests:8,} requests: MiB {memory}; files {files}; threads {threads}; "
            f"temporary {self.temporary}; replaced {self.replaced}"
        )


@dataclass
class Day:
    """All samples, the answers that were not as expected, and the requests that were stopped for their time.

    The last are no fault: on a busy machine the limit of time is met now and then, and the process replaced.
    """

    samples: list[Sample] = field(default_factory=list)
    asked: Counter[str] = field(default_factory=Counter)
    wrong: list[str] = field(default_factory=list)
    late: list[str] = field(default_factory=list)


class Service:
    """A running `acidity serve` with two workers."""

    def __init__(self, address: str, process: subprocess.Popen[str], folder: Path) -> None:
        self.host = address.removeprefix("http://")
        self.process, self.folder = process, folder

    def connect(self) -> http.client.HTTPConnection:
        """A new connection."""
        return http.client.HTTPConnection(self.host, timeout=120)

    def get(self, path: str) -> bytes:
        """An answer over a connection of its own."""
        connection = self.connect()
        try:
            connection.request("GET", path)
            return connection.getresponse().read()
        finally:
            connection.close()

    def rest(self) -> dict[str, Any]:
        """Wait until no process is at work and every client's connection is closed; what the service says of itself."""
        end = time.monotonic() + _REST_SECONDS
        while True:
            said: dict[str, Any] = json.loads(self.get("/api/v1/about"))["workers"]
            sockets = _sockets(self.process.pid, self.host)
            if (said["busy"], said["waiting"], sockets) == (0, 0, 0) or time.monotonic() > end:
                return said  # what has not come to rest is found in the sample
            time.sleep(0.05)

    def sample(self, requests: int) -> Sample:
        """What the processes hold now."""
        said = self.rest()
        answers = tuple(_without_noise(self.get(path)) for path in Load.PROBES)
        self.rest()
        pids = [self.process.pid, *_children(self.process.pid)]
        return Sample(
            requests, {pid: _held(pid) for pid in pids}, len(list(self.folder.iterdir())), said["replaced"], answers
        )


def _without_noise(answer: bytes) -> str:
    """An answer with numbers to six decimals: the last digits depend on what a matrix was multiplied along with."""
    text = answer.decode("utf-8")
    return re.sub(r"-?\d+\.\d{7,}(?:e-?\d+)?", lambda number: f"{float(number[0]):.6f}", text)


def _difference(one: str, other: str) -> str:
    """Where two answers part."""
    place = next((k for k, (a, b) in enumerate(zip(one, other, strict=False)) if a != b), min(len(one), len(other)))
    return f"{one[max(0, place - 60) : place + 40]!r} became {other[max(0, place - 60) : place + 40]!r}"


def _held(pid: int) -> Held:
    rollup = Path(f"/proc/{pid}/smaps_rollup").read_text(encoding="ascii")
    kib = sum(int(n) for n in re.findall(r"^(?:Anonymous|Swap): +(\d+) kB", rollup, re.MULTILINE))
    files, threads = (sum(1 for _ in Path(f"/proc/{pid}/{what}").iterdir()) for what in ("fd", "task"))
    return Held(kib / 1024, files, threads)


def _children(pid: int) -> list[int]:
    found = [
        int(child)
        for thread in Path(f"/proc/{pid}/task").iterdir()
        for child in (thread / "children").read_text(encoding="ascii").split()
    ]
    return sorted(found)


def _sockets(pid: int, host: str) -> int:
    """Connections of clients that the process still has open."""
    port = f"{int(host.rpartition(':')[2]):04X}"
    own = set()
    for link in Path(f"/proc/{pid}/fd").iterdir():
        try:
            own.add(str(link.readlink()))
        except FileNotFoundError:  # closed meanwhile
            continue
    rows = [line.split() for line in Path("/proc/net/tcp").read_text(encoding="ascii").splitlines()[1:]]
    listening = "0A"
    return sum(r[1].endswith(f":{port}") and r[3] != listening and f"socket:[{r[9]}]" in own for r in rows)


@contextmanager
def serving() -> Iterator[Service]:
    """A service on a free port, run as a user runs it, with a folder for temporary files of its own."""
    with tempfile.TemporaryDirectory(prefix="long-day-") as place:
        environment = {**os.environ, "PYTHONPATH": str(ROOT), "TMPDIR": place}
        command = [sys.executable, "-m", "qsar", "serve", "--port", "0", "--workers", "2"]
        with subprocess.Popen(command, stderr=subprocess.PIPE, text=True, cwd=ROOT, env=environment) as process:
            assert process.stderr is not None
            line = process.stderr.readline()
            found = re.search(r"http://[\d.]+:\d+", line)
            try:
                if not found:
                    raise RuntimeError(f"acidity serve does not start: {line}")
                yield Service(found[0], process, Path(place))
            finally:
                process.terminate()
                process.wait(60)
            said = [x for x in process.stderr if "interrupted" not in x]
            if said:
                raise RuntimeError(f"acidity serve complained: {''.join(said)}")


def ask(service: Service, connection: http.client.HTTPConnection, request: Request) -> str:
    """Send one request; what was wrong with the answer, or nothing."""
    if request.leaves:
        leave(service, request)
        return ""
    try:
        connection.request(request.method, request.path, request.body, request.headers)
        answer = connection.getresponse()
        content = answer.read()
    except (OSError, http.client.HTTPException) as problem:
        connection.close()
        return f"{request.kind}: {type(problem).__name__}: {problem}"
    if answer.status not in request.expected:
        asked = f"{request.path[:200]} {(request.body or b'')[:300]!r}"
        return f"{request.kind}: {answer.status} {content[:200]!r} to {asked}"
    if request.complete and not content.rstrip().rpartition(b"\n")[2].startswith(b'{"event": "end"'):
        return f"{request.kind}: the stream ends with {content[-200:]!r}"
    return ""


def leave(service: Service, request: Request) -> None:
    """Begin a request and go away: in the middle of the body, before the answer, or in the middle of it."""
    connection = service.connect()
    try:
        body = request.body or b""
        sent = body[: len(body) // 2] if request.leaves == "body" else body
        connection.putrequest(request.method, request.path)
        for name, value in {**request.headers, "content-length": str(len(body))}.items():
            connection.putheader(name, value)
        connection.endheaders(sent)
        if request.leaves == "answer":
            connection.getresponse().read(10)
    finally:
        connection.close()


def run_part(service: Service, load: Load, numbers: range, day: Day) -> None:
    """Send some requests with all clients, each over a connection that it keeps."""
    waiting = iter(numbers)
    lock = threading.Lock()

    def client() -> None:
        connection = service.connect()
        try:
            while True:
                with lock:
                    number = next(waiting, None)
                if number is None:
                    return
                request = load.request(number)
                wrong = ask(service, connection, request)
                with lock:
                    day.asked[request.kind] += 1
                    if wrong:
                        (day.late if _LATE in wrong else day.wrong).append(f"request {number}: {wrong}")
        finally:
            connection.close()

    with ThreadPoolExecutor(CLIENTS) as pool:
        for done in [pool.submit(client) for _ in range(CLIENTS)]:
            done.result()


def live(requests: int, seed: int = 1, parts: int = PARTS, tell: Any = None) -> Day:
    """Let a service live through a day.

    Parameters
    ----------
    requests : int
        Number of requests of the load.
    seed : int
        Fixes the load.
    parts : int
        Times that the service comes to rest and is looked at, besides the start.
    tell : callable, optional
        Given a line for each sample.
    """
    day, load = Day(), Load(seed)
    with serving() as service:
        edges = [round(requests * k / parts) for k in range(parts + 1)]
        for start, end in zip([0, *edges], edges, strict=False):
            run_part(service, load, range(start, end), day)
            day.samples.append(service.sample(end))
            if tell is not None:
                tell(day.samples[-1].line())
    return day


def faults(day: Day, from_part: int, memory_mib: float) -> list[str]:
    """What speaks against a flat day; nothing, where it was flat.

    Parameters
    ----------
    day : Day
    from_part : int
        Number of the sample from which nothing may grow; before it caches fill.
    memory_mib : float
        What one process may hold more at the end than then.
    """
    first, last = day.samples[from_part], day.samples[-1]
    found = list(day.wrong[:10])
    for sample in day.samples[1:]:
        pairs = zip(day.samples[0].answers, sample.answers, strict=True)
        found += [f"after {sample.requests:,} requests {_difference(a, b)}" for a, b in pairs if a != b]
    if len(last.processes) != len(first.processes):
        found.append(f"{len(first.processes)} processes became {len(last.processes)}")
    new, replaced = len(set(last.processes) - set(first.processes)), last.replaced - first.replaced
    if new > replaced:
        found.append(f"{new} new processes, {replaced} were replaced")
    for pid, now in last.processes.items():
        then = next(s.processes[pid] for s in day.samples[from_part:] if pid in s.processes)
        found += [f"process {pid}: {said}" for said in _growth(then, now, memory_mib)]
    if last.temporary:
        found.append(f"{last.temporary} temporary files are left")
    return found


def _growth(then: Held, now: Held, memory_mib: float) -> list[str]:
    """What a process holds more than it did."""
    found = []
    if now.memory > then.memory + memory_mib:
        found.append(f"{then.memory:.1f} MiB became {now.memory:.1f} MiB")
    if now.files != then.files:
        found.append(f"{then.files} open files became {now.files}")
    if now.threads > max(then.threads, MOST_THREADS):
        found.append(f"{then.threads} threads became {now.threads}")
    return found


def main() -> int:
    """Run the day and print its figures."""
    parser = argparse.ArgumentParser(description="A long day of acidity serve in miniature.")
    parser.add_argument("--requests", type=int, default=100_000)
    parser.add_argument("--seed", type=int, default=1)
    parser.add_argument("--parts", type=int, default=PARTS)
    parser.add_argument("--memory", type=float, default=16.0, help="MiB that a process may grow after a fifth (16)")
    args = parser.parse_args()
    print("figures of: parent, resource tracker, worker, worker", flush=True)
    begun = time.monotonic()
    day = live(args.requests, args.seed, args.parts, lambda line: print(line, flush=True))
    print(f"{time.monotonic() - begun:.0f} s; " + ", ".join(f"{k} {n:,}" for k, n in sorted(day.asked.items())))
    print("\n".join(day.late) or "none was late")
    found = faults(day, max(1, args.parts // 5), args.memory)
    print("\n".join(found) or "flat")
    return bool(found)


if __name__ == "__main__":
    sys.exit(main())
