"""Output files appear whole or not at all."""

from __future__ import annotations

import os
import tempfile
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path

from qsar.errors import UserError


def check_target(target: str | os.PathLike[str]) -> Path:
    """Check that a file can be written at `target`, and follow it if it is a symbolic link.

    Parameters
    ----------
    target : path-like
        Where the file is wanted.

    Returns
    -------
    pathlib.Path
        The real place; its folder exists and `target` is either absent or a regular file.

    Raises
    ------
    UserError
        If the folder does not exist, or `target` is itself a folder or a device.
    """
    path = Path(target)
    try:
        path = path.resolve()
        folder, is_folder, is_other = path.parent, path.is_dir(), path.exists() and not path.is_file()
        has_folder = folder.is_dir()
    except (OSError, ValueError) as problem:
        raise UserError(f"cannot write {target}: {_reason(problem)}") from problem
    if is_folder:
        raise UserError(f"cannot write {target}: it is a folder; give the name of a file in it")
    if is_other:
        raise UserError(f"cannot write {target}: it is not a regular file; give the name of a file")
    if not has_folder:
        raise UserError(f"cannot write {target}: the folder {folder} does not exist; create it first")
    return path


def check_folder(folder: str | os.PathLike[str]) -> Path:
    """Make a folder, and check before long work that files can be written in it.

    Raises
    ------
    UserError
        If it is a file, cannot be made, or cannot be written in.
    """
    path = Path(folder)
    if path.exists() and not path.is_dir():
        raise UserError(f"cannot write to {folder}: it is a file; give the name of a folder")
    try:
        path.mkdir(parents=True, exist_ok=True)
        with tempfile.TemporaryFile(dir=path):
            return path
    except (OSError, ValueError) as problem:
        raise UserError(f"cannot write to the folder {folder}: {_reason(problem)}; choose another") from problem


@contextmanager
def atomic_path(target: str | os.PathLike[str]) -> Iterator[Path]:
    """Give a temporary file beside `target` that takes its name when the block ends well.

    The temporary file is deleted when the block raises, an interrupt (Ctrl-C) included, and whatever was at
    `target` before stays as it was.

    Parameters
    ----------
    target : path-like
        Where the file is wanted. Its folder must exist.

    Yields
    ------
    pathlib.Path
        An empty file in the same folder, with the same extension, to be written by the block. The block may
        move it away; then nothing is put at `target`.

    Raises
    ------
    UserError
        If no file can be written there.
    """
    path = check_target(target)
    try:
        handle, name = tempfile.mkstemp(
            prefix=f".{path.stem[:80]}.", suffix=f".tmp{path.suffix}", dir=path.parent
        )
        os.close(handle)
    except OSError as problem:
        raise UserError(f"cannot write {target}: {_reason(problem)}; choose another folder") from problem
    temporary = Path(name)
    try:
        temporary.chmod(_mode(path))
        yield temporary
        if temporary.exists():
            try:
                temporary.replace(path)
            except OSError as problem:
                raise UserError(f"cannot write {target}: {_reason(problem)}") from problem
    finally:
        temporary.unlink(missing_ok=True)


def _mode(path: Path) -> int:
    """Permissions of the file that is replaced, or those that a new file would get."""
    if path.exists():
        return path.stat().st_mode & 0o777
    mask = os.umask(0)
    os.umask(mask)
    return 0o666 & ~mask


def _reason(problem: OSError | ValueError) -> str:
    return getattr(problem, "strerror", None) or str(problem)
