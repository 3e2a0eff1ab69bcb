"""What a model says of a training acid when nothing of that acid has entered it.

Each fold of acids has one member that never saw them. Joined with the calibration scores, neighbours and domain
counts of the other folds alone, that member is a model of its own: :func:`without_fold`. Its interval is the split
form of CV+ (the scores of acids that are not in the fold, around the one member that may be used), so that an acid
of the training table can be judged like a stranger.
"""

from __future__ import annotations

from collections import Counter
from collections.abc import Sequence
from dataclasses import fields, replace
from functools import cached_property
from typing import Any, TypeVar

import numpy as np
from numpy.typing import NDArray
from rdkit import Chem

from qsar.descriptors import Molecule, SiteView
from qsar.errors import UserError
from qsar.ionisation import cube, edge_descriptors
from qsar.model.domain import features_seen
from qsar.model.intervals import Calibration
from qsar.model.library import Library
from qsar.model.model import Model, Prediction
from qsar.model.neighbours import Neighbours
from qsar.model.training_set import dominant_edge
from qsar.structures import Acid, read_acid

Ints = NDArray[np.int64]


class Judge:
    """Predicts every acid without it.

    Parameters
    ----------
    model : Model
        With the structures of its training acids.

    Raises
    ------
    UserError
        If the model withholds its structures, so that nobody can tell which acids it has seen.
    """

    def __init__(self, model: Model) -> None:
        if not all(model.library.smiles):
            raise UserError(f"{model.name}: structures are withheld; its own acids cannot be told from others")
        self.model = model
        self._parts: dict[int, Model] = {}

    def fold_of(self, acid: Acid) -> int | None:
        """Fold that holds the acid, or None if no acid of this constitution was trained on.

        A measured acid that differs only in configuration counts as the same one: its fold is left out.
        """
        rows = self.model.library.rows_of(acid.smiles)
        if rows:
            return int(self.model.calibration.member[next(iter(rows.values()))])
        row = self._constitutions.get(constitution(acid))
        return None if row is None else int(self.model.calibration.member[row])

    @cached_property
    def _constitutions(self) -> dict[str, int]:
        found: dict[str, int] = {}
        for row, smiles in enumerate(self.model.library.smiles):
            found.setdefault(constitution(read_acid(smiles)), row)
        return found

    def without(self, fold: int) -> Model:
        """The model that no acid of a fold has entered."""
        if fold not in self._parts:
            self._parts[fold] = without_fold(self.model, fold, self._features)
        return self._parts[fold]

    @cached_property
    def _features(self) -> dict[int, list[set[tuple[str, ...]]]]:
        """For each fold, what each of its acids showed the domain."""
        library, member = self.model.library, self.model.calibration.member
        steps: dict[str, list[int]] = {}
        for row, smiles in enumerate(library.smiles):
            steps.setdefault(smiles, []).append(row)
        found: dict[int, list[set[tuple[str, ...]]]] = {}
        for smiles, rows in steps.items():
            shown = _shown(self.model, read_acid(smiles), [int(library.step[r]) for r in rows])
            found.setdefault(int(member[rows[0]]), []).append(shown)
        return found

    def predict(self, acids: Sequence[Acid], coverage: float = 0.9) -> tuple[list[Prediction], NDArray[np.bool_]]:
        """Predict acids, each by the part of the model that never saw it.

        Parameters
        ----------
        acids : sequence of Acid
        coverage : float

        Returns
        -------
        predictions : list of Prediction
            In the order of `acids`.
        trained_on : ndarray of bool, shape (n,)
            Whether the acid is in the training table.
        """
        folds = [self.fold_of(acid) for acid in acids]
        results: list[Prediction | None] = [None] * len(acids)
        for fold in sorted(set(folds), key=lambda f: -1 if f is None else f):
            rows = [i for i, f in enumerate(folds) if f == fold]
            part = self.model if fold is None else self.without(fold)
            for i, prediction in zip(rows, part.predict([acids[i] for i in rows], coverage), strict=True):
                results[i] = prediction
        return [r for r in results if r is not None], np.array([f is not None for f in folds], dtype=bool)


def constitution(acid: Acid) -> str:
    """Canonical SMILES without any configuration."""
    return str(Chem.MolToSmiles(acid.mol, isomericSmiles=False))


def without_fold(model: Model, fold: int, features: dict[int, list[set[tuple[str, ...]]]] | None = None) -> Model:
    """The part of a model that no acid of one fold has entered.

    Parameters
    ----------
    model : Model
    fold : int
        Fold (member) to leave out.
    features : dict, optional
        For each fold, what each of its acids showed the domain; without it the domain counts stay those of the
        whole model.

    Returns
    -------
    Model
        One member; scores, neighbours and library of the other folds. Descriptor scaling, distance weights, the
        coefficients of the expected error and the thresholds of the verdicts remain those of the whole model.
    """
    members, calibration, library = model.members, model.calibration, model.library
    kept = calibration.member != fold
    one = slice(fold, fold + 1)
    trees = replace(members.trees, root=members.trees.root[one], baseline=members.trees.baseline[one])
    counts = Counter(model.domain.counts)
    for shown in (features or {}).get(fold, []):
        counts.subtract(shown)
    scores = _rows_kept(calibration, kept)
    return replace(
        model,
        members=replace(members, dual=members.dual[one], slopes=members.slopes[one], trees=trees),
        neighbours=Neighbours(model.neighbours.weights, model.neighbours.points[kept]),
        calibration=replace(scores, member=np.zeros_like(scores.member)),
        domain=replace(model.domain, counts={k: n for k, n in counts.items() if n > 0}),
        library=_rows_kept(library, kept),
    )


_Rows = TypeVar("_Rows", Library, Calibration)


def _rows_kept(table: _Rows, kept: NDArray[np.bool_]) -> _Rows:
    """The same with some measured steps only: every field that has one value a step is cut."""
    values = {f.name: getattr(table, f.name) for f in fields(table)}
    cut: dict[str, Any] = {
        name: v[kept] if isinstance(v, np.ndarray) else [x for x, k in zip(v, kept, strict=True) if k]
        for name, v in values.items()
        if len(v) == len(kept)
    }
    return replace(table, **cut)


def _shown(model: Model, acid: Acid, steps: Sequence[int]) -> set[tuple[str, ...]]:
    """What an acid showed the domain: the features at the dominant edges of its measured steps."""
    n = len(acid.sites)
    network = cube(n)
    micro = model.micro(edge_descriptors(acid)).mean(axis=0) if n > 1 else np.zeros(1)
    molecule = Molecule(acid.graph)
    shown: set[tuple[str, ...]] = set()
    for step in steps:
        edge = dominant_edge(micro, n, step) if n > 1 else 0
        state = int(network.start[edge])
        ionised = frozenset(s for k, s in enumerate(acid.sites) if state >> k & 1)
        shown.update(features_seen(SiteView(molecule, acid.sites[int(network.site[edge])], ionised)))
    return shown
