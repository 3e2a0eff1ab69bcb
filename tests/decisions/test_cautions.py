"""Cautions from structure and from bases, each where it belongs and only there.

Hazards: GESTIS Substance Database and Bretherick's Handbook of Reactive Chemical Hazards, from memory.
"""

from __future__ import annotations

import pytest

from qsar.decisions.bases import base_named
from qsar.decisions.cautions import (
    REFER,
    STRUCTURAL,
    StructuralCaution,
    base_cautions,
    matched,
    structural_cautions,
    with_reference,
)

NAMES = [caution.name for caution in STRUCTURAL]


@pytest.mark.parametrize("caution", STRUCTURAL, ids=NAMES)
def test_example_and_counterexample(caution: StructuralCaution) -> None:
    assert caution in matched(caution.example)
    assert caution not in matched(caution.counterexample)
    assert "\n" not in caution.text


@pytest.mark.parametrize(
    ("smiles", "names"),
    [
        ("CC(=O)O", set()),
        ("OC(=O)c1ccccc1", set()),
        ("OC(=O)c1ccc(F)cc1", set()),  # fluorine on a ring
        ("OC(=O)c1ccc(Cl)cc1", set()),
        ("OC(=O)CCCl", set()),
        ("CC(Cl)C(=O)O", set()),  # not an acetic acid
        ("OC(=O)C(Cl)(Cl)Cl", {"haloacetic acid"}),
        ("OC(=O)CI", {"haloacetic acid"}),
        ("OC(=O)CBr", {"haloacetic acid"}),
        ("OC(=O)C(F)(F)F", {"haloacetic acid", "fluorinated acid"}),
        ("OC(=O)CF", {"fluoroacetic acid", "haloacetic acid", "fluorinated acid"}),
        ("OC(=O)C(F)(F)C(F)(F)F", {"fluorinated acid"}),
        ("OC(=O)C[N+](=O)[O-]", {"nitro compound"}),
        ("OC(=O)c1cc([N+](=O)[O-])cc([N+](=O)[O-])c1", {"nitro compound"}),
        ("CN(C)CC(=O)O", set()),
        ("C[N+](C)(C)CC(=O)[O-]", set()),
        ("OC(=O)CN=[N+]=[N-]", {"azide"}),
        ("OC(=O)C=[N+]=[N-]", set()),  # a diazo compound is no azide
        ("OC(=O)CN=Nc1ccccc1", set()),
        ("CC(C)(OO)C(=O)O", {"peroxide"}),
        ("O=C(O)CCC(=O)OOC(C)(C)C", {"peroxide"}),
        ("COC(=O)CC(=O)O", set()),
    ],
)
def test_structures(smiles: str, names: set[str]) -> None:
    assert {caution.name for caution in matched(smiles)} == names


@pytest.mark.parametrize(
    ("smiles", "lines"),
    [("OC(=O)CF", 1), ("OC(=O)C(F)(F)F", 1), ("OC(=O)C(F)(F)C[N+](=O)[O-]", 2), ("CC(=O)O", 0)],
)
def test_one_line_says_it(smiles: str, lines: int) -> None:
    assert len(structural_cautions(smiles)) == lines


def test_bases() -> None:
    assert base_cautions([base_named("ammonia"), base_named("triethylamine")]) == []
    (gas,) = base_cautions([base_named("hydrogencarbonate")], co2_bar=2.3, closed=True)
    assert "CO2" in gas and "2.3 bar" in gas and "vent" in gas
    assert "bar" not in base_cautions([base_named("carbonate")], co2_bar=1.0, closed=False)[0]
    (heat,) = base_cautions([base_named("hydroxide")])
    assert "heat" in heat
    assert len(base_cautions([base_named("hydroxide"), base_named("carbonate")])) == 2


def test_reference_only_beside_cautions() -> None:
    assert with_reference([]) == []
    assert with_reference(["a line"]) == ["a line", REFER]
    for word in ("safety data sheet", "local rules", "qualified person"):
        assert word in REFER


def test_unreadable_structure() -> None:
    with pytest.raises(ValueError, match="not a readable SMILES"):
        matched("C1CC")
