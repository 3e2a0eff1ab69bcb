"""The value of a measurement against simulation, and the words of the verdicts."""

from __future__ import annotations

from statistics import NormalDist

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from qsar.decisions.worth_measuring import (
    choice_verdict,
    elsewhere,
    precision_needed,
    probability_in,
    ranges_where,
    remaining_error,
    say_ranges,
    setting_verdict,
)

BELOW_5_2 = ((-np.inf, 5.2),)


@pytest.mark.parametrize(
    ("mean", "sd", "holds", "u"),
    [
        (4.9, 0.3, BELOW_5_2, 0.15),
        (5.1, 0.4, BELOW_5_2, 0.05),
        (5.0, 0.5, ((4.6, 5.4),), 0.2),
    ],
)
def test_remaining_error_against_simulation(
    mean: float, sd: float, holds: tuple[tuple[float, float], ...], u: float
) -> None:
    """Simulate acids, measure them, choose by the posterior, and count wrong choices."""
    random = np.random.default_rng(7)
    true = random.normal(mean, sd, 300_000)
    measured = true + random.normal(0.0, u, true.size)
    posterior = (mean * u**2 + measured * sd**2) / (sd**2 + u**2)
    spread = sd * u / np.hypot(sd, u)
    choose = probability_in(holds, posterior, spread) >= 0.5
    right = np.zeros(true.size, dtype=bool)
    for low, high in holds:
        right |= (low < true) & (true < high)
    assert remaining_error(mean, sd, holds, u) == pytest.approx(float(np.mean(choose != right)), abs=0.003)


@given(mean=st.floats(3, 7), sd=st.floats(0.05, 1), flip=st.floats(3, 7))
@settings(max_examples=40, deadline=None)
def test_needed_precision_brings_the_risk_down(mean: float, sd: float, flip: float) -> None:
    holds = ((-np.inf, flip),)
    needed = precision_needed(mean, sd, holds, 0.05)
    before = remaining_error(mean, sd, holds, float("inf"))
    if needed is None:
        assert before <= 0.05
        return
    u = needed / NormalDist().inv_cdf(0.975)
    assert before > 0.05
    assert remaining_error(mean, sd, holds, u) == pytest.approx(0.05, abs=0.002)


def test_probability_wrong_is_the_normal_tail() -> None:
    # Table of the normal distribution: 0.1587 beyond one standard deviation.
    verdict = choice_verdict("a base", [5.0], [0.2], [BELOW_5_2])
    assert verdict.probability_wrong == pytest.approx(0.1587, abs=1e-4)
    assert verdict.flips_at == (5.2,)
    assert verdict.measure_to is not None
    assert f"measure to ± {verdict.measure_to:.2f} before choosing" in verdict.sentence


def test_far_from_the_flip_measuring_changes_nothing() -> None:
    sentence = choice_verdict("hydrogencarbonate", [4.2], [0.2], [BELOW_5_2]).sentence
    assert sentence.startswith("hydrogencarbonate holds for any pKa below 5.20")
    assert sentence.endswith("measuring changes nothing.")


def test_at_the_flip_no_measurement_settles_it() -> None:
    verdict = choice_verdict("a base", [5.2], [0.02], [BELOW_5_2], risk=0.01)
    assert "choose otherwise" in verdict.sentence


def test_the_deciding_step_is_the_doubtful_one() -> None:
    verdict = choice_verdict("a base", [3.0, 5.0], [0.2, 0.2], [BELOW_5_2, BELOW_5_2])
    assert verdict.step == 2 and "(step 2)" in verdict.sentence
    settled = choice_verdict("a base", [3.0, 3.5], [0.01, 0.01], [BELOW_5_2, BELOW_5_2])
    assert settled.step == 2


def test_setting_needs_a_measurement_as_fine_as_its_tolerance() -> None:
    verdict = setting_verdict("The recipe keeps pH 4.70 ± 0.1 for", 4.76, 0.2, (4.66, 4.86), 0.62)
    assert verdict.measure_to == pytest.approx(0.1)
    assert "measure the pKa to ± 0.10 first" in verdict.sentence
    assert setting_verdict("It keeps", 4.76, 0.01, (4.66, 4.86), 1e-9).sentence.endswith(
        "measuring changes nothing."
    )


def test_a_setting_that_holds_to_one_side_asks_for_a_measurement_up_to_its_flip() -> None:
    verdict = setting_verdict("The recipe keeps pH 3.10 ± 0.1 for", 0.62, 0.79, (-np.inf, 0.98), 0.32)
    assert verdict.measure_to == pytest.approx(0.36)
    assert "measure the pKa to ± 0.36 first" in verdict.sentence


def test_ranges() -> None:
    grid = np.linspace(0.0, 10.0, 101)
    assert ranges_where(grid, 5.2 - grid) == ((-np.inf, pytest.approx(5.2)),)
    assert ranges_where(grid, 1.0 - np.abs(grid - 4.0)) == ((pytest.approx(3.0), pytest.approx(5.0)),)
    assert ranges_where(grid, -np.ones_like(grid)) == ()
    assert ranges_where(grid, np.ones_like(grid)) == ((-np.inf, np.inf),)
    assert elsewhere(((3.0, 5.0),)) == ((-np.inf, 3.0), (5.0, np.inf))
    assert elsewhere(BELOW_5_2) == ((5.2, np.inf),)
    assert elsewhere(()) == ((-np.inf, np.inf),)
    assert say_ranges(BELOW_5_2) == "any pKa below 5.20"
    assert say_ranges(((3.0, 5.0), (6.0, np.inf))) == "a pKa between 3.00 and 5.00 or any pKa above 6.00"
