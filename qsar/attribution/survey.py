"""Does the model know chemistry: mean contribution of each type of substituent beside the measured matched pairs."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Callable, Sequence
from dataclasses import dataclass
from statistics import fmean
from typing import TYPE_CHECKING

from qsar.attribution.explain import explain_many
from qsar.attribution.explanation import Explanation, Witnesses
from qsar.attribution.witnesses import Key, key_of, measured_pairs

if TYPE_CHECKING:
    from qsar.model.model import Model

_CHUNK = 50
PARENTS = {
    "a": "aromatic ring",
    "b": "propenoic or propynoic acid",
    "c": "ring",
    "d": "chain",
}


@dataclass(frozen=True, slots=True)
class SurveyRow:
    """One type of substituent at one distance.

    Attributes
    ----------
    name : str
    on : str
        What carries it: the kind of parent, or another substituent.
    bonds : int
        From the carboxyl carbon.
    n : int
        Contributions that were averaged.
    mean, low, high : float
        Mean and range of the contributions, pKa units.
    witnesses : Witnesses
        Measured pairs; `verdict` compares their range with the mean contribution.
    """

    name: str
    on: str
    bonds: int
    n: int
    mean: float
    low: float
    high: float
    witnesses: Witnesses


@dataclass(frozen=True)
class Survey:
    """All types of substituents of the acids that a model was trained on.

    Attributes
    ----------
    rows : tuple of SurveyRow
    explanations : tuple of Explanation
        Of all steps of all these acids.
    """

    rows: tuple[SurveyRow, ...]
    explanations: tuple[Explanation, ...]

    @property
    def contradictions(self) -> tuple[SurveyRow, ...]:
        """Rows whose mean contribution the measured pairs contradict."""
        return tuple(row for row in self.rows if row.witnesses.verdict == "contradicts")


def survey(model: Model, done: Callable[[int], object] = lambda _: None) -> Survey:
    """Explain every acid of a model's own table and average by type of substituent.

    Parameters
    ----------
    model : Model
        Its bundle must hold the structures of its training acids; otherwise the survey is empty.
    done : callable
        Called with the number of acids after each chunk, for progress.

    Returns
    -------
    Survey
    """
    smiles = sorted({s for s in model.library.smiles if s})
    explanations: list[Explanation] = []
    for start in range(0, len(smiles), _CHUNK):
        chunk = smiles[start : start + _CHUNK]
        for answer in explain_many(model, chunk):
            explanations += answer.steps
        done(len(chunk))
    return Survey(tuple(_rows(model, explanations)), tuple(explanations))


def _rows(model: Model, explanations: Sequence[Explanation]) -> list[SurveyRow]:
    values: dict[Key, list[float]] = defaultdict(list)
    names: dict[Key, tuple[str, str]] = {}
    for e in explanations:
        for k, substituent in enumerate(e.decomposition.substituents):
            key = key_of(e.decomposition, k)
            values[key].append(e.contributions[k].contribution)
            carrier = substituent.carrier
            on = PARENTS[e.decomposition.rule] if carrier is None else e.decomposition.substituents[carrier].name
            names[key] = substituent.name, on
    pairs = measured_pairs(model)
    rows = []
    for key, found in values.items():
        mean = fmean(found)
        name, on = names[key]
        rows.append(SurveyRow(name, on, key[1], len(found), mean, min(found), max(found), pairs.witnesses(key, mean)))
    return sorted(rows, key=lambda row: (row.on, row.name, row.bonds))
