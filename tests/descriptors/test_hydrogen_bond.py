"""Donors near the carboxylate: a donor atom d bonds from the carboxyl carbon closes a ring of d + 3 atoms.

The ring is O-C-...-X-H: glycolic acid 5, salicylic acid 6 (Dippy, Chem. Rev. 1939, 25, 151).
"""

from __future__ import annotations

import pytest
from descriptors.worked import check, not_worked

NEUTRAL: list[tuple[str, dict[str, float]]] = [
    ("OC(=O)CO", {"oh_ring5": 1, "oh_ring6": 0, "oh_ring6_rigid": 0}),
    ("OC(=O)CCO", {"oh_ring5": 0, "oh_ring6": 1}),
    ("OC(=O)CCCO", {"oh_ring6": 0, "oh_ring7": 1, "oh_ring7_rigid": 0}),
    ("OC(=O)CCCCO", {"oh_ring5": 0, "oh_ring6": 0, "oh_ring7": 0}),
    ("OC(=O)COC", {"oh_ring5": 0}),  # no hydrogen to give
    # salicylic acid; its meta and para isomers are out of reach; two OH beside the COOH
    ("Oc1ccccc1C(=O)O", {"oh_ring6": 1, "oh_ring6_rigid": 1, "oh_ortho_pair": 0}),
    ("Oc1cccc(C(=O)O)c1", {"oh_ring6": 0, "oh_ring7": 1, "oh_ring6_rigid": 0, "oh_ring7_rigid": 0}),
    ("Oc1ccc(C(=O)O)cc1", {"oh_ring5": 0, "oh_ring6": 0, "oh_ring7": 0}),
    ("Oc1cccc(O)c1C(=O)O", {"oh_ring6": 2, "oh_ring6_rigid": 2, "oh_ortho_pair": 1}),
    # 6-methylsalicylic acid: the second ortho group presses the COOH towards the OH
    ("Cc1cccc(O)c1C(=O)O", {"oh_ortho_buttressed": 1, "oh_ortho_pair": 0, "oh_ring6_rigid": 1}),
    ("Cc1ccc(C(=O)O)c(O)c1", {"oh_ortho_buttressed": 0, "oh_ring6_rigid": 1}),
    # 2-(hydroxyamino)benzoic acid: N closes a ring of six, O one of seven, both held in place by the ring
    ("ONc1ccccc1C(=O)O", {"oh_ring7": 1, "oh_ring7_rigid": 1, "nh_ring6": 1, "nh_ring6_rigid": 1}),
    # glycine, beta-alanine, 4-aminobutanoic acid; anthranilic acid
    ("NCC(=O)O", {"nh_ring5": 1, "nh_ring6": 0}),
    ("NCCC(=O)O", {"nh_ring5": 0, "nh_ring6": 1, "nh_ring6_rigid": 0}),
    ("NCCCC(=O)O", {"nh_ring6": 0, "nh_ring7": 1}),
    ("Nc1ccccc1C(=O)O", {"nh_ring6": 1, "nh_ring6_rigid": 1}),
    ("C[N+](C)(C)CC(=O)O", {"nh_ring5": 0}),
    # malonic acid: its other OH is three bonds away, 6; succinic acid 7; maleic and phthalic acid are held in place,
    # fumaric acid is held away
    ("OC(=O)CC(=O)O", {"cooh_ring6": 1, "cooh_ring7": 0, "hindered_monoanion": 0}),
    ("OC(=O)CCC(=O)O", {"cooh_ring6": 0, "cooh_ring7": 1, "cooh_ring7_rigid": 0}),
    ("OC(=O)/C=C\\C(=O)O", {"cooh_ring7": 1, "cooh_ring7_rigid": 1}),
    ("OC(=O)/C=C/C(=O)O", {"cooh_ring7_rigid": 0}),
    ("OC(=O)c1ccccc1C(=O)O", {"cooh_ring7": 1, "cooh_ring7_rigid": 1}),
]
IONISED: list[tuple[str, dict[str, float]]] = [
    # the proton of the monoanion: malonic 1; maleic held in place 2; succinic 1; glutaric too far
    ("OC(=O)CC(=O)O", {"hindered_monoanion": 1, "cooh_ring6": 0}),
    ("OC(=O)CCC(=O)O", {"hindered_monoanion": 1, "cooh_ring7": 0}),
    ("OC(=O)/C=C\\C(=O)O", {"hindered_monoanion": 2}),
    ("OC(=O)CCCC(=O)O", {"hindered_monoanion": 0}),
]


@pytest.mark.parametrize(("smiles", "expected"), NEUTRAL)
def test_worked_by_hand(smiles: str, expected: dict[str, float]) -> None:
    check(smiles, expected)


@pytest.mark.parametrize(("smiles", "expected"), IONISED)
def test_worked_by_hand_with_the_other_group_ionised(smiles: str, expected: dict[str, float]) -> None:
    check(smiles, expected, ionised=True)


def test_every_column_is_worked() -> None:
    assert not_worked("hydrogen bond", NEUTRAL + IONISED) == set()
