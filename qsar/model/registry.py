"""The user's models: bundles by name in one folder, and which of all models is in use.

The folder is the user's data folder, or ``QSAR_MODELS``, or what ``--models`` names. Each bundle is a folder of its
own, complete before it gets its name, and nothing lists them but the folder itself; so two trainings cannot spoil a
list, and one damaged bundle says nothing about the others. Names are given and taken under a lock that the operating
system drops with the process.
"""

from __future__ import annotations

import json
import os
import re
import shutil
import tempfile
from collections.abc import Iterator
from contextlib import contextmanager
from dataclasses import dataclass
from pathlib import Path
from typing import IO, TYPE_CHECKING, Any

from qsar.errors import UserError
from qsar.files import atomic_path
from qsar.paths import DEFAULT_MODEL, models_folder

if TYPE_CHECKING:
    from qsar.model.model import Model

FOLDER_VARIABLE = "QSAR_MODELS"
IN_USE = "in_use.json"
_LOCK = ".lock"
_NAME = re.compile(r"[A-Za-z0-9][A-Za-z0-9._-]{0,63}")


@dataclass(frozen=True)
class Entry:
    """A model in the list.

    Attributes
    ----------
    name : str
    folder : pathlib.Path
    shipped : bool
        Came with the program; cannot be deleted.
    in_use : bool
    card : dict
        Empty where the card cannot be read.
    problem : str
        Why the bundle cannot be used; empty where it can, as far as its card shows.
    """

    name: str
    folder: Path
    shipped: bool
    in_use: bool
    card: dict[str, Any]
    problem: str = ""


def user_folder() -> Path:
    """Folder of the user's own models; it need not exist yet."""
    named = os.environ.get(FOLDER_VARIABLE)
    if named:
        return Path(named).expanduser()
    from platformdirs import user_data_path

    return user_data_path("qsar", appauthor=False) / "models"


def check_name(name: str) -> str:
    """Check the name of a model.

    Raises
    ------
    UserError
        If it is no plain name; so no name leads out of the folder of models.
    """
    if not _NAME.fullmatch(name):
        raise UserError(
            f"{name[:70]!r} is no name for a model; use up to 64 letters, digits, dots, dashes and underscores, "
            "beginning with a letter or digit"
        )
    return name


class Registry:
    """The models in one folder together with the shipped ones.

    Parameters
    ----------
    folder : pathlib.Path, optional
        The user's folder by default.
    shipped : pathlib.Path, optional
        Folder of the shipped models.
    """

    def __init__(self, folder: Path | None = None, shipped: Path | None = None) -> None:
        self.folder = folder or user_folder()
        self.shipped = shipped or models_folder()

    def path(self, name: str) -> Path:
        """Folder of the bundle of that name.

        Raises
        ------
        UserError
            If there is none.
        """
        check_name(name)
        for parent in (self.folder, self.shipped):
            if (parent / name).is_dir():
                return parent / name
        names = ", ".join(sorted(self._names()))
        raise UserError(f"no model {name} in {self.folder} or among the shipped ones; there are: {names or 'none'}")

    def _names(self) -> dict[str, Path]:
        """Folder of each model; the shipped ones first."""
        found: dict[str, Path] = {}
        for parent in (self.shipped, self.folder):
            if parent.is_dir():
                for folder in sorted(parent.iterdir()):
                    if folder.is_dir() and _NAME.fullmatch(folder.name):
                        found.setdefault(folder.name, folder)
        return found

    def in_use(self) -> str:
        """Name of the model in use; the shipped one where nothing was chosen.

        Raises
        ------
        UserError
            If the choice cannot be read.
        """
        path = self.folder / IN_USE
        try:
            if path.stat().st_size > 4096:
                raise ValueError("too large")
            stored = json.loads(path.read_text(encoding="utf-8"))
            return check_name(stored["name"])
        except FileNotFoundError:
            return DEFAULT_MODEL
        except (OSError, ValueError, KeyError, TypeError, UserError) as problem:
            raise UserError(f"{path}: damaged; `acidity models use NAME` writes it anew") from problem

    def folder_in_use(self) -> Path:
        """Folder of the model in use.

        Raises
        ------
        UserError
            If the choice cannot be read or its bundle is gone; another model is never taken in its place.
        """
        name = self.in_use()
        if name == DEFAULT_MODEL and not (self.folder / name).is_dir():
            return self.shipped / name
        try:
            return self.path(name)
        except UserError as problem:
            raise UserError(
                f"the model in use, {name}, is gone from {self.folder}; `acidity models use {DEFAULT_MODEL}` goes "
                "back to the shipped one"
            ) from problem

    def entries(self) -> list[Entry]:
        """All models, the shipped ones first; a damaged one is listed with its problem."""
        from qsar.model.bundle import ARRAYS, read_card

        try:
            used = self.in_use()
        except UserError:
            used = ""  # said by whoever needs the model; the list shows none in use
        entries = []
        for name, folder in self._names().items():
            card, problem = {}, ""
            try:
                card = read_card(folder)
                if not (folder / ARRAYS).is_file():
                    problem = f"{ARRAYS} is missing"
            except UserError as error:
                problem = str(error)
            entries.append(Entry(name, folder, folder.parent == self.shipped, name == used, card, problem))
        return entries

    def use(self, name: str) -> None:
        """Make a model the one in use; its bundle is loaded once to see that it can be.

        Raises
        ------
        UserError
            If there is no such model or it cannot be loaded; what was in use stays.
        """
        from qsar.model.bundle import load

        with self._locked():
            load(self.path(name))
            self._write_choice(name)

    def _write_choice(self, name: str) -> None:
        with atomic_path(self.folder / IN_USE) as path:
            path.write_text(json.dumps({"name": name}) + "\n", encoding="utf-8")

    def delete(self, name: str) -> bool:
        """Delete one of the user's models.

        Returns
        -------
        bool
            Whether it was in use; then the shipped one is in use now.

        Raises
        ------
        UserError
            If there is no such model or it is a shipped one.
        """
        with self._locked():
            folder = self.path(name)
            if folder.parent != self.folder:
                raise UserError(
                    f"{name} came with the program and is not deleted; use another with `acidity models use`"
                )
            was_used = (self.folder / IN_USE).exists() and self._chosen_or_none() == name
            if was_used:
                self._write_choice(DEFAULT_MODEL)
            doomed = Path(tempfile.mkdtemp(prefix=".deleted-", dir=self.folder))
            folder.rename(doomed / name)  # gone at once, even where removing the files takes a while
        shutil.rmtree(doomed, ignore_errors=True)
        return was_used

    def _chosen_or_none(self) -> str | None:
        try:
            return self.in_use()
        except UserError:
            return None  # a damaged choice names nothing that could be deleted

    def is_taken(self, name: str) -> bool:
        """Whether a model of that name exists."""
        return check_name(name) in self._names()

    def add(self, model: Model, name: str) -> Entry:
        """Save a model under a name.

        Returns
        -------
        Entry
            Its name is `name`, or `name` with a number behind where another took it meanwhile.

        Raises
        ------
        UserError
            If the folder cannot be written.
        """
        from dataclasses import replace

        from qsar.model.bundle import save

        check_name(name)
        with self._locked():
            chosen, number = name, 1
            while self.is_taken(chosen):
                number += 1
                chosen = check_name(f"{name[:58]}-{number}")
            unfinished = Path(tempfile.mkdtemp(prefix=".unfinished-", dir=self.folder))
            try:
                save(replace(model, card={**model.card, "name": chosen}), unfinished / chosen)
                (unfinished / chosen).rename(self.folder / chosen)
            finally:
                shutil.rmtree(unfinished, ignore_errors=True)
        return next(e for e in self.entries() if e.name == chosen)

    def adopt(self, source: Path, name: str | None = None) -> Entry:
        """Copy a bundle from elsewhere, after loading it once without running any of it.

        Raises
        ------
        UserError
            If it cannot be loaded.
        """
        from qsar.model.bundle import load

        model = load(source)
        return self.add(model, name or source.resolve().name)

    @contextmanager
    def _locked(self) -> Iterator[None]:
        try:
            self.folder.mkdir(parents=True, exist_ok=True)
            handle = (self.folder / _LOCK).open("a+b")
        except OSError as problem:
            raise UserError(
                f"cannot write in {self.folder}: {problem.strerror}; choose another with --models"
            ) from problem
        with handle:
            _lock(handle)
            yield


def _lock(handle: IO[bytes]) -> None:
    """Wait for an exclusive lock, which ends when the file is closed."""
    try:
        import fcntl
    except ImportError:  # Windows
        import msvcrt

        handle.seek(0)
        msvcrt.locking(handle.fileno(), msvcrt.LK_LOCK, 1)  # type: ignore[attr-defined]
    else:
        fcntl.flock(handle, fcntl.LOCK_EX)


def resolve(model: str | Path | None = None, folder: Path | None = None) -> Path:
    """Folder of a bundle from what a user names: a folder, the name of a model, or nothing for the one in use.

    Parameters
    ----------
    model : str or pathlib.Path, optional
    folder : pathlib.Path, optional
        Folder of models, the user's by default.
    """
    registry = Registry(folder)
    if model is None:
        return registry.folder_in_use()
    path = Path(model)
    if not path.exists() and _NAME.fullmatch(str(model)):
        return registry.path(str(model))
    return path
