"""Models: training, bundles, prediction."""

from __future__ import annotations

from pathlib import Path

from qsar.model.bundle import load, read_card, save
from qsar.model.model import Model, Neighbour, Prediction, StepPrediction
from qsar.paths import default_model

__all__ = ["Model", "Neighbour", "Prediction", "StepPrediction", "load", "load_model", "read_card", "save"]


def load_model(folder: Path | str | None = None) -> Model:
    """Load a model: the bundle in `folder`, or the one in use.

    Raises
    ------
    UserError
        With one line if it cannot be loaded.
    """
    return load(Path(folder) if folder is not None else default_model())
