"""Charges and second carboxyl groups with distance decay (Kirkwood & Westheimer, J. Chem. Phys. 1938, 6, 506).

n is the number of bonds from the carboxyl carbon to the atom that carries the charged group: 1 on the alpha atom.
"""

from __future__ import annotations

import pytest
from descriptors.worked import check, describe, not_worked

NEUTRAL: list[tuple[str, dict[str, float]]] = [
    # glycine: NH3+ on the alpha carbon, n = 1, every decay 1
    (
        "NCC(=O)O",
        {
            "cations": 1,
            "cation_g50": 1,
            "cation_g75": 1,
            "cation_inverse": 1,
            "cation_alpha": 1,
            "anions": 0,
            "net_charge": 1,
            "cation_in_ring": 0,
            "cation_pairs": 0,
        },
    ),
    # beta-alanine: n = 2
    ("NCCC(=O)O", {"cations": 1, "cation_g50": 0.5, "cation_g75": 0.75, "cation_inverse": 0.5, "cation_alpha": 0}),
    # lysine: n = 1 and 5; two ordered pairs of cations
    (
        "NCCCC[C@H](N)C(=O)O",
        {
            "cations": 2,
            "cation_g50": 1 + 0.5**4,
            "cation_g75": 1 + 0.75**4,
            "cation_inverse": 1.2,
            "net_charge": 2,
            "cation_pairs": 2,
        },
    ),
    # isonicotinic acid: the ring that carries COOH is itself protonated
    ("OC(=O)c1ccncc1", {"cations": 1, "cation_in_ring": 1, "net_charge": 1}),
    # sulfoacetic acid: sulfonate, n = 1
    ("OC(=O)CS(=O)(=O)O", {"anions": 1, "anion_nearest": 1, "net_charge": -1, "cations": 0}),
    # oxalic acid: the other group is the neighbour itself (n = 0)
    (
        "OC(=O)C(=O)O",
        {"carboxyls": 1, "carboxyl_g40": 1, "carboxyl_g70": 1, "carboxyl_nearest": 2, "carboxyl_geminal": 0},
    ),
    # malonic (n = 1), succinic (n = 2), glutaric acid (n = 3)
    (
        "OC(=O)CC(=O)O",
        {"carboxyls": 1, "carboxyl_g40": 1, "carboxyl_nearest": 1, "carboxyl_geminal": 1, "carboxyl_path_bulk": 0},
    ),
    (
        "OC(=O)CCC(=O)O",
        {"carboxyls": 1, "carboxyl_g40": 0.4, "carboxyl_g70": 0.7, "carboxyl_nearest": 0.5, "carboxyl_geminal": 0},
    ),
    ("OC(=O)CCCC(=O)O", {"carboxyl_g40": 0.16, "carboxyl_g70": 0.49, "carboxyl_nearest": 1 / 3, "anions": 0}),
    # 2,2-dimethylsuccinic acid: two methyls and one quaternary carbon on the path; weight 0.5**(n - 2) = 1
    ("OC(=O)CC(C)(C)C(=O)O", {"carboxyl_path_bulk": 2, "carboxyl_path_quaternary": 1, "carboxyl_path_unsaturated": 0}),
    # 3,3-dimethylglutaric acid: the same one bond further, weight 1/2
    ("OC(=O)CC(C)(C)CC(=O)O", {"carboxyl_path_bulk": 1, "carboxyl_path_quaternary": 0.5}),
    # fumaric and maleic acid: two unsaturated carbons between the groups, trans and cis
    ("OC(=O)/C=C/C(=O)O", {"carboxyl_path_unsaturated": 2, "carboxyl_cis": -1, "vicinal_splay": 0}),
    ("OC(=O)/C=C\\C(=O)O", {"carboxyl_path_unsaturated": 2, "carboxyl_cis": 1}),
    ("OC(=O)C=CC(=O)O", {"carboxyl_cis": 0}),
    # cis- and trans-cyclobutane-1,2-dicarboxylic acid: (1R,2S) is cis, (1R,2R) trans
    ("OC(=O)[C@H]1CC[C@H]1C(=O)O", {"carboxyl_cis": 1}),
    ("OC(=O)[C@H]1CC[C@@H]1C(=O)O", {"carboxyl_cis": -1}),
    # the same on small rings: 1 on a three-membered, 1/2 on a four-membered one
    ("OC(=O)[C@H]1CC[C@H]1C(=O)O", {"cis_small_ring": 0.5, "cis_small_ring_anion": 0}),
    ("OC(=O)[C@H]1C[C@@H]1C(=O)O", {"cis_small_ring": -1}),
    # carbons on the ammonium nitrogen besides the one that leads to the acid: N,N-dimethylglycine 2, betaine 3; one
    # bond further half as much
    ("CN(C)CC(=O)O", {"cation_substituents": 2, "cation_delocalised": 0}),
    ("C[N+](C)(C)CC(=O)O", {"cation_substituents": 3}),
    ("CN(C)CCC(=O)O", {"cation_substituents": 1}),
    # guanidinoacetic and 3-guanidinopropanoic acid: a delocalised cation
    ("NC(=N)NCC(=O)O", {"cation_delocalised": 1, "cation_substituents": 0}),
    ("NC(=N)NCCC(=O)O", {"cation_delocalised": 0.5}),
    # succinic acids: methyl counts 1, ethyl 1.5; the product of both ends
    ("OC(=O)CC(C)C(=O)O", {"vicinal_crowd": 0}),
    ("OC(=O)C(C)C(C)C(=O)O", {"vicinal_crowd": 1, "vicinal_crowd_anion": 0}),
    ("OC(=O)C(C)(C)C(C)(C)C(=O)O", {"vicinal_crowd": 4}),
    ("OC(=O)C(CC)C(CC)C(=O)O", {"vicinal_crowd": 2.25}),
    # dimethyl- and diethylmalonic acid: two alkyl groups (1) and half a point for each carbon that branches further
    ("OC(=O)C(C)(C)C(=O)O", {"geminal_bulk": 1, "geminal_bulk_anion": 0}),
    ("OC(=O)C(CC)(CC)C(=O)O", {"geminal_bulk": 2, "geminal_small_ring": 0}),
    # 1,1-dicarboxylic acids of cyclopropane and cyclobutane
    ("OC(=O)C1(CC1)C(=O)O", {"geminal_small_ring": 1, "geminal_bulk": 1}),
    ("OC(=O)C1(CCC1)C(=O)O", {"geminal_small_ring": 0.5}),
    # cyclobutene- and cyclohexene-1,2-dicarboxylic acid: 6 - ring size
    ("OC(=O)C1=C(CC1)C(=O)O", {"vicinal_splay": 2, "vicinal_splay_anion": 0}),
    ("OC(=O)C1=C(CCCC1)C(=O)O", {"vicinal_splay": 0}),
]
IONISED: list[tuple[str, dict[str, float]]] = [
    (
        "OC(=O)CC(=O)O",
        {
            "anions": 1,
            "anion_g50": 1,
            "anion_g75": 1,
            "anion_inverse": 1,
            "anion_nearest": 1,
            "carboxyls": 0,
            "net_charge": -1,
        },
    ),
    (
        "OC(=O)CCC(=O)O",
        {
            "anions": 1,
            "anion_g50": 0.5,
            "anion_g75": 0.75,
            "anion_inverse": 0.5,
            "anion_nearest": 0.5,
            "carboxyl_g40": 0,
        },
    ),
    ("OC(=O)CC(C)(C)C(=O)O", {"anion_path_bulk": 2, "anion_path_quaternary": 1, "carboxyl_path_bulk": 2}),
    ("OC(=O)/C=C/C(=O)O", {"anion_cis": -1}),
    ("OC(=O)/C=C\\C(=O)O", {"anion_cis": 1, "carboxyl_cis": 1}),
    ("OC(=O)C(CC)(CC)C(=O)O", {"geminal_bulk": 0, "geminal_bulk_anion": 2}),
    ("OC(=O)[C@H]1CC[C@H]1C(=O)O", {"cis_small_ring": 0, "cis_small_ring_anion": 0.5}),
    ("OC(=O)C(C)C(C)C(=O)O", {"vicinal_crowd": 0, "vicinal_crowd_anion": 1}),
    ("OC(=O)C1(CC1)C(=O)O", {"geminal_small_ring": 0, "geminal_small_ring_anion": 1}),
    ("OC(=O)C1=C(CC1)C(=O)O", {"vicinal_splay": 0, "vicinal_splay_anion": 2}),
]


@pytest.mark.parametrize(("smiles", "expected"), NEUTRAL)
def test_worked_by_hand(smiles: str, expected: dict[str, float]) -> None:
    check(smiles, expected)


@pytest.mark.parametrize(("smiles", "expected"), IONISED)
def test_worked_by_hand_with_the_other_group_ionised(smiles: str, expected: dict[str, float]) -> None:
    check(smiles, expected, ionised=True)


def test_every_column_is_worked() -> None:
    assert not_worked("charge", NEUTRAL + IONISED) == set()


def test_a_neutral_carboxyl_group_becomes_an_anion_and_nothing_else_is_counted_twice() -> None:
    citric = "OC(=O)CC(O)(C(=O)O)CC(=O)O"
    before, after = describe(citric), describe(citric, ionised=True)
    assert (before["carboxyls"], before["anions"]) == (2, 0)
    assert (after["carboxyls"], after["anions"]) == (0, 2)


def test_both_ends_of_a_symmetric_acid_see_the_same() -> None:
    for smiles in ("OC(=O)CC(C)(C)CC(=O)O", "OC(=O)[C@H]1CC[C@@H]1C(=O)O", "OC(=O)/C=C\\C(=O)O"):
        assert describe(smiles, "C(=O)[OX2H1]") == describe(smiles)
