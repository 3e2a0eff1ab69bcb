"""The estimators in scikit-learn's own checks, in pipelines and grid searches, and on the screen of a notebook.

scikit-learn's ``check_estimator`` feeds numbers, which no structure is. It is run in two ways: on the estimators
themselves, where it checks what does not need data, and on subclasses that take each row of numbers for one of a list
of acids, where it checks fitting and predicting. What cannot apply is listed with its reason.
"""

from __future__ import annotations

import pickle
from html.parser import HTMLParser
from typing import Any, ClassVar

import numpy as np
import pytest
from sklearn.base import clone
from sklearn.linear_model import Ridge
from sklearn.model_selection import GridSearchCV, KFold, cross_val_score
from sklearn.pipeline import make_pipeline
from sklearn.preprocessing import StandardScaler
from sklearn.utils.estimator_checks import check_estimator
from sklearn.utils.validation import validate_data
from small_models import reference_rows, small_model

from qsar.descriptors import NAMES
from qsar.estimators import AcidityDescriptors, AcidityRegressor, first_edge
from qsar.ionisation import edge_descriptors
from qsar.notebook import MARKS, Predictions, predictions_html
from qsar.structures import read_acid

ROWS = [m for m in reference_rows()[::5] if m.step == 1]
SMILES = [m.acid.smiles for m in ROWS]
PKA = np.array([m.pka for m in ROWS])
SHUFFLED = KFold(3, shuffle=True, random_state=0)  # the table is sorted by family
QUICK: dict[str, Any] = {"folds": 3, "max_iter": 5}


class FromNumbers:
    """Takes each row of numbers for an acid, the same one for the same numbers and another for others."""

    pool: ClassVar[list[Any]] = [read_acid(s) for s in dict.fromkeys(SMILES)]
    known: ClassVar[dict[bytes, int]] = {}

    def _acids(self, structures: Any, *, reset: bool) -> list[Any]:
        x = validate_data(self, structures, reset=reset, dtype=np.float64)
        places = [self.known.setdefault(np.round(row, 6).tobytes(), len(self.known)) for row in x]
        return [self.pool[place % len(self.pool)] for place in places]

    def __sklearn_tags__(self) -> Any:
        tags = super().__sklearn_tags__()  # type: ignore[misc]
        tags.input_tags.one_d_array = False
        tags.input_tags.two_d_array = True
        tags.input_tags.string = False
        if tags.regressor_tags is not None:
            tags.regressor_tags.poor_score = True  # a random acid says nothing of the target
        return tags


class NumberDescriptors(FromNumbers, AcidityDescriptors):
    pass


class NumberRegressor(FromNumbers, AcidityRegressor):
    pass


#: Checks of scikit-learn that cannot apply, with the reason.
NOT_APPLICABLE = {
    "check_sample_weight_equivalence_on_dense_data": "copies of a row change the variance of its acid as weights do "
    "not, and acids without weight are dealt out to no fold",
    "check_sample_weights_shape": "trains on four different rows; an ensemble of folds needs more acids",
    "check_sample_weights_not_overwritten": "trains on four different rows; an ensemble of folds needs more acids",
}


@pytest.mark.parametrize("estimator", [AcidityDescriptors(), AcidityRegressor(**QUICK)])
@pytest.mark.filterwarnings("ignore:Can't test estimator")
def test_scikit_learn_accepts_the_estimator(estimator: Any) -> None:
    results = check_estimator(estimator, on_fail=None)
    assert results and all(r["status"] in ("passed", "skipped") for r in results), results


@pytest.mark.slow
@pytest.mark.parametrize("estimator", [NumberDescriptors(), NumberRegressor(**QUICK)])
@pytest.mark.filterwarnings("ignore")
def test_scikit_learn_accepts_what_the_estimator_does(estimator: Any) -> None:
    results = check_estimator(estimator, expected_failed_checks=NOT_APPLICABLE, on_fail=None)
    failed = [(r["check_name"], repr(r["exception"])[-400:]) for r in results if r["status"] == "failed"]
    assert not failed, failed
    expected = [r["check_name"] for r in results if r["status"] == "xfail"]
    assert isinstance(estimator, AcidityDescriptors) or sorted(expected) == sorted(NOT_APPLICABLE)
    assert sum(r["status"] == "passed" for r in results) > 35


def test_columns_are_those_of_the_model() -> None:
    transformer = AcidityDescriptors().fit(SMILES)
    x = transformer.transform(SMILES)
    assert x.shape == (len(SMILES), len(NAMES))
    assert list(transformer.get_feature_names_out()) == list(NAMES)
    single = [i for i, s in enumerate(SMILES) if len(read_acid(s).sites) == 1]
    for i in single[:10]:
        assert np.array_equal(x[i], edge_descriptors(read_acid(SMILES[i]))[0])
    frame = AcidityDescriptors().set_output(transform="pandas").fit_transform(SMILES[:3])
    assert list(frame.columns) == list(NAMES)


def test_every_column_has_its_publication_and_unit() -> None:
    assert set(AcidityDescriptors.citations()) == set(AcidityDescriptors.units()) == set(NAMES)
    assert all(AcidityDescriptors.citations().values())


def test_the_first_proton_is_the_more_acidic_one() -> None:
    """2-Chlorobutanedioic and 2-fluoropentanedioic acid: the COOH beside the halogen (Branch & Calvin 1941)."""
    for smiles, near in (("OC(=O)C(Cl)CC(=O)O", "Cl"), ("OC(=O)C(F)CCC(=O)O", "F")):
        acid = read_acid(smiles)
        site = acid.sites[first_edge(acid)]
        alpha = next(a for a in acid.mol.GetAtomWithIdx(site).GetNeighbors() if a.GetSymbol() == "C")
        assert near in {a.GetSymbol() for a in alpha.GetNeighbors()}


def test_a_bad_structure_is_named_or_left_empty() -> None:
    with pytest.raises(ValueError, match=r"X\[1\] = 'CCO': no carboxyl"):
        AcidityDescriptors().fit(["CC(=O)O", "CCO"])
    x = AcidityDescriptors(on_error="nan").fit_transform(["CC(=O)O", "CCO"])
    assert np.isfinite(x[0]).all() and np.isnan(x[1]).all()
    for bad in ("CC(=O)O", [1.0, 2.0], [["CC(=O)O", "CC(=O)O"]], []):
        with pytest.raises(ValueError, match="X"):
            AcidityDescriptors().fit(bad)
    with pytest.raises(ValueError, match="on_error"):
        AcidityDescriptors(on_error="ignore").fit(SMILES)


def test_in_a_pipeline_and_a_grid_search() -> None:
    line = make_pipeline(AcidityDescriptors(), StandardScaler(), Ridge())
    search = GridSearchCV(line, {"ridge__alpha": [1.0, 30.0]}, cv=SHUFFLED, scoring="neg_mean_absolute_error").fit(
        SMILES, PKA
    )
    spread = float(np.mean(np.abs(PKA - np.median(PKA))))
    assert -search.best_score_ < 0.8 * spread  # the descriptors say something


def test_the_regressor_under_a_grid_search() -> None:
    search = GridSearchCV(AcidityRegressor(**QUICK), {"amplitude": [0.1, 0.8]}, cv=SHUFFLED).fit(SMILES, PKA)
    assert set(search.best_params_) == {"amplitude"}
    assert search.best_score_ > 0.3
    assert cross_val_score(clone(search.best_estimator_), SMILES, PKA, cv=SHUFFLED).min() > 0.0


def test_the_regressor_is_the_model_and_reproducible() -> None:
    a = AcidityRegressor(**QUICK).fit(SMILES, PKA)
    b = clone(a).fit(np.array(SMILES, dtype=object)[:, None], list(PKA))
    assert np.array_equal(a.predict(SMILES[:5]), b.predict(SMILES[:5]))
    assert a.predict(SMILES[:1])[0] == a.model_.predict(SMILES[:1])[0].steps[0].pka
    ends = a.predict_interval(SMILES[:5], 0.8)
    assert ((ends[:, 0] <= a.predict(SMILES[:5])) & (a.predict(SMILES[:5]) <= ends[:, 1])).all()
    again = pickle.loads(pickle.dumps(a))
    assert np.array_equal(again.predict(SMILES[:5]), a.predict(SMILES[:5]))


def test_weightless_rows_do_not_count() -> None:
    wrong = PKA.copy()
    wrong[:5] += 5.0
    weight = np.ones(len(PKA))
    weight[:5] = 0.0
    a = AcidityRegressor(**QUICK).fit(SMILES, wrong, sample_weight=weight)
    b = AcidityRegressor(**QUICK).fit(SMILES[5:], PKA[5:])
    assert np.array_equal(a.predict(SMILES[5:10]), b.predict(SMILES[5:10]))


class Wellformed(HTMLParser):
    """Checks that tags close in order, and counts them."""

    def __init__(self) -> None:
        super().__init__()
        self.open: list[str] = []
        self.count: dict[str, int] = {}

    def handle_starttag(self, tag: str, attrs: list[tuple[str, str | None]]) -> None:
        self.open.append(tag)
        self.count[tag] = self.count.get(tag, 0) + 1

    def handle_startendtag(self, tag: str, attrs: list[tuple[str, str | None]]) -> None:
        self.count[tag] = self.count.get(tag, 0) + 1

    def handle_endtag(self, tag: str) -> None:
        assert self.open.pop() == tag


def test_predictions_show_themselves_as_a_table_with_drawings() -> None:
    predictions = Predictions(small_model().predict(["CC(=O)O", "OC(=O)CC(=O)O", "CCO", "<script>"]))
    html = predictions._repr_html_()
    page = Wellformed()
    page.feed(html)
    assert page.open == []
    assert page.count["svg"] == 2 and page.count["table"] == 1
    assert page.count["tr"] == 1 + 1 + 2 + 1 + 1
    assert "<script>" not in html and "&lt;script&gt;" in html
    first = predictions[0].steps[0]
    assert f"<b>{first.pka:.2f}</b>" in html and MARKS[first.domain] in html
    assert "http:" not in html.replace("http://www.w3.org", "").replace("http://www.rdkit.org", "")


def test_long_lists_are_cut_and_counted() -> None:
    html = predictions_html(small_model().predict(["CC(=O)O"]) * 60)
    assert html.count("<svg") == 50 and "and 10 more" in html
    assert "no predictions" in predictions_html([])
