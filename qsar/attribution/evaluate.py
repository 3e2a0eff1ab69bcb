"""Values of many hypothetical molecules from one call of the model, each distinct molecule once."""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from qsar.attribution.coalitions import Case, Hypothetical, cases
from qsar.descriptors import Molecule, SiteView, rounded, site_descriptors
from qsar.model.domain import OUTSIDE
from qsar.model.model import evidence_of

if TYPE_CHECKING:
    from qsar.model.model import Model

Floats = NDArray[np.float64]

_BLOCK = 2000  # rows that are handed to the model at once
_KEEP = 20_000  # molecules that are remembered for later acids


@dataclass(frozen=True, slots=True)
class Value:
    """Micro pKa of the asked site of one molecule.

    Attributes
    ----------
    members : ndarray, shape (n_members,)
    outside : bool
        Whether the molecule is outside the domain.
    """

    members: Floats
    outside: bool


@dataclass(eq=False)
class Evaluator:
    """Collects molecules, evaluates them together and remembers them.

    Attributes
    ----------
    model : Model
    """

    model: Model
    _known: dict[str, Value] = field(default_factory=dict)
    _waiting: dict[str, list[Case]] = field(default_factory=dict)

    def make_room(self) -> None:
        """Forget all values once they are many; to be called before asking, for what was asked rests on them."""
        if len(self._known) > _KEEP:
            self._known.clear()

    def ask(self, molecule: Hypothetical) -> str:
        """Note a molecule for the next `run`; returns its key."""
        if molecule.key not in self._known and molecule.key not in self._waiting:
            self._waiting[molecule.key] = cases(molecule)
        return molecule.key

    def ask_cases(self, key: str, given: list[Case]) -> str:
        """Note a molecule whose configurations are known already."""
        if key not in self._known and key not in self._waiting:
            self._waiting[key] = given
        return key

    def run(self) -> None:
        """Evaluate what was asked."""
        keys = list(self._waiting)
        flat = [(k, case) for k, key in enumerate(keys) for case in self._waiting[key]]
        members: list[Floats] = []
        outside: list[bool] = []
        for start in range(0, len(flat), _BLOCK):
            values, flags = self._block([case for _, case in flat[start : start + _BLOCK]])
            members += list(values.T)
            outside += flags
        owner = [k for k, _ in flat]
        position = 0
        for k, key in enumerate(keys):
            count = len(self._waiting[key])
            rows = slice(position, position + count)
            assert owner[position] == k
            self._known[key] = Value(np.mean(members[rows], axis=0), any(outside[rows]))
            position += count
        self._waiting.clear()

    def __getitem__(self, key: str) -> Value:
        return self._known[key]

    def _block(self, block: list[Case]) -> tuple[Floats, list[bool]]:
        """Micro pKa by member, shape (n_members, n), and whether each case is outside the domain."""
        model = self.model
        views = [SiteView(Molecule(c.acid.graph), c.site, c.ionised) for c in block]
        x = rounded([site_descriptors(view) for view in views])
        trend, boosted = model.members.predict(x)
        distances = model.neighbours.distances(model.members, x)
        evidence = evidence_of(
            distances,
            np.abs(model.library.pka - model.library.pka_without),
            np.abs(boosted).mean(axis=0),
            np.zeros(len(block)),
            np.array([model.domain.sparse(view) for view in views]),
        )
        expected = model.calibration.expected_error(evidence)
        nearest = distances.min(axis=1)
        flags = [
            model.domain.judge(view, float(e), "", float(d))[0] == OUTSIDE
            for view, e, d in zip(views, expected, nearest, strict=True)
        ]
        return trend + boosted, flags
