"""Measured matched pairs: two measured acids that differ by one group against hydrogen.

A pair bears on a contribution when the group is the same, at the same distance, on the same kind of parent and, for
a group on a substituent, on the same one. Of dibasic acids only those with two equal carboxyl groups are used; the
statistical log10 2 of their steps is known exactly and taken off.
"""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Iterable
from dataclasses import dataclass, replace
from math import log10
from typing import TYPE_CHECKING
from weakref import WeakKeyDictionary

from rdkit import Chem

from qsar.attribution.coalitions import hypothetical
from qsar.attribution.explanation import SITE_STATISTICS, Explanation, Witnesses
from qsar.structures import Acid, StructureError, read_acid
from qsar.substituents import Decomposition, decompose

if TYPE_CHECKING:
    from qsar.model.model import Model

#: How far a contribution may lie outside the range of its pairs, pKa units: the uncertainty of a difference of two
#: measured constants and of what else differs between the acids.
TOLERANCE = 0.2
_EXAMPLES = 3

Key = tuple[str, int, str, str]


def key_of(parts: Decomposition, position: int) -> Key:
    """What must be equal for two exchanges to be the same: group, bonds, kind of parent, carrier."""
    substituent = parts.substituents[position]
    carrier = "" if substituent.carrier is None else parts.substituents[substituent.carrier].kind
    return substituent.kind, substituent.path_length, parts.rule, carrier


@dataclass(frozen=True, slots=True)
class Pair:
    """Two measured acids that differ by one group.

    Attributes
    ----------
    with_, without : str
        Names of the acids.
    difference : float
        Measured pKa with the group less that without it, statistics taken off.
    """

    with_: str
    without: str
    difference: float


@dataclass(frozen=True, eq=False)
class MeasuredPairs:
    """All matched pairs of a table, by what is exchanged.

    Attributes
    ----------
    pairs : dict
    """

    pairs: dict[Key, list[Pair]]

    def witnesses(self, key: Key, contribution: float) -> Witnesses:
        """The pairs that bear on a contribution, and whether they agree with it."""
        found = self.pairs.get(key, [])
        if not found:
            return Witnesses()
        differences = [pair.difference for pair in found]
        low, high, mean = min(differences), max(differences), sum(differences) / len(differences)
        verdict = "agrees" if low - TOLERANCE <= contribution <= high + TOLERANCE else "contradicts"
        nearest = sorted(found, key=lambda pair: (abs(pair.difference - mean), pair.with_))[:_EXAMPLES]
        examples = tuple((pair.with_, pair.without, pair.difference) for pair in nearest)
        return Witnesses(len(found), low, high, mean, verdict, examples)

    def beside(self, explanation: Explanation) -> Explanation:
        """The explanation with the witnesses of each contribution."""
        lines = tuple(
            line
            if line.substituent == SITE_STATISTICS
            else replace(line, witnesses=self.witnesses(key_of(explanation.decomposition, k), line.contribution))
            for k, line in enumerate(explanation.contributions)
        )
        return replace(explanation, contributions=lines)


_known: WeakKeyDictionary[Model, MeasuredPairs] = WeakKeyDictionary()


def measured_pairs(model: Model) -> MeasuredPairs:
    """The matched pairs among the acids that a model was trained on, found once for each model."""
    if model not in _known:
        library = model.library
        rows = [
            (library.smiles[k], library.label(k), int(library.step[k]), float(library.pka[k]))
            for k in range(len(library.smiles))
            if library.smiles[k]
        ]
        _known[model] = find_pairs(rows)
    return _known[model]


def find_pairs(rows: Iterable[tuple[str, str, int, float]]) -> MeasuredPairs:
    """Find all matched pairs of a table.

    Parameters
    ----------
    rows : iterable of (smiles, name, step, pka)
        Canonical SMILES.

    Returns
    -------
    MeasuredPairs
    """
    rows = list(rows)
    single: dict[str, tuple[str, float]] = {}
    acids: dict[str, Acid] = {}
    for smiles, name, _, pka in rows:
        if smiles not in acids:
            try:
                acids[smiles] = read_acid(smiles)
            except StructureError:
                continue  # a table made by another version may hold an acid that this one refuses
        acid = acids[smiles]
        if len(acid.sites) == 1:
            single[_flat(acid.smiles)] = name, pka
    found: dict[Key, list[Pair]] = defaultdict(list)
    for smiles, name, step, pka in rows:
        if smiles not in acids:
            continue
        acid = acids[smiles]
        statistic = _statistic(acid, step)
        if statistic is None:
            continue
        ionised = frozenset(acid.sites[1:]) if step == 2 else frozenset()
        parts = decompose(acid, acid.sites[0], ionised)
        carriers = {s.carrier for s in parts.substituents}
        for k in range(len(parts.substituents)):
            if k in carriers:
                continue
            rest = [j for j in range(len(parts.substituents)) if j != k]
            other = single.get(_flat(hypothetical(acid, parts, ionised, rest).smiles))
            if other is not None:
                found[key_of(parts, k)].append(Pair(name, other[0], pka - statistic - other[1]))
    return MeasuredPairs(dict(found))


def _statistic(acid: Acid, step: int) -> float | None:
    """Statistical part of a measured step where it is known without a model; None where it is not."""
    if len(acid.sites) == 1:
        return 0.0
    if len(acid.sites) > 2:
        return None
    rank = list(Chem.CanonicalRankAtoms(acid.mol, breakTies=False, includeChirality=False))
    if rank[acid.sites[0]] != rank[acid.sites[1]]:
        return None
    return -log10(2.0) if step == 1 else log10(2.0)


def _flat(smiles: str) -> str:
    """SMILES without configuration at centres, which pairs may state or leave open; E/Z stays."""
    if "@" not in smiles:
        return smiles
    return str(Chem.MolToSmiles(Chem.MolFromSmiles(smiles.replace("@", ""))))
