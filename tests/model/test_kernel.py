"""The trend against scikit-learn's Gaussian process and against the conditions of a constrained least-squares fit."""

from __future__ import annotations

import numpy as np
import pytest
from sklearn.gaussian_process import GaussianProcessRegressor
from sklearn.gaussian_process.kernels import ConstantKernel, DotProduct, Matern

from qsar.model.kernel import CLIP, KernelSettings, Scaling, covariance, fit_trend

SETTINGS = KernelSettings(length=3.0, amplitude=0.7, linear=0.2, noise=0.1)


def data(n: int, free: int, lowers: int, seed: int = 0) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    rng = np.random.default_rng(seed)
    return rng.normal(size=(n, free)), rng.uniform(0, 2, (n, lowers)), rng.uniform(0.001, 0.05, n)


def reference_kernel(settings: KernelSettings):  # type: ignore[no-untyped-def]
    """Constant + linear + Matern 3/2 (Rasmussen & Williams 2006, ch. 4)."""
    return (
        ConstantKernel(settings.amplitude**2) * Matern(settings.length, nu=1.5)
        + ConstantKernel(settings.linear**2) * DotProduct(1e-12)
        + ConstantKernel(1.0)
    )


def test_covariance_is_that_of_the_reference_library() -> None:
    a, b = np.random.default_rng(1).normal(size=(2, 30, 4))
    assert covariance(a, b, SETTINGS) == pytest.approx(reference_kernel(SETTINGS)(a, b), abs=1e-9)


def test_without_constrained_columns_it_is_a_gaussian_process() -> None:
    free, _, variance = data(60, 5, 1)
    lowers = np.zeros((60, 1))
    target = 4.5 + np.sin(free[:, 0]) + 0.3 * free[:, 1]
    scaling = Scaling.of(free)
    trend = fit_trend(free, lowers, target, variance, SETTINGS, scaling)
    reference = GaussianProcessRegressor(reference_kernel(SETTINGS), alpha=variance + SETTINGS.noise**2, optimizer=None)
    reference.fit(scaling(free), target - trend.offset)
    new, *_ = data(40, 5, 1, seed=9)
    expected = reference.predict(scaling(new)) + trend.offset
    assert trend.predict(new, np.zeros((40, 1))) == pytest.approx(expected, abs=1e-6)


def test_slopes_are_found_and_never_have_the_wrong_sign() -> None:
    free, lowers, variance = data(300, 3, 3)
    target = 5.0 - lowers @ np.array([1.0, 0.4, -0.7]) + 0.2 * free[:, 0]
    trend = fit_trend(free, lowers, target, variance, SETTINGS, Scaling.of(free))
    assert np.all(trend.slopes >= 0.0)
    assert trend.slopes[:2] == pytest.approx([1.0, 0.4], abs=0.15)
    assert trend.slopes[2] == 0.0  # this column would raise the value


def test_slopes_meet_the_optimality_conditions() -> None:
    # Karush, Kuhn and Tucker: the gradient is zero where a weight is positive and not negative where it is zero
    # (Lawson & Hanson, Solving Least Squares Problems, 1974, ch. 23).
    free, lowers, variance = data(80, 4, 6, seed=5)
    target = 4.0 - lowers @ np.array([0.8, 0.0, 0.5, -0.3, 0.1, -0.1]) + 0.1 * np.random.default_rng(2).normal(size=80)
    scaling = Scaling.of(free)
    trend = fit_trend(free, lowers, target, variance, SETTINGS, scaling)
    k = covariance(scaling(free), scaling(free), SETTINGS) + np.diag(variance + SETTINGS.noise**2)
    left = target - trend.offset + lowers @ trend.slopes
    gradient = lowers.T @ np.linalg.solve(k, left)
    scale = np.abs(lowers.T @ np.linalg.solve(k, target)).max()
    active = trend.slopes > 0
    assert active.any() and (~active).any()
    # a very small ridge is allowed to pull positive weights
    assert np.abs(gradient[active]).max() < 0.01 * scale
    assert gradient[~active].min() > -0.01 * scale
    assert trend.dual == pytest.approx(np.linalg.solve(k, left), rel=1e-6, abs=1e-9)


def test_more_withdrawal_never_raises() -> None:
    free, lowers, variance = data(100, 3, 4, seed=7)
    target = np.random.default_rng(4).normal(4.5, 1.0, 100)  # noise: the trend must hold whatever is learnt
    trend = fit_trend(free, lowers, target, variance, SETTINGS, Scaling.of(free))
    more = lowers + np.random.default_rng(5).uniform(0, 3, lowers.shape)
    assert np.all(trend.predict(free, more) <= trend.predict(free, lowers) + 1e-9)


def test_precise_measurements_are_met_more_closely() -> None:
    free, lowers, _ = data(50, 3, 1, seed=8)
    lowers = np.zeros_like(lowers)
    target = np.random.default_rng(6).normal(4.5, 1.0, 50)
    precise = fit_trend(free, lowers, target, np.full(50, 1e-4), SETTINGS, Scaling.of(free)).predict(free, lowers)
    loose = fit_trend(free, lowers, target, np.full(50, 1.0), SETTINGS, Scaling.of(free)).predict(free, lowers)
    assert np.abs(precise - target).mean() < np.abs(loose - target).mean()


def test_scaling() -> None:
    free = np.array([[1.0, 5.0, 0.0], [3.0, 5.0, 0.0], [5.0, 5.0, 300.0]])
    scaling = Scaling.of(free)
    scaled = scaling(free)
    assert scaled[:, 0] == pytest.approx([-(1.5**0.5), 0.0, 1.5**0.5])  # standard deviation sqrt(8/3)
    assert np.all(scaled[:, 1] == 0.0)  # constant: no information, no division by zero
    far = scaling(np.array([[1e6, 5.0, -1e9]]))
    assert np.abs(far).max() == CLIP
    assert np.all(scaling(np.array([[3.0, 99.0, 100.0]]))[:, 1] == 0.0)
