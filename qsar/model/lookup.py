"""Small trees as tables to look up, for many rows at once.

A tree with k splits answers k yes-or-no questions about a row; the answers, read as a binary number, are the place of
its value in a table of ``2 ** k`` values. Many trees ask the same questions, which are so asked once. The leaves are
the same numbers that walking down the tree finds, and they are added up in the same order.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

if TYPE_CHECKING:
    from qsar.model.boosting import Trees

Floats = NDArray[np.float64]
Ints = NDArray[np.int64]

MOST_SPLITS = 8  # a table of 256 values a tree; larger trees are walked


@dataclass(frozen=True)
class Lookup:
    """The tables of all trees.

    Attributes
    ----------
    feature : ndarray of int, shape (n_questions,)
    threshold : ndarray, shape (n_questions, 1)
        A question is whether a row's value of `feature` is at most this.
    question : ndarray of int, shape (n_splits, n_trees)
        What each tree asks; the first one again where it has fewer splits.
    value : ndarray, shape (n_trees * 2**n_splits,)
    base : ndarray of int, shape (n_trees, 1)
        Where the table of a tree begins.
    """

    feature: Ints
    threshold: Floats
    question: Ints
    value: Floats
    base: Ints

    @classmethod
    def of(cls, trees: Trees) -> Lookup | None:
        """Tables of trees; None where a tree has more than `MOST_SPLITS` splits."""
        inner = trees.feature >= 0
        asked = list(zip(trees.feature[inner].tolist(), trees.threshold[inner].tolist(), strict=True))
        questions = {q: i for i, q in enumerate(sorted(set(asked)))}
        number = np.full(len(trees.feature), -1)
        number[inner] = [questions[q] for q in asked]
        roots = trees.root.ravel().tolist()
        splits = [_splits(trees, root) for root in roots]
        most = max((len(s) for s in splits), default=0)
        if not 0 < most <= MOST_SPLITS:
            return None
        question = np.zeros((most, len(roots)), dtype=np.int64)
        value = np.empty((len(roots), 2**most))
        for tree, own in enumerate(splits):
            question[: len(own), tree] = number[own]
            value[tree] = _table(trees, roots[tree], own, most)
        return cls(
            np.array([f for f, _ in questions]),
            np.array([[t] for _, t in questions]),
            question,
            value.ravel(),
            (np.arange(len(roots)) * 2**most)[:, None],
        )

    def leaves(self, x: Floats) -> Floats:
        """Value of each tree for each row of `x`, shape (n, n_trees)."""
        answers = (x.T[self.feature] <= self.threshold).view(np.uint8)
        code = answers[self.question[0]]
        for bit, asked in enumerate(self.question[1:], start=1):
            code |= answers[asked] << bit
        return np.ascontiguousarray(self.value[code + self.base].T)


def _splits(trees: Trees, root: int) -> list[int]:
    """Nodes of a tree that are no leaves, parents first."""
    found, queue = [], [root]
    for node in queue:
        if trees.feature[node] >= 0:
            found.append(node)
            queue += [int(trees.left[node]), int(trees.right[node])]
    return found


def _table(trees: Trees, root: int, own: list[int], most: int) -> Floats:
    """Value of a tree for each combination of answers; bit i is set where split i is answered with yes."""
    code = np.arange(2**most)
    node = np.full(2**most, root)
    for bit, split in enumerate(own):
        here = node == split
        node[here] = np.where(code[here] >> bit & 1, trees.left[split], trees.right[split])
    values: Floats = trees.threshold[node]
    return values
