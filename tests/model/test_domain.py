"""The domain: what was seen, and the verdict with its reasons."""

from __future__ import annotations

import numpy as np
import pytest

from qsar.descriptors import Molecule, SiteView
from qsar.model import Model
from qsar.model.domain import BORDERLINE, INSIDE, OUTSIDE, VERDICTS, Domain, environment, features_seen
from qsar.structures import read_acid


def view(smiles: str) -> SiteView:
    acid = read_acid(smiles)
    return SiteView(Molecule(acid.graph), acid.sites[0])


def domain(*smiles: str, borderline: float = 0.3, outside: float = 0.6) -> Domain:
    counted = Domain.of([[view(s)] for s in smiles], np.ones(1))
    return Domain(counted.counts, borderline, outside)


@pytest.mark.parametrize(
    ("smiles", "words"),
    [
        ("OC=O", "hydrogen"),
        ("CC(=O)O", "a saturated carbon of a chain"),
        ("OC(=O)C1CC1", "a saturated carbon of a 3-membered ring"),
        ("C=CC(=O)O", "an unsaturated carbon"),
        ("OC(=O)C1=CCCC1", "an unsaturated carbon in a 5-membered ring"),
        ("C#CC(=O)O", "an alkynyl carbon"),
        ("OC(=O)c1ccccc1", "an aromatic system of 6 atoms"),
        ("OC(=O)c1ccco1", "an aromatic system of 5 atoms with O"),
        ("OC(=O)c1cscn1", "an aromatic system of 5 atoms with NS"),
    ],
)
def test_environment_in_words(smiles: str, words: str) -> None:
    assert environment(view(smiles)) == words


def test_features_of_an_acid() -> None:
    found = set(features_seen(view("OC(=O)C(Cl)CCO")))
    assert {("group", "chloro"), ("group", "hydroxy"), ("site", "a saturated carbon of a chain")} <= found
    assert ("place", "chloro", "1", "chain") in found
    assert ("place", "hydroxy", "3", "chain") in found
    assert ("place", "chloro", "2", "ring") in set(features_seen(view("OC(=O)c1ccccc1Cl")))


def test_counts_are_of_acids_not_of_groups() -> None:
    d = domain("OC(=O)C(Cl)(Cl)Cl", "OC(=O)CCl")
    assert d.counts["group", "chloro"] == 2


def test_sparse_coverage_by_hand() -> None:
    # acetic acid shows one feature, its environment, which three acids share: 1 / (1 + 3); leaving itself out 1 / 3
    d = domain("CC(=O)O", "CCC(=O)O", "OC(=O)CCl")
    assert d.sparse(view("CC(=O)O")) == pytest.approx(1 / 4)
    assert d.sparse(view("CC(=O)O"), less=1) == pytest.approx(1 / 3)
    # chloroacetic acid: group (1), place (1) and environment (3)
    assert d.sparse(view("OC(=O)CCl")) == pytest.approx(1 / 2 + 1 / 2 + 1 / 4)
    assert d.sparse(view("OC(=O)CCl"), less=1) == pytest.approx(1 + 1 + 1 / 3)


MANY = ["CC(=O)O", "CCC(=O)O", "CCCC(=O)O", "OC(=O)CCl", "OC(=O)CCCl", "OC(=O)CCCCl"]


@pytest.mark.parametrize(
    ("smiles", "expected", "verdict", "word"),
    [
        ("CCCCC(=O)O", 0.1, INSIDE, "close to measured"),
        ("CCCCC(=O)O", 0.31, BORDERLINE, "expected error 0.31"),
        ("CCCCC(=O)O", 0.61, OUTSIDE, "expected error 0.61"),
        ("OC(=O)CF", 0.1, OUTSIDE, "no measured acid has a fluoro group"),
        ("OC(=O)c1ccccc1", 0.1, OUTSIDE, "no measured acid has its COOH on an aromatic system"),
    ],
)
def test_verdict(smiles: str, expected: float, verdict: str, word: str) -> None:
    found, reasons = domain(*MANY).judge(view(smiles), expected, "propanoic acid", 0.4)
    assert found == verdict
    assert any(word in r for r in reasons)
    assert any("propanoic acid" in r for r in reasons)


def test_a_known_group_in_a_new_place_is_borderline() -> None:
    found, reasons = domain("CC(=O)O", "CCC(=O)O", "OC(=O)CCl").judge(view("OC(=O)CCCl"), 0.1, "x", 0.1)
    assert found == BORDERLINE
    assert any("chloro group two bonds from the COOH" in r for r in reasons)


def test_a_rare_environment_is_borderline() -> None:
    found, reasons = domain("CC(=O)O", "CCC(=O)O", "CCCC(=O)O", "C=CC(=O)O").judge(view("C=C(C)C(=O)O"), 0.1, "x", 0.1)
    assert found != INSIDE
    assert any("only one measured acid has a COOH on an unsaturated carbon" in r for r in reasons)


def test_reasons_are_sentences_of_one_line() -> None:
    for smiles in ("CCCCC(=O)O", "OC(=O)CF", "OC(=O)c1ccncc1", "FC1CC1C(=O)O"):
        _, reasons = domain(*MANY).judge(view(smiles), 0.4, "x", 0.1)
        assert reasons
        assert all(r and "\n" not in r for r in reasons)


def test_error_rises_from_verdict_to_verdict(model: Model) -> None:
    # out-of-fold errors of the training acids, by the expected error that was known before they were measured
    library, d = model.library, model.domain
    error = np.abs(library.pka - library.pka_without)
    level = (library.expected_error > d.borderline_above).astype(int) + (library.expected_error > d.outside_above)
    means = [error[level == k].mean() for k in range(len(VERDICTS))]
    assert 0 < d.borderline_above < d.outside_above
    assert means[0] < means[1] < means[2]


def test_what_nobody_measured_is_outside(model: Model) -> None:
    # a tetrazole, a pteridine, a phosphonium and a cyclic boronate; the ones that the table has learnt are left out
    candidates = ["OC(=O)c1nnn[nH]1", "OC(=O)c1cnc2nccnc2n1", "OC(=O)C[P+](C)(C)C", "OC(=O)CB1OCCO1"]
    unseen = [
        s
        for s in candidates
        if any(f[0] in ("group", "site") and not model.domain.counts.get(f) for f in features_seen(view(s)))
    ]
    assert unseen
    for smiles in unseen:
        (step,) = model.predict([smiles])[0].steps
        assert step.domain == OUTSIDE
        assert any("no measured acid has" in reason for reason in step.reasons)


def test_common_acids_are_inside(model: Model) -> None:
    for smiles in ("CCCCC(=O)O", "OC(=O)c1ccc(C)cc1", "OC(=O)CCCl"):
        assert model.predict([smiles])[0].steps[0].domain == INSIDE
