"""``acidity workup``: which base pulls an acid into water, and which pH parts two acids."""

from __future__ import annotations

import argparse
from collections.abc import Iterator, Sequence
from pathlib import Path
from typing import TYPE_CHECKING

from qsar.commands.decision_options import (
    Acids,
    Row,
    add_acid_arguments,
    check_outputs,
    numbered,
    refusals,
    show,
    show_acid,
    show_table,
    write_table,
)
from qsar.commands.quantities import counted, fraction, not_negative, number, positive
from qsar.errors import UserError
from qsar.progress import progress

if TYPE_CHECKING:
    from qsar.decisions.bases import Base
    from qsar.decisions.speciation import LogP
    from qsar.decisions.steps import AcidSteps
    from qsar.decisions.window import Window
    from qsar.decisions.workup import Extraction, Workup

HELP = "which base pulls an acid into water, and which pH parts two acids"

COLUMNS = (
    "id", "smiles", "base", "ph", "in_water", "low", "high", "deprotonated", "delta_pka",
    "sufficient", "probability_sufficient", "step", "flips_at", "co2_left_mmol", "co2_bar",
    "chosen", "probability_wrong", "measure_to", "log_p", "log_p_source", "target", "into", "co2",
    "temperature_c", "beyond_davies",
)  # fmt: skip
WINDOW_COLUMNS = (
    "in_water", "in_organic", "target", "from_ph", "from_ph_low", "from_ph_high", "to_ph",
    "to_ph_low", "to_ph_high", "exists", "probability_exists", "best_ph", "probability_at_best",
    "fraction_in_water", "fraction_in_organic", "flips_when_difference_below", "probability_wrong",
    "measure_first", "measure_to", "measure_both",
)  # fmt: skip
_MILLI = 1e-3
_LOG_P_ERROR = 0.7  # of Crippen's atom contributions: Wildman & Crippen 1999, 0.68


def add_arguments(parser: argparse.ArgumentParser) -> None:
    """Describe the arguments of the command."""
    add_acid_arguments(parser)
    parser.add_argument(
        "--log-p",
        type=number,
        action="append",
        metavar="LOGP",
        help="log P of the uncharged acid between this solvent and water, once for each acid "
        "(default: estimated by Crippen's atom contributions, which are for octanol)",
    )
    parser.add_argument(
        "--amount", type=positive, default=10.0, metavar="MMOL", help="acid (default: 10 mmol)"
    )
    parser.add_argument(
        "--organic", type=positive, default=50.0, metavar="ML", help="organic layer (default: 50 mL)"
    )
    parser.add_argument("--water", type=positive, default=50.0, metavar="ML", help="water (default: 50 mL)")
    parser.add_argument(
        "--base",
        action="append",
        metavar="NAME",
        help="base to try, several times if wanted: hydrogencarbonate, carbonate, ammonia, pyridine, "
        "triethylamine, ethanolamine, triethanolamine, hydroxide, or NAME:pKa for another amine "
        "(default: all of these)",
    )
    parser.add_argument(
        "--equivalents",
        type=not_negative,
        default=2.0,
        metavar="N",
        help="formula units of base for each acid proton (default: 2)",
    )
    parser.add_argument(
        "--target",
        type=fraction,
        default=0.95,
        metavar="FRACTION",
        help="fraction wanted there (default: 0.95)",
    )
    parser.add_argument(
        "--into",
        choices=("water", "organic"),
        default="water",
        help="where the acid is wanted (default: water)",
    )
    parser.add_argument(
        "--co2",
        choices=("kept", "vented"),
        default="vented",
        help="CO2 kept in a closed vessel, or vented (default)",
    )
    parser.add_argument(
        "--headspace",
        type=not_negative,
        metavar="ML",
        help="gas above the liquid (default: half of the liquid)",
    )
    parser.add_argument(
        "--vented-to",
        type=positive,
        default=1.01325,
        metavar="BAR",
        help="CO2 left above the water after venting (default: 1.01325, one atmosphere)",
    )
    parser.add_argument(
        "--ionic-strength",
        type=not_negative,
        default=0.1,
        metavar="MOL_L",
        help="of the buffered water for the window of two acids, 0 to 0.5 (default: 0.1)",
    )
    parser.add_argument(
        "--window", type=Path, metavar="FILE", help="write the window of two acids as .csv, .xlsx or .json"
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
    from qsar.decisions.bases import BASES, base_named
    from qsar.decisions.workup import plan_workup

    if args.ionic_strength > 0.5:
        raise UserError("--ionic-strength: the Davies equation is used from 0 to 0.5 mol/L only")
    check_outputs(args)
    acids = Acids(args)
    with refusals():
        bases = [base_named(text) for text in args.base] if args.base else list(BASES)
    usable = _with_log_p(acids, args)
    if args.window is not None and len(usable) != 2:
        raise UserError(f"--window is for two acids; {len(usable)} could be used")
    results: list[Workup] = []
    with refusals(), progress(lambda: len(usable), "acids") as advance:
        for acid, log_p in usable:
            results.append(plan_workup(acid, log_p, _job(acid, args), bases, args.risk))
            advance(1)
    for position, result in enumerate(results):
        if position:
            print()
        _show(result)
        _show_log_p_error(result, bases, args.risk)
        if args.plot is not None:
            from qsar.decisions.plots import save, workup_figure

            save(workup_figure(result), numbered(args.plot, position, len(results)))
    if len(results) == 2:
        _two_acids(results, args)
    if results:
        _show_notes(results, bases)
    if args.output is not None and results:
        write_table(args.output, COLUMNS, [row for result in results for row in _rows(result)])
    return acids.status


def _with_log_p(acids: Acids, args: argparse.Namespace) -> list[tuple[AcidSteps, LogP]]:
    """Usable acids with their log P; an acid without one is refused."""
    from qsar.decisions.speciation import log_p_of
    from qsar.decisions.steps import UnusableAcid
    from qsar.decisions.workup import check_partitions

    found = acids.all()
    given: Sequence[float] = args.log_p or ()
    if given and len(given) != len(found):
        raise UserError(
            f"--log-p is given {counted(len(given), 'time')} for {counted(len(found), 'acid')}; give it once for each"
        )
    pairs = []
    for i, acid in enumerate(found):
        try:
            check_partitions(acid)
        except UnusableAcid as problem:
            acids.refuse(acid.name, str(problem))
            continue
        log_p = log_p_of(acid, given[i] if given else None)
        if log_p is None:
            acids.refuse(acid.name, "no structure to estimate log P from; give --log-p")
        else:
            pairs.append((acid, log_p))
    return pairs


def _job(acid: AcidSteps, args: argparse.Namespace) -> Extraction:
    from qsar.decisions.workup import Extraction

    headspace = 0.5 * (args.organic + args.water) if args.headspace is None else args.headspace
    amount = args.amount * _MILLI
    return Extraction(
        amount,
        args.organic * _MILLI,
        args.water * _MILLI,
        args.equivalents * amount * len(acid.pka),
        args.target,
        args.into,
        args.co2,
        headspace * _MILLI,
        args.vented_to,
        args.temperature,
    )


def _show(result: Workup) -> None:
    from qsar.decisions.workup import gentler_alternative
    from qsar.decisions.worth_measuring import say_probability

    job = result.extraction
    show_acid(result.acid)
    show(
        f"{job.acid_mol / _MILLI:g} mmol, {job.organic_l / _MILLI:g} mL organic, {job.water_l / _MILLI:g} "
        f"mL water, {job.base_mol / _MILLI:g} mmol of base; {result.log_p.label}: {result.log_p.value:.2f}"
    )
    rows = [
        (
            outcome.base.name,
            f"{outcome.ph:.2f}",
            f"{100 * outcome.in_water:.1f} %",
            f"{100 * outcome.in_water_low:.1f} to {100 * outcome.in_water_high:.1f} %",
            f"{100 * outcome.deprotonated:.1f} %",
            f"{outcome.delta_pka:+.1f}",
            "yes" if outcome.sufficient else "no",
            f"{outcome.probability_sufficient:.3f}",
        )
        for outcome in result.outcomes
    ]
    interval = f"{100 * result.acid.coverage:g} % interval"
    wanted = f"{100 * job.target:g} % in {job.into}"
    show_table(("base", "pH", "in water", interval, "ionised", "ΔpKa", wanted, "probability"), rows)
    show(
        "ΔpKa: constant of the base's conjugate acid less that of the acid. probability: that the base brings "
        f"{wanted}, given how well the pKa is known."
    )
    if result.chosen is None:
        show(
            f"No base of this list brings {100 * job.target:g} % into the {job.into} layer in one extraction."
        )
        show(result.verdict.sentence)
        return
    what = "Gentlest that does" if job.into == "water" else "Strongest that leaves it there"
    show(f"{what}: {result.chosen.base.name}.")
    show(result.verdict.sentence)
    gentler = gentler_alternative(result)
    if gentler is not None:
        base, limit = gentler
        show(f"The next gentler base, {base.name}, would do below pKa {limit:.2f}.")
    if result.safe is None:
        show("No base of this list is safe at the accepted risk without a measurement.")
    elif result.safe is not result.chosen:
        wrong = 1.0 - result.safe.probability_sufficient
        show(
            f"Without a measurement take {result.safe.base.name}: wrong with probability "
            f"{say_probability(wrong)}."
        )


def _show_log_p_error(result: Workup, bases: Sequence[Base], risk: float) -> None:
    """Whether an error of an estimated log P would change the choice; its error often exceeds that of the pKa."""
    from qsar.decisions.speciation import LogP
    from qsar.decisions.workup import plan_workup

    if "Crippen" not in result.log_p.label:
        return
    towards = 1.0 if result.extraction.into == "water" else -1.0  # the direction that works against the target
    other = LogP(result.log_p.value + towards * _LOG_P_ERROR, result.log_p.label)
    chosen = plan_workup(result.acid, other, result.extraction, bases, risk).chosen
    before = None if result.chosen is None else result.chosen.base
    after = None if chosen is None else chosen.base
    if before is None:
        return
    start = f"At log P {other.value:.2f}, one standard error {'above' if towards > 0 else 'below'} the estimate,"
    if after == before:
        show(f"{start} {before.name} still does.")
    else:
        instead = "no base of this list does" if after is None else f"it takes {after.name}"
        show(f"{start} {before.name} no longer does and {instead}: give --log-p if you know it.")


def _two_acids(results: Sequence[Workup], args: argparse.Namespace) -> None:
    """Find, print, draw and write the window of two acids."""
    from qsar.decisions.window import Layered, find_window

    first, second = (Layered(result.acid, result.log_p) for result in results)
    with refusals():
        window = find_window(
            first,
            second,
            args.organic / args.water,
            max(args.target, 0.501),
            args.ionic_strength,
            args.temperature,
            args.risk,
        )
    print()
    for sentence in window.sentences:
        show(sentence)
    if args.plot is not None:
        from qsar.decisions.plots import save, window_figure

        save(window_figure(window), args.plot.with_name(f"{args.plot.stem}-window{args.plot.suffix}"))
    if args.window is not None:
        write_table(args.window, WINDOW_COLUMNS, [_window_row(window)])


def _show_notes(results: Sequence[Workup], bases: Sequence[Base]) -> None:
    """What the numbers leave out, and what can hurt."""
    from qsar.decisions.bases import CARBONIC_NOTE, WATER_NOTE
    from qsar.decisions.cautions import base_cautions, structural_cautions, with_reference

    print()
    show(WATER_NOTE)
    if any(base.is_carbonate for base in bases):
        show(CARBONIC_NOTE)
    if any("Crippen" in result.log_p.label for result in results):
        show(
            "An estimated log P is for octanol and may be off by 0.7, which moves every flip by as much; "
            "that is not in the intervals."
        )
    for note in dict.fromkeys(note for result in results for note in result.notes):
        show(f"{note[0].upper()}{note[1:]}.")
    pressure = max(outcome.co2_bar for result in results for outcome in result.outcomes)
    closed = results[0].extraction.co2 == "kept"
    lines = [
        line for result in results if result.acid.smiles for line in structural_cautions(result.acid.smiles)
    ]
    lines += base_cautions(bases, pressure, closed)
    for line in with_reference(list(dict.fromkeys(lines))):
        show(f"Caution: {line}" if line in lines else line)


def _rows(result: Workup) -> Iterator[Row]:
    """One row for each base."""
    job, verdict = result.extraction, result.verdict
    for outcome in result.outcomes:
        chosen = outcome is result.chosen
        decisive = verdict.step
        ends = [
            end for pair in outcome.holds_by_step[decisive - 1] for end in pair if abs(end) < float("inf")
        ]
        yield {
            "id": result.acid.name,
            "smiles": result.acid.smiles,
            "base": outcome.base.name,
            "ph": outcome.ph,
            "in_water": outcome.in_water,
            "low": outcome.in_water_low,
            "high": outcome.in_water_high,
            "deprotonated": outcome.deprotonated,
            "delta_pka": outcome.delta_pka,
            "sufficient": outcome.sufficient,
            "probability_sufficient": outcome.probability_sufficient,
            "step": decisive,
            "flips_at": ends[0] if ends else None,
            "co2_left_mmol": outcome.co2_left_mol / _MILLI,
            "co2_bar": outcome.co2_bar,
            "chosen": chosen,
            "probability_wrong": verdict.probability_wrong if chosen else None,
            "measure_to": verdict.measure_to if chosen else None,
            "log_p": result.log_p.value,
            "log_p_source": result.log_p.label,
            "target": job.target,
            "into": job.into,
            "co2": job.co2,
            "temperature_c": job.temperature_c,
            "beyond_davies": outcome.beyond_davies,
        }


def _window_row(window: Window) -> Row:
    return {
        "in_water": window.wet.acid.name,
        "in_organic": window.dry.acid.name,
        "target": window.target,
        "from_ph": window.from_ph.ph,
        "from_ph_low": window.from_ph.low,
        "from_ph_high": window.from_ph.high,
        "to_ph": window.to_ph.ph,
        "to_ph_low": window.to_ph.low,
        "to_ph_high": window.to_ph.high,
        "exists": window.exists,
        "probability_exists": window.probability_exists,
        "best_ph": window.best_ph,
        "probability_at_best": window.probability_at_best,
        "fraction_in_water": window.wet_in_water,
        "fraction_in_organic": window.dry_in_organic,
        "flips_when_difference_below": window.flips_when_difference_below,
        "probability_wrong": window.probability_wrong,
        "measure_first": window.measure_first,
        "measure_to": window.measure_to,
        "measure_both": window.measure_both,
    }
