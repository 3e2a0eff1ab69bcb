"""Where the reference table and the models lie, in a checkout and in an installed wheel.

In a checkout (an editable install included) they are at top level, ``training_data/`` and ``models/``; the
wheel carries them as ``qsar/data/`` (see ``force-include`` in ``pyproject.toml``).
"""

from __future__ import annotations

from pathlib import Path

DEFAULT_MODEL = "carboxylic-1"
"""Name of the shipped model: a folder of ``models/``."""

_PACKAGE = Path(__file__).resolve().parent
_TABLE = "carboxylic_acids.csv"


def checkout() -> Path | None:
    """Top folder of the checkout that this package runs from, or None for an installed wheel."""
    top = _PACKAGE.parent
    return top if (top / "pyproject.toml").is_file() and (top / "training_data").is_dir() else None


def data_folder() -> Path:
    """Folder of the reference table and its list of sources."""
    top = checkout()
    return top / "training_data" if top else _PACKAGE / "data"


def reference_table() -> Path:
    """Measured constants that the shipped model was trained on."""
    return data_folder() / _TABLE


def sources_table() -> Path:
    """Publications that the reference table cites."""
    return data_folder() / "sources.csv"


def models_folder() -> Path:
    """Folder of the shipped models, one folder each."""
    top = checkout()
    return top / "models" if top else _PACKAGE / "data" / "models"


def default_model() -> Path:
    """Bundle of the shipped model."""
    return models_folder() / DEFAULT_MODEL
