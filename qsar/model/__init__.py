"""Models: training, bundles, prediction."""

from __future__ import annotations

from pathlib import Path

from qsar.model.bundle import load, read_card, save
from qsar.model.model import Model, Neighbour, Prediction, StepPrediction
from qsar.model.registry import resolve

__all__ = ["Model", "Neighbour", "Prediction", "StepPrediction", "load", "load_model", "read_card", "save"]


def load_model(folder: Path | str | None = None) -> Model:
    """Load a model.

    Parameters
    ----------
    folder : path or str, optional
        Folder of a bundle, or the name of one of the models that ``acidity models`` lists; by default the model
        in use.

    Raises
    ------
    UserError
        With one line if it cannot be loaded.
    """
    return load(resolve(folder))
