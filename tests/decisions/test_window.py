"""The pH window of two acids against the closed formula and a simulation of its probabilities."""

from __future__ import annotations

import numpy as np
import pytest

from qsar.conditions import pka_shift
from qsar.decisions.speciation import LogP
from qsar.decisions.steps import UnusableAcid, given_steps
from qsar.decisions.window import Layered, Window, find_window, fraction_in_water


def layered(name: str, pka: float, sd: float, log_p: float) -> Layered:
    return Layered(given_steps(name, [pka], sd=sd), LogP(log_p, "log P as given"))


def edges(window: Window) -> tuple[float, float]:
    """Edges by hand: pH = pK' + log10(P r f / (1 - f) - 1), from D = P / (1 + 10^(pH - pK'))."""
    shift = float(pka_shift(0, 0.1))
    found = []
    for item, fraction in ((window.wet, window.target), (window.dry, 1.0 - window.target)):
        ratio = 10.0**item.log_p.value * fraction / (1.0 - fraction)
        found.append(item.acid.pka[0] + shift + float(np.log10(ratio - 1.0)))
    return found[0], found[1]


def test_benzoic_acid_and_2_naphthol() -> None:
    # pKa 4.20 and 9.51 (CRC Handbook), log P 1.87 and 2.70 (Hansch & Leo), from memory.  That
    # hydrogencarbonate (pH 7 to 8.5) parts them is common practice, no source.
    window = find_window(layered("benzoic acid", 4.20, 0.05, 1.87), layered("2-naphthol", 9.51, 0.05, 2.70))
    assert window.exists and window.probability_exists > 0.999
    assert window.wet.acid.name == "benzoic acid"
    assert window.from_ph.ph < 8.0 < window.to_ph.ph
    assert (window.from_ph.ph, window.to_ph.ph) == pytest.approx(edges(window), abs=1e-6)
    assert window.wet_in_water > 0.95 and window.dry_in_organic > 0.95
    assert window.measure_first == "" and "Measuring changes nothing" in window.sentences[-1]


def test_equal_acids_have_none() -> None:
    window = find_window(layered("a", 4.2, 0.1, 2.0), layered("b", 4.3, 0.1, 2.0))
    assert not window.exists and window.probability_exists < 0.001
    assert window.sentences[0].startswith("There is no pH")


def test_probability_is_that_of_a_normal_difference() -> None:
    """The window opens where pKa(b) - pKa(a) exceeds a constant, and that difference is normal."""
    a, b = layered("a", 3.0, 0.3, 1.8), layered("b", 6.0, 0.2, 1.8)
    window = find_window(a, b)
    random = np.random.default_rng(1)
    difference = random.normal(6.0, 0.2, 400_000) - random.normal(3.0, 0.3, 400_000)
    simulated = float(np.mean(difference > window.flips_when_difference_below))
    assert window.probability_exists == pytest.approx(simulated, abs=0.005)
    # At the chosen pH both must hold, each by itself.
    low, high = window.from_ph, window.to_ph
    right = np.mean(
        (random.normal(low.mean, low.sd, 400_000) < window.best_ph)
        & (random.normal(high.mean, high.sd, 400_000) > window.best_ph)
    )
    assert window.probability_at_best == pytest.approx(float(right), abs=0.005)


def test_the_vaguer_acid_is_measured_first() -> None:
    window = find_window(layered("sure", 3.0, 0.05, 1.8), layered("vague", 6.2, 0.4, 1.8))
    assert window.probability_wrong > 0.05
    assert window.measure_first == "vague" and "Measure vague first" in window.sentences[-1]
    assert window.measure_to is not None and not window.measure_both
    swapped = find_window(layered("vague", 3.0, 0.4, 1.8), layered("sure", 6.2, 0.05, 1.8))
    assert swapped.measure_first == "vague"


def test_order_of_the_acids_does_not_matter() -> None:
    a, b = layered("a", 4.2, 0.1, 1.9), layered("b", 9.5, 0.1, 2.7)
    one, other = find_window(a, b), find_window(b, a)
    assert one.wet.acid.name == other.wet.acid.name == "a"
    assert one.best_ph == pytest.approx(other.best_ph)


def test_closing_the_difference_shuts_the_window() -> None:
    window = find_window(layered("a", 3.0, 0.1, 1.8), layered("b", 6.0, 0.1, 1.8))
    limit = window.flips_when_difference_below
    assert find_window(layered("a", 3.0, 0.1, 1.8), layered("b", 3.0 + limit + 0.02, 0.1, 1.8)).exists
    assert not find_window(layered("a", 3.0, 0.1, 1.8), layered("b", 3.0 + limit - 0.02, 0.1, 1.8)).exists


def test_fraction_in_water_without_ionisation() -> None:
    # Nernst distribution.
    assert float(fraction_in_water(1.0, np.array([9.0]), 1.0, 2.0)) == pytest.approx(1.0 / 21.0, rel=1e-6)


def test_refusals() -> None:
    acid = layered("a", 4.2, 0.1, 1.9)
    with pytest.raises(ValueError, match="target"):
        find_window(acid, acid, target=0.4)
    zwitterion = Layered(given_steps("glycine", [2.35], charge_of_acid_form=1), LogP(-3.2, "log P as given"))
    with pytest.raises(UnusableAcid, match="glycine"):
        find_window(acid, zwitterion)
