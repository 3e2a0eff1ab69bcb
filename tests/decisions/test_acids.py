"""Steps of an acid: given, measured or predicted, their distribution and their charge."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field
from pathlib import Path
from statistics import NormalDist

import numpy as np
import pytest

import qsar.model
from qsar.decisions.acids import charge_beside_carboxyl, steps_of, steps_of_many
from qsar.decisions.steps import AcidSteps, UnusableAcid, given_steps
from qsar.reading import Record
from qsar.structures import Acid, read_acid


@dataclass(frozen=True)
class Step:
    """A step as a model gives it; invented numbers."""

    step: int
    pka: float
    low: float
    high: float
    domain: str = "inside"
    reasons: tuple[str, ...] = ()
    measured: float | None = None
    measured_uncertainty: float | None = None
    measured_source: str = ""
    pka_without: float | None = None


@dataclass(frozen=True)
class Prediction:
    structure: str
    steps: list[Step] = field(default_factory=list)
    error: str | None = None


class Model:
    """Two steps for two carboxyl groups, a measured first step where asked for, an error for bromides."""

    def predict(self, acids: Sequence[Acid], coverage: float) -> list[Prediction]:
        answers = []
        for acid in acids:
            if "Br" in acid.smiles:
                answers.append(Prediction("", error="not today"))
                continue
            measured = {"measured": 4.76, "measured_uncertainty": 0.02} if acid.smiles == "CC(=O)O" else {}
            steps = [Step(1, 4.5, 4.2, 4.8, "outside", ("never seen",), **measured)]
            steps += [Step(k, 4.5 + k, 4.0 + k, 5.0 + k) for k in range(2, len(acid.sites) + 1)]
            answers.append(Prediction(acid.smiles, steps))
        return answers


@pytest.fixture
def model(monkeypatch: pytest.MonkeyPatch) -> list[Path | None]:
    """Put the invented model in place; returns the folders that were asked for."""
    asked: list[Path | None] = []

    def load(folder: Path | None = None) -> Model:
        asked.append(folder)
        return Model()

    monkeypatch.setattr(qsar.model, "load_model", load)
    return asked


def test_predicted_steps(model: list[Path | None]) -> None:
    acid = steps_of("OC(=O)CCC(=O)O", 0.9, name="succinic acid", model_folder=Path("mine"))
    assert (acid.name, acid.origin, acid.charge_of_acid_form) == ("succinic acid", "predicted", 0)
    assert (acid.pka, acid.low, acid.high) == ((4.5, 6.5), (4.2, 6.0), (4.8, 7.0))
    assert model == [Path("mine")]
    assert acid.notes == ("step 1: verdict outside, so the interval may be too narrow (never seen)",)


def test_measured_value_goes_before_the_prediction(model: list[Path | None]) -> None:
    acid = steps_of("CC(=O)O", 0.9)
    assert acid.origin == "measured" and acid.pka == (4.76,)
    assert acid.sd == pytest.approx([0.02])
    assert "measured 4.76 from the model's training table" in acid.notes[0]


def test_known_constants_need_no_model(model: list[Path | None]) -> None:
    acid = steps_of("CC(=O)O", 0.9, [4.76], pka_sd=0.1)
    assert model == [] and acid.origin == "given" and acid.sd == pytest.approx([0.1])
    assert acid.smiles == "CC(=O)O"


def test_unusable_inputs_keep_their_place(model: list[Path | None]) -> None:
    records = [
        Record("a", "c1ccccc1", "acids.csv, row 2"),
        Record("b", "CC(=O)O"),
        Record("c", "OC(=O)CBr"),
        Record("d", "", "acids.csv, row 5", None, "no SMILES"),
    ]
    outcomes = steps_of_many(records, 0.9)
    assert [outcome.acid is not None for outcome in outcomes] == [False, True, False, False]
    assert outcomes[2].error == "not today"
    with pytest.raises(UnusableAcid, match=r"acids\.csv, row 2: no carboxyl group"):
        outcomes[0].unwrap()


def test_shipped_model_knows_benzoic_acid() -> None:
    # CRC Handbook: 4.204 at 25 degC (from memory).
    acid = steps_of("OC(=O)c1ccccc1", 0.9)
    assert acid.pka[0] == pytest.approx(4.204, abs=0.1)


@pytest.mark.parametrize(
    ("smiles", "charge"),
    [
        ("CC(=O)O", 0),
        ("NCC(=O)O", 1),
        ("C[N+](C)(C)CC(=O)[O-]", 1),
        ("NCCCCC(N)C(=O)O", 2),
        ("CC(=O)NCC(=O)O", 0),
        ("OC(=O)CCS(=O)(=O)O", -1),
        ("OC(=O)CCP(=O)(O)O", -1),
        ("OC(=O)CC#N", 0),
        ("OC(=O)C[N+](=O)[O-]", 0),
    ],
)
def test_charge_where_the_carboxyl_proton_leaves(smiles: str, charge: int) -> None:
    assert charge_beside_carboxyl(read_acid(smiles)) == charge


def test_amino_acids_are_told_about_their_ammonium() -> None:
    assert "ammonium" in steps_of("NCC(=O)O", 0.9, [2.35]).notes[0]
    assert steps_of("NCC(=O)O", 0.9, [2.35, 9.78]).notes == ()


def test_interval_is_read_as_a_normal() -> None:
    acid = AcidSteps("an acid", "", (4.2,), (3.9,), (4.5,), 0.9, 0)
    # Two-sided 90 % quantile of the normal: 1.645.
    assert acid.sd == pytest.approx([0.3 / 1.645], rel=1e-3)
    draws = acid.draws(2000)[:, 0]
    assert float(np.mean((draws > 3.9) & (draws < 4.5))) == pytest.approx(0.9, abs=0.002)
    assert float(draws.std()) == pytest.approx(float(acid.sd[0]), rel=5e-3)


def test_draws_repeat_and_keep_the_order_of_steps() -> None:
    acid = given_steps("an acid", [4.2, 4.6], sd=0.5)
    one, other = acid.draws(500), acid.draws(500)
    assert np.array_equal(one, other)
    assert (np.diff(one, axis=1) >= 0.0).all()
    assert not np.array_equal(one, acid.draws(500, seed=1))


def test_a_measurement_narrows_one_step() -> None:
    acid = given_steps("an acid", [4.2, 5.6], sd=0.5).measured_at(1, 0.05)
    assert acid.sd == pytest.approx([0.5, 0.05])


def test_refusals() -> None:
    with pytest.raises(ValueError, match="same number of steps"):
        AcidSteps("x", "", (4.2,), (3.9, 1.0), (4.5,), 0.9, 0)
    with pytest.raises(ValueError, match="not an interval"):
        AcidSteps("x", "", (4.2,), (4.3,), (4.5,), 0.9, 0)
    with pytest.raises(ValueError, match="coverage 1"):
        AcidSteps("x", "", (4.2,), (4.1,), (4.5,), 1.0, 0)
    with pytest.raises(ValueError, match="standard deviation"):
        given_steps("x", [4.2], sd=-1.0)
    assert NormalDist().inv_cdf(0.95) == pytest.approx(1.645, abs=1e-3)
