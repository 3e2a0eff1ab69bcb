"""Finished parts of a long validation, kept so that an interrupted run goes on where it stopped."""

from __future__ import annotations

import hashlib
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from qsar.errors import UserError
from qsar.files import atomic_path

Floats = NDArray[np.float64]


class Cache:
    """Arrays by name in one folder.

    Parameters
    ----------
    folder : pathlib.Path
        Made if it is not there.

    Raises
    ------
    UserError
        If the folder cannot be made.
    """

    def __init__(self, folder: Path) -> None:
        try:
            folder.mkdir(parents=True, exist_ok=True)
        except OSError as error:
            raise UserError(f"cannot create {folder}: {error.strerror}") from error
        self.folder = folder

    def path(self, name: str) -> Path:
        """File of a name."""
        return self.folder / f"{hashlib.sha256(name.encode()).hexdigest()[:24]}.npy"

    def get(self, name: str, length: int) -> Floats | None:
        """The stored array, or None where there is none of this length."""
        path = self.path(name)
        if not path.is_file():
            return None
        try:
            found: Floats = np.load(path, allow_pickle=False)
        except (OSError, ValueError, EOFError):
            return None  # damaged: computed again
        return found if found.shape == (length,) and found.dtype == np.float64 else None

    def put(self, name: str, values: Floats) -> None:
        """Store an array."""
        with atomic_path(self.path(name)) as temporary:
            np.save(temporary, values, allow_pickle=False)

    def clear(self) -> None:
        """Delete what is stored."""
        for path in self.folder.glob("*.npy"):
            path.unlink(missing_ok=True)
