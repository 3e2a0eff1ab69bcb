"""The descriptors and the model as scikit-learn estimators, for notebooks, pipelines and grid searches.

Both take SMILES (a list, a Series, a one-dimensional array, or a table of one column) where scikit-learn's own
estimators take numbers::

    from sklearn.linear_model import RidgeCV
    from sklearn.pipeline import make_pipeline
    from sklearn.preprocessing import StandardScaler
    from qsar.estimators import AcidityDescriptors, AcidityRegressor

    line = make_pipeline(AcidityDescriptors(), StandardScaler(), RidgeCV()).fit(smiles, pka)
    model = AcidityRegressor(folds=5).fit(smiles, pka)
    model.predict(["CCC(=O)O"])
    model.describe(["CCC(=O)O"])  # shows itself as a table with drawings
"""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any, Self

import numpy as np
from numpy.typing import ArrayLike, NDArray
from sklearn.base import BaseEstimator, RegressorMixin, TransformerMixin
from sklearn.utils import Tags
from sklearn.utils.validation import _check_sample_weight, check_consistent_length, check_is_fitted, column_or_1d

from qsar.descriptors import NAMES, Molecule, SiteView
from qsar.descriptors.pipeline import EFFECTS
from qsar.ionisation import cube, edge_descriptors
from qsar.notebook import Predictions
from qsar.structures import Acid, StructureError, read_acid
from qsar.table import Measurement

Floats = NDArray[np.float64]

_ATTENUATION = 0.4  # per bond; Branch & Calvin 1941


class _TakesStructures(BaseEstimator):  # type: ignore[misc]
    """What both estimators share: reading structures, and saying that they do not take numbers."""

    def __sklearn_tags__(self) -> Tags:
        tags = super().__sklearn_tags__()
        tags.input_tags.one_d_array = True
        tags.input_tags.two_d_array = False
        tags.input_tags.string = True
        return tags

    def _acids(self, structures: Any, *, reset: bool) -> list[Acid | None]:
        """Acids of the inputs; None where one cannot be used and that is allowed."""
        acids: list[Acid | None] = []
        for position, text in enumerate(_texts(structures)):
            try:
                acids.append(read_acid(text))
            except StructureError as problem:
                if getattr(self, "on_error", "raise") != "nan":
                    raise ValueError(f"X[{position}] = {text[:60]!r}: {problem}") from problem
                acids.append(None)
        if reset:
            self.n_features_in_ = 1
        return acids


def _texts(structures: Any) -> list[str]:
    """The inputs as a flat list of SMILES.

    Raises
    ------
    ValueError
        If they are not strings, or come in several columns.
    """
    if isinstance(structures, str):
        raise ValueError("X is one string; give a list of SMILES")
    values = np.asarray(structures, dtype=object)
    if values.ndim == 2 and values.shape[1] == 1:
        values = values[:, 0]
    if values.ndim != 1:
        raise ValueError(f"X has shape {values.shape}; give SMILES in one column")
    if not len(values):
        raise ValueError("X is empty: 0 SMILES (shape=(0,)) while a minimum of 1 is required.")
    wrong = next((i for i, v in enumerate(values) if not isinstance(v, str)), None)
    if wrong is not None:
        raise ValueError(f"X[{wrong}] = {values[wrong]!r} is not a SMILES string")
    return list(values)


def first_edge(acid: Acid) -> int:
    """The proton that is likely to leave first, as a position among the edges of the acid's network.

    Of several COOH it is the one with the largest inductive effect, the sum of sigma_I attenuated by 0.4 per bond; of
    equal ones the first. No model is asked, so that a descriptor never depends on one.
    """
    molecule = Molecule(acid.graph)

    def pull(site: int) -> float:
        view = SiteView(molecule, site)
        return sum(t.constants.sigma_i * _ATTENUATION**t.bonds for t in [*view.terms, *view.withdrawing])

    network = cube(len(acid.sites))
    at_start = np.flatnonzero(network.start == 0)
    strength = [round(pull(acid.sites[int(network.site[e])]), 9) for e in at_start]
    return int(at_start[int(np.argmax(strength))])


class AcidityDescriptors(TransformerMixin, _TakesStructures):  # type: ignore[misc]
    """Physical descriptors of the first carboxyl proton of each acid.

    Parameters
    ----------
    on_error : {"raise", "nan"}
        What to do with a structure that cannot be used: raise, or give a row of NaN.

    Attributes
    ----------
    n_features_in_ : int
        1: the column of structures.

    Examples
    --------
    >>> AcidityDescriptors().fit_transform(["CC(=O)O", "OC(=O)CCl"]).shape[0]
    2
    """

    def __init__(self, on_error: str = "raise") -> None:
        self.on_error = on_error

    def fit(self, X: Any, y: Any = None) -> Self:
        """Check the structures; there is nothing to learn."""
        if self.on_error not in ("raise", "nan"):
            raise ValueError(f"on_error is {self.on_error!r}; give 'raise' or 'nan'")
        self._acids(X, reset=True)
        return self

    def transform(self, X: Any) -> Floats:
        """Descriptors.

        Parameters
        ----------
        X : sequence of str, length n
            SMILES.

        Returns
        -------
        ndarray, shape (n, n_descriptors)
            Columns in the order of :meth:`get_feature_names_out`.

        Raises
        ------
        ValueError
            With position and reason of a structure that cannot be used, unless `on_error` is "nan".
        """
        check_is_fitted(self)
        acids = self._acids(X, reset=False)
        unusable = np.full(len(NAMES), np.nan)
        return np.array([unusable if a is None else edge_descriptors(a)[first_edge(a)] for a in acids])

    def get_feature_names_out(self, input_features: ArrayLike | None = None) -> NDArray[np.object_]:
        """Names of the columns."""
        return np.array(NAMES, dtype=object)

    @staticmethod
    def citations() -> dict[str, tuple[str, ...]]:
        """The publications behind each column, by its name."""
        return {column.name: effect.citations for effect in EFFECTS for column in effect.columns}

    @staticmethod
    def units() -> dict[str, str]:
        """Unit of each column, "1" for a pure number."""
        return {column.name: column.unit for effect in EFFECTS for column in effect.columns}

    def __sklearn_tags__(self) -> Tags:
        tags = super().__sklearn_tags__()
        tags.requires_fit = True
        tags.input_tags.allow_nan = False
        return tags


class AcidityRegressor(RegressorMixin, _TakesStructures):  # type: ignore[misc]
    """The whole model as a regressor: first pKa from structure.

    Parameters
    ----------
    folds : int
        Members of the ensemble, each blind to one share of the acids.
    max_iter : int
        Boosting iterations of each member.
    learning_rate : float
        Of the boosting.
    length, amplitude, linear, noise : float
        Of the trend; see :class:`qsar.model.kernel.KernelSettings`. None takes the shipped model's.
    uncertainty : float
        Standard uncertainty of the values in `y`, pKa units.
    random_state : int
        Seed of folds and boosters.

    Attributes
    ----------
    model_ : qsar.model.Model
        Can be saved with :func:`qsar.model.save`.
    n_iter_ : int
        Boosting iterations done.
    n_features_in_ : int
        1: the column of structures.
    """

    def __init__(
        self,
        folds: int = 10,
        max_iter: int | None = None,
        learning_rate: float | None = None,
        length: float | None = None,
        amplitude: float | None = None,
        linear: float | None = None,
        noise: float | None = None,
        uncertainty: float = 0.05,
        random_state: int = 1,
    ) -> None:
        self.folds = folds
        self.max_iter = max_iter
        self.learning_rate = learning_rate
        self.length = length
        self.amplitude = amplitude
        self.linear = linear
        self.noise = noise
        self.uncertainty = uncertainty
        self.random_state = random_state

    def fit(self, X: Any, y: ArrayLike, sample_weight: ArrayLike | None = None) -> Self:
        """Train.

        Parameters
        ----------
        X : sequence of str, length n
            SMILES.
        y : array_like, shape (n,)
            Measured first pKa at ionic strength 0.
        sample_weight : array_like, shape (n,), optional

        Raises
        ------
        ValueError
            If a structure cannot be used, or there are fewer than two acids a fold.
        """
        from qsar.model.training import train

        acids = [a for a in self._acids(X, reset=True) if a is not None]
        values = self._targets(y, acids)
        weights = None if sample_weight is None else self._weights(sample_weight, len(acids))
        rows = [Measurement(a, 1, v, self.uncertainty, "", "", "") for a, v in zip(acids, values, strict=True)]
        if weights is not None:
            rows = [r for r, w in zip(rows, weights, strict=True) if w > 0]
            weights = [w for w in weights if w > 0]
        distinct = len({r.acid.smiles for r in rows})
        if distinct < 2 * self.folds:
            raise ValueError(
                f"X holds {distinct} different acids (n_samples = {len(acids)}, 1 sample is too few); at least two a "
                f"fold ({2 * self.folds}) are needed"
            )
        settings = self._settings()
        self.model_ = train(rows, "estimator", settings, weights=weights)
        self.n_iter_ = settings.boosting.max_iter
        return self

    def _targets(self, y: ArrayLike, acids: Sequence[Acid]) -> list[float]:
        if y is None:
            raise ValueError("requires y to be passed, but the target y is None")
        values = column_or_1d(y, warn=True, dtype=np.float64)
        check_consistent_length(acids, values)
        if not np.all(np.isfinite(values)):
            raise ValueError("y contains NaN or infinity; every acid needs a pKa")
        return [float(v) for v in values]

    @staticmethod
    def _weights(sample_weight: ArrayLike, n: int) -> list[float]:
        checked = _check_sample_weight(sample_weight, np.empty((n, 1)), ensure_non_negative=True)
        return [float(w) for w in checked]

    def _settings(self) -> Any:
        from dataclasses import replace

        from qsar.model.members import Settings

        plain = Settings(folds=self.folds, seed=self.random_state)

        def given(*names: str) -> dict[str, Any]:
            return {name: getattr(self, name) for name in names if getattr(self, name) is not None}

        return replace(
            plain,
            kernel=replace(plain.kernel, **given("length", "amplitude", "linear", "noise")),
            boosting=replace(plain.boosting, **given("max_iter", "learning_rate")),
        )

    def predict(self, X: Any) -> Floats:
        """First pKa of each acid.

        Parameters
        ----------
        X : sequence of str, length n
            SMILES.

        Returns
        -------
        ndarray, shape (n,)
        """
        return np.array([p.steps[0].pka for p in self.describe(X)])

    def predict_interval(self, X: Any, coverage: float = 0.9) -> Floats:
        """Ends of the interval of the first pKa; shape (n, 2)."""
        return np.array([(p.steps[0].low, p.steps[0].high) for p in self.describe(X, coverage)])

    def describe(self, X: Any, coverage: float = 0.9) -> Predictions:
        """All steps with intervals, verdicts and neighbours, as a list that shows itself in a notebook."""
        check_is_fitted(self, "model_")
        acids = [a for a in self._acids(X, reset=False) if a is not None]
        return Predictions(self.model_.predict(acids, coverage))
