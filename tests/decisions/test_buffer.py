"""Buffers against measured reference solutions and textbook rules."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from qsar.decisions.buffer import Recipe, make_buffer, salt_for, solve_recipe
from qsar.decisions.steps import given_steps

ACETIC = given_steps("acetic acid", [4.756], sd=0.01)


@pytest.mark.parametrize(
    ("name", "pka", "recipe", "reference"),
    # Bates, J. Res. NBS A 1962, 66, 179, and Buck et al. 2002 (25 degC); constants as in test_equilibrium.
    [
        ("acetate 0.1 + 0.1", (4.756,), Recipe(0.1, 0.1), 4.652),
        ("acetate 0.01 + 0.01", (4.756,), Recipe(0.01, 0.01), 4.718),
        ("hydrogen phthalate 0.05", (2.950, 5.408), Recipe(0.0, 0.05, 1), 4.005),
        ("dihydrogen citrate 0.05", (3.128, 4.761, 6.396), Recipe(0.0, 0.05, 1), 3.776),
        ("phosphates 0.025 + 0.025", (2.148, 7.198, 12.35), Recipe(0.025, 0.025, 2), 6.865),
    ],
)
def test_reference_solutions(name: str, pka: tuple[float, ...], recipe: Recipe, reference: float) -> None:
    assert make_buffer(given_steps(name, pka), recipe).ph == pytest.approx(reference, abs=0.02)


def test_textbook_acetate_buffer_takes_up_base_and_acid() -> None:
    # Henderson-Hasselbalch textbook problem: 0.1 + 0.1 mol/L acetate, 0.01 mol/L of NaOH or HCl added:
    # +0.09, -0.09.
    plain = make_buffer(ACETIC, Recipe(0.1, 0.1)).ph
    assert make_buffer(ACETIC, Recipe(0.1, 0.1, strong_base_m=0.01)).ph - plain == pytest.approx(
        0.09, abs=0.01
    )
    assert make_buffer(ACETIC, Recipe(0.1, 0.1, strong_base_m=-0.01)).ph - plain == pytest.approx(
        -0.09, abs=0.01
    )


def test_weak_acid_alone_and_salt_alone() -> None:
    # Textbook values, which leave activities out, so they are compared where these are near one: 0.1 and
    # 0.001 mol/L acetic acid 2.88 and 3.91, 0.001 mol/L sodium acetate 7.88.
    assert make_buffer(ACETIC, Recipe(0.1, 0.0)).ph == pytest.approx(2.88, abs=0.02)
    assert make_buffer(ACETIC, Recipe(0.001, 0.0)).ph == pytest.approx(3.91, abs=0.02)
    assert make_buffer(ACETIC, Recipe(0.0, 0.001)).ph == pytest.approx(7.88, abs=0.02)


def test_highest_capacity_and_useful_range() -> None:
    # Van Slyke 1922: at pH = pK' the capacity of one step is ln(10) / 4 = 0.576 of its concentration.
    result = make_buffer(ACETIC, Recipe(0.05, 0.05))
    assert result.capacity / 0.1 == pytest.approx(0.576, abs=0.002)
    ((low, high),) = result.useful
    # One unit to either side of the conditional constant.
    assert high - low == pytest.approx(2.0, abs=0.002)
    assert 0.5 * (low + high) == pytest.approx(result.ph, abs=0.01)


def test_overlapping_steps_make_one_range() -> None:
    # McIlvaine and citrate buffers are used from about pH 2.2 (3.0) to 6.2 or higher: common practice, no
    # source.
    result = make_buffer(given_steps("citric acid", [3.128, 4.761, 6.396]), Recipe(0.05, 0.05, 2))
    assert len(result.useful) == 1
    assert result.useful[0][0] < 3.0 and result.useful[0][1] > 6.2


@given(pka=st.floats(3, 11), total=st.floats(0.01, 0.4), share=st.floats(0.2, 0.8))
@settings(max_examples=25, deadline=None)
def test_ratio_for_a_wanted_ph(pka: float, total: float, share: float) -> None:
    acid = given_steps("an acid", [pka])
    recipe = Recipe(total * (1 - share), total * share)
    ph = float(solve_recipe(recipe, np.array([[pka]]), 0)[0].ph[0])
    found = salt_for(acid, Recipe(0.5 * total, 0.5 * total), ph)
    assert found.salt_m == pytest.approx(recipe.salt_m, rel=1e-3, abs=1e-6)


def test_verdicts_say_where_they_flip() -> None:
    vague = given_steps("an acid", [4.756], sd=0.2)
    result = make_buffer(vague, Recipe(0.05, 0.05), tolerance=0.1, wanted_ph=4.7)
    made, suits = result.verdicts
    # A pH outside +/- 0.1 where the constant has a standard deviation of 0.2: two-sided tail, about 0.6.
    assert made.probability_wrong == pytest.approx(0.62, abs=0.02)
    assert made.measure_to == pytest.approx(0.10, abs=0.01)
    assert suits.flips_at == pytest.approx((4.7 - 1 + 0.086, 4.7 + 1 + 0.086), abs=0.01)
    assert "measuring changes nothing" in suits.sentence


def test_wrong_acid_for_the_ph_is_left_aside() -> None:
    result = make_buffer(ACETIC, Recipe(0.05, 0.05), wanted_ph=7.4)
    assert result.verdicts[1].choice.startswith("Leaving acetic acid aside")
    assert "no pKa near" in result.verdicts[0].sentence


def test_a_recipe_that_is_off_is_said_to_be() -> None:
    result = make_buffer(ACETIC, Recipe(0.05, 0.05), wanted_ph=5.2)
    assert "change the ratio" in result.verdicts[0].sentence


def test_amino_acid_with_its_hydrochloride() -> None:
    # Glycine and its hydrochloride, equal amounts: the textbook buffer of the first step (pK' at this ionic
    # strength), more acid left than the shortcut says because some of it dissociates.
    glycine = given_steps("glycine", [2.35, 9.78], charge_of_acid_form=1)
    ph = make_buffer(glycine, Recipe(0.1, 0.1)).ph
    assert 2.35 < ph < 2.6


def test_refusals() -> None:
    with pytest.raises(ValueError, match="not both zero"):
        make_buffer(ACETIC, Recipe(0.0, 0.0))
    with pytest.raises(ValueError, match="no step 2; it has 1 step"):
        make_buffer(ACETIC, Recipe(0.1, 0.1, step=2))
    with pytest.raises(ValueError, match="own ions make"):
        make_buffer(ACETIC, Recipe(0.1, 0.1, ionic_strength_m=0.05))
    with pytest.raises(ValueError, match="take another step or another acid"):
        salt_for(ACETIC, Recipe(0.05, 0.05), 11.0)
    assert make_buffer(ACETIC, Recipe(0.7, 0.7)).notes
