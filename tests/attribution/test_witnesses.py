"""Measured matched pairs."""

from __future__ import annotations

import pytest

from qsar.attribution import Explained
from qsar.attribution.witnesses import TOLERANCE, find_pairs, key_of
from qsar.structures import read_acid
from qsar.substituents import decompose

# CRC Handbook of Chemistry and Physics, dissociation constants of organic acids and bases, 25 °C; from memory
HANDBOOK = [
    ("CC(=O)O", "acetic acid", 1, 4.756),
    ("O=C(O)CCl", "chloroacetic acid", 1, 2.87),
    ("O=C(O)C(Cl)Cl", "dichloroacetic acid", 1, 1.35),
    ("CCC(=O)O", "propanoic acid", 1, 4.87),
    ("CC(Cl)C(=O)O", "2-chloropropanoic acid", 1, 2.83),
    ("O=C(O)CCCl", "3-chloropropanoic acid", 1, 3.98),
    ("O=C(O)CCC(=O)O", "succinic acid", 1, 4.21),
    ("O=C(O)CCC(=O)O", "succinic acid", 2, 5.64),
]


def test_pairs_of_chlorine_against_hydrogen_are_found_by_distance() -> None:
    pairs = find_pairs(HANDBOOK).pairs
    alpha = pairs["*Cl", 2, "d", ""]
    assert sorted(round(p.difference, 3) for p in alpha) == [-2.04, -1.886, -1.52, -1.52]
    (beta,) = pairs["*Cl", 3, "d", ""]
    assert (beta.with_, beta.without) == ("3-chloropropanoic acid", "propanoic acid")
    assert beta.difference == pytest.approx(3.98 - 4.87)


def test_statistics_of_equal_carboxyl_groups_are_taken_off() -> None:
    pairs = find_pairs(HANDBOOK).pairs
    (neutral,) = pairs["*C(=O)O", 3, "d", ""]
    (ionised,) = pairs["*C(=O)[O-]", 3, "d", ""]
    assert neutral.difference == pytest.approx(4.21 + 0.30103 - 4.87, abs=1e-4)
    assert ionised.difference == pytest.approx(5.64 - 0.30103 - 4.87, abs=1e-4)


def test_witnesses_agree_or_contradict_by_the_range_of_the_pairs() -> None:
    pairs = find_pairs(HANDBOOK)
    acid = read_acid("ClCCC(=O)O")
    key = key_of(decompose(acid, acid.sites[0]), 0)
    assert pairs.witnesses(key, -0.80).verdict == "agrees"
    assert pairs.witnesses(key, -0.89 - TOLERANCE - 0.01).verdict == "contradicts"
    assert pairs.witnesses(key, +0.50).verdict == "contradicts"
    assert pairs.witnesses(("*Br", 3, "d", ""), -0.8).n == 0


def test_most_contributions_with_measured_pairs_agree_with_them(explained: list[Explained]) -> None:
    told = [x.witnesses for a in explained for e in a.steps for x in e.contributions if x.witnesses.n]
    assert len(told) > 100
    agree = sum(w.verdict == "agrees" for w in told)
    assert agree / len(told) > 0.8
    for w in told:
        assert w.low <= w.mean <= w.high and len(w.examples) == min(w.n, 3)
