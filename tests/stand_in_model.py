"""A model that misbehaves on request, for what no real model does: it hangs, fails, or ends its process.

Run as a script it is the command ``acidity`` with this model in place of the real one. Its numbers mean
nothing.
"""

from __future__ import annotations

import os
import sys
import time
from collections.abc import Sequence
from dataclasses import dataclass, field
from pathlib import Path

from rdkit import Chem

from qsar.errors import UserError

NAME = "stand-in"
FAILS = "CC(Br)C(=O)O"
ENDS_PROCESS = "CC(I)C(=O)O"
HANGS = "CC(F)C(=O)O"


@dataclass(frozen=True)
class Step:
    step: int
    pka: float
    low: float
    high: float
    coverage: float
    domain: str = "inside"
    reasons: tuple[str, ...] = ("a reason", "another")
    nearest: str = "CC(=O)O"
    nearest_pka: float | None = 4.756
    nearest_distance: float | None = 1 / 3
    measured: float | None = None
    pka_without: float | None = None
    model: str = NAME


@dataclass(frozen=True)
class Prediction:
    structure: str = ""
    steps: list[Step] = field(default_factory=list)
    error: str | None = None


class StandIn:
    def predict(self, acids: Sequence[object], coverage: float = 0.9) -> list[Prediction]:
        return [self._one(acid, coverage) for acid in acids]

    def _one(self, acid: object, coverage: float) -> Prediction:
        if isinstance(acid, Exception):
            return Prediction(error=str(acid))
        mol = Chem.MolFromSmiles(acid) if isinstance(acid, str) else acid.mol  # type: ignore[attr-defined]
        if mol is None:
            return Prediction(error=f"{acid} is not a SMILES")
        sites = len(mol.GetSubstructMatches(Chem.MolFromSmarts("C(=O)[OX2H1]")))
        if not sites:
            return Prediction(error="no COOH")
        if acid == FAILS:
            raise ArithmeticError("made to fail")
        if acid == ENDS_PROCESS:
            os._exit(9)
        if acid == HANGS:
            sys.stderr.write("hanging\n")
            sys.stderr.flush()
            time.sleep(60)
        smiles = Chem.MolToSmiles(mol)
        pka = 3 + mol.GetNumAtoms() / 7
        return Prediction(
            smiles, [Step(k + 1, pka + k, pka + k - 0.3, pka + k + 0.3, coverage) for k in range(sites)]
        )


def open_stand_in(folder: Path | None = None) -> StandIn:
    if folder is not None:
        raise UserError(f"{folder}: no model there")
    return StandIn()


if __name__ == "__main__":
    import stand_in_model  # under its own name, so that workers can find it

    from qsar.cli import main
    from qsar.commands import predict

    predict.open_model = stand_in_model.open_stand_in
    sys.exit(main())
