"""Tasks of a service that misbehaves on request: they hang, fail, or end their process. Their numbers mean nothing."""

from __future__ import annotations

import os
import time
from typing import Any

HANGS, ENDS_PROCESS, FAILS = "CC(F)C(=O)O", "CC(I)C(=O)O", "CC(Br)C(=O)O"
HANGS_OVER_CONTRIBUTIONS = "CC(Cl)C(=O)O"


def open_desk(folder: object) -> None:
    """There is nothing to load."""


def predict(desk: None, records: list[tuple[str, str, str, str | None]], coverage: float) -> list[list[dict[str, Any]]]:
    return [[_row(*record)] for record in records]


def _row(identity: str, smiles: str, where: str, error: str | None) -> dict[str, Any]:
    misbehave(smiles)
    return {"id": identity, "smiles": smiles, "structure": smiles, "step": 1, "pka": 4.0, "domain": "inside"}


def misbehave(smiles: str) -> None:
    if smiles == HANGS:
        time.sleep(600)
    if smiles == ENDS_PROCESS:
        os._exit(9)
    if smiles == FAILS:
        raise ArithmeticError("made to fail")


def acid(desk: None, smiles: str, coverage: float, step: int, contributions: bool = True) -> dict[str, Any]:
    if smiles == HANGS_OVER_CONTRIBUTIONS and contributions:
        time.sleep(600)
    misbehave(smiles)
    return {"smiles": smiles, "name": "", "model": "", "shown_step": 1, "steps": [], "notes": []}


def read_file(desk: None, content: bytes, name: str, most: int) -> list[tuple[str, str, str, str | None]]:
    if content.startswith(b"hang"):
        time.sleep(600)
    return [(str(i), line, "", None) for i, line in enumerate(content.decode().split(), start=1)]


TASKS = {"predict": predict, "acid": acid, "read_file": read_file}
