"""Descriptors of one carboxyl group by column name, for cases worked by hand."""

from __future__ import annotations

import math

from rdkit import Chem

from qsar.descriptors import EFFECTS, NAMES, Molecule, SiteView, site_descriptors
from qsar.structures import read_acid


def describe(smiles: str, site: str = "", ionised: bool = False) -> dict[str, float]:
    """Descriptors of one site.

    `site` is SMARTS whose first atom is the carboxyl carbon meant (the first one where empty); with `ionised`
    all other carboxyl groups have lost their proton.
    """
    acid = read_acid(smiles)
    carbon = acid.sites[0]
    if site:
        carbon = acid.mol.GetSubstructMatch(Chem.MolFromSmarts(site))[0]
        assert carbon in acid.sites
    others = frozenset(acid.sites) - {carbon} if ionised else frozenset()
    values = site_descriptors(SiteView(Molecule(acid.graph), carbon, others))
    assert len(values) == len(NAMES)
    return dict(zip(NAMES, values, strict=True))


def check(smiles: str, expected: dict[str, float], site: str = "", ionised: bool = False) -> None:
    """Compare the named columns with values worked by hand."""
    found = describe(smiles, site, ionised)
    wrong = {
        name: (found[name], value)
        for name, value in expected.items()
        if not math.isclose(found[name], value, abs_tol=1e-9)
    }
    assert not wrong, f"{smiles}: (found, by hand) {wrong}"


def not_worked(effect: str, cases: list[tuple]) -> set[str]:  # type: ignore[type-arg]
    """Columns of an effect for which no case has a value other than zero."""
    worked = {name for case in cases for name, value in case[1].items() if value}
    (mine,) = (e for e in EFFECTS if e.name == effect)
    return {column.name for column in mine.columns} - worked
