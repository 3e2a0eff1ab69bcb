"""Bulk beside the carboxyl group, in Charton's nu.

J. Am. Chem. Soc. 1975, 97, 1552: methyl 0.52, ethyl 0.56, isopropyl 0.76, t-butyl 1.24, Cl 0.55, NO2 0.76 (from
memory).
"""

from __future__ import annotations

import pytest
from descriptors.worked import check, describe, not_worked

CASES: list[tuple[str, dict[str, float]]] = [
    # 2-methyl-6-nitrobenzoic acid
    (
        "Cc1cccc([N+](=O)[O-])c1C(=O)O",
        {
            "ortho_count": 2,
            "ortho_bulk": 0.52 + 0.76,
            "ortho_largest": 0.76,
            "ortho_both": 1,
            "ortho_alkyl": 1,
            "ortho_nitro": 1,
            "ortho_halogen": 0,
            "ortho_fused": 0,
        },
    ),
    ("OC(=O)c1ccccc1Cl", {"ortho_count": 1, "ortho_bulk": 0.55, "ortho_both": 0, "ortho_halogen": 1}),
    # two ortho groups: the sum of their sigma_I, 2 * 0.47 and -0.01 + 0.65; one alone does not count
    ("OC(=O)c1c(Cl)cccc1Cl", {"ortho_pair_sigma": 0.94, "ortho_both": 1}),
    ("Cc1cccc([N+](=O)[O-])c1C(=O)O", {"ortho_pair_sigma": 0.64}),
    ("OC(=O)c1ccccc1[N+](=O)[O-]", {"ortho_pair_sigma": 0}),
    ("OC(=O)c1ccccc1C(C)(C)C", {"ortho_bulk": 1.24, "ortho_alkyl": 1}),
    ("OC(=O)c1ccccc1OC", {"ortho_ether": 1}),
    ("OC(=O)c1ccccc1C(C)=O", {"ortho_carbonyl": 1}),
    ("OC(=O)c1ccc(C)cc1", {"ortho_count": 0, "ortho_alkyl": 0}),
    # 1-naphthoic acid: the second ring is fused beside the COOH; 2-naphthoic acid: not
    ("OC(=O)c1cccc2ccccc12", {"ortho_fused": 1, "ortho_count": 0}),
    ("OC(=O)c1ccc2ccccc2c1", {"ortho_fused": 0}),
    # 4-pyridone-3-carboxylic acid: the ring carbonyl beside the COOH
    ("O=c1cc[nH]cc1C(=O)O", {"ortho_ring_carbonyl": 1, "ortho_count": 1}),
    # 2-methylpropanoic acid: two methyls on the alpha carbon
    ("CC(C)C(=O)O", {"alpha_bulk": 1.04, "beta_bulk": 0}),
    # 3-methylbutanoic acid: isopropyl on the alpha carbon, two methyls on the beta; these are three bonds away
    ("CC(C)CC(=O)O", {"alpha_bulk": 0.76, "beta_bulk": 1.04, "atoms_at_three": 2, "atoms_at_four": 0}),
    # hexanoic acid: C4, C5, C6 are three, four and five bonds from C1
    ("CCCCCC(=O)O", {"atoms_at_three": 1, "atoms_at_four": 1, "atoms_at_five": 1, "alpha_bulk": 0.56}),
    ("CC(=O)O", {"alpha_bulk": 0, "beta_bulk": 0, "atoms_at_three": 0}),
]


@pytest.mark.parametrize(("smiles", "expected"), CASES)
def test_worked_by_hand(smiles: str, expected: dict[str, float]) -> None:
    check(smiles, expected)


def test_every_column_is_worked() -> None:
    assert not_worked("steric", CASES) == set()


def test_bulk_of_the_alpha_group_grows_with_branching() -> None:
    # CH3 < C2H5 < CH(CH3)2 < C(CH3)3 in nu
    found = [describe(s)["alpha_bulk"] for s in ("CCC(=O)O", "CCCC(=O)O", "CC(C)CC(=O)O", "CC(C)(C)CC(=O)O")]
    assert found == sorted(found)
    assert len(set(found)) == 4
