"""Progress of long work on standard error: how much is done, how fast, and the time left."""

from __future__ import annotations

import sys
from collections.abc import Callable, Iterator
from contextlib import contextmanager


@contextmanager
def progress(
    total: Callable[[], int | None], unit: str, *, wanted: bool | None = None
) -> Iterator[Callable[[int], object]]:
    """Show a progress bar while the block runs.

    Parameters
    ----------
    total : callable
        Returns how much there is to do, or None if that is not known; called only if a bar is shown.
    unit : str
        What is counted.
    wanted : bool, optional
        Show it or not; by default it is shown where standard error is a terminal.

    Yields
    ------
    callable
        To be called with the amount that was done since the last call.
    """
    if not (sys.stderr.isatty() if wanted is None else wanted):
        yield lambda done: None
        return
    from tqdm import tqdm  # only where a bar is seen

    with tqdm(total=total(), unit=f" {unit}", file=sys.stderr, dynamic_ncols=True, smoothing=0.1) as bar:
        yield bar.update
