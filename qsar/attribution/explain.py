"""From a predicted acid to what each of its substituents contributed."""

from __future__ import annotations

from collections.abc import Callable, Iterable, Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING
from weakref import WeakKeyDictionary

import numpy as np
from numpy.typing import NDArray

from qsar.attribution.coalitions import Case, Hypothetical, hypothetical, match_atoms
from qsar.attribution.evaluate import Evaluator
from qsar.attribution.explanation import Explanation
from qsar.attribution.game import Coalition, Forest, shares
from qsar.attribution.lines import Game, assemble, pairs_of
from qsar.ionisation import cube, edge_descriptors, macroscopic
from qsar.isomers import configurations
from qsar.model.training_set import dominant_edge
from qsar.structures import Acid, StructureError
from qsar.substituents import Decomposition, decompose

if TYPE_CHECKING:
    from qsar.model.model import Model, Prediction, StepPrediction

Floats = NDArray[np.float64]

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
    evaluator.make_room()
    networks = _networks(model, [p.acid for p in predictions if p.acid is not None and p.error is None])
    prepared: list[list[Game]] = []
    for prediction in predictions:
        network = networks.get(prediction.structure)
        games = [] if network is None else [_prepare(network, s, evaluator) for s in prediction.steps]
        prepared.append(games)
    evaluator.run()
    results = []
    for prediction, games in zip(predictions, prepared, strict=True):
        steps = tuple(assemble(game, evaluator, coverage) for game in games)
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
    edges = {(int(q), int(i)): k for k, (q, i) in enumerate(zip(network.start, network.site, strict=True))}
    return [edges[sum(1 << place[k] for k in range(network.n) if q >> k & 1), place[i]] for q, i in edges]


def _prepare(network: _Network, step: StepPrediction, evaluator: Evaluator) -> Game:
    acid, n = network.acid, len(network.acid.sites)
    cube_ = cube(n)
    edge = dominant_edge(network.micro.mean(axis=0), n, step.step) if n > 1 else 0
    state, site = int(cube_.start[edge]), acid.sites[int(cube_.site[edge])]
    ionised = frozenset(s for k, s in enumerate(acid.sites) if state >> k & 1)
    parts = decompose(acid, site, ionised)
    forest = Forest(tuple(s.carrier for s in parts.substituents))
    alike = _interchangeable(acid, parts)
    game = shares(forest, alike)
    everyone = frozenset(range(forest.n))
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
                Case(isomer, atoms[site], frozenset(atoms[s] for s in ionised)) for isomer, atoms in network.isomers
            ]
            keys[coalition] = evaluator.ask_cases(f"{molecule.key} as read", isomers)
        else:
            keys[coalition] = evaluator.ask(molecule)
        smiles_of[keys[coalition]] = molecule.smiles
    return Game(
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
    graph = acid.graph
    groups: dict[tuple[int, str], list[int]] = {}
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


def _pair_coalitions(forest: Forest) -> list[Coalition]:
    found: list[Coalition] = []
    for i in range(forest.n):
        below = forest.carriers_of(i)
        found += [below, below | {i}]
    for i, j in pairs_of(forest):
        below = forest.carriers_of(i) | forest.carriers_of(j)
        found += [below, below | {i}, below | {j}, below | {i, j}]
    return found
