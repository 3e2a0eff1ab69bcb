"""What the interface takes and gives, as its own page shows it."""

from __future__ import annotations

from typing import Annotated, Any, Literal

from pydantic import BaseModel, ConfigDict, Field

from qsar.reading import MAX_SMILES

Text = Annotated[str, Field(max_length=400)]
Smiles = Annotated[str, Field(max_length=2 * MAX_SMILES, examples=["OC(=O)c1ccccc1"])]
SmilesInAddress = Annotated[str, Field(max_length=MAX_SMILES, examples=["OC(=O)c1ccccc1"])]
Coverage = Annotated[
    float, Field(ge=0.5, le=0.99, description="Fraction of true values that the intervals are meant to hold.")
]
StepNumber = Annotated[int, Field(ge=1, le=6, description="Carboxyl proton that leaves, from 1.")]
Number = Annotated[float, Field(ge=-1e6, le=1e6, allow_inf_nan=False)]
Amount = Annotated[float, Field(gt=0, le=1e6, allow_inf_nan=False)]
Verdict = Literal["inside", "borderline", "outside", "unusable"]


class _Taken(BaseModel):
    model_config = ConfigDict(extra="forbid")


class Problem(BaseModel):
    """Why a request is not answered."""

    detail: str = Field(description="A plain sentence: what is wrong, and how to mend it.")


class Structure(_Taken):
    """One structure with what it is called."""

    id: Text = ""
    smiles: Smiles


class Row(BaseModel):
    """One row of the table of predictions: an acid step, or an input that could not be used."""

    model_config = ConfigDict(extra="forbid")

    id: Annotated[str, Field(max_length=2_000)]
    smiles: Annotated[str, Field(max_length=2 * MAX_SMILES)] = Field(description="As given.")
    structure: Annotated[str, Field(max_length=2 * MAX_SMILES)] = Field("", description="Canonical SMILES.")
    step: StepNumber | None = None
    pka: Number | None = None
    low: Number | None = None
    high: Number | None = None
    coverage: Annotated[float, Field(gt=0, lt=1)] | None = None
    domain: Verdict = "unusable"
    reasons: Annotated[str, Field(max_length=10_000)] = ""
    nearest: Annotated[str, Field(max_length=2 * MAX_SMILES)] = Field(
        "", description="SMILES of the nearest measured acid."
    )
    nearest_pka: Number | None = None
    nearest_distance: Annotated[float, Field(ge=0, allow_inf_nan=False)] | None = None
    measured: Number | None = Field(None, description="Reference value, where the acid is in the table.")
    pka_without: Number | None = Field(None, description="Prediction made without that value.")
    model: Text = ""


class PredictQuestion(_Taken):
    """Structures to predict."""

    structures: Annotated[list[Structure], Field(min_length=1)]
    coverage: Coverage = 0.9


class Rows(BaseModel):
    """Rows in the order of the input."""

    rows: list[Row]


class TextQuestion(_Taken):
    """What a user pasted."""

    text: Annotated[str, Field(max_length=5_000_000, examples=["OC(=O)c1ccccc1 benzoic acid"])]


class ReadStructure(BaseModel):
    """One structure that was found in a text."""

    id: str
    smiles: str
    where: str
    error: str | None


class ReadAnswer(BaseModel):
    """What was found in a text."""

    structures: list[ReadStructure]


class SwapQuestion(_Taken):
    """A group for a place."""

    smiles: Smiles
    position: Text = Field(description="Key of a position, its number, its place or its label.", examples=["para"])
    group: Annotated[str, Field(max_length=500)] = Field(
        description="Name of a group in the list, or its SMILES with *.", examples=["NO2"]
    )
    coverage: Coverage = 0.9
    step: StepNumber = 1


class AnaloguesQuestion(_Taken):
    """A list of groups for a place."""

    smiles: Smiles
    position: Text = Field(examples=["para"])
    groups: Annotated[list[Annotated[str, Field(max_length=500)]], Field(max_length=300)] | None = Field(
        None, description="Names or SMILES with *; left out, the whole list."
    )
    step: StepNumber = 1
    low: Number | None = Field(None, description="Only analogues whose pKa is not below this.")
    high: Number | None = Field(None, description="Only analogues whose pKa is not above this.")
    coverage: Coverage = 0.9


class AnalogueRow(BaseModel):
    """One analogue."""

    group: str
    smiles: str
    step: int
    pka: float | None
    low: float | None
    high: float | None
    coverage: float
    domain: Verdict
    reasons: str
    measured: float | None
    change: float | None = Field(description="pKa less that of the acid that was started from.")


class AnaloguesAnswer(BaseModel):
    """All analogues at one place, by rising pKa."""

    smiles: str
    position: str
    place: str
    group: str
    rows: list[AnalogueRow]


class ExportQuestion(_Taken):
    """Rows to write to a file."""

    format: Literal["csv", "xlsx", "json", "sdf"]
    rows: Annotated[list[Row], Field(min_length=1)]


class ReportQuestion(_Taken):
    """Acids for the HTML report."""

    structures: Annotated[list[Structure], Field(min_length=1)]
    coverage: Coverage = 0.9
    decisions: Annotated[
        list[BaseQuestion | WindowQuestion | BufferQuestion | RiskQuestion], Field(max_length=8)
    ] = Field(default_factory=list, description="Decisions to answer in the report, each with its `kind`.")


class _Decision(_Taken):
    name: Text = ""
    smiles: Smiles
    coverage: Coverage = 0.9
    temperature_c: Annotated[float, Field(ge=10, le=40)] = 25.0
    risk: Annotated[float, Field(gt=0, lt=0.5, description="Accepted probability of a wrong choice.")] = 0.05


class BaseQuestion(_Decision):
    """Which base pulls the acid into the water."""

    kind: Literal["base"] = "base"
    log_p: Annotated[float, Field(ge=-10, le=20)] | None = Field(None, description="Left out, estimated.")
    amount_mmol: Amount = 10.0
    organic_ml: Amount = 50.0
    water_ml: Amount = 50.0
    equivalents: Annotated[float, Field(ge=0, le=1000)] = 2.0
    target: Annotated[float, Field(gt=0, lt=1)] = 0.95
    into: Literal["water", "organic"] = "water"
    co2: Literal["kept", "vented"] = "vented"


class WindowQuestion(_Decision):
    """Which pH parts two acids."""

    kind: Literal["window"] = "window"
    other_name: Text = ""
    other_smiles: Smiles
    log_p: Annotated[float, Field(ge=-10, le=20)] | None = None
    other_log_p: Annotated[float, Field(ge=-10, le=20)] | None = None
    organic_ml: Amount = 50.0
    water_ml: Amount = 50.0
    target: Annotated[float, Field(gt=0.5, lt=1)] = 0.95
    ionic_strength_m: Annotated[float, Field(ge=0, le=0.5)] = 0.1


class BufferQuestion(_Decision):
    """How much acid and salt make a pH."""

    kind: Literal["buffer"] = "buffer"
    ph: Annotated[float, Field(ge=0, le=14)] = Field(examples=[4.2])
    total_m: Annotated[float, Field(gt=0, le=5)] = 0.1
    step: StepNumber = 1
    tolerance: Annotated[float, Field(gt=0, le=3)] = 0.1


class RiskQuestion(_Decision):
    """Whether to measure before a choice that flips at a pKa."""

    kind: Literal["risk"] = "risk"
    flips_at: Annotated[float, Field(ge=-10, le=20)] = Field(examples=[4.5])
    step: StepNumber = 1


class DecisionAnswer(BaseModel):
    """Answer to a decision; what else is in it depends on the question."""

    model_config = ConfigDict(extra="allow")

    kind: Literal["base", "window", "buffer", "risk"]
    headline: str
    acids: list[dict[str, Any]]
    verdicts: list[dict[str, Any]] = Field(description="With the pKa values at which each choice flips.")
    lines: list[str]
    cautions: list[str]
    fine_print: list[str]


class AcidAnswer(BaseModel):
    """Everything about one acid: for each step the row of the table, evidence and contributions."""

    model_config = ConfigDict(extra="allow")

    smiles: str
    name: str = Field(description="Empty for an acid that is not in the table.")
    model: str
    shown_step: int
    steps: list[dict[str, Any]]
    notes: list[str]
    drawing: dict[str, Any] = Field(description="SVG text for light and dark pages, and its size.")
    positions: list[dict[str, Any]] = Field(description="Places whose hydrogen or substituent can be exchanged.")


class GroupAnswer(BaseModel):
    """A group that can be put in."""

    name: str
    smiles: str
    words: str


class NamedSmiles(BaseModel):
    """An acid with its name."""

    name: str
    smiles: str


class AboutAnswer(BaseModel):
    """The model, the limits, and how busy the service is."""

    model: str
    card: dict[str, Any]
    names: list[str] = Field(description="Names of measured acids.")
    limits: dict[str, float]
    workers: dict[str, int]


ReportQuestion.model_rebuild()
