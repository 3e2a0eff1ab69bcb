"""From a predicted acid to what each of its substituents contributed."""

from __future__ import annotations

from collections.abc import Callable, Iterable, Sequence
from dataclasses import dataclass
from itertools import combinations
from typing import TYPE_CHECKING
from weakref import WeakKeyDictionary

import numpy as np
from numpy.typing import NDArray
from rdkit import Chem

from qsar.attribution.coalitions import Case, Hypothetical, hypothetical, match_atoms
from qsar.attribution.evaluate import Evaluator
from qsar.attribution.explanation import SITE_STATISTICS, Contribution, Explanation
from qsar.attribution.game import Coalition, Forest, Shares, shares
from qsar.constants.electronegativity import group_electronegativity, group_electronegativity_of_smiles
from qsar.ionisation import cube, edge_descriptors, macroscopic
from qsar.isomers import configurations
from qsar.model.training_set import dominant_edge
from qsar.structures import Acid, StructureError
from qsar.substituents import Decomposition, Substituent, decompose

if TYPE_CHECKING:
    from qsar.model.model import Model, Prediction, StepPrediction

Floats = NDArray[np.float64]

_ZERO = 1e-12
_MOST_IN_PAIRS = 20
_evaluators: WeakKeyDictionary[Model, Evaluator] = WeakKeyDictionary()


@dataclass(frozen=True)
class Explained:
    """Answer to one input: its explanations, one a step, or the reason why there are none.

    Attributes
    ----------
    prediction : Prediction
    steps : tuple of Explanation
    """

    prediction: Prediction
    steps: tuple[Explanation, ...]

    @property
    def error(self) -> str | None:
        """Why the input could not be used."""
        return self.prediction.error


def explain(model: Model, acid: str | Acid, coverage: float = 0.9) -> tuple[Explanation, ...]:
    """What each substituent of an acid contributed to each of its steps.

    Parameters
    ----------
    model : Model
    acid : str or Acid
        SMILES or a standardised acid.
    coverage : float
        Of the intervals.

    Returns
    -------
    tuple of Explanation
        One for each step.

    Raises
    ------
    StructureError
        If the structure cannot be used.
    """
    (answer,) = explain_many(model, [acid], coverage)
    if answer.error is not None:
        raise StructureError(answer.error)
    return answer.steps


def explain_many(
    model: Model,
    acids: Sequence[str | Acid | StructureError],
    coverage: float = 0.9,
    *,
    witnesses: bool = True,
    done: Callable[[int], object] = lambda _: None,
) -> list[Explained]:
    """Explain acids together; all their hypothetical molecules are evaluated in one call of the model.

    Parameters
    ----------
    model : Model
    acids : sequence of str, Acid or StructureError
        As for ``Model.predict``.
    coverage : float
    witnesses : bool
        Whether to look for measured matched pairs.
    done : callable
        Called with 1 after each acid, for progress.

    Returns
    -------
    list of Explained
        In the order of the input.
    """
    predictions = model.predict(acids, coverage=coverage)
    evaluator = _evaluators.setdefault(model, Evaluator(model))
    networks = _networks(model, [p.acid for p in predictions if p.acid is not None and p.error is None])
    prepared: list[list[_Game]] = []
    for prediction in predictions:
        network = networks.get(prediction.structure)
        games = [] if network is None else [_prepare(network, s, evaluator) for s in prediction.steps]
        prepared.append(games)
    evaluator.run()
    results = []
    for prediction, games in zip(predictions, prepared, strict=True):
        steps = tuple(_assemble(game, evaluator, coverage) for game in games)
        results.append(Explained(prediction, steps))
        done(1)
    if witnesses:
        from qsar.attribution.witnesses import measured_pairs

        pairs = measured_pairs(model)
        results = [Explained(r.prediction, tuple(pairs.beside(e) for e in r.steps)) for r in results]
    return results


@dataclass(frozen=True)
class _Network:
    """Micro and macroscopic constants of an acid by member, and its configurations."""

    acid: Acid
    isomers: list[tuple[Acid, tuple[int, ...]]]
    micro: Floats  # (n_members, n_edges), mean over the configurations, sites in the order of `acid`
    macro: Floats  # (n_members, n_sites)


def _networks(model: Model, acids: Iterable[Acid]) -> dict[str, _Network]:
    unique = {acid.smiles: acid for acid in acids}
    isomers: dict[str, list[Acid]] = {s: configurations(acid)[0] for s, acid in unique.items()}
    blocks = [edge_descriptors(isomer) for s in unique for isomer in isomers[s]]
    if not blocks:
        return {}
    first = np.concatenate([[0], np.cumsum([len(b) for b in blocks])])
    by_member = model.micro(np.vstack(blocks))
    found, k = {}, 0
    for smiles, acid in unique.items():
        n = len(acid.sites)
        micro, macro, matched = [], [], []
        for isomer in isomers[smiles]:
            own = by_member[:, first[k] : first[k + 1]]
            atoms = tuple(range(acid.mol.GetNumAtoms())) if isomer is acid else match_atoms(acid, isomer)
            micro.append(own[:, _same_edges(acid, isomer, atoms)])
            macro.append(macroscopic(own, n))
            matched.append((isomer, atoms))
            k += 1
        found[smiles] = _Network(acid, matched, np.mean(micro, axis=0), np.mean(macro, axis=0))
    return found


def _same_edges(acid: Acid, isomer: Acid, atoms: tuple[int, ...]) -> list[int]:
    """For each edge of an acid the same edge of an isomer."""
    network = cube(len(acid.sites))
    place = [isomer.sites.index(atoms[s]) for s in acid.sites]
    edges = {
        (int(q), int(i)): k for k, (q, i) in enumerate(zip(network.start, network.site, strict=True))
    }
    return [
        edges[sum(1 << place[k] for k in range(network.n) if q >> k & 1), place[i]] for q, i in edges
    ]


@dataclass(frozen=True)
class _Game:
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


def _prepare(network: _Network, step: StepPrediction, evaluator: Evaluator) -> _Game:
    acid, n = network.acid, len(network.acid.sites)
    cube_ = cube(n)
    edge = dominant_edge(network.micro.mean(axis=0), n, step.step) if n > 1 else 0
    state, site = int(cube_.start[edge]), acid.sites[int(cube_.site[edge])]
    ionised = frozenset(s for k, s in enumerate(acid.sites) if state >> k & 1)
    parts = decompose(acid, site, ionised)
    forest = Forest(tuple(s.carrier for s in parts.substituents))
    game = shares(forest)
    everyone = frozenset(range(forest.n))
    alike = _interchangeable(acid, parts)
    keys: dict[Coalition, str] = {}
    made: dict[Coalition, Hypothetical] = {}
    smiles_of: dict[str, str] = {}
    for coalition in dict.fromkeys([*game.coalitions, *_pair_coalitions(forest), frozenset()]):
        standard = _standard(coalition, alike)
        if standard not in made:
            made[standard] = hypothetical(acid, parts, ionised, standard)
        molecule = made[standard]
        if standard == everyone:
            isomers = [
                Case(isomer, atoms[site], frozenset(atoms[s] for s in ionised))
                for isomer, atoms in network.isomers
            ]
            keys[coalition] = evaluator.ask_cases(f"{molecule.key} as read", isomers)
        else:
            keys[coalition] = evaluator.ask(molecule)
        smiles_of[keys[coalition]] = molecule.smiles
    return _Game(
        acid,
        step,
        parts,
        ionised,
        forest,
        game,
        keys,
        made[frozenset()].smiles,
        smiles_of,
        network.micro[:, edge],
        network.macro[:, step.step - 1],
    )


def _interchangeable(acid: Acid, parts: Decomposition) -> list[tuple[int, ...]]:
    """Sets of equal substituents on one saturated chain atom, of which only the number matters."""
    graph, groups = acid.graph, {}
    carriers = {s.carrier for s in parts.substituents}
    for k, s in enumerate(parts.substituents):
        inner = s.path[-2]
        if k not in carriers and graph.saturated(inner) and not graph.ring_size[inner]:
            groups.setdefault((inner, s.kind), []).append(k)
    return [tuple(members) for members in groups.values() if len(members) > 1]


def _standard(coalition: Coalition, alike: list[tuple[int, ...]]) -> Coalition:
    for members in alike:
        count = sum(k in coalition for k in members)
        if 0 < count < len(members):
            coalition = (coalition - set(members)) | set(members[:count])
    return coalition


def _pairs(forest: Forest) -> list[tuple[int, int]]:
    """Pairs of which neither carries the other; the nearest substituents only, where there are very many."""
    return [
        (i, j)
        for i, j in combinations(range(min(forest.n, _MOST_IN_PAIRS)), 2)
        if i not in forest.carriers_of(j) and j not in forest.carriers_of(i)
    ]


def _pair_coalitions(forest: Forest) -> list[Coalition]:
    found: list[Coalition] = []
    for i in range(forest.n):
        below = forest.carriers_of(i)
        found += [below, below | {i}]
    for i, j in _pairs(forest):
        below = forest.carriers_of(i) | forest.carriers_of(j)
        found += [below, below | {i}, below | {j}, below | {i, j}]
    return found


def _assemble(game: _Game, evaluator: Evaluator, coverage: float) -> Explanation:
    values = {s: evaluator[key] for s, key in game.keys.items()}
    everyone = frozenset(range(game.forest.n))
    by_member = {s: v.members for s, v in values.items()}
    by_member[everyone] = game.micro
    table = np.array([by_member[s] for s in game.shares.coalitions])  # (n_coalitions, n_members)
    phi = _equal_shares(game, game.shares.matrix @ table)
    error = game.shares.sampling_error(table.mean(axis=1))
    outside = {s for s, v in values.items() if v.outside}
    touched = np.array([s in outside for s in game.shares.coalitions])
    exposure = _exposure(game.shares, touched)
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


def _equal_shares(game: _Game, phi: Floats) -> Floats:
    """Give substituents that symmetry makes equal the same share; the sum stays."""
    marked = Chem.Mol(game.acid.mol)
    for s in game.acid.sites:
        marked.GetAtomWithIdx(s).SetAtomMapNum(1 if s == game.parts.site else 2 if s in game.ionised else 3)
    rank = list(Chem.CanonicalRankAtoms(marked, breakTies=False))
    classes: dict[tuple[int, str], list[int]] = {}
    for k, s in enumerate(game.parts.substituents):
        classes.setdefault((rank[s.atoms[0]], s.kind), []).append(k)
    for members in classes.values():
        if len(members) > 1:
            phi[members] = phi[members].mean(axis=0)
    return phi


def _exposure(game: Shares, touched: NDArray[np.bool_]) -> Floats:
    """Share of the orders in which a player joins at a coalition that is outside, or makes one."""
    if not touched.any():
        return np.zeros(len(game.matrix))
    up = np.where(game.matrix > 0, game.matrix, 0.0) @ touched
    down = np.where(game.matrix < 0, -game.matrix, 0.0) @ touched
    return np.minimum(np.maximum(up, down), 1.0)


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


def _strongest_pair(game: _Game, mean: dict[Coalition, float], player: int) -> tuple[str, float | None]:
    best: tuple[str, float] | None = None
    for i, j in _pairs(game.forest):
        if player not in (i, j):
            continue
        below = game.forest.carriers_of(i) | game.forest.carriers_of(j)
        together = mean[below | {i, j}] - mean[below | {i}] - mean[below | {j}] + mean[below]
        if best is None or abs(together) > abs(best[1]) + _ZERO:
            best = game.parts.substituents[j if player == i else i].label, together
    return best or ("", None)


def _statistics(game: _Game, coverage: float) -> list[Contribution]:
    micro = game.micro.mean()
    value = game.step.pka - float(micro)
    if abs(value) < _ZERO or len(game.acid.sites) == 1 and abs(value) < 1e-10:
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


def _notes(game: _Game, table: Floats) -> tuple[str, ...]:
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
    from qsar.graph import Graph
    from qsar.groups import CATIONIC, perceive

    mol = Chem.MolFromSmiles(smiles)
    return [g.kind for g in perceive(Graph.from_mol(mol)) if g.kind in CATIONIC]
