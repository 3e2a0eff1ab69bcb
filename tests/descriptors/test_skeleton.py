"""What carries the carboxyl group: counts that are read off the drawing.

Alkyl groups and chain: Taft 1956. Places of ring hetero atoms as in 2- and 3-furoic acid.
"""

from __future__ import annotations

from math import log

import pytest
from descriptors.worked import check, not_worked

CASES: list[tuple[str, dict[str, float]]] = [
    ("OC=O", {"formic": 1, "alpha_hydrogens": 0, "longest": 0}),
    # acetic acid: one atom besides the carboxyl group, ln(1 + 1)
    (
        "CC(=O)O",
        {
            "formic": 0,
            "alpha_hydrogens": 3,
            "alpha_carbons": 0,
            "log_atoms": log(2),
            "longest": 1,
            "saturated_carbons": 1,
        },
    ),
    ("CC(C)(C)C(=O)O", {"alpha_hydrogens": 0, "alpha_carbons": 3, "alpha_quaternary": 1}),
    ("C=CC(=O)O", {"alpha_unsaturated": 1, "alpha_hydrogens": 1, "saturated_carbons": 0}),
    ("COCC(=O)O", {"alpha_hetero": 1, "alpha_carbons": 0, "alpha_unsaturated": 0}),
    # 3-methylbutanoic acid: C2 at one bond, C3 at two, two methyls at three: 1 + 0.4 + 2 * 0.16
    (
        "CC(C)CC(=O)O",
        {
            "gamma_carbons": 2,
            "beta_branching": 1,
            "alkyl_g40": 1.72,
            "saturated_carbons": 4,
            "longest": 3,
            "log_atoms": log(5),
        },
    ),
    ("CCCCCC(=O)O", {"longest": 5, "beta_branching": 0}),
    ("OC(=O)C1CC1", {"ring3": 1, "ring4": 0}),
    ("OC(=O)C1CCC1", {"ring4": 1, "ring3": 0}),
    ("OC(=O)C1CCCC1", {"ring5": 1}),
    ("OC(=O)C1CCCCC1", {"ring6": 1, "ring_larger": 0, "ring_bridged": 0}),
    ("OC(=O)C1CCCCCC1", {"ring_larger": 1, "ring6": 0}),
    # decalin-4a-carboxylic acid: the COOH is on the carbon shared by two six-membered rings
    ("OC(=O)C12CCCCC1CCCC2", {"ring6": 2, "ring_bridged": 1}),
    # 2- and 3-substituted five-membered rings: position 1 is beside, 2 one further
    ("OC(=O)c1ccco1", {"ring_hetero5": 1, "ring_o_adjacent": 1, "ring_o_remote": 0}),
    ("OC(=O)c1ccoc1", {"ring_hetero5": 1, "ring_o_adjacent": 0, "ring_o_remote": 1}),
    ("OC(=O)c1cccs1", {"ring_s_adjacent": 1, "ring_s_remote": 0}),
    ("OC(=O)c1ccsc1", {"ring_s_adjacent": 0, "ring_s_remote": 1}),
    ("OC(=O)c1ccc[nH]1", {"ring_nh_adjacent": 1, "ring_nh_remote": 0}),
    ("OC(=O)c1cc[nH]c1", {"ring_nh_adjacent": 0, "ring_nh_remote": 1}),
    # picolinic, nicotinic and isonicotinic acid; para counts half
    ("OC(=O)c1ccccn1", {"ring_hetero5": 0, "ring_n_adjacent": 1, "ring_n_remote": 0}),
    ("OC(=O)c1cccnc1", {"ring_n_adjacent": 0, "ring_n_remote": 1}),
    ("OC(=O)c1ccncc1", {"ring_n_adjacent": 0, "ring_n_remote": 0.5}),
    ("OC(=O)C1CCCO1", {"ring_hetero_saturated": 1, "ring5": 1, "alpha_hetero": 1}),
    ("OC(=O)C1COCCN1", {"ring_hetero_saturated": 2}),
]


@pytest.mark.parametrize(("smiles", "expected"), CASES)
def test_worked_by_hand(smiles: str, expected: dict[str, float]) -> None:
    check(smiles, expected)


def test_every_column_is_worked() -> None:
    assert not_worked("skeleton", CASES) == set()
