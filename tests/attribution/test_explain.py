"""Attributions of the shipped model: the identity on many acids, and what the trade expects of simple ones."""

from __future__ import annotations

from math import log10

import pytest
from rdkit import Chem

from qsar.attribution import SITE_STATISTICS, Contribution, Explained, Explanation, explain, explain_many
from qsar.groups import CATIONIC, perceive
from qsar.model import Model
from qsar.structures import StructureError, read_acid


def only(model: Model, smiles: str) -> Explanation:
    (explanation,) = explain(model, smiles)
    return explanation


def groups(explanation: Explanation) -> list[Contribution]:
    return [line for line in explanation.contributions if line.atoms]


def statistics(explanation: Explanation) -> list[float]:
    return [x.contribution for x in explanation.contributions if x.substituent == SITE_STATISTICS]


def test_contributions_add_up_on_every_acid(explained: list[Explained]) -> None:
    steps = [e for answer in explained for e in answer.steps]
    assert len(steps) > 200
    assert sum(len(e.acid.sites) > 1 for e in steps) > 50
    assert sum(any(g.kind in CATIONIC for g in perceive(e.acid.graph)) for e in steps) > 50
    for e in steps:
        total = e.parent_pka + sum(line.contribution for line in e.contributions)
        assert total == pytest.approx(e.pka, abs=1e-9), e.smiles


def test_the_sum_is_the_predicted_pka(model: Model, explained: list[Explained]) -> None:
    again = model.predict([answer.prediction.structure for answer in explained[:40]])
    for answer, prediction in zip(explained, again, strict=False):
        for e, step in zip(answer.steps, prediction.steps, strict=True):
            assert e.pka == pytest.approx(step.pka, abs=1e-9)


@pytest.mark.parametrize("isomers_open", ["CC=CC(=O)O", "OC(=O)C1CCC1C(=O)O", "OC(=O)C=CC(=O)O", "CC(Cl)=C(F)C(=O)O"])
def test_contributions_add_up_where_the_configuration_is_open(model: Model, isomers_open: str) -> None:
    (prediction,) = model.predict([isomers_open])
    for e, step in zip(explain(model, isomers_open), prediction.steps, strict=True):
        total = e.parent_pka + sum(line.contribution for line in e.contributions)
        assert total == pytest.approx(step.pka, abs=1e-9)


EXPECTED = [
    # common practice, no source: share per chlorine; ± 0.3
    ("ClCC(=O)O", "α-chloro", -1.9),
    ("ClC(Cl)C(=O)O", "α-chloro", -1.7),
    ("ClC(Cl)(Cl)C(=O)O", "α-chloro", -1.3),
    ("ClCCC(=O)O", "β-chloro", -0.7),
    ("ClCCCC(=O)O", "γ-chloro", -0.3),
]


@pytest.mark.parametrize(("smiles", "name", "share"), EXPECTED)
def test_shares_of_chlorine_are_those_the_trade_expects(model: Model, smiles: str, name: str, share: float) -> None:
    lines = groups(only(model, smiles))
    assert {line.substituent for line in lines} == {name}
    for line in lines:
        assert line.contribution == pytest.approx(share, abs=0.3)


def test_an_acid_without_substituents_has_no_contributions(model: Model) -> None:
    for smiles in ("O=CO", "CC(=O)O", "OC(=O)c1ccccc1", "OC(=O)C=C", "OC(=O)C1CCCCC1"):
        e = only(model, smiles)
        assert e.contributions == ()
        assert e.parent_pka == pytest.approx(e.pka, abs=1e-9)


@pytest.mark.parametrize(
    "smiles", ["ClC(Cl)C(=O)O", "Cc1cccc(C)c1C(=O)O", "CC(C)=CC(=O)O", "CCC(CC)(CC)C(=O)O", "ClCCC(CCCl)C(=O)O"]
)
def test_equal_groups_have_equal_shares_and_a_row_each(model: Model, smiles: str) -> None:
    e = only(model, smiles)
    rank = list(Chem.CanonicalRankAtoms(e.acid.mol, breakTies=False))
    classes: dict[int, list[Contribution]] = {}
    for line in groups(e):
        classes.setdefault(rank[line.atoms[0]], []).append(line)
    assert max(map(len, classes.values())) > 1
    for lines in classes.values():
        assert {line.contribution for line in lines} == {lines[0].contribution}
        assert {(line.low, line.high) for line in lines} == {(lines[0].low, lines[0].high)}


def test_site_statistics_of_a_symmetric_dibasic_acid_are_log10_2(model: Model) -> None:
    # two equal sites: the macroscopic step is log10 2 below or above the micro one (N. Bjerrum, 1923)
    for smiles in ("OC(=O)CCC(=O)O", "OC(=O)c1ccc(cc1)C(=O)O", "OC(=O)C(=O)O", "OC(=O)CCCCC(=O)O"):
        first, second = explain(model, smiles)
        assert statistics(first) == pytest.approx([-log10(2)], abs=1e-9)
        assert statistics(second) == pytest.approx([log10(2)], abs=1e-9)


def test_site_statistics_are_absent_where_they_are_zero(model: Model) -> None:
    for smiles in ("ClCC(=O)O", "NCC(=O)O", "OC(=O)c1ccncc1"):
        assert statistics(only(model, smiles)) == []


def test_the_other_groups_of_polybasic_acids_and_zwitterions_are_substituents(model: Model) -> None:
    first, second = explain(model, "OC(=O)CCC(=O)O")
    assert [x.substituent for x in groups(first)] == ["β-carboxy"]
    assert [x.substituent for x in groups(second)] == ["β-carboxylate"]
    # a carboxyl group lowers, a carboxylate raises, an ammonium group lowers strongly (Kirkwood & Westheimer 1938)
    assert groups(first)[0].contribution < 0 < groups(second)[0].contribution
    (ammonium,) = groups(only(model, "NCC(=O)O"))
    assert ammonium.substituent == "α-ammonio" and ammonium.contribution < -1.5


@pytest.mark.parametrize("smiles", ["ClCC(=O)O", "CC(C)Cc1ccc(cc1)C(C)C(=O)O", "COc1cccc(C(=O)O)c1Cl", "OCC(F)CC(=O)O"])
def test_parent_and_lone_substituent_are_molecules_that_can_be_predicted(model: Model, smiles: str) -> None:
    from qsar.attribution.coalitions import hypothetical

    e = only(model, smiles)
    (parent,) = model.predict([e.parent])
    assert parent.steps[0].pka == pytest.approx(e.parent_pka, abs=1e-9)
    for k, line in enumerate(groups(e)):
        below: list[int] = []
        above = line.carrier
        while above is not None:
            below.append(above)
            above = groups(e)[above].carrier
        pair = [hypothetical(e.acid, e.decomposition, e.ionised, s).smiles for s in ([*below, k], below)]
        with_, without = model.predict(pair)
        assert line.alone == pytest.approx(with_.steps[0].pka - without.steps[0].pka, abs=1e-9)


def test_two_players_share_their_interaction_evenly(model: Model) -> None:
    # for two free players the Shapley value is the mean of "first" and "last": alone + half the interaction
    e = only(model, "ClCC(F)C(=O)O")
    for line in groups(e):
        assert line.alone is not None and line.pair_interaction is not None
        assert line.contribution == pytest.approx(line.alone + 0.5 * line.pair_interaction, abs=1e-9)


def test_mirror_images_get_the_same_shares(model: Model) -> None:
    left, right = (only(model, s) for s in ("N[C@@H](CO)C(=O)O", "N[C@H](CO)C(=O)O"))
    assert [x.contribution for x in left.contributions] == pytest.approx(
        [x.contribution for x in right.contributions], abs=1e-9
    )


def test_many_players_are_sampled_and_the_error_is_stated(model: Model) -> None:
    e = only(model, "OC(=O)" + "C(F)(F)" * 7 + "C(F)(F)F")
    assert not e.exact
    assert any("sampled" in note for note in e.notes)
    assert any(line.sampling_error > 0 for line in e.contributions)
    assert e.parent_pka + sum(x.contribution for x in e.contributions) == pytest.approx(e.pka, abs=1e-9)


def test_intervals_hold_their_contribution_and_widen_with_coverage(model: Model) -> None:
    narrow, wide = (explain(model, "CC(C)Cc1ccc(cc1)C(C)C(=O)O", c)[0] for c in (0.5, 0.95))
    for a, b in zip(narrow.contributions, wide.contributions, strict=True):
        assert b.low <= a.low <= a.contribution <= a.high <= b.high


def test_group_electronegativity_of_chlorine_is_paulings(model: Model) -> None:
    # Allred, J. Inorg. Nucl. Chem. 1961, 17, 215: Cl 3.16
    assert groups(only(model, "ClCC(=O)O"))[0].electronegativity == pytest.approx(3.16)


def test_hypothetical_molecules_outside_the_domain_are_flagged(explained: list[Explained]) -> None:
    flagged = [e for answer in explained for e in answer.steps if e.outside]
    assert flagged
    for e in flagged:
        assert all(read_acid(s).sites for s in e.outside)
        assert all(0.0 <= line.outside <= 1.0 for line in e.contributions)


def test_an_input_that_is_no_acid_is_answered_with_its_reason(model: Model) -> None:
    with pytest.raises(StructureError, match="carboxyl"):
        explain(model, "CCO")
    bad, good = explain_many(model, ["CCO", "CC(=O)O"])
    assert bad.error is not None and not bad.steps
    assert good.error is None and len(good.steps) == 1
    assert [e.pka for e in model.explain("ClCC(=O)O")] == [only(model, "ClCC(=O)O").pka]


def test_what_is_remembered_of_earlier_acids_is_forgotten_between_acids_only(
    model: Model, monkeypatch: pytest.MonkeyPatch
) -> None:
    """The second acid shares its parent with the first: it must be explained alike, however little is kept."""
    acids = ["OC(=O)CCCCl", "OC(=O)CCCBr"]
    wanted = [explain(model, s)[0] for s in acids]
    monkeypatch.setattr("qsar.attribution.evaluate._KEEP", 1)
    for _ in range(2):
        for smiles, before in zip(acids, wanted, strict=True):
            (again,) = explain(model, smiles)
            assert again.parent_pka == pytest.approx(before.parent_pka, abs=1e-9)
            assert [x.contribution for x in again.contributions] == pytest.approx(
                [x.contribution for x in before.contributions], abs=1e-9
            )
