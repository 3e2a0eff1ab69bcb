"""The game with precedence against averaging over every order, written out."""

from __future__ import annotations

from itertools import permutations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from qsar.attribution.game import Forest, shares


@st.composite
def forests(draw: st.DrawFn, most: int = 6) -> Forest:
    n = draw(st.integers(0, most))
    return Forest(tuple(draw(st.one_of(st.none(), st.integers(0, i - 1))) if i else None for i in range(n)))


def all_orders(forest: Forest) -> list[tuple[int, ...]]:
    return [
        order
        for order in permutations(range(forest.n))
        if all(c is None or order.index(c) < order.index(i) for i, c in enumerate(forest.carrier))
    ]


def by_definition(forest: Forest, value: dict[frozenset[int], float]) -> np.ndarray:
    """Faigle & Kern 1992: the mean marginal contribution over all orders that respect precedence."""
    orders = all_orders(forest)
    phi = np.zeros(forest.n)
    for order in orders:
        for k, i in enumerate(order):
            phi[i] += value[frozenset(order[: k + 1])] - value[frozenset(order[:k])]
    return phi / len(orders)


@given(forests(), st.integers(0, 10**6))
@settings(max_examples=60, deadline=None)
def test_exact_shares_are_the_mean_over_all_orders(forest: Forest, seed: int) -> None:
    game = shares(forest)
    v = np.random.default_rng(seed).normal(size=len(game.coalitions))
    value = dict(zip(game.coalitions, v, strict=True))
    assert game.exact
    assert game.matrix @ v == pytest.approx(by_definition(forest, value), abs=1e-9)


@given(forests())
@settings(max_examples=60, deadline=None)
def test_orders_are_counted_by_the_hook_formula(forest: Forest) -> None:
    # Knuth, The Art of Computer Programming, vol. 3, 5.1.4
    assert forest.orders(frozenset(range(forest.n))) == len(all_orders(forest))


def test_shapley_value_of_a_known_game() -> None:
    # the glove game: one left glove (0), two right gloves (1, 2); Shapley value 2/3, 1/6, 1/6
    # (textbook example, e.g. Osborne & Rubinstein, A Course in Game Theory, MIT Press, 1994)
    game = shares(Forest((None, None, None)))
    v = np.array([float(0 in s and bool(s & {1, 2})) for s in game.coalitions])
    assert game.matrix @ v == pytest.approx([2 / 3, 1 / 6, 1 / 6])


def test_interchangeable_players_give_the_same_shares_from_fewer_coalitions() -> None:
    # players 1, 2, 3 only count by their number; the full game is the reference
    forest = Forest((None, None, None, None, 0))

    def value(s: frozenset[int]) -> float:
        return float(np.sin(len(s & {1, 2, 3}) + 1.7 * (0 in s) + 0.4 * (4 in s)))

    whole, few = shares(forest), shares(forest, [(1, 2, 3)])
    assert len(few.coalitions) < len(whole.coalitions)
    expected = whole.matrix @ np.array([value(s) for s in whole.coalitions])
    assert few.matrix @ np.array([value(s) for s in few.coalitions]) == pytest.approx(expected, abs=1e-12)


def test_sampled_shares_add_up_and_come_with_an_error_that_covers_them() -> None:
    # an additive game with one strong pair: value of a player = its weight + half of the pair's interaction
    n = 12
    forest = Forest((None,) * n)
    weight = np.linspace(-1, 1, n)
    game = shares(forest)

    def value(s: frozenset[int]) -> float:
        return float(sum(weight[i] for i in s) + 2.0 * ({0, 1} <= s))

    v = np.array([value(s) for s in game.coalitions])
    phi, error = game.matrix @ v, game.sampling_error(v)
    assert not game.exact
    assert phi.sum() == pytest.approx(value(frozenset(range(n))), abs=1e-9)
    expected = weight + np.array([1.0, 1.0] + [0.0] * (n - 2))
    assert np.all(np.abs(phi - expected) <= 4 * error + 1e-9)
    assert error[2:] == pytest.approx(np.zeros(n - 2), abs=1e-12)


def test_sampled_orders_respect_precedence() -> None:
    forest = Forest(tuple(None if i % 3 == 0 else i - 1 for i in range(40)))
    game = shares(forest)
    assert not game.exact
    for s in game.coalitions:
        assert all(forest.carrier[i] is None or forest.carrier[i] in s for i in s)


def test_a_carrier_must_come_first() -> None:
    with pytest.raises(ValueError, match="carrier"):
        Forest((1, None))
