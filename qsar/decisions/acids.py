"""The steps of an acid from its structure: given by the user, measured, or predicted, in that order."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace
from pathlib import Path
from statistics import NormalDist
from typing import TYPE_CHECKING

from qsar.decisions.steps import MEASURED_SD, AcidSteps, UnusableAcid, given_steps
from qsar.reading import Record

if TYPE_CHECKING:
    from qsar.model.model import Model, Prediction
    from qsar.structures import Acid

__all__ = ["AcidSteps", "Outcome", "charge_beside_carboxyl", "steps_of", "steps_of_many"]


def charge_beside_carboxyl(acid: Acid) -> int:
    """Charge of the acid form where its carboxyl protons leave: +1 for glycine, 0 for acetic acid.

    Aliphatic amines, amidines and other strong bases count as protonated, ring nitrogen and anilines as the model
    takes them, sulfonic and phosphonic acids as singly ionised.
    """
    from qsar.descriptors import Molecule
    from qsar.groups import CATIONIC

    charge = 0
    for group in Molecule(acid.graph).groups:
        charge += group.kind in CATIONIC
        charge -= group.kind in ("sulfonate", "phosphonate")
    return charge


def steps_of(
    source_smiles: str,
    coverage: float,
    pka_override: Sequence[float] | None = None,
    *,
    pka_sd: float = MEASURED_SD,
    name: str | None = None,
    model_folder: Path | None = None,
) -> AcidSteps:
    """The steps of one structure.

    Parameters
    ----------
    source_smiles : str
        Structure as given.
    coverage : float
        Coverage of the intervals, in (0, 1).
    pka_override : sequence of float, optional
        Known constants; the model is not asked then.
    pka_sd : float
        Standard deviation of the known constants.
    name : str, optional
        Name for the output; the structure as given by default.
    model_folder : pathlib.Path, optional
        Model to load in place of the shipped one.

    Raises
    ------
    UnusableAcid
        When the structure cannot be used.
    UserError
        When the model cannot be opened.
    """
    record = Record(name or source_smiles, source_smiles)
    return steps_of_many([record], coverage, [pka_override], pka_sd, model_folder)[0].unwrap()


@dataclass(frozen=True)
class Outcome:
    """An acid, or the reason why there is none."""

    record: Record
    acid: AcidSteps | None
    error: str | None

    def unwrap(self) -> AcidSteps:
        """Return the acid.

        Raises
        ------
        UnusableAcid
            With the reason, where there is none.
        """
        if self.acid is None:
            raise UnusableAcid(f"{self.record.where or self.record.id}: {self.error}")
        return self.acid


def steps_of_many(
    records: Sequence[Record],
    coverage: float,
    pka_overrides: Sequence[Sequence[float] | None] | None = None,
    pka_sd: float = MEASURED_SD,
    model_folder: Path | None = None,
    model: Model | None = None,
) -> list[Outcome]:
    """The steps of many inputs with one call of the model; an outcome for each, in order.

    Parameters
    ----------
    records : sequence of Record
        Structures as read.
    coverage, pka_sd, model_folder
        As in `steps_of`.
    pka_overrides : sequence, optional
        Known constants for each record, or None.
    model : Model, optional
        A model that is loaded already; `model_folder` does not matter then.

    Raises
    ------
    UserError
        When the model cannot be opened.
    """
    from qsar.structures import StructureError, acid_from_mol, read_acid

    overrides = pka_overrides or [None] * len(records)
    structures: list[Acid | str] = []
    for record in records:
        try:
            if record.error is not None:
                raise StructureError(record.error)
            structures.append(read_acid(record.smiles) if record.mol is None else acid_from_mol(record.mol))
        except StructureError as error:
            structures.append(str(error))
    asked = [
        structure
        for structure, override in zip(structures, overrides, strict=True)
        if override is None and not isinstance(structure, str)
    ]
    answers = iter(_predicted(asked, coverage, model_folder, model))
    outcomes = []
    for record, structure, override in zip(records, structures, overrides, strict=True):
        if isinstance(structure, str):
            outcomes.append(Outcome(record, None, structure))
            continue
        name, charge = record.id, charge_beside_carboxyl(structure)
        if override is not None:
            acid = given_steps(name, override, pka_sd, coverage, charge, structure.smiles)
        else:
            prediction = next(answers)
            if prediction.error is not None:
                outcomes.append(Outcome(record, None, str(prediction.error)))
                continue
            acid = _from_prediction(name, prediction, coverage, charge)
        outcomes.append(
            Outcome(record, replace(acid, notes=acid.notes + _charge_note(acid, structure)), None)
        )
    return outcomes


def _predicted(acids: list[Acid], coverage: float, folder: Path | None, model: Model | None) -> list[Prediction]:
    if not acids:
        return []
    if model is None:
        from qsar.model import load_model

        model = load_model(folder)
    return model.predict(acids, coverage=coverage)


def _from_prediction(name: str, prediction: Prediction, coverage: float, charge: int) -> AcidSteps:
    """Steps of a prediction; a measured value takes the place of the predicted one."""
    quantile = NormalDist().inv_cdf(0.5 + coverage / 2.0)
    pka: list[float] = []
    low: list[float] = []
    high: list[float] = []
    notes: list[str] = []
    measured = 0
    for step in prediction.steps:
        if step.measured is not None:
            measured += 1
            value = float(step.measured)
            sd = MEASURED_SD if step.measured_uncertainty is None else float(step.measured_uncertainty)
            half = quantile * sd
            pka.append(value)
            low.append(value - half)
            high.append(value + half)
            notes.append(
                f"step {step.step}: measured {value:.2f} from the model's training table "
                f"{_source(step.measured_source)}is used, standard uncertainty {sd:g}{_without(step.pka_without)}"
            )
            continue
        pka.append(float(step.pka))
        low.append(float(min(step.low, step.pka)))
        high.append(float(max(step.high, step.pka)))
        if step.domain != "inside":
            why = "; ".join(step.reasons)
            notes.append(
                f"step {step.step}: verdict {step.domain}, so the interval may be too narrow ({why})"
            )
    origin = "measured" if measured == len(pka) else "predicted"
    return AcidSteps(
        name,
        prediction.structure,
        tuple(pka),
        tuple(low),
        tuple(high),
        coverage,
        charge,
        origin,
        tuple(notes),
    )


def _source(key: str) -> str:
    return f"(source {key}) " if key else ""


def _without(value: float | None) -> str:
    return "" if value is None else f"; predicted without it {value:.2f}"


def _charge_note(acid: AcidSteps, structure: Acid) -> tuple[str, ...]:
    if acid.charge_of_acid_form > 0 and len(acid.pka) <= len(structure.sites):
        return (
            "only carboxyl protons are counted: a protonated nitrogen loses its own proton at higher pH "
            "(aliphatic ammonium near 9 to 11, pyridinium and anilinium near 4 to 6, common practice); give every "
            "constant with --pka to include it",
        )
    base = _weak_base(structure)
    if base is not None and len(acid.pka) <= len(structure.sites):
        return (
            f"a weakly basic nitrogen takes up a proton below about pH {base:.1f} (estimated): below pH {base + 1:.1f} "
            "charge, fractions and log D do not hold, and the acid goes into water as a cation; give every constant "
            "with --pka to include it",
        )
    return ()


def _weak_base(structure: Acid) -> float | None:
    """Estimated pKa of the strongest aniline that is neutral where the carboxyl proton leaves; None without one."""
    from qsar.basicity import anilinium_pka
    from qsar.descriptors import Molecule
    from qsar.groups import owners

    groups = Molecule(structure.graph).groups
    group_of = owners(groups)
    found = [anilinium_pka(structure.graph, g.atoms[0], group_of) for g in groups if g.kind == "amino"]
    return max((pka for pka in found if pka is not None and pka > 0.0), default=None)
