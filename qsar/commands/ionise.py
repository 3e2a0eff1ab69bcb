"""``acidity ionise``: fractions of the protonation states, charge and log D against pH."""

from __future__ import annotations

import argparse
from collections.abc import Iterator
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
from qsar.commands.quantities import fraction, not_negative, number, ph, positive
from qsar.errors import UserError
from qsar.progress import progress

if TYPE_CHECKING:
    from qsar.decisions.speciation import Speciation
    from qsar.decisions.steps import AcidSteps

HELP = "fraction of each protonation state, charge and log D against pH"

COLUMNS = (
    "id", "smiles", "ph", "state", "charge", "fraction", "low", "high", "average_charge",
    "average_charge_low", "average_charge_high", "log_d", "log_d_low", "log_d_high", "log_p",
    "log_p_source", "coverage", "ionic_strength_m", "temperature_c",
)  # fmt: skip
_MOST_POINTS = 5000
_ION_PAIRS = 4.0  # units of log P by which the ion pair of a carboxylate lies lower (common practice: 3 to 4)


def add_arguments(parser: argparse.ArgumentParser) -> None:
    """Describe the arguments of the command."""
    add_acid_arguments(parser)
    parser.add_argument(
        "--ionic-strength",
        type=not_negative,
        default=0.0,
        metavar="MOL_L",
        help="0 to 0.5 mol/L (default: 0)",
    )
    parser.add_argument(
        "--log-p",
        type=number,
        metavar="LOGP",
        help="log P of the uncharged form for log D (default: estimated by Crippen's atom contributions)",
    )
    parser.add_argument("--from-ph", type=ph, default=0.0, metavar="PH", help="first pH (default: 0)")
    parser.add_argument("--to-ph", type=ph, default=14.0, metavar="PH", help="last pH (default: 14)")
    parser.add_argument(
        "--ph-step", type=positive, default=0.1, metavar="PH", help="step of pH (default: 0.1)"
    )
    parser.add_argument(
        "--at-ph",
        type=ph,
        metavar="PH",
        help="ask whether the acid is ionised at this pH, and how sure that is",
    )
    parser.add_argument(
        "--fraction",
        type=fraction,
        default=0.99,
        metavar="FRACTION",
        help="ionised fraction that is wanted (default: 0.99)",
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
        For conditions out of range or an output that cannot be written.
    """
    import numpy as np

    from qsar.decisions.speciation import log_p_of, speciation

    if args.to_ph <= args.from_ph:
        raise UserError(f"--to-ph {args.to_ph:g} must lie above --from-ph {args.from_ph:g}")
    points = (args.to_ph - args.from_ph) / args.ph_step
    if not 1 <= points <= _MOST_POINTS:
        raise UserError(
            f"--from-ph, --to-ph and --ph-step make {points:.0f} points; 1 to {_MOST_POINTS} are possible"
        )
    grid = args.from_ph + args.ph_step * np.arange(int(points + 1e-6) + 1)
    check_outputs(args)
    acids = Acids(args)
    results = []
    found = acids.all()
    with refusals(), progress(lambda: len(found), "acids") as advance:
        for acid in found:
            log_p = log_p_of(acid, args.log_p)
            results.append(speciation(acid, grid, args.ionic_strength, args.temperature, log_p))
            advance(1)
    for position, result in enumerate(results):
        if position:
            print()
        with refusals():
            _show(result, args)
        if args.plot is not None:
            from qsar.decisions.plots import save, speciation_figure

            save(speciation_figure(result), numbered(args.plot, position, len(results)))
    if args.output is not None and results:
        write_table(args.output, COLUMNS, [row for result in results for row in _rows(result)])
    return acids.status


def _rows(result: Speciation) -> Iterator[Row]:
    """One row for each pH and state."""
    acid, share, charge, log_d = result.acid, result.fraction, result.charge, result.log_d
    for i, at_ph in enumerate(result.ph):
        for lost, z in enumerate(acid.charges):
            yield {
                "id": acid.name,
                "smiles": acid.smiles,
                "ph": float(at_ph),
                "state": lost,
                "charge": int(z),
                "fraction": float(share.value[i, lost]),
                "low": float(share.low[i, lost]),
                "high": float(share.high[i, lost]),
                "average_charge": float(charge.value[i]),
                "average_charge_low": float(charge.low[i]),
                "average_charge_high": float(charge.high[i]),
                "log_d": None if log_d is None else float(log_d.value[i]),
                "log_d_low": None if log_d is None else float(log_d.low[i]),
                "log_d_high": None if log_d is None else float(log_d.high[i]),
                "log_p": None if log_d is None or result.log_p is None else result.log_p.value,
                "log_p_source": "" if log_d is None or result.log_p is None else result.log_p.label,
                "coverage": acid.coverage,
                "ionic_strength_m": result.ionic_strength_m,
                "temperature_c": result.temperature_c,
            }


def _show(result: Speciation, args: argparse.Namespace) -> None:
    acid = result.acid
    show_acid(acid)
    if args.output is None:
        _show_table(result, args)
    if result.log_d is not None and result.log_p is not None:
        show(
            f"{result.log_p.label}: {result.log_p.value:.2f}. Its error is not in the bands; ion pairs are "
            "left out, and with salt about they keep log D from falling much further than 4 units."
        )
    elif acid.charge_of_acid_form != 0:
        show(
            "No log D: the form without net charge is a zwitterion or does not exist; give --log-p if you "
            "know it."
        )
    _show_decision(acid, args)


def _show_table(result: Speciation, args: argparse.Namespace) -> None:
    """Print fractions with their bands, about one line for each pH unit."""
    from qsar.decisions.speciation import state_label

    acid = result.acid
    every = max(1, round(1.0 / args.ph_step))
    heading = ["pH", *(state_label(int(z), k) for k, z in enumerate(acid.charges)), "mean charge"]
    if result.log_d is not None:
        heading.append("log D")
    table = []
    for i in range(0, result.ph.size, every):
        share = result.fraction
        cells = [
            f"{share.value[i, k]:.3f} ({share.low[i, k]:.3f} to {share.high[i, k]:.3f})"
            for k in range(acid.charges.size)
        ]
        line = [f"{result.ph[i]:.2f}", *cells, f"{round(float(result.charge.value[i]), 2) + 0.0:+.2f}"]
        if result.log_d is not None and result.log_p is not None:
            value, floor = float(result.log_d.value[i]), result.log_p.value - _ION_PAIRS
            line.append(f"{value:.2f}" if value > floor else f"below {floor:.1f}")
        table.append(line)
    show_table(heading, table)


def _show_decision(acid: AcidSteps, args: argparse.Namespace) -> None:
    """Where the pH has to be, and whether a measurement would change that."""
    from qsar.decisions.ionised import ionised_verdict, safe_ph
    from qsar.decisions.speciation import ph_band_at_fraction

    conditions = {"ionic_strength_m": args.ionic_strength, "temperature_c": args.temperature}
    for step in range(1, len(acid.pka) + 1):
        for wanted in dict.fromkeys((0.5, args.fraction)):
            value, low, high = ph_band_at_fraction(acid, wanted, step, **conditions)
            lost = f"{step} proton{'s' if step > 1 else ''}"
            show(f"pH {value:.2f} ({low:.2f} to {high:.2f}): {100 * wanted:g} % has lost {lost}.")
    if args.at_ph is not None:
        print()
        show(ionised_verdict(acid, args.at_ph, args.fraction, 1, risk=args.risk, **conditions).sentence)
        return
    _, verdict = safe_ph(acid, args.fraction, 1, risk=args.risk, **conditions)
    print()
    show(verdict.sentence)
