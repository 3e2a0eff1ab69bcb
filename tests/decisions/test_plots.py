"""Figures: what they show, and that nothing hangs on colour alone."""

from __future__ import annotations

from pathlib import Path

import pytest

from qsar.decisions.buffer import Recipe, make_buffer
from qsar.decisions.plots import (
    COLOURS,
    STYLES,
    buffer_figure,
    save,
    speciation_figure,
    window_figure,
    workup_figure,
)
from qsar.decisions.speciation import LogP, speciation
from qsar.decisions.steps import given_steps
from qsar.decisions.window import Layered, find_window
from qsar.decisions.workup import Extraction, plan_workup
from qsar.errors import UserError

ACID = given_steps("an acid with a $ in its name", [4.2], sd=0.1)
LOG_P = LogP(1.9, "log P as given")

# Okabe & Ito 2008, Color Universal Design: the palette as published (from memory).
OKABE_ITO = {"#000000", "#E69F00", "#56B4E9", "#009E73", "#F0E442", "#0072B2", "#D55E00", "#CC79A7"}


def test_palette() -> None:
    assert set(COLOURS) <= OKABE_ITO
    assert len(set(COLOURS)) == len(COLOURS) == len({str(style) for style in STYLES})


@pytest.mark.parametrize(
    ("pka", "charge", "names"),
    [
        ([4.2], 0, ["charge 0", "charge -1"]),
        ([4.2, 5.6], 0, ["charge 0", "charge -1", "charge -2"]),
        ([2.35, 9.78], 1, ["charge +1", "charge 0", "charge -1"]),
    ],
)
def test_every_state_has_its_curve_and_name(pka: list[float], charge: int, names: list[str]) -> None:
    acid = given_steps("an acid", pka, charge_of_acid_form=charge)
    figure = speciation_figure(speciation(acid))
    ax = figure.axes[0]
    assert [text.get_text() for text in ax.texts] == names
    assert len(ax.lines) == len(names)
    assert len({str(line.get_linestyle()) + str(line.get_color()) for line in ax.lines}) == len(names)
    assert len(ax.collections) == len(names)  # a band each


def test_log_d_has_its_own_panel_with_the_source() -> None:
    figure = speciation_figure(speciation(ACID, log_p=LOG_P))
    assert len(figure.axes) == 3
    assert "log P as given" in figure.axes[2].get_title(loc="right")


def test_workup_window_and_buffer(tmp_path: Path) -> None:
    workup = plan_workup(ACID, LOG_P, Extraction(0.01, 0.05, 0.05, 0.02))
    figure = workup_figure(workup)
    assert len(figure.axes[0].get_yticklabels()) == len(workup.outcomes)
    other = given_steps("another", [9.5], sd=0.1)
    window = find_window(Layered(ACID, LOG_P), Layered(other, LOG_P))
    assert "open" in window_figure(window).axes[0].get_title(loc="left")
    shut = find_window(Layered(ACID, LOG_P), Layered(ACID, LOG_P))
    assert "shut" in window_figure(shut).axes[0].get_title(loc="left")
    buffer = buffer_figure(make_buffer(ACID, Recipe(0.05, 0.05)))
    for number, drawn in enumerate((figure, window_figure(window), buffer)):
        save(drawn, tmp_path / f"{number}.svg")
        assert (tmp_path / f"{number}.svg").stat().st_size > 5000


def test_the_same_figure_is_the_same_file(tmp_path: Path) -> None:
    for kind in ("svg", "png"):
        for name in ("one", "two"):
            save(speciation_figure(speciation(ACID)), tmp_path / f"{name}.{kind}")
        assert (tmp_path / f"one.{kind}").read_bytes() == (tmp_path / f"two.{kind}").read_bytes()


def test_other_formats_are_refused(tmp_path: Path) -> None:
    with pytest.raises(UserError, match=r"\.png, \.svg"):
        save(speciation_figure(speciation(ACID)), tmp_path / "a.gif")
