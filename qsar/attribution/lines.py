"""From the values of coalition molecules to the lines of an explanation."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass
from itertools import combinations
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray
from rdkit import Chem

from qsar.attribution.evaluate import Evaluator
from qsar.attribution.explanation import SITE_STATISTICS, Contribution, Explanation
from qsar.attribution.game import Coalition, Forest, Shares
from qsar.constants.electronegativity import group_electronegativity, group_electronegativity_of_smiles
from qsar.graph import Graph
from qsar.groups import CATIONIC, perceive
from qsar.structures import Acid
from qsar.substituents import Decomposition, Substituent

if TYPE_CHECKING:
    from qsar.model.model import StepPrediction

Floats = NDArray[np.float64]

_ZERO = 1e-12
_MOST_IN_PAIRS = 20


@dataclass(frozen=True)
class Game:
    """One step of one acid before its molecules are evaluated."""

    acid: Acid
    step: StepPrediction
    parts: Decomposition
    ionised: frozenset[int]
    forest: Forest
    shares: Shares
    keys: dict[Coalition, str]
    parent: str
    smiles_of: dict[str, str]
    micro: Floats  # of the whole acid's edge, by member
    macro: Floats  # of the whole acid's step, by member


def pairs_of(forest: Forest) -> list[tuple[int, int]]:
    """Pairs of which neither carries the other; the nearest substituents only, where there are very many."""
    return [
        (i, j)
        for i, j in combinations(range(min(forest.n, _MOST_IN_PAIRS)), 2)
        if i not in forest.carriers_of(j) and j not in forest.carriers_of(i)
    ]


def assemble(game: Game, evaluator: Evaluator, coverage: float) -> Explanation:
    """The explanation of one step, once its molecules are evaluated."""
    values = {s: evaluator[key] for s, key in game.keys.items()}
    everyone = frozenset(range(game.forest.n))
    by_member = {s: v.members for s, v in values.items()}
    by_member[everyone] = game.micro
    table = np.array([by_member[s] for s in game.shares.coalitions])  # (n_coalitions, n_members)
    equal = _symmetric(game)
    phi = _equal_shares(equal, game.shares.matrix @ table)
    error = _equal_shares(equal, game.shares.sampling_error(table.mean(axis=1)))
    outside = {s for s, v in values.items() if v.outside}
    touched = np.array([s in outside for s in game.shares.coalitions])
    exposure = _equal_shares(equal, _exposure(game.shares, touched))
    mean = {s: float(v.mean()) for s, v in by_member.items()}
    lines = []
    for i, substituent in enumerate(game.parts.substituents):
        low, high = _interval(phi[i], coverage, float(error[i]))
        pair, interaction = _strongest_pair(game, mean, i)
        below = game.forest.carriers_of(i)
        lines.append(
            Contribution(
                substituent.label,
                substituent.name,
                substituent.kind,
                substituent.atoms,
                substituent.path,
                _electronegativity(game.acid, substituent),
                float(phi[i].mean()),
                low,
                high,
                mean[below | {i}] - mean[below],
                pair,
                interaction,
                substituent.carrier,
                float(error[i]),
                float(exposure[i]),
            )
        )
    lines += _statistics(game, coverage)
    parent_pka = mean[frozenset()]
    flagged = sorted({game.smiles_of[game.keys[s]] for s in outside if s != everyone})
    return Explanation(
        game.acid,
        game.step.step,
        game.step.pka,
        game.parent,
        parent_pka,
        _closed(tuple(lines), parent_pka, game.step.pka),
        game.parts,
        game.ionised,
        coverage,
        game.shares.exact,
        len(set(game.keys.values())),
        tuple(flagged),
        game.step,
        _notes(game, table.mean(axis=1)),
    )


def _closed(lines: tuple[Contribution, ...], parent_pka: float, pka: float) -> tuple[Contribution, ...]:
    """Check that the lines add up.

    Raises
    ------
    ArithmeticError
        If they do not; then the network and the molecules were evaluated differently.
    """
    gap = pka - parent_pka - sum(line.contribution for line in lines)
    if abs(gap) > 1e-9:
        raise ArithmeticError(f"contributions miss the predicted pKa by {gap:.1e}")
    return lines


def _symmetric(game: Game) -> list[list[int]]:
    """Sets of substituents that the symmetry of the acid, in its charge state, makes equal."""
    marked = Chem.Mol(game.acid.mol)
    for s in game.acid.sites:
        marked.GetAtomWithIdx(s).SetAtomMapNum(1 if s == game.parts.site else 2 if s in game.ionised else 3)
    rank = list(Chem.CanonicalRankAtoms(marked, breakTies=False))
    classes: dict[tuple[int, str], list[int]] = {}
    for k, substituent in enumerate(game.parts.substituents):
        classes.setdefault((rank[substituent.atoms[0]], substituent.kind), []).append(k)
    return [members for members in classes.values() if len(members) > 1]


def _equal_shares(equal: Iterable[list[int]], values: Floats) -> Floats:
    """Give equal substituents the same share; the sum stays."""
    values = values.copy()
    for members in equal:
        values[members] = values[members].mean(axis=0)
    return values


def _exposure(game: Shares, touched: NDArray[np.bool_]) -> Floats:
    """Share of the orders in which a player joins at a coalition that is outside, or makes one."""
    if not touched.any():
        return np.zeros(len(game.matrix))
    up = np.where(game.matrix > 0, game.matrix, 0.0) @ touched
    down = np.where(game.matrix < 0, -game.matrix, 0.0) @ touched
    result: Floats = np.minimum(np.maximum(up, down), 1.0)
    return result


def _interval(members: Floats, coverage: float, sampling: float, around: float | None = None) -> tuple[float, float]:
    """Interval from the members, each of which left out one part of the measured acids.

    The delete-a-group jackknife: variance (G - 1)/G times the sum of squared deviations, Student's t with G - 1
    degrees of freedom (P. S. Kott, J. Off. Stat. 2001, 17, 521). The sampling error is added in quadrature.
    """
    from scipy.special import stdtrit

    centre, groups = float(members.mean()), len(members)
    if groups < 2:
        return centre, centre
    variance = (groups - 1) / groups * float(np.sum((members - centre) ** 2))
    half = float(stdtrit(groups - 1, 0.5 + coverage / 2)) * float(np.sqrt(variance + sampling**2))
    centre = centre if around is None else around
    return centre - half, centre + half


def _strongest_pair(game: Game, mean: dict[Coalition, float], player: int) -> tuple[str, float | None]:
    best: tuple[str, float] | None = None
    for i, j in pairs_of(game.forest):
        if player not in (i, j):
            continue
        below = game.forest.carriers_of(i) | game.forest.carriers_of(j)
        together = mean[below | {i, j}] - mean[below | {i}] - mean[below | {j}] + mean[below]
        if best is None or abs(together) > abs(best[1]) + _ZERO:
            best = game.parts.substituents[j if player == i else i].label, together
    return best or ("", None)


def _statistics(game: Game, coverage: float) -> list[Contribution]:
    micro = game.micro.mean()
    value = game.step.pka - float(micro)
    if abs(value) < _ZERO:
        return []
    low, high = _interval(game.macro - game.micro, coverage, 0.0, value)
    return [Contribution(SITE_STATISTICS, SITE_STATISTICS, "", (), (), None, value, low, high)]


def _electronegativity(acid: Acid, substituent: Substituent) -> float | None:
    """Group electronegativity; None for a fragment with an element that has no value."""
    try:
        if substituent.kind.count("*") == 1:
            return group_electronegativity_of_smiles(substituent.kind)
    except ValueError:
        pass  # the fragment does not stand alone; its atoms within the molecule do
    graph = acid.graph
    atoms = frozenset(substituent.atoms)
    try:
        return group_electronegativity(
            graph.numbers, graph.neighbours, atoms, substituent.atoms[0], graph.hydrogens, graph.charges
        )
    except ValueError:
        return None


def _notes(game: Game, table: Floats) -> tuple[str, ...]:
    notes = []
    if game.shares.samples is not None:
        worst = float(game.shares.sampling_error(table).max())
        notes.append(
            f"{game.forest.n} substituents: sampled over {len(game.shares.samples)} orders, standard error of a "
            f"contribution at most {worst:.2f}, which is part of each interval"
        )
    if not _cations(game.acid.smiles) and _cations(game.parent):
        notes.append("an amine is protonated in the parent and not in the acid")
    return tuple(notes)


def _cations(smiles: str) -> list[str]:
    mol = Chem.MolFromSmiles(smiles)
    return [g.kind for g in perceive(Graph.from_mol(mol)) if g.kind in CATIONIC]
