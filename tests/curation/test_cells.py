"""Numbers as people type them.

Spellings are common practice, no source; brackets behind a number are the concise notation of its standard
uncertainty (JCGM 100:2008, 7.2.2).
"""

from __future__ import annotations

import pytest
from hypothesis import given
from hypothesis import strategies as st

from qsar.curation.cells import CellError, read_quantity


@pytest.mark.parametrize(
    ("text", "value"),
    [
        ("4.76", 4.76),
        (" 4,76 ", 4.76),
        ("−0.5", -0.5),
        (".5", 0.5),
        ("1.75e-5", 1.75e-5),
        ("1.75E-05", 1.75e-5),
        ("1.75 x 10^-5", 1.75e-5),
        ("1,75×10⁻⁵", 1.75e-5),
        ("1.75·10**-5", 1.75e-5),
        ("pKa = 4.76", 4.76),
        ("pKa1: 2.85", 2.85),
        ("4.76 ± 0.02", 4.76),
        ("4.76(2)", 4.76),
        ("4.76 (25 °C)", 4.76),
        ("4.76 at 25C, I = 0.15 M", 4.76),
        ("ca. 4.8", 4.8),
        ("~4.8", 4.8),
    ],
)
def test_value(text: str, value: float) -> None:
    assert read_quantity(text).value == pytest.approx(value)


def test_what_is_written_beside_the_value() -> None:
    assert read_quantity("4.76 ± 0.02").spread == pytest.approx(0.02)
    assert read_quantity("4.76(12)").spread == pytest.approx(0.12)
    assert read_quantity("4.76 (20 °C)").temperature_c == 20.0
    assert read_quantity("4.56 I=0.1 M").ionic_strength_m == pytest.approx(0.1)
    assert read_quantity("17.5 µM").unit == "µM"
    assert read_quantity("pKb 9.24").prefix == "pKb"
    assert read_quantity("ca. 5").approximate
    assert "comma" in read_quantity("4,76").notes[0]


@pytest.mark.parametrize(
    ("text", "reason"),
    [
        ("", "empty"),
        ("n.d.", "no number"),
        (">8", "limit"),
        ("< 2.0", "limit"),
        ("≥ 7", "limit"),
        ("pKa > 8", "limit"),
        ("below 2", "limit"),
        ("4.1-4.3", "range"),
        ("4.1 – 4.3", "range"),
        ("4.1 to 4.3", "range"),
        ("2.85; 5.70", "2 values"),
        ("2.85, 5.70", "2 values"),
        ("2,85/5,70", "2 values"),
        ("3.13 4.76 6.40", "3 values"),
    ],
)
def test_refused(text: str, reason: str) -> None:
    with pytest.raises(CellError, match=reason):
        read_quantity(text)


@given(st.floats(-2, 14).map(lambda v: round(v, 3)), st.sampled_from([".", ","]))
def test_any_plain_number_is_read_as_it_stands(value: float, mark: str) -> None:
    assert read_quantity(f"{value:.3f}".replace(".", mark)).value == pytest.approx(value, abs=1e-12)


@given(st.text(max_size=40))
def test_any_text_is_a_number_or_one_refusal(text: str) -> None:
    try:
        quantity = read_quantity(text)
    except CellError as problem:
        assert str(problem)
    else:
        assert isinstance(quantity.value, float)
