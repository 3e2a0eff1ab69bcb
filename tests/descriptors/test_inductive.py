"""Inductive columns: S(g) = sum of sigma_I * g**(n - 1), n bonds from the carboxyl carbon to the carrier.

Attenuation by a constant factor a bond: Branch & Calvin 1941; sigma_I: Charton, Prog. Phys. Org. Chem. 1981, 13,
119 (Cl 0.47, F 0.52, OCH3 0.27, from memory). Group electronegativity: Bratsch, J. Chem. Educ. 1985, 62, 101.
"""

from __future__ import annotations

from itertools import pairwise
from math import log, sqrt

import pytest
from descriptors.worked import check, describe, not_worked

from qsar.descriptors import LOWERS, NAMES

# Methoxy from its graph, each atom half the weight of the one before: top 1 + (1 + 3/2)/2 = 2.25; bottom
# 1/3.44 + (1/2.55 + 1.5/2.20)/2 = 0.827686; 2.25/0.827686 = 2.71842; hydrogen's 2.20 off.
METHOXY = 2.25 / (1 / 3.44 + (1 / 2.55 + 1.5 / 2.20) / 2) - 2.20

CASES: list[tuple[str, dict[str, float]]] = [
    # 3-chlorobutanoic acid: one Cl, its carbon two bonds away. Cl alone has Pauling's 3.16, 0.96 over hydrogen.
    (
        "CC(Cl)CC(=O)O",
        {
            "withdrawing_g25": 0.47 * 0.25,
            "withdrawing_g40": 0.47 * 0.4,
            "withdrawing_g60": 0.47 * 0.6,
            "withdrawing_pi_g60": 0.0,
            "withdrawing_pi_g80": 0.0,
            "withdrawing_largest": 0.188,
            "withdrawing_second": 0.0,
            "withdrawing_squares": 0.188**2,
            "withdrawing_root": sqrt(0.188),
            "withdrawing_within1": 0.0,
            "withdrawing_within2": 0.47,
            "withdrawing_within3": 0.47,
            "withdrawing_within4": 0.47,
            "withdrawing_chi_g40": (3.16 - 2.20) * 0.4,
            "withdrawing_damped_root": sqrt(0.15 + 0.188) - sqrt(0.15),
            "withdrawing_damped_log": log(1 + 0.188 / 0.15),
            "scaffold_sigma_g40": 0.0,
        },
    ),
    # 2-chloro-2-methoxyacetic acid: the scaffold itself withdraws 0.27, which damps what Cl adds
    (
        "COC(Cl)C(=O)O",
        {
            "withdrawing_g40": 0.47,
            "scaffold_sigma_g40": 0.27,
            "withdrawing_damped_root": sqrt(0.15 + 0.27 + 0.47) - sqrt(0.15 + 0.27),
            "withdrawing_damped_log": log(1 + 0.47 / (0.15 + 0.27)),
        },
    ),
    # chlorofluoroacetic acid: both on the alpha carbon, n = 1
    (
        "OC(=O)C(F)Cl",
        {
            "withdrawing_g25": 0.99,
            "withdrawing_g40": 0.99,
            "withdrawing_g60": 0.99,
            "withdrawing_largest": 0.52,
            "withdrawing_second": 0.47,
            "withdrawing_squares": 0.52**2 + 0.47**2,
            "withdrawing_root": sqrt(0.99),
            "withdrawing_within1": 0.99,
            "withdrawing_chi_g40": (3.98 - 2.20) + (3.16 - 2.20),
        },
    ),
    # 4-chlorobut-2-enoic acid: n = 3, and every path from the acid to C4 crosses the double bond
    (
        "OC(=O)/C=C/CCl",
        {
            "withdrawing_g40": 0.47 * 0.16,
            "withdrawing_pi_g60": 0.47 * 0.36,
            "withdrawing_pi_g80": 0.47 * 0.64,
            "withdrawing_within2": 0.0,
            "withdrawing_within3": 0.47,
        },
    ),
    # methoxyacetic acid: O on the alpha carbon; O is 3.44 - 2.55 = 0.89 over carbon, two bonds away: 0.5**0
    (
        "COCC(=O)O",
        {
            "scaffold_sigma_g25": 0.27,
            "scaffold_sigma_g40": 0.27,
            "scaffold_sigma_g60": 0.27,
            "scaffold_sigma_pi_g60": 0.0,
            "scaffold_largest": 0.27,
            "groups_alpha": 1.0,
            "groups_beta": 0.0,
            "scaffold_chi_g40": METHOXY,
            "scaffold_chi_atoms": 0.89,
            "withdrawing_g40": 0.0,
        },
    ),
    # 3-, 4- and 5-methoxyalkanoic acids: n = 2, 3, 4
    (
        "COCCC(=O)O",
        {
            "scaffold_sigma_g25": 0.27 * 0.25,
            "scaffold_sigma_g40": 0.27 * 0.4,
            "scaffold_largest": 0.108,
            "groups_alpha": 0.0,
            "groups_beta": 1.0,
            "scaffold_chi_g40": METHOXY * 0.4,
            "scaffold_chi_atoms": 0.445,
        },
    ),
    ("COCCCC(=O)O", {"scaffold_sigma_g60": 0.27 * 0.36, "groups_gamma": 1.0, "scaffold_chi_atoms": 0.2225}),
    ("COCCCCC(=O)O", {"scaffold_sigma_g60": 0.27 * 0.216, "groups_further": 1.0}),
    # 4-methoxybut-2-enoic acid: the ether is reached through the double bond only, n = 3
    ("COC/C=C/C(=O)O", {"scaffold_sigma_pi_g60": 0.27 * 0.36, "groups_gamma": 1.0}),
]


@pytest.mark.parametrize(("smiles", "expected"), CASES)
def test_worked_by_hand(smiles: str, expected: dict[str, float]) -> None:
    check(smiles, expected)


def test_every_column_is_worked() -> None:
    assert not_worked("inductive", CASES) == set()


@pytest.mark.parametrize(
    ("plain", "edited"),
    [
        (
            "CCCC(=O)O",
            ["CC(Cl)CC(=O)O", "CC(F)(F)CC(=O)O", "N#CC(C)CC(=O)O", "CC([N+](=O)[O-])CC(=O)O", "BrCC(I)CC(=O)O"],
        ),
        ("OC(=O)C1CCCC1", ["OC(=O)C1(F)CCCC1", "OC(=O)C1CC(F)(F)CC1", "OC(=O)C1(C#N)CCCC1"]),
        ("Cc1ccccc1C(=O)O", ["FC(F)(F)c1ccccc1C(=O)O", "N#CCc1ccccc1C(=O)O"]),
        ("C/C=C/C(=O)O", ["FC/C=C/C(=O)O", "FC(F)(F)/C=C/C(=O)O"]),
        ("OC(=O)CCC(=O)O", ["OC(=O)C(F)(F)C(F)(F)C(=O)O"]),
        ("C[C@H](N)C(=O)O", ["FC[C@H](N)C(=O)O"]),
    ],
)
def test_a_group_on_saturated_carbon_moves_the_constrained_columns_only(plain: str, edited: list[str]) -> None:
    # So that the trend holds by construction: every other column is that of the acid with hydrogen in its place.
    before = describe(plain)
    for smiles in edited:
        after = describe(smiles)
        moved = {n for n, lowers in zip(NAMES, LOWERS, strict=True) if not lowers and after[n] != before[n]}
        assert moved == set(), smiles
        assert after["withdrawing_g40"] > before["withdrawing_g40"]


def test_constrained_columns_fall_with_distance_and_grow_with_number() -> None:
    lowers = [n for n, low in zip(NAMES, LOWERS, strict=True) if low]
    chain = ["OC(=O)" + "C" * k + "C(Cl)" + "C" * (6 - k) for k in range(6)]
    rows = [describe(s) for s in chain]
    for near, far in pairwise(rows):
        assert all(near[n] >= far[n] for n in lowers)
    one, two, three = (describe(s) for s in ("OC(=O)CCl", "OC(=O)C(Cl)Cl", "OC(=O)C(Cl)(Cl)Cl"))
    for n in lowers:
        assert one[n] <= two[n] <= three[n]


def test_order_of_the_halogens() -> None:
    # sigma_I: F 0.52 > Cl 0.47 > Br 0.45 > I 0.39 (Charton 1981, from memory)
    found = [describe(f"OC(=O)C{x}")["withdrawing_g40"] for x in ("F", "Cl", "Br", "I")]
    assert found == sorted(found, reverse=True)
    assert len(set(found)) == 4
