"""The order of substituted acids that every chemist knows, predicted without the acid in question.

Values: common practice, no source; where a handbook differs, the training table keeps the handbook's.
"""

from __future__ import annotations

from itertools import pairwise

import pytest

from qsar.model import Model, load_model
from qsar.structures import read_acid
from qsar.validation.without import Judge

USUAL = {
    "acetic": ("CC(=O)O", 4.8),
    "chloroacetic": ("OC(=O)CCl", 2.8),
    "dichloroacetic": ("OC(=O)C(Cl)Cl", 1.3),
    "trichloroacetic": ("OC(=O)C(Cl)(Cl)Cl", 0.9),
    "fluoroacetic": ("OC(=O)CF", None),
    "2,2-dimethylpropanoic": ("CC(C)(C)C(=O)O", 5.1),
    "2-chlorobutanoic": ("CCC(Cl)C(=O)O", 2.9),
    "3-chlorobutanoic": ("CC(Cl)CC(=O)O", 4.1),
    "4-chlorobutanoic": ("ClCCCC(=O)O", 4.5),
}
ORDERS = (
    ("trichloroacetic", "dichloroacetic", "chloroacetic", "acetic", "2,2-dimethylpropanoic"),
    ("fluoroacetic", "chloroacetic"),
    ("2-chlorobutanoic", "3-chlorobutanoic", "4-chlorobutanoic"),
)


@pytest.fixture(scope="module")
def model(shipped_model: object) -> Model:
    return load_model()


@pytest.fixture(scope="module")
def without(model: Model) -> dict[str, float]:
    """Stored out-of-fold prediction of each acid."""
    found = {}
    for name, (smiles, _) in USUAL.items():
        rows = model.library.rows_of(read_acid(smiles).smiles)
        assert 1 in rows, f"{name} acid is not in the table"
        found[name] = float(model.library.pka_without[rows[1]])
    return found


@pytest.mark.parametrize("order", ORDERS, ids=lambda order: order[0])
def test_order(without: dict[str, float], order: tuple[str, ...]) -> None:
    values = [without[name] for name in order]
    assert all(a < b for a, b in pairwise(values)), dict(zip(order, values, strict=True))


@pytest.mark.parametrize("name", [name for name, (_, value) in USUAL.items() if value is not None])
def test_value(without: dict[str, float], name: str) -> None:
    within = 0.6 if name == "trichloroacetic" else 0.4
    assert without[name] == pytest.approx(USUAL[name][1], abs=within)


def test_stored_values_are_those_of_the_member_that_never_saw_the_acid(model: Model, without: dict[str, float]) -> None:
    """The stored value of each acid is what the model without its fold says when asked."""
    predictions, trained_on = Judge(model).predict([read_acid(smiles) for smiles, _ in USUAL.values()])
    assert trained_on.all()
    for name, prediction in zip(USUAL, predictions, strict=True):
        assert prediction.steps[0].pka == pytest.approx(without[name], abs=1e-9)
