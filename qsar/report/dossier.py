"""The model's dossier along the five OECD principles for the validation of QSAR models.

OECD, Guidance Document on the Validation of (Quantitative) Structure-Activity Relationship [(Q)SAR] Models,
Series on Testing and Assessment No. 69, 2007.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import NDArray

from qsar.attribution.survey import Survey, SurveyRow, survey
from qsar.descriptors import EFFECTS

if TYPE_CHECKING:
    from qsar.model.model import Model

Floats = NDArray[np.float64]


@dataclass(frozen=True, slots=True)
class Fit:
    """How predictions compare with measured values.

    Attributes
    ----------
    name : str
    n : int
    mean_absolute, root_mean_square, worst : float
        Errors, pKa units.
    explained : float
        1 - sum of squared errors over the sum of squares about the mean of these measured values.
    """

    name: str
    n: int
    mean_absolute: float
    root_mean_square: float
    worst: float
    explained: float

    @classmethod
    def of(cls, name: str, measured: Floats, predicted: Floats) -> Fit:
        """Compare two arrays of shape (n,)."""
        error = predicted - measured
        spread = float(np.sum((measured - measured.mean()) ** 2))
        return cls(
            name,
            len(error),
            float(np.abs(error).mean()),
            float(np.sqrt(np.mean(error**2))),
            float(np.abs(error).max()),
            1.0 - float(np.sum(error**2)) / spread if spread > 0 else float("nan"),
        )


@dataclass(frozen=True)
class Dossier:
    """What the report says about the model.

    Attributes
    ----------
    card : dict
    effects : list of (str, int, tuple of str)
        Each physical effect, its number of descriptors, its publications.
    lowers : int
        Descriptors along which the model can only fall.
    families : list of (str, int)
        Families of measured acids and their steps.
    range : (float, float)
        Of the measured pKa.
    fitted, left_out : Fit or None
        Goodness of fit, and the same acids predicted by the member that never saw them.
    by_family : list of Fit
        Of the acids left out.
    survey : Survey
    shown : list of SurveyRow
        Types with measured pairs and at least two contributions.
    """

    card: dict[str, Any]
    effects: list[tuple[str, int, tuple[str, ...]]]
    lowers: int
    families: list[tuple[str, int]]
    range: tuple[float, float]
    fitted: Fit | None
    left_out: Fit | None
    by_family: list[Fit]
    survey: Survey
    shown: list[SurveyRow]


def dossier(model: Model, done: Callable[[int], object] = lambda _: None) -> Dossier:
    """Collect a model's dossier; every acid of its own table is explained for it.

    Parameters
    ----------
    model : Model
    done : callable
        Called with the number of acids after each chunk, for progress.

    Returns
    -------
    Dossier
    """
    library = model.library
    found = survey(model, done)
    family = np.array(library.family)
    names = sorted({f for f in library.family if f})
    fits = [Fit.of(f, library.pka[family == f], library.pka_without[family == f]) for f in names]
    predicted = {(e.smiles, e.step): e.pka for e in found.explanations}
    keys = [(smiles, int(step)) for smiles, step in zip(library.smiles, library.step, strict=True)]
    rows = [k for k, key in enumerate(keys) if key in predicted]
    fitted = None
    if rows:
        values = np.array([predicted[keys[k]] for k in rows])
        fitted = Fit.of("all acids, in the fit", library.pka[rows], values)
    return Dossier(
        model.card,
        [(effect.name.replace("_", " "), len(effect.columns), effect.citations) for effect in EFFECTS],
        sum(column.lowers for effect in EFFECTS for column in effect.columns),
        [(f, int((family == f).sum())) for f in names],
        (float(library.pka.min()), float(library.pka.max())),
        fitted,
        Fit.of("all acids, each left out", library.pka, library.pka_without),
        fits,
        found,
        [row for row in found.rows if row.witnesses.n and row.n > 1],
    )
