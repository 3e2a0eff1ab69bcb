"""Advisories: each pattern on the acid that it is about, and not on its close relative.

What they say is general knowledge (common practice, no source): alpha-keto acids hydrate, gamma-hydroxy acids close
to lactones, beta-keto acids lose CO2, long chains form micelles.
"""

from __future__ import annotations

import pytest
from benchmarks.many_acids import LIMIT, acid

from qsar.advisories import Advisory, advise, advisories
from qsar.structures import read_acid


def names(smiles: str) -> set[str]:
    said = set(advise(read_acid(smiles).mol))
    return {a.name for a in advisories() if a.sentence in said}


@pytest.mark.parametrize("advisory", advisories(), ids=lambda a: a.name)
def test_the_table_s_own_examples(advisory: Advisory) -> None:
    assert advisory.pattern is not None
    assert advisory.name in names(advisory.positive)
    assert advisory.name not in names(advisory.negative)
    assert advisory.sentence.strip() == advisory.sentence and len(advisory.sentence) < 200


def test_names_are_unique() -> None:
    assert len({a.name for a in advisories()}) == len(advisories())
    assert len({a.sentence for a in advisories()}) == len(advisories())


@pytest.mark.parametrize(
    ("smiles", "wanted"),
    [
        ("CC(=O)C(=O)O", {"hydrate"}),  # pyruvic acid
        ("O=CC(=O)O", {"hydrate_aldehyde"}),  # glyoxylic acid
        ("CC(O)CCC(=O)O", {"gamma_hydroxy"}),  # 4-hydroxypentanoic acid
        ("OCc1ccccc1C(=O)O", {"gamma_hydroxy"}),  # closes to phthalide
        ("OCCCCC(=O)O", {"delta_hydroxy"}),
        ("CC(=O)CC(=O)O", {"decarboxylation"}),
        ("OC(=O)CC(=O)O", {"decarboxylation"}),
        ("OC(=O)C(Br)(Br)Br", {"decarboxylation_trihalo"}),
        ("CCCCCCCCCCCCCCCCCC(=O)O", {"micelle"}),
        ("CCCCCCCC/C=C\\CCCCCCCC(=O)O", {"micelle"}),  # oleic acid
        ("Oc1ccccc1C(=O)O", {"phenol"}),
        ("SCC(N)C(=O)O", {"thiol"}),
        ("OC(=O)CN1C(=O)CCC1=O", set()),  # an imide without N-H
    ],
)
def test_known_acids(smiles: str, wanted: set[str]) -> None:
    assert wanted <= names(smiles)


@pytest.mark.parametrize(
    "smiles",
    [
        "CC(=O)O",
        "OC(=O)c1ccccc1",
        "CC(O)C(=O)O",
        "OC(=O)CCC(=O)O",
        "C/C=C/C(=O)O",
        "OC(=O)CCl",
        "CC(C)C(=O)O",
        "OC(=O)c1ccco1",
    ],
)
def test_plain_acids_need_no_advice(smiles: str) -> None:
    assert names(smiles) == set()


def test_advice_does_not_depend_on_how_the_acid_was_written() -> None:
    assert names("[O-]C(=O)C(=O)C.[Na+]") == names("CC(=O)C(=O)O")


def test_leaving_out_patterns_that_cannot_match_changes_nothing() -> None:
    smiles = [a.positive for a in advisories()] + [a.negative for a in advisories()]
    smiles += [acid(number) for number in range(0, LIMIT, LIMIT // 1500)]
    for one in smiles:
        read = read_acid(one)
        assert advise(read.drawn, read.graph) == advise(read.mol)
