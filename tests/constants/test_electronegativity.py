"""Group electronegativity against cases worked by hand and published scales."""

from __future__ import annotations

import random
from collections.abc import Callable

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy.stats import spearmanr

from qsar.constants import (
    Substituent,
    equalised_electronegativity,
    group_electronegativity,
    group_electronegativity_of_smiles,
    group_graph,
    substituents,
)

GROUPS = [row for row in substituents() if row.group != "H"]


def equalised(smiles: str) -> float:
    return equalised_electronegativity(*group_graph(smiles))


@pytest.mark.parametrize(
    ("smiles", "expected"),
    [
        ("[*]C", 4 / (1 / 2.55 + 3 / 2.20)),
        ("[*]C(F)(F)F", 4 / (1 / 2.55 + 3 / 3.98)),
        ("[*]O", 2 / (1 / 3.44 + 1 / 2.20)),
        ("[*]C#N", 2 / (1 / 2.55 + 1 / 3.04)),
        ("[*][N+](=O)[O-]", 3 / (1 / 3.04 + 2 / 3.44)),
        ("[*][NH3+]", (4 + 1) / (1 / 3.04 + 3 / 2.20)),
        ("[*]C(=O)[O-]", (3 - 1) / (1 / 2.55 + 2 / 3.44)),
        ("[*]F", 3.98),
        ("[*][O-]", 0.0),
    ],
)
def test_equalisation_by_hand(smiles: str, expected: float) -> None:
    """Bratsch 1985: (n + q) / sum(1 / chi), written out with Pauling's values."""
    assert equalised(smiles) == pytest.approx(expected, abs=1e-12)


@pytest.mark.parametrize(
    ("smiles", "expected"),
    [
        # weights: attached atom 1, next shell 1/2, then 1/4; sp carbon 2.55 + 0.81, sp2 carbon 2.55 + 0.27
        ("[*]C", 2.5 / (1 / 2.55 + 1.5 / 2.20)),
        ("[*]O", 1.5 / (1 / 3.44 + 0.5 / 2.20)),
        ("[*]OC", (1 + 0.5 + 0.75) / (1 / 3.44 + 0.5 / 2.55 + 0.75 / 2.20)),
        ("[*]C#N", 1.5 / (1 / 3.36 + 0.5 / 3.04)),
        ("[*][NH3+]", (2.5 + 1) / (1 / 3.04 + 1.5 / 2.20)),
        ("[*]C(=O)O", 2.25 / (1 / 2.82 + 1 / 3.44 + 0.25 / 2.20)),
        ("[*]C(=O)[O-]", (2 - 0.5) / (1 / 2.82 + 1 / 3.44)),
        # a quarter of the dipole stays: +1/4 on N, -1/4 on one O of weight 1/2
        ("[*][N+](=O)[O-]", (2 + 0.25 - 0.125) / (1 / 3.04 + 1 / 3.44)),
        # +2/4 on S, -1/4 on each of two O of weight 1/2
        ("[*]S(=O)(=O)C", (3.25 + 0.5 - 0.25) / (1 / 2.58 + 1 / 3.44 + 0.5 / 2.55 + 0.75 / 2.20)),
    ],
)
def test_weighted_equalisation_by_hand(smiles: str, expected: float) -> None:
    assert group_electronegativity_of_smiles(smiles) == pytest.approx(expected, abs=1e-12)


def test_against_the_scale_of_wells() -> None:
    """Wells 1968, 17 groups (values from memory).

    Eleven lie within 0.2. The formula gives vinyl and phenyl 0.4 to 0.5 too little and falls 0.8 short for
    OH and NH2, whose hydrogens pull the mean down; CH2Cl is 0.26 short; iodine keeps Pauling's
    2.66 where Wells has 2.28.
    """
    rows = [row for row in GROUPS if row.group_electronegativity is not None]
    misses = {
        row.group: group_electronegativity_of_smiles(row.smiles) - float(row.group_electronegativity or 0)
        for row in rows
    }
    assert len(misses) == 17
    far = {group for group, miss in misses.items() if abs(miss) > 0.2}
    assert far == {"OH", "NH2", "CH=CH2", "C6H5", "CH2Cl", "I"}
    assert float(np.median(np.abs(list(misses.values())))) < 0.2


def rank_correlation(name: str, formula: str = "weighted") -> tuple[float, int]:
    rows = [row for row in GROUPS if getattr(row, name) is not None]
    compute = group_electronegativity_of_smiles if formula == "weighted" else equalised
    published = [getattr(row, name) for row in rows]
    return float(spearmanr(published, [compute(row.smiles) for row in rows])[0]), len(rows)


@pytest.mark.parametrize(
    ("name", "least_rows", "least"),
    [("sigma_i", 60, 0.84), ("taft_star", 70, 0.88), ("group_electronegativity", 17, 0.60)],
)
def test_ranks_groups_as_published_scales_do(name: str, least_rows: int, least: float) -> None:
    """Measured: sigma_I 0.86 (63 groups), Taft sigma* 0.90 (77), Wells 0.65 (17); sources as in the table."""
    found, rows = rank_correlation(name)
    assert rows >= least_rows
    assert found > least


@pytest.mark.parametrize("name", ["sigma_i", "taft_star", "group_electronegativity"])
def test_weighting_by_distance_beats_plain_equalisation(name: str) -> None:
    """Measured with plain equalisation: sigma_I 0.79, sigma* 0.86, Wells 0.45."""
    assert rank_correlation(name)[0] > rank_correlation(name, "plain")[0]


def test_halogens_and_halogenated_methyl_rank_by_their_inductive_constants() -> None:
    """Charton 1981: F > Cl >= Br > I; CF3 > CHF2 > CH2F > CH3, CCl3 > CHCl2 > CH2Cl > CH3."""
    for series in (
        ["[*]F", "[*]Cl", "[*]Br", "[*]I"],
        ["[*]C(F)(F)F", "[*]C(F)F", "[*]CF", "[*]C"],
        ["[*]C(Cl)(Cl)Cl", "[*]C(Cl)Cl", "[*]CCl", "[*]C"],
        ["[*]C#C", "[*]C=C", "[*]CC"],
    ):
        values = [group_electronegativity_of_smiles(smiles) for smiles in series]
        assert values == sorted(values, reverse=True)


@pytest.mark.parametrize(
    ("cation", "neutral", "anion"),
    [
        ("[*][NH3+]", "[*]N", "[*][NH-]"),
        ("[*][OH2+]", "[*]O", "[*][O-]"),
        ("[*]C(O)=[OH+]", "[*]C(=O)O", "[*]C(=O)[O-]"),
    ],
)
def test_a_proton_gained_raises_and_a_proton_lost_lowers(cation: str, neutral: str, anion: str) -> None:
    """Common practice, no source."""
    for formula in (group_electronegativity_of_smiles, equalised):
        assert formula(cation) > formula(neutral) > formula(anion)


@pytest.mark.parametrize(
    ("one", "other"),
    [
        ("[*]S(C)=O", "[*][S+](C)[O-]"),
        ("[*]P(C)(C)=O", "[*][P+](C)(C)[O-]"),
        ("[*]S(C)(=O)=O", "[*][S+2](C)([O-])[O-]"),
    ],
)
def test_one_value_however_a_dipole_is_drawn(one: str, other: str) -> None:
    assert group_electronegativity_of_smiles(one) == pytest.approx(
        group_electronegativity_of_smiles(other), abs=1e-12
    )
    assert equalised(one) == pytest.approx(equalised(other), abs=1e-12)


@settings(deadline=None, max_examples=60)
@given(row=st.sampled_from(GROUPS), seed=st.integers(0, 2**16))
def test_the_order_of_atoms_does_not_matter(row: Substituent, seed: int) -> None:
    numbers, neighbours, atoms, anchor, hydrogens, charges = group_graph(row.smiles)
    new = list(range(len(numbers)))
    random.Random(seed).shuffle(new)
    old = sorted(new, key=new.__getitem__)
    for place, goal in enumerate(new):
        old[goal] = place
    shuffled = (
        [numbers[i] for i in old],
        [[new[j] for j in reversed(neighbours[i])] for i in old],
        [new[i] for i in atoms],
        new[anchor],
        [hydrogens[i] for i in old],
        [charges[i] for i in old],
    )
    for formula in (group_electronegativity, equalised_electronegativity):
        assert formula(*shuffled) == pytest.approx(
            formula(numbers, neighbours, atoms, anchor, hydrogens, charges), rel=1e-12
        )


@settings(deadline=None, max_examples=60)
@given(row=st.sampled_from(GROUPS), data=st.data())
def test_fluorine_for_hydrogen_raises_the_value(row: Substituent, data: st.DataObject) -> None:
    numbers, neighbours, atoms, anchor, hydrogens, charges = group_graph(row.smiles)
    bearers = [i for i in atoms if hydrogens[i]]
    if not bearers:
        return
    place = data.draw(st.sampled_from(bearers))
    last = len(numbers)
    changed = (
        [*numbers, 9],
        [[*n, last] if i == place else n for i, n in enumerate(neighbours)] + [[place]],
        [*atoms, last],
        anchor,
        [h - (i == place) for i, h in enumerate(hydrogens)] + [0],
        [*charges, 0],
    )
    before = (numbers, neighbours, atoms, anchor, hydrogens, charges)
    for formula in (group_electronegativity, equalised_electronegativity):
        assert formula(*changed) > formula(*before)


def test_hydrogens_may_be_counted_or_listed() -> None:
    counted = group_electronegativity([0, 6], [[1], [0]], [1], 1, [0, 3], [0, 0])
    neighbours = [[1], [0, 2, 3, 4], [1], [1], [1]]
    listed = group_electronegativity([0, 6, 1, 1, 1], neighbours, [1, 2, 3, 4], 1, [0] * 5, [0] * 5)
    assert counted == pytest.approx(listed, abs=1e-12)


@pytest.mark.parametrize("formula", [group_electronegativity, equalised_electronegativity])
def test_a_group_that_does_not_hang_together_is_refused(formula: Callable[..., float]) -> None:
    with pytest.raises(ValueError, match="anchor"):
        formula([0, 6], [[1], [0]], [1], 0, [0, 3], [0, 0])
    with pytest.raises(ValueError, match="not joined"):
        formula([6, 6, 6], [[1], [0, 2], [1]], [0, 2], 0, [3, 2, 3], [0, 0, 0])


@pytest.mark.parametrize("smiles", ["CC", "[*]C[*]", "[*]1CC1", "C(["])
def test_smiles_that_are_no_group_are_refused(smiles: str) -> None:
    with pytest.raises(ValueError, match=r"one dummy atom|cannot be read"):
        group_electronegativity_of_smiles(smiles)


def test_an_element_without_a_value_is_named() -> None:
    with pytest.raises(KeyError, match="atomic number 92"):
        group_electronegativity_of_smiles("[*][U]")
