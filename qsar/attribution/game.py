r"""The game with precedence: each player's average over all orders in which a carrier comes before what it carries.

The players are the nodes of a forest. A coalition is closed: with a player it holds the player's carrier. With
:math:`e(S)` the number of orders of a coalition S that respect precedence and :math:`e'(R)` that of the rest R,

.. math:: \phi_i = \sum_S \frac{e(S)\, e'(N \setminus S \setminus i)}{e(N)} \,[v(S \cup i) - v(S)]

summed over the coalitions S to which i can be added (U. Faigle, W. Kern, Int. J. Game Theory 1992, 21, 249; the
value of L. S. Shapley, 1953, where nothing is nested). Both counts follow from the hook formula for forests,
:math:`e = n! / \prod_v h_v` with :math:`h_v` the size of the subtree of v (D. E. Knuth, The Art of Computer
Programming, vol. 3, 5.1.4, exercise 20).
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from itertools import pairwise
from math import comb, factorial, prod

import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]
Coalition = frozenset[int]

EXACT_UP_TO = 10
ORDERS = 64  # sampled orders beyond that, in pairs of an order and its mirror


@dataclass(frozen=True)
class Forest:
    """Who carries whom.

    Attributes
    ----------
    carrier : tuple of (int or None)
        For each player the player that carries it; carriers have lower positions.
    """

    carrier: tuple[int | None, ...]

    def __post_init__(self) -> None:
        if any(c is not None and not 0 <= c < i for i, c in enumerate(self.carrier)):
            raise ValueError("a carrier must come before what it carries")

    @property
    def n(self) -> int:
        """Number of players."""
        return len(self.carrier)

    def carriers_of(self, player: int) -> Coalition:
        """All players that must be there before a player."""
        found = []
        above = self.carrier[player]
        while above is not None:
            found.append(above)
            above = self.carrier[above]
        return frozenset(found)

    def coalitions(self, alike: Sequence[Sequence[int]] = (), most: int | None = None) -> list[Coalition]:
        """All closed coalitions, the empty one first.

        Parameters
        ----------
        alike : sequence of sequence of int
            Sets of interchangeable players; of coalitions that differ only by them one is listed, the one that
            holds the first members of each set.
        most : int, optional
            Stop once there are more than so many.
        """
        before = {b: a for members in alike for a, b in pairwise(members)}
        found: list[Coalition] = [frozenset()]
        for player, carrier in enumerate(self.carrier):
            needed = {x for x in (carrier, before.get(player)) if x is not None}
            found += [s | {player} for s in found if needed <= s]
            if most is not None and len(found) > most:
                break
        return found

    def orders(self, members: Coalition) -> int:
        """Number of orders of some players that respect precedence among them."""
        size = dict.fromkeys(members, 1)
        for player in sorted(members, reverse=True):
            carrier = self.carrier[player]
            if carrier in size:
                size[carrier] += size[player]
        return factorial(len(members)) // prod(size.values())


@dataclass(frozen=True)
class Shares:
    """How the value of each player is put together from coalitions.

    Attributes
    ----------
    coalitions : list of frozenset of int
        Those that must be evaluated.
    matrix : ndarray, shape (n_players, n_coalitions)
        ``matrix @ v`` gives the players' values.
    samples : ndarray, shape (n_orders, n_players, 2) or None
        For sampled games the positions of the coalitions with and without the player in each order.
    """

    coalitions: list[Coalition]
    matrix: Floats
    samples: NDArray[np.int64] | None = None

    @property
    def exact(self) -> bool:
        """Whether all orders were averaged."""
        return self.samples is None

    def sampling_error(self, v: Floats) -> Floats:
        """Standard error of each player's value from sampling, shape (n_players,); zero for exact games.

        Parameters
        ----------
        v : ndarray, shape (n_coalitions,)
        """
        if self.samples is None:
            return np.zeros(len(self.matrix))
        marginal = v[self.samples[..., 0]] - v[self.samples[..., 1]]
        pairs = 0.5 * (marginal[0::2] + marginal[1::2])  # an order and its mirror are not independent
        result: Floats = pairs.std(axis=0, ddof=1) / np.sqrt(len(pairs))
        return result


def shares(forest: Forest, alike: Sequence[Sequence[int]] = (), orders: int = ORDERS, seed: int = 1) -> Shares:
    """Coalitions and weights of a game: exact up to ten players, sampled orders beyond.

    More than ten players are still exact where no more coalitions than those of ten free ones, 1024, are left by
    precedence and by interchangeable players.

    Parameters
    ----------
    forest : Forest
    alike : sequence of sequence of int
        Sets of players that can be interchanged without any change; none of them carries another.
    orders : int
        Orders sampled beyond that, an even number.
    seed : int

    Returns
    -------
    Shares
    """
    few = len(forest.coalitions(alike, most=2**EXACT_UP_TO)) <= 2**EXACT_UP_TO
    return _exact(forest, alike) if few else _sampled(forest, orders, seed)


def _exact(forest: Forest, alike: Sequence[Sequence[int]]) -> Shares:
    found = forest.coalitions(alike)
    place = {s: k for k, s in enumerate(found)}
    everyone = frozenset(range(forest.n))
    total = forest.orders(everyone)
    before = [forest.orders(s) for s in found]
    after = [forest.orders(everyone - s) for s in found]
    group = {i: tuple(members) for members in alike for i in members}
    sets = [group.get(i, (i,)) for i in range(forest.n)]
    matrix = np.zeros((forest.n, len(found)))
    for k, s in enumerate(found):
        # how many coalitions the listed one stands for
        copies = prod(comb(len(m), sum(i in s for i in m)) for m in alike)
        for i in sorted(everyone - s):
            grown = place.get(s | {i})
            if grown is None:
                continue
            members = sets[i]
            free = sum(j not in s for j in members)
            weight = copies * free * before[k] * after[grown] / total / len(members)
            matrix[list(members), grown] += weight
            matrix[list(members), k] -= weight
    return Shares(found, matrix)


def _sampled(forest: Forest, orders: int, seed: int) -> Shares:
    place: dict[Coalition, int] = {frozenset(): 0}
    matrix_entries: list[tuple[int, int, int]] = []
    samples = np.zeros((orders, forest.n, 2), dtype=np.int64)
    for row, order in enumerate(_orders(forest, orders, seed)):
        s: Coalition = frozenset()
        for i in order:
            after = s | {i}
            with_, without = place.setdefault(after, len(place)), place[s]
            samples[row, i] = with_, without
            matrix_entries.append((i, with_, without))
            s = after
    matrix = np.zeros((forest.n, len(place)))
    for i, with_, without in matrix_entries:
        matrix[i, with_] += 1.0 / orders
        matrix[i, without] -= 1.0 / orders
    return Shares(list(place), matrix, samples)


def _orders(forest: Forest, orders: int, seed: int) -> Iterator[Sequence[int]]:
    """Orders drawn evenly from those that respect precedence, each followed by its mirror.

    The next player is drawn among those whose carrier is there, with chances in proportion to the players that
    hang on it; this is uniform over the orders of a forest. The mirror uses the complementary random numbers.
    """
    rng = np.random.default_rng(seed)
    hanging = [1] * forest.n
    for player in reversed(range(forest.n)):
        carrier = forest.carrier[player]
        if carrier is not None:
            hanging[carrier] += hanging[player]
    children = [[i for i, c in enumerate(forest.carrier) if c == k] for k in range(forest.n)]
    roots = [i for i, c in enumerate(forest.carrier) if c is None]
    for _ in range(orders // 2):
        draws = rng.random(forest.n)
        for u in (draws, 1.0 - draws):
            ready, order = list(roots), []
            for x in u:
                edges = np.cumsum([hanging[i] for i in ready])
                chosen = ready.pop(min(int(np.searchsorted(edges, x * edges[-1], side="right")), len(edges) - 1))
                order.append(chosen)
                ready += children[chosen]
            yield order
