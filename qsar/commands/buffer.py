"""``acidity buffer``: pH, capacity and useful range of an acid with its salt."""

from __future__ import annotations

import argparse
from typing import TYPE_CHECKING

from qsar.commands.decision_options import (
    Acids,
    Row,
    add_acid_arguments,
    check_outputs,
    numbered,
    show,
    show_acid,
    write_table,
)
from qsar.commands.quantities import concentration, not_negative, number, ph, positive
from qsar.errors import UserError
from qsar.progress import progress

if TYPE_CHECKING:
    from qsar.decisions.buffer import BufferResult, Recipe
    from qsar.decisions.steps import AcidSteps

HELP = "pH, capacity and useful range of an acid with its salt"

COLUMNS = (
    "id", "smiles", "acid_m", "salt_m", "step", "strong_base_m", "ph", "low", "high", "capacity",
    "ionic_strength_m", "useful_range", "wanted_ph", "question", "deciding_step", "holds_from", "holds_to",
    "probability_wrong", "measure_to", "coverage", "temperature_c",
)  # fmt: skip


def add_arguments(parser: argparse.ArgumentParser) -> None:
    """Describe the arguments of the command."""
    add_acid_arguments(parser)
    parser.add_argument(
        "--acid",
        type=concentration,
        metavar="MOL_L",
        help="acid form (default: 0.05 mol/L, or none where --salt is given)",
    )
    parser.add_argument(
        "--salt",
        type=concentration,
        metavar="MOL_L",
        help="salt form (default: 0.05 mol/L, or none where --acid is given)",
    )
    parser.add_argument(
        "--total",
        type=positive,
        default=0.1,
        metavar="MOL_L",
        help="acid and salt together, where --ph asks for their ratio (default: 0.1 mol/L)",
    )
    parser.add_argument(
        "--step",
        type=int,
        default=1,
        metavar="K",
        help="the salt has lost K protons, the acid form one fewer (default: 1)",
    )
    parser.add_argument(
        "--strong-base",
        type=number,
        default=0.0,
        metavar="MOL_L",
        help="strong base added, below zero for strong acid (default: 0)",
    )
    parser.add_argument(
        "--ionic-strength",
        type=not_negative,
        metavar="MOL_L",
        help="held by an inert salt, 0 to 0.5 (default: that of the buffer's own ions)",
    )
    parser.add_argument(
        "--ph",
        type=ph,
        metavar="PH",
        help="pH that is wanted; without --acid and --salt their ratio is found",
    )
    parser.add_argument(
        "--tolerance",
        type=positive,
        default=0.1,
        metavar="PH",
        help="by how much pH may be off (default: 0.1)",
    )


def run(args: argparse.Namespace) -> int:
    """Run the command.

    Returns
    -------
    int
        0 if every acid was answered, 3 if some could not be used, 2 if a source could not be read.

    Raises
    ------
    UserError
        For amounts out of range or an output that cannot be written.
    """
    from qsar.decisions.buffer import make_buffer

    if args.ionic_strength is not None and args.ionic_strength > 0.5:
        raise UserError("--ionic-strength: the Davies equation is used from 0 to 0.5 mol/L only")
    if args.acid is not None and args.salt is not None and args.acid + args.salt == 0.0:
        raise UserError("--acid and --salt are both zero; there is no buffer without either")
    if args.ph is not None and (args.acid is None) != (args.salt is None):
        raise UserError("--ph with only one of --acid and --salt: leave both out to find their ratio, or give both")
    check_outputs(args)
    acids = Acids(args)
    results = []
    found = acids.all()
    with progress(lambda: len(found), "acids") as advance:
        for acid in found:
            try:
                recipe = _recipe(acid, args)
                results.append(make_buffer(acid, recipe, args.tolerance, args.ph, args.risk))
            except ValueError as problem:
                acids.refuse(acid.name, str(problem))
            advance(1)
    for position, result in enumerate(results):
        if position:
            print()
        _show(result)
        if args.plot is not None:
            from qsar.decisions.plots import buffer_figure, save

            save(buffer_figure(result), numbered(args.plot, position, len(results)))
    if args.output is not None and results:
        write_table(args.output, COLUMNS, [row for result in results for row in _rows(result, args)])
    return acids.status


def _recipe(acid: AcidSteps, args: argparse.Namespace) -> Recipe:
    """The recipe as given, or the ratio that makes the wanted pH."""
    from qsar.decisions.buffer import Recipe, salt_for

    conditions = (args.step, args.strong_base, args.ionic_strength, args.temperature)
    if args.ph is not None and args.acid is None and args.salt is None:
        return salt_for(acid, Recipe(0.5 * args.total, 0.5 * args.total, *conditions), args.ph)
    acid_m, salt_m = args.acid, args.salt
    if acid_m is None and salt_m is None:
        acid_m = salt_m = 0.5 * args.total
    return Recipe(acid_m or 0.0, salt_m or 0.0, *conditions)


def _show(result: BufferResult) -> None:
    from qsar.decisions.bases import base_named
    from qsar.decisions.cautions import base_cautions, structural_cautions, with_reference

    recipe = result.recipe
    show_acid(result.acid)
    added = f", strong base {recipe.strong_base_m:g} mol/L" if recipe.strong_base_m else ""
    show(f"acid form {recipe.acid_m:.4g} mol/L, salt (step {recipe.step}) {recipe.salt_m:.4g} mol/L{added}")
    show(
        f"pH {result.ph:.2f} ({result.ph_low:.2f} to {result.ph_high:.2f}), capacity {result.capacity:.3g} "
        f"mol/(L pH), ionic strength {result.ionic_strength_m:.3g} mol/L, {recipe.temperature_c:g} °C"
    )
    show(f"useful range: pH {_say_ranges(result.useful)}")
    for verdict in result.verdicts:
        show(verdict.sentence)
    for note in result.notes:
        show(f"{note[0].upper()}{note[1:]}.")
    lines = structural_cautions(result.acid.smiles) if result.acid.smiles else []
    if recipe.strong_base_m > 0.0:
        lines += base_cautions([base_named("hydroxide")])
    for line in with_reference(lines):
        show(f"Caution: {line}" if line in lines else line)


def _say_ranges(ranges: tuple[tuple[float, float], ...]) -> str:
    return " and ".join(f"{max(low, 0.0):.1f} to {min(high, 14.0):.1f}" for low, high in ranges) or "none"


def _rows(result: BufferResult, args: argparse.Namespace) -> list[Row]:
    """One row for each verdict."""
    recipe = result.recipe
    return [
        {
            "id": result.acid.name,
            "smiles": result.acid.smiles,
            "acid_m": recipe.acid_m,
            "salt_m": recipe.salt_m,
            "step": recipe.step,
            "strong_base_m": recipe.strong_base_m,
            "ph": result.ph,
            "low": result.ph_low,
            "high": result.ph_high,
            "capacity": result.capacity,
            "ionic_strength_m": result.ionic_strength_m,
            "useful_range": _say_ranges(result.useful),
            "wanted_ph": args.ph,
            "question": verdict.choice,
            "deciding_step": verdict.step,
            "holds_from": verdict.holds[0][0] if verdict.holds else None,
            "holds_to": verdict.holds[-1][1] if verdict.holds else None,
            "probability_wrong": verdict.probability_wrong,
            "measure_to": verdict.measure_to,
            "coverage": result.acid.coverage,
            "temperature_c": recipe.temperature_c,
        }
        for verdict in result.verdicts
    ]
