"""Decisions as plain data: which base, which window, which buffer, and whether to measure first.

Each answer has a headline, the verdict with the constants at which it flips, and the lines that go with it.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Iterable, Sequence
from dataclasses import replace
from typing import TYPE_CHECKING, Any

from qsar.decisions.acids import steps_of_many
from qsar.decisions.steps import AcidSteps, at_temperature
from qsar.decisions.worth_measuring import Verdict, choice_verdict, say_probability
from qsar.reading import Record
from qsar.service.settings import Refused

if TYPE_CHECKING:
    from qsar.model.model import Model

_MILLI = 1e-3
_INFINITE = float("inf")


def _acids(
    model: Model, asked: Sequence[tuple[str, str]], coverage: float, temperature_c: float
) -> list[AcidSteps]:
    """Steps of acids, given as name and SMILES, at a temperature.

    Raises
    ------
    Refused
        If one of them cannot be used.
    """
    records = [Record(name, smiles) for name, smiles in asked]
    found = []
    for outcome in steps_of_many(records, coverage, model=model):
        if outcome.acid is None:
            raise Refused(422, f"{outcome.record.id[:60]}: {outcome.error}")
        found.append(at_temperature(outcome.acid, temperature_c))
    return found


def _acid_view(acid: AcidSteps) -> dict[str, Any]:
    return {
        "name": acid.name,
        "smiles": acid.smiles,
        "origin": acid.origin,
        "coverage": acid.coverage,
        "steps": [
            {"step": k + 1, "pka": acid.pka[k], "low": acid.low[k], "high": acid.high[k]}
            for k in range(len(acid.pka))
        ],
        "notes": list(acid.notes),
    }


def _verdict_view(verdict: Verdict) -> dict[str, Any]:
    return {
        "step": verdict.step,
        "pka": verdict.pka,
        "holds": [[_end(low), _end(high)] for low, high in verdict.holds],
        "flips_at": list(verdict.flips_at),
        "probability_wrong": verdict.probability_wrong,
        "measure_to": verdict.measure_to,
        "sentence": verdict.sentence,
    }


def _end(value: float) -> float | None:
    return None if math.isinf(value) else value


def _sentence(text: str) -> str:
    return f"{text[0].upper()}{text[1:]}" + ("" if text.endswith(".") else ".")


def _cautions(smiles: Iterable[str], more: Sequence[str] = ()) -> list[str]:
    from qsar.decisions.cautions import structural_cautions, with_reference

    lines = [line for text in smiles if text for line in structural_cautions(text)]
    return with_reference(list(dict.fromkeys([*lines, *more])))


def base(model: Model, q: dict[str, Any]) -> dict[str, Any]:
    """Which base pulls an acid into the water, or leaves it in the organic layer."""
    from qsar.decisions.bases import BASES, CARBONIC_NOTE, WATER_NOTE
    from qsar.decisions.cautions import base_cautions
    from qsar.decisions.speciation import log_p_of
    from qsar.decisions.workup import Extraction, check_partitions, gentler_alternative, plan_workup

    (acid,) = _acids(model, [(q["name"] or "this acid", q["smiles"])], q["coverage"], q["temperature_c"])
    check_partitions(acid)
    log_p = log_p_of(acid, q["log_p"])
    assert log_p is not None  # there is a structure without charge
    amount = q["amount_mmol"] * _MILLI
    job = Extraction(
        amount,
        q["organic_ml"] * _MILLI,
        q["water_ml"] * _MILLI,
        q["equivalents"] * amount * len(acid.pka),
        q["target"],
        q["into"],
        q["co2"],
        0.5 * (q["organic_ml"] + q["water_ml"]) * _MILLI,
        temperature_c=q["temperature_c"],
    )
    result = plan_workup(acid, log_p, job, BASES, q["risk"])
    lines = [f"{log_p.label}: {log_p.value:.2f}"]
    gentler = gentler_alternative(result)
    if gentler is not None:
        lines.append(f"the next gentler base, {gentler[0].name}, would do below pKa {gentler[1]:.2f}")
    if result.safe is None:
        lines.append("no base of this list is safe at the accepted risk without a measurement")
    elif result.safe is not result.chosen:
        wrong = say_probability(1.0 - result.safe.probability_sufficient)
        lines.append(f"without a measurement take {result.safe.base.name}: wrong with probability {wrong}")
    if "Crippen" in log_p.label:
        lines.append("an estimated log P is for octanol and may be off by 0.7, which moves every flip by as much")
    share = f"{100 * job.target:g} % in the {'water' if job.into == 'water' else 'organic layer'}"
    if result.chosen is None:
        headline = f"No base of this list gives {share} in one extraction."
    else:
        what = "the gentlest that gives" if job.into == "water" else "the strongest that leaves"
        headline = f"{_sentence(result.chosen.base.name)[:-1]} is {what} {share}."
    pressure = max(o.co2_bar for o in result.outcomes)
    return {
        "kind": "base",
        "headline": headline,
        "acids": [_acid_view(acid)],
        "verdicts": [_verdict_view(result.verdict)],
        "table": [
            {
                "base": o.base.name,
                "ph": o.ph,
                "in_water": o.in_water,
                "low": o.in_water_low,
                "high": o.in_water_high,
                "sufficient": o.sufficient,
                "probability": o.probability_sufficient,
                "chosen": o is result.chosen,
            }
            for o in result.outcomes
        ],
        "wanted": job.target if job.into == "water" else 1.0 - job.target,
        "lines": [_sentence(x) for x in [*lines, *result.notes, *acid.notes]],
        "cautions": _cautions([acid.smiles], base_cautions(BASES, pressure, job.co2 == "kept")),
        "fine_print": [WATER_NOTE, CARBONIC_NOTE],
    }


def window(model: Model, q: dict[str, Any]) -> dict[str, Any]:
    """Which pH has one acid in the water and the other in the organic layer."""
    from qsar.decisions.speciation import log_p_of
    from qsar.decisions.window import Layered, find_window
    from qsar.decisions.workup import check_partitions

    asked = [(q["name"] or "this acid", q["smiles"]), (q["other_name"] or "the other acid", q["other_smiles"])]
    acids = _acids(model, asked, q["coverage"], q["temperature_c"])
    pairs = []
    for acid, given in zip(acids, (q["log_p"], q["other_log_p"]), strict=True):
        check_partitions(acid)
        log_p = log_p_of(acid, given)
        assert log_p is not None
        pairs.append(Layered(acid, log_p))
    if pairs[0].acid.name == pairs[1].acid.name:
        pairs = [Layered(replace(p.acid, name=f"{p.acid.name} ({k})"), p.log_p) for k, p in enumerate(pairs, 1)]
    found = find_window(
        pairs[0],
        pairs[1],
        q["organic_ml"] / q["water_ml"],
        max(q["target"], 0.501),
        q["ionic_strength_m"],
        q["temperature_c"],
        q["risk"],
    )
    headline, *others = found.sentences
    lines = [f"{p.acid.name}: {p.log_p.label}: {p.log_p.value:.2f}" for p in pairs]
    if any("Crippen" in p.log_p.label for p in pairs):
        lines.append("an estimated log P is for octanol and may be off by 0.7; that is not in the probabilities")
    return {
        "kind": "window",
        "headline": headline,
        "acids": [_acid_view(p.acid) for p in (found.wet, found.dry)],
        "verdicts": [],
        "edges": [
            {"name": name, "ph": edge.ph, "low": edge.low, "high": edge.high}
            for name, edge in ((found.wet.acid.name, found.from_ph), (found.dry.acid.name, found.to_ph))
        ],
        "exists": found.exists,
        "probability_exists": found.probability_exists,
        "best_ph": found.best_ph,
        "measure_first": found.measure_first,
        "measure_to": found.measure_to,
        "lines": [*others, *(_sentence(x) for x in lines), *(_sentence(n) for p in pairs for n in p.acid.notes)],
        "cautions": _cautions(p.acid.smiles for p in pairs),
        "fine_print": [],
    }


def buffer(model: Model, q: dict[str, Any]) -> dict[str, Any]:
    """How much acid and salt make a pH, and how sure that is."""
    from qsar.decisions.buffer import Recipe, make_buffer, salt_for

    (acid,) = _acids(model, [(q["name"] or "this acid", q["smiles"])], q["coverage"], q["temperature_c"])
    step = min(q["step"], len(acid.pka))
    half = 0.5 * q["total_m"]
    recipe = Recipe(half, half, step, 0.0, None, q["temperature_c"])
    try:
        recipe = salt_for(acid, recipe, q["ph"])
        result = make_buffer(acid, recipe, q["tolerance"], q["ph"], q["risk"])
    except ValueError as problem:
        raise Refused(422, str(problem)) from problem
    salt = f"salt (after {step} proton{'' if step == 1 else 's'})"
    useful = " and ".join(f"{max(a, 0.0):.1f} to {min(b, 14.0):.1f}" for a, b in result.useful) or "none"
    lines = [
        f"capacity {result.capacity:.3g} mol/(L pH), ionic strength {result.ionic_strength_m:.3g} mol/L",
        f"useful range: pH {useful}",
        *result.notes,
        *acid.notes,
    ]
    return {
        "kind": "buffer",
        "headline": (
            f"{recipe.acid_m:.4g} mol/L acid form and {recipe.salt_m:.4g} mol/L {salt} make pH {result.ph:.2f}, "
            f"between {result.ph_low:.2f} and {result.ph_high:.2f}."
        ),
        "acids": [_acid_view(acid)],
        "verdicts": [_verdict_view(v) for v in result.verdicts],
        "ph": result.ph,
        "ph_low": result.ph_low,
        "ph_high": result.ph_high,
        "wanted_ph": q["ph"],
        "tolerance": q["tolerance"],
        "useful": [[max(a, 0.0), min(b, 14.0)] for a, b in result.useful],
        "lines": [_sentence(x) for x in lines],
        "cautions": _cautions([acid.smiles]),
        "fine_print": [],
    }


def risk(model: Model, q: dict[str, Any]) -> dict[str, Any]:
    """Whether a choice that holds on one side of a pKa is worth a measurement."""
    (acid,) = _acids(model, [(q["name"] or "this acid", q["smiles"])], q["coverage"], q["temperature_c"])
    step = min(q["step"], len(acid.pka)) - 1
    flip = q["flips_at"]
    below = acid.pka[step] < flip
    held = (-_INFINITE, flip) if below else (flip, _INFINITE)
    holds = [[held] if k == step else [(-_INFINITE, _INFINITE)] for k in range(len(acid.pka))]
    verdict = choice_verdict("The choice", acid.pka, acid.sd.tolist(), holds, None, q["risk"])
    if verdict.measure_to is None:
        settled = verdict.probability_wrong <= q["risk"]
        headline = "Do not measure: the choice stands." if settled else "A measurement of this step does not settle it."
    else:
        headline = f"Measure to ± {verdict.measure_to:.2f} before choosing."
    return {
        "kind": "risk",
        "headline": headline,
        "acids": [_acid_view(acid)],
        "verdicts": [_verdict_view(verdict)],
        "lines": [_sentence(n) for n in acid.notes],
        "cautions": [],
        "fine_print": [],
    }


def answered(decision: Callable[[Model, dict[str, Any]], dict[str, Any]]) -> Callable[..., dict[str, Any]]:
    """The decision with whatever the calculation refuses as a refusal of the request."""

    def asked(model: Model, question: dict[str, Any]) -> dict[str, Any]:
        try:
            return decision(model, question)
        except ValueError as problem:
            raise Refused(422, str(problem)) from problem

    return asked


DECISIONS = {name: answered(f) for name, f in (("base", base), ("window", window), ("buffer", buffer), ("risk", risk))}
"""Decisions by the name of the question."""
