"""The trend over chosen points: against the exact one, against LAPACK, and against scikit-learn's Nystroem features.

The mean over chosen points is that of the subset of regressors (Quinonero-Candela & Rasmussen, J. Mach. Learn. Res.
2005, 6, 1939; Rasmussen & Williams, Gaussian Processes for Machine Learning, 2006, section 8.3.1), which is a ridge
regression on the Nystroem features of the points (Williams & Seeger, Adv. Neural Inf. Process. Syst. 2001, 13, 682).
"""

from __future__ import annotations

from functools import cache

import numpy as np
import pytest
from numpy.typing import NDArray
from scipy.linalg import cho_factor, cho_solve, cholesky, solve_triangular
from scipy.linalg.lapack import dpstrf
from scipy.optimize import lsq_linear
from sklearn.gaussian_process.kernels import ConstantKernel, DotProduct, Matern
from sklearn.kernel_approximation import Nystroem
from sklearn.linear_model import Ridge
from small_models import reference_rows

from qsar.descriptors import LOWERS
from qsar.model import inducing
from qsar.model.edges import Edges
from qsar.model.inducing import basis, features, fit, pivots, root_of
from qsar.model.kernel import KernelSettings, KernelTrend, Scaling, basis_points, covariance, fit_trend
from qsar.model.training_set import TrainingSet, training_set

Floats = NDArray[np.float64]
SETTINGS = KernelSettings(length=3.0, amplitude=0.7, linear=0.2, noise=0.1)
PLAIN = KernelSettings()


def kernel(a: Floats, b: Floats) -> Floats:
    return covariance(a, b, SETTINGS)


def reference_kernel():  # type: ignore[no-untyped-def]
    """Constant + linear + Matern 3/2 of scikit-learn."""
    return (
        ConstantKernel(SETTINGS.amplitude**2) * Matern(SETTINGS.length, nu=1.5)
        + ConstantKernel(SETTINGS.linear**2) * DotProduct(1e-12)
        + ConstantKernel(1.0)
    )


@cache
def monobasic() -> tuple[TrainingSet, NDArray[np.bool_]]:
    """The monobasic acids of the reference table, whose edges are their steps, and which of them are trained on."""
    data = training_set([m for m in reference_rows() if len(m.acid.sites) == 1])
    assert len(data.x) == len(data.acids) < inducing.MOST_EXACT
    return data, np.random.default_rng(0).random(len(data.acids)) < 0.8


def trend_of(data: TrainingSet, steps: NDArray[np.int64], points: Floats | None, scaling: Scaling) -> KernelTrend:
    edges = data.step_acid[steps]
    free, lowers = data.x[edges][:, ~LOWERS], data.x[edges][:, LOWERS]
    return fit_trend(free, lowers, data.pka[steps], data.uncertainty[steps] ** 2, PLAIN, scaling, points)


def said_of(trend: KernelTrend, data: TrainingSet) -> Floats:
    return trend.predict(data.x[:, ~LOWERS], data.x[:, LOWERS])


def test_with_all_distinct_points_it_is_the_exact_trend() -> None:
    data, train = monobasic()
    steps = np.flatnonzero(train[data.step_acid])
    scaling = Scaling.of(data.x[:, ~LOWERS])
    points = np.unique(scaling(data.x[data.step_acid[steps]][:, ~LOWERS]), axis=0)
    exact, over = trend_of(data, steps, None, scaling), trend_of(data, steps, points, scaling)
    assert over.points.shape == points.shape
    assert said_of(over, data) == pytest.approx(said_of(exact, data), abs=1e-6)
    assert over.slopes == pytest.approx(exact.slopes, abs=1e-6)


def test_with_fewer_points_the_error_of_acids_left_out_stays_near_the_exact_one() -> None:
    """More points come closer; with the share that the smallest large table has the error grows by less than 0.01."""
    data, train = monobasic()
    steps, held = np.flatnonzero(train[data.step_acid]), ~train[data.step_acid]
    scaling = Scaling.of(data.x[:, ~LOWERS])
    scaled = scaling(data.x[train][:, ~LOWERS])
    order = pivots(scaled, lambda a, b: covariance(a, b, PLAIN), len(scaled))
    exact = said_of(trend_of(data, steps, None, scaling), data)[data.step_acid]
    away, error = [], []
    for share in (0.125, 0.25, 0.5, inducing.POINTS / inducing.MOST_EXACT):
        few = scaled[order[: round(len(scaled) * share)]]
        found = said_of(trend_of(data, steps, few, scaling), data)[data.step_acid]
        away.append(float(np.sqrt(np.mean((found - exact)[held] ** 2))))
        error.append(float(np.abs(found - data.pka)[held].mean()))
    assert away == sorted(away, reverse=True)
    assert abs(error[-1] - np.abs(exact - data.pka)[held].mean()) < 0.01


def test_the_mean_is_ridge_regression_on_nystroem_features() -> None:
    rng = np.random.default_rng(3)
    edges, new = rng.normal(size=(120, 4)), rng.normal(size=(30, 4))
    points = edges[:25]
    target, variance = np.sin(edges[:, 0]) + 0.1 * rng.normal(size=120), rng.uniform(0.01, 0.05, 120)
    root = root_of(kernel(points, points))
    weights, slopes = fit(features(root, kernel(edges, points)), np.zeros((120, 1)), target, variance, 0.05)
    assert slopes.tolist() == [0.0]
    one = reference_kernel()
    theirs = Nystroem(kernel=lambda a, b: one(a[None], b[None])[0, 0], n_components=len(points), random_state=0)
    ridge = Ridge(alpha=1.0, fit_intercept=False)
    ridge.fit(theirs.fit(points).transform(edges), target, sample_weight=1.0 / variance)
    found = features(root, kernel(new, points)) @ weights
    assert found == pytest.approx(ridge.predict(theirs.transform(new)), abs=1e-6)


def test_slopes_are_the_bounded_least_squares_of_another_library_function() -> None:
    """Whitening by the full n x n covariance instead of Woodbury's identity, and scipy's bounded least squares."""
    rng = np.random.default_rng(4)
    edges, lowers = rng.normal(size=(150, 3)), rng.uniform(0.0, 2.0, (150, 4))
    points, variance = edges[:30], rng.uniform(0.01, 0.05, 150)
    target = -lowers @ np.array([0.8, 0.3, 0.0, -0.5]) + 0.3 * np.sin(edges[:, 0]) + 0.1 * rng.normal(size=150)
    cross, among = kernel(edges, points), kernel(points, points)
    _, slopes = fit(features(root_of(among), cross.copy()), lowers, target, variance, 0.05)
    whole = cross @ cho_solve(cho_factor(among), cross.T) + np.diag(variance)
    white = solve_triangular(cholesky(whole, lower=True), np.column_stack([-lowers, target]), lower=True)
    rows, values = np.vstack([white[:, :-1], 0.05 * np.eye(4)]), np.append(white[:, -1], np.zeros(4))
    expected = lsq_linear(rows, values, (0.0, np.inf), method="bvls", tol=1e-14).x
    assert slopes == pytest.approx(expected, abs=1e-6)
    assert slopes[3] == 0.0
    assert slopes[0] > 0.3


def test_pivots_are_lapacks() -> None:
    """The order of LAPACK's Cholesky decomposition with complete pivoting (dpstrf; LAPACK Users' Guide)."""
    points = np.random.default_rng(5).normal(size=(80, 6))
    _, order, rank, info = dpstrf(kernel(points, points))
    assert (rank, info) == (80, 0)
    assert pivots(points, kernel, 80).tolist() == (order - 1).tolist()
    assert pivots(points, kernel, 20).tolist() == (order[:20] - 1).tolist()


def test_features_give_back_the_covariance() -> None:
    """V V' of the features is the Nystroem approximation, and exact among the points (Williams & Seeger 2001)."""
    points = np.random.default_rng(10).normal(size=(40, 3))
    few = points[:15]
    found = features(root_of(kernel(few, few)), kernel(points, few))
    expected = kernel(points, few) @ np.linalg.pinv(kernel(few, few)) @ kernel(few, points)
    assert found @ found.T == pytest.approx(expected, abs=1e-6)
    assert (found @ found.T)[:15, :15] == pytest.approx(kernel(few, few), abs=1e-8)


def test_what_repeats_other_points_is_not_taken() -> None:
    points = np.random.default_rng(6).normal(size=(15, 4))
    chosen = pivots(np.vstack([points, points, points]), kernel, 45)
    assert len(chosen) == 15
    assert np.array_equal(np.unique(chosen % 15), np.arange(15))


def test_small_tables_keep_all_points_and_large_ones_some(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(inducing, "MOST_EXACT", 40)
    monkeypatch.setattr(inducing, "POINTS", 12)
    points = np.random.default_rng(7).normal(size=(41, 3))
    assert np.array_equal(basis(points[:40], kernel), points[:40])
    few = basis(points, kernel)
    assert few.shape == (12, 3)
    rows = [int(np.flatnonzero((points == p).all(axis=1))[0]) for p in few]
    assert rows == sorted(set(rows))  # rows of the table, each once, in its order
    assert np.array_equal(few, basis(points.copy(), kernel))  # and the same ones again


def test_edges_fit_as_the_trend_does() -> None:
    """Rows of a covariance that is reckoned once, against fits that reckon their own."""
    data, train = monobasic()
    scaling = Scaling.of(data.x[:, ~LOWERS])
    points = scaling(data.x[::3][:, ~LOWERS])
    edge = np.flatnonzero(train)
    value, variance = np.linspace(2.0, 5.0, len(edge)), np.full(len(edge), 0.01)
    own = data.x[edge]
    for few in (None, points):
        edges = Edges(data.x, PLAIN, scaling, few)
        trend = edges.fit(edge, value, variance)
        plain = fit_trend(own[:, ~LOWERS], own[:, LOWERS], value, variance, PLAIN, scaling, few)
        assert said_of(trend, data) == pytest.approx(said_of(plain, data), abs=1e-9)
        assert edges.predict(trend) == pytest.approx(said_of(trend, data), abs=1e-9)
        assert edges.predict(trend, edge[:7]) == pytest.approx(edges.predict(trend)[edge[:7]], abs=1e-9)


def test_the_same_fit_twice_is_the_same_to_the_last_bit() -> None:
    data, train = monobasic()
    steps = np.flatnonzero(train[data.step_acid])
    scaling = Scaling.of(data.x[:, ~LOWERS])
    points = scaling(data.x[::4][:, ~LOWERS])
    one, two = (trend_of(data, steps, points, scaling) for _ in range(2))
    assert np.array_equal(one.dual, two.dual)
    assert np.array_equal(one.slopes, two.slopes)


@pytest.mark.parametrize("wrong", [np.nan, np.inf])
def test_a_descriptor_that_is_no_number_is_refused(wrong: float, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(inducing, "MOST_EXACT", 5)
    free = np.random.default_rng(8).normal(size=(10, 3))
    free[4, 1] = wrong
    with pytest.raises(ValueError, match="row 4"):
        basis_points(free, SETTINGS, Scaling(np.zeros(3), np.ones(3)) if np.isnan(wrong) else _Unclipped())


class _Unclipped(Scaling):
    """A scaling that lets infinity through."""

    def __init__(self) -> None:
        super().__init__(np.zeros(3), np.ones(3))

    def __call__(self, free: Floats) -> Floats:
        return free


@pytest.mark.parametrize("wrong", [0.0, -0.1, np.nan])
def test_a_variance_that_is_none_is_refused(wrong: float) -> None:
    points = np.random.default_rng(9).normal(size=(8, 2))
    variance = np.full(8, 0.01)
    variance[3] = wrong
    with pytest.raises(ValueError, match="variance of target 3"):
        fit(kernel(points, points), np.zeros((8, 1)), np.zeros(8), variance, 0.05)
