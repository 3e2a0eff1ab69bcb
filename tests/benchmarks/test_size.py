"""Time of one prediction against heavy atoms and against carboxyl groups, as a plot."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path
from time import perf_counter

import numpy as np
import pytest

from qsar.model import load_model

REPEATS = 5
COPIES = 8


def by_atoms() -> dict[int, str]:
    """Acids of 5 to 150 heavy atoms: as many anilide units as fit, and what remains as an alkyl chain."""
    found = {}
    for atoms in (5, 10, 20, 30, 40, 60, 80, 100, 125, 150):
        units, rest = divmod(atoms - 4, 9)  # a unit C6H4-NH-CO has nine heavy atoms, COOH and the last carbon four
        found[atoms] = "OC(=O)" + "C" * rest + "c1ccc(NC(=O)" * units + "C" + ")cc1" * units
    return found


def by_groups() -> dict[int, str]:
    """Chain acids with one to six carboxyl groups."""
    return {n: "OC(=O)C" + "C(C(=O)O)C" * (n - 1) + "C" * (12 - 2 * n) for n in range(1, 7)}


def _milliseconds(model, smiles: str) -> float:  # type: ignore[no-untyped-def]
    """Best of several: other work on the machine only ever adds."""
    best = np.inf
    for _ in range(REPEATS):
        begun = perf_counter()
        model.predict([smiles] * COPIES)
        best = min(best, perf_counter() - begun)
    return 1000.0 * best / COPIES


def test_time_against_size(checkout: Path, tell: Callable[[str], None], pytestconfig: pytest.Config) -> None:
    from matplotlib.figure import Figure
    from rdkit import Chem

    model = load_model()
    atoms = {Chem.MolFromSmiles(s).GetNumHeavyAtoms(): s for s in by_atoms().values()}
    groups = by_groups()
    assert all(len(model.predict([s])[0].steps) == n for n, s in groups.items())
    assert all(len(model.predict([s])[0].steps) == 1 for s in atoms.values())
    sizes = {n: _milliseconds(model, s) for n, s in sorted(atoms.items())}
    bases = {n: _milliseconds(model, s) for n, s in groups.items()}
    figure = Figure(figsize=(7.0, 2.8), layout="constrained")
    for axes, times, label in zip(
        figure.subplots(1, 2), (sizes, bases), ("heavy atoms", "carboxyl groups"), strict=True
    ):
        axes.plot(list(times), list(times.values()), "o-", color="#0072b2", markersize=4)
        axes.set(xlabel=label, ylabel="ms a structure", ylim=(0, None))
        axes.grid(alpha=0.3)
    target = Path(pytestconfig.getoption("--plots") or checkout / "reports") / "time_by_size.png"
    figure.savefig(target, dpi=100)
    tell("ms by heavy atoms: " + ", ".join(f"{n}: {t:.2f}" for n, t in sizes.items()))
    tell("ms by carboxyl groups: " + ", ".join(f"{n}: {t:.2f}" for n, t in bases.items()))
    tell(f"plot in {target}")
