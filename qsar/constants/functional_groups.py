"""Constants of the functional-group kinds that descriptors meet, from ``functional_groups.csv``.

The inductive constant sigma_I and the resonance constant sigma_R of Charton (Prog. Phys. Org. Chem. 1981, 13,
119; from memory) do not come from the ionisation of meta- and para-benzoic acids, so that a benzoic acid that is
held out is not predicted with a constant that was made from its own pKa. The column ``estimated`` names the values
of a row that are no published ones but own estimates, set by analogy with a neighbouring group before any training.
"""

from __future__ import annotations

import csv
from dataclasses import dataclass
from functools import cache
from importlib.resources import files


@dataclass(frozen=True, slots=True)
class FunctionalGroup:
    """Constants of one kind of group.

    Attributes
    ----------
    kind : str
        Key used by :mod:`qsar.groups`.
    label : str
        Name for people.
    smiles : str
        A representative with its attachment point as ``[*]``; empty for the catch-all kind.
    sigma_i, sigma_r : float
        Inductive and resonance substituent constants, dimensionless.
    bulk : float
        Charton's steric constant nu, in units of 100 pm over hydrogen (for large groups the smaller profile).
    donor : bool
        Whether the group donates a hydrogen bond.
    """

    kind: str
    label: str
    smiles: str
    sigma_i: float
    sigma_r: float
    bulk: float
    donor: bool


@cache
def functional_groups() -> dict[str, FunctionalGroup]:
    """All kinds, by key."""
    text = files("qsar.constants").joinpath("functional_groups.csv").read_text(encoding="utf-8")
    return {
        row["kind"]: FunctionalGroup(
            row["kind"],
            row["label"],
            row["smiles"],
            float(row["sigma_i"]),
            float(row["sigma_r"]),
            float(row["bulk"]),
            row["donor"] == "1",
        )
        for row in csv.DictReader(text.splitlines())
    }
