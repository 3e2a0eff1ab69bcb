"""Work on a Dask cluster that runs already: ``--cluster ADDRESS``, with the optional package ``distributed``.

The workers need this program in the same version. A worker that ends in the middle costs nothing but time: the
scheduler gives its work to another.
"""

from __future__ import annotations

from collections import deque
from collections.abc import Callable, Iterable, Iterator
from contextlib import contextmanager
from itertools import islice
from typing import TYPE_CHECKING, Any, TypeVar

from qsar.errors import UserError

if TYPE_CHECKING:
    from distributed import Client

T = TypeVar("T")
R = TypeVar("R")

WAIT_SECONDS = 20
_AHEAD = 4  # pieces under way for each worker thread
_RETRIES = 5  # times that a piece may lose its worker


@contextmanager
def connected(address: str) -> Iterator[Client]:
    """A connection to the scheduler.

    Parameters
    ----------
    address : str
        Such as ``tcp://host:8786``.

    Raises
    ------
    UserError
        If ``distributed`` is not installed or the scheduler does not answer.
    """
    try:
        from distributed import Client
    except ImportError as problem:
        raise UserError("--cluster needs the package distributed: pip install 'qsar[cluster]'") from problem
    try:
        client = Client(address, timeout=WAIT_SECONDS, set_as_default=False)  # type: ignore[no-untyped-call]
    except (OSError, ValueError) as problem:
        raise UserError(f"--cluster {address}: no scheduler answers there; check the address") from problem
    try:
        yield client
    finally:
        client.close()  # type: ignore[no-untyped-call]


def in_order(address: str, work: Callable[..., R], pieces: Iterable[T], shared: object = None) -> Iterator[R]:
    """Do a stream of pieces on the cluster; results come in the order of the pieces.

    Parameters
    ----------
    address : str
    work : callable
        Can be pickled; does one piece, with `shared` before it where that is given.
    pieces : iterable
        Never more than a few for each worker are taken ahead.
    shared : object, optional
        What every piece needs; sent to each worker once instead of with each piece.

    Yields
    ------
    result of one piece

    Raises
    ------
    UserError
        If the cluster cannot be reached, has no workers, loses all that hold `shared`, or a piece ends one worker after
        the other.
    """
    with connected(address) as client:
        from concurrent.futures import CancelledError

        from distributed import KilledWorker

        before: list[Any] = []
        if shared is not None:
            _under_way(client, address)  # there must be workers to send it to
            before = [client.scatter(shared, broadcast=True, hash=False)]  # type: ignore[no-untyped-call]
        stream = iter(pieces)
        waiting: deque[Any] = deque()
        while True:
            for piece in islice(stream, max(_under_way(client, address) - len(waiting), 0)):
                waiting.append(client.submit(work, *before, piece, pure=False, retries=_RETRIES))
            if not waiting:
                return
            try:
                result: R = waiting.popleft().result()
            except KilledWorker as problem:
                reason = f"one piece of work ended several workers ({problem})"
                raise UserError(f"--cluster {address}: {reason}") from problem
            except CancelledError as problem:
                reason = "all workers that held the data have ended; start the command again"
                raise UserError(f"--cluster {address}: {reason}") from problem
            yield result


def _under_way(client: Client, address: str) -> int:
    threads: int = sum(client.nthreads().values())  # type: ignore[no-untyped-call]
    if not threads:
        try:
            client.wait_for_workers(1, timeout=WAIT_SECONDS)
        except (TimeoutError, OSError) as problem:
            raise UserError(f"--cluster {address}: the scheduler has no workers; start some") from problem
        threads = sum(client.nthreads().values())  # type: ignore[no-untyped-call]
    return _AHEAD * max(threads, 1)
