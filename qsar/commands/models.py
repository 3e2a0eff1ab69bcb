"""``acidity models``: list the models, choose the one in use, add and delete."""

from __future__ import annotations

import argparse
from pathlib import Path
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from qsar.model.registry import Entry, Registry

HELP = "list models and choose which is in use"


def add_arguments(parser: argparse.ArgumentParser) -> None:
    """Describe the arguments of the command."""
    parser.add_argument(
        "action",
        nargs="?",
        default="list",
        choices=("list", "use", "delete", "add"),
        help="list (default); use NAME; delete NAME; add FOLDER, a bundle from elsewhere",
    )
    parser.add_argument("name", nargs="?", metavar="NAME", help="name of a model, or folder of a bundle for add")
    parser.add_argument(
        "--models", type=Path, metavar="FOLDER", help="folder of models (default: that of the user, or QSAR_MODELS)"
    )


def run(args: argparse.Namespace) -> int:
    """Run the command."""
    from qsar.errors import UserError
    from qsar.model.registry import Registry

    registry = Registry(args.models)
    if args.action == "list":
        if args.name:
            raise UserError(f"models list takes no name; did you mean `acidity models use {args.name}`?")
        print("\n".join(listing(registry)))
        return 0
    if not args.name:
        raise UserError(f"models {args.action}: name the model (`acidity models` lists them)")
    if args.action == "use":
        registry.use(args.name)
        print(f"{args.name} is in use")
    elif args.action == "delete":
        was_used = registry.delete(args.name)
        print(f"{args.name} is deleted" + (f"; {registry.in_use()} is in use" if was_used else ""))
    else:
        entry = registry.adopt(Path(args.name))
        print(f"{entry.name} is added; `acidity models use {entry.name}` puts it to use")
    return 0


def listing(registry: Registry) -> list[str]:
    """Lines of the list."""
    head = ("", "model", "date", "rows", "error", "table")
    rows = [head, *(_cells(entry) for entry in registry.entries())]
    widths = [max(len(row[k]) for row in rows) for k in range(len(head))]
    lines = ["  ".join(cell.ljust(w) for cell, w in zip(row, widths, strict=True)).rstrip() for row in rows]
    return [
        *lines,
        "* in use. rows: measured steps. error: mean absolute error of acids left out, pKa units.",
        f"own models: {registry.folder}",
    ]


def _cells(entry: Entry) -> tuple[str, ...]:
    mark = "*" if entry.in_use else ""
    if entry.problem:
        return mark, entry.name, "", "", "", f"cannot be used: {entry.problem}"
    card = entry.card
    metrics = card.get("metrics")
    error = metrics.get("out_of_fold_mean_absolute_error") if isinstance(metrics, dict) else None
    return (
        mark,
        entry.name,
        _text(card.get("date")),
        _text(card.get("steps")),
        f"{error:.3f}" if isinstance(error, float) else "",
        _tables(card.get("tables")) + (" (structures withheld)" if card.get("structures_withheld") is True else ""),
    )


def _tables(stored: object) -> str:
    names = [_text(t.get("name")) for t in stored if isinstance(t, dict)] if isinstance(stored, list) else []
    return " + ".join(names)


def _text(value: object) -> str:
    """What a card from elsewhere says, cut so that it cannot steer the terminal."""
    return "".join(c for c in str("" if value is None else value) if c.isprintable())[:40]
