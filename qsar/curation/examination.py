r"""Cross-examination: values far from what a model made without them expects, and what would explain each.

The artefacts that may lie behind a value are compared by Bayes' rule,

.. math:: P(h \mid v) \propto P(h)\, t_3\!\left(r_h / s_h\right) / s_h

with :math:`r_h` what is left of the difference if artefact h happened, :math:`s_h` the standard deviation of model,
row and artefact together, and Student's t with 3 degrees of freedom because errors have long tails. A row is flagged
and never changed.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING

from qsar.curation.artefacts import NO_FAULT, Case, Suspicion, suspicions
from qsar.curation.duplicates import Merged

if TYPE_CHECKING:
    from qsar.model import Model, StepPrediction
    from qsar.structures import Acid

COVERAGE = 0.95
LEAST = 0.3  # pKa units; smaller differences are left alone however sure the model is
_SHOWN = 0.02  # least likelihood that is listed
_NORMAL_OVER_MEAN = math.sqrt(math.pi / 2.0)  # standard deviation over mean absolute value of a normal distribution
_AT_ONCE = 200


@dataclass(frozen=True)
class Explanation:
    """An artefact with its likelihood among those considered."""

    suspicion: Suspicion
    likelihood: float


@dataclass(frozen=True)
class Flag:
    """A row whose value is far from what is expected.

    Attributes
    ----------
    merged : Merged
    expected, low, high : float
        What the model expects without the row, and its 95 % interval.
    domain : str
        The model's verdict on the acid.
    explanations : tuple of Explanation
        Most likely first.
    """

    merged: Merged
    expected: float
    low: float
    high: float
    domain: str
    explanations: tuple[Explanation, ...]

    @property
    def artefact(self) -> str:
        """The most likely artefact; empty where none is likelier than a sound value that the model misjudges."""
        kind = self.explanations[0].suspicion.kind
        return "" if kind == NO_FAULT else kind

    @property
    def sentence(self) -> str:
        """One line for the user."""
        best = self.explanations[0]
        row = self.merged.row
        typed = f" ({row.measured:.2f} before its correction)" if abs(row.pka - row.measured) >= 0.005 else ""
        return (
            f"pKa {row.pka:.2f}{typed}, expected {self.expected:.2f} ({self.low:.2f} to {self.high:.2f}); most "
            f"likely ({best.likelihood:.0%}): {best.suspicion.kind}: {best.suspicion.explanation}"
        )


def examine(rows: Sequence[Merged], model: Model, done: Callable[[int], object] = lambda _: None) -> list[Flag]:
    """Find rows far from expectation and rank what would explain them.

    Parameters
    ----------
    rows : sequence of Merged
    model : Model
        For an acid that it was trained on, its stored prediction made without the acid is used.
    done : callable
        Called with the number of rows finished.

    Returns
    -------
    list of Flag
        In the order of the rows.
    """
    flags = []
    for start in range(0, len(rows), _AT_ONCE):
        block = rows[start : start + _AT_ONCE]
        for row, prediction in zip(block, model.predict([m.row.acid for m in block], COVERAGE), strict=True):
            flag = _judge(row, prediction.steps, model)
            if flag is not None:
                flags.append(flag)
        done(len(block))
    return flags


def _without(step: StepPrediction) -> float:
    return step.pka if step.pka_without is None else step.pka_without


def _judge(merged: Merged, steps: Sequence[StepPrediction], model: Model) -> Flag | None:
    row = merged.row
    assert row.step is not None
    own = steps[row.step - 1]
    expected = _without(own)
    low, high = own.low + expected - own.pka, own.high + expected - own.pka
    if abs(row.pka - expected) <= LEAST or low - row.uncertainty <= row.pka <= high + row.uncertainty:
        return None
    case = Case(row, [_without(s) for s in steps], _isomers(row.acid, row.step, model))
    base = math.hypot(_NORMAL_OVER_MEAN * own.expected_error, row.uncertainty)
    return Flag(merged, expected, low, high, own.domain, rank(suspicions(case), base))


def _isomers(acid: Acid, step: int, model: Model) -> list[float]:
    """Expected pKa of the other E/Z and cis/trans isomers."""
    from rdkit import Chem

    from qsar.isomers import configurations
    from qsar.structures import read_acid

    plain = Chem.Mol(acid.mol)
    Chem.RemoveStereochemistry(plain)
    others, _ = configurations(read_acid(Chem.MolToSmiles(plain)))
    others = [a for a in others if a.smiles != acid.smiles]
    if len(others) == 0 or Chem.MolToSmiles(plain) in {a.smiles for a in others}:
        return []
    return [p.steps[step - 1].pka for p in model.predict(others)]


def rank(found: Sequence[Suspicion], base: float) -> tuple[Explanation, ...]:
    """Likelihoods of artefacts, most likely first; very unlikely ones are left out.

    Parameters
    ----------
    found : sequence of Suspicion
    base : float
        Standard deviation of model and row together, pKa units.
    """
    logs = []
    for s in found:
        scale = math.hypot(base, s.spread)
        logs.append(math.log(s.prior) - 2.0 * math.log1p((s.residual / scale) ** 2 / 3.0) - math.log(scale))
    top = max(logs)
    weights = [math.exp(v - top) for v in logs]
    total = sum(weights)
    ranked = sorted(
        (Explanation(s, w / total) for s, w in zip(found, weights, strict=True)), key=lambda e: -e.likelihood
    )
    return tuple(e for k, e in enumerate(ranked) if k == 0 or e.likelihood >= _SHOWN)
