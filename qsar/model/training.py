"""Training: from measured steps to a model with calibrated intervals and a domain."""

from __future__ import annotations

import platform
from collections.abc import Callable, Sequence
from dataclasses import replace
from datetime import date
from typing import Any

import numpy as np

from qsar.descriptors import Molecule, SiteView
from qsar.descriptors.pipeline import NAMES
from qsar.errors import UserError
from qsar.ionisation import cube
from qsar.model.bundle import KIND, SCHEMA, settings_to
from qsar.model.domain import Domain
from qsar.model.inducing import MOST_EXACT
from qsar.model.intervals import Calibration, fit_scale
from qsar.model.library import Library
from qsar.model.members import Members, Settings, fit_members, out_of_fold, trend_without
from qsar.model.model import Model, class_of, evidence_of
from qsar.model.neighbours import Neighbours, coordinates
from qsar.model.training_set import Floats, Ints, TrainingSet, training_set
from qsar.table import Measurement

STRANGER_FOLDS = 5
_ROWS_AT_ONCE = 500  # steps of a large table whose distances to all others are held together
ANALOGUE_DISTANCE = 0.2  # pKa units; acids this close are homologues or differ in a remote group


def train(
    measurements: Sequence[Measurement],
    name: str,
    settings: Settings | None = None,
    *,
    weights: Sequence[float] | None = None,
    provenance: dict[str, Any] | None = None,
    withhold_structures: bool = False,
    done: Callable[[int], object] = lambda _: None,
    jobs: int = 1,
) -> Model:
    """Train a model.

    Parameters
    ----------
    measurements : sequence of Measurement
    name : str
        Name of the bundle.
    settings : Settings, optional
    weights : sequence of float, optional
        Weight of each measurement; 1 where not given.
    provenance : dict, optional
        Entries for the card: table, its SHA-256, number of rows and the like.
    withhold_structures : bool
        Leave the training acids' structures and names out of the model; neighbours are then shown as values only.
    done : callable
        Called with 1 after each member.
    jobs : int
        Processes; the outcome does not depend on it.

    Returns
    -------
    Model
        The same arrays, bit for bit, from the same measurements, settings and library versions.

    Raises
    ------
    UserError
        If there are fewer acids than two a fold.
    """
    settings = settings or Settings()
    data = training_set(measurements, weights)
    if len(data.acids) < 2 * settings.folds:
        raise UserError(
            f"{len(data.acids)} acids are too few for {settings.folds} folds; give at least {2 * settings.folds}"
        )
    members, fold = fit_members(data, settings, done, jobs)
    return assemble(data, members, fold, name, provenance or {}, withhold_structures=withhold_structures)


def assemble(
    data: TrainingSet,
    members: Members,
    fold: Ints,
    name: str,
    provenance: dict[str, Any],
    *,
    withhold_structures: bool,
) -> Model:
    """Calibrate fitted members and join everything into a model.

    One thread, so that no sum depends on how many there are.
    """
    import scipy.linalg  # noqa: F401 - its threads are limited too
    from threadpoolctl import threadpool_limits

    with threadpool_limits(1):
        return _assemble(data, members, fold, name, provenance, withhold_structures=withhold_structures)


def _assemble(
    data: TrainingSet,
    members: Members,
    fold: Ints,
    name: str,
    provenance: dict[str, Any],
    *,
    withhold_structures: bool,
) -> Model:
    micro, boosted = out_of_fold(data, members, fold)
    without = data.steps(micro)
    trend, correction = members.predict(data.x)
    dominant = data.dominant_edges((trend + correction).mean(axis=0))
    x = data.x[dominant]
    neighbours = Neighbours.of(members, x)
    views = [_view(data, int(a), int(e)) for a, e in zip(data.step_acid, dominant, strict=True)]
    by_acid: dict[int, list[SiteView]] = {}
    for acid, view in zip(data.step_acid, views, strict=True):
        by_acid.setdefault(int(acid), []).append(view)
    domain = Domain.of(by_acid.values(), np.ones(1))
    error = np.abs(data.pka - without)
    step_fold = fold[data.step_acid]
    sparse = np.array([domain.sparse(view, less=1) for view in views])
    correction_size = np.abs(boosted[dominant])

    def evidence_without(step_fold: Ints, defect: Floats) -> Floats:
        return _evidence_without(members, neighbours, x, step_fold, error, correction_size, defect, sparse)

    evidence = evidence_without(step_fold, _defects(data, micro))
    strangers, stranger_fold = without_analogues(data, members, neighbours) or (micro, fold)
    stranger_error = np.abs(data.pka - data.steps(strangers))
    stranger_evidence = evidence_without(stranger_fold[data.step_acid], _defects(data, strangers))
    coefficients = fit_scale(np.vstack([evidence, stranger_evidence]), np.concatenate([error, stranger_error]))
    label = np.array(
        [
            class_of(view, len(data.acids[a].sites), int(step))
            for view, a, step in zip(views, data.step_acid, data.step_number, strict=True)
        ]
    )
    calibration = Calibration(coefficients, np.zeros(0), np.zeros(0), step_fold, label)
    expected = calibration.expected_error(evidence)
    calibration = replace(
        calibration,
        scores=error / expected,
        stranger_scores=stranger_error / calibration.expected_error(stranger_evidence),
    )
    domain = Domain(domain.counts, float(np.quantile(expected, 0.72)), float(np.quantile(expected, 0.92)))
    library = Library(
        ["" if withhold_structures else data.acids[a].smiles for a in data.step_acid],
        ["" if withhold_structures else n.replace("\t", " ") for n in data.name],
        [f.replace("\t", " ") for f in data.family],
        [s.replace("\t", " ") for s in data.source],
        data.step_number,
        data.pka,
        data.uncertainty,
        without,
        expected,
    )
    card = _card(data, members, domain, name, provenance, error, withhold_structures)
    return Model(card, members, neighbours, calibration, domain, library)


def _evidence_without(
    members: Members,
    neighbours: Neighbours,
    x: Floats,
    fold: Ints,
    error: Floats,
    boosted: Floats,
    defect: Floats,
    sparse: Floats,
) -> Floats:
    """Evidence of each measured step as if its whole fold had not been measured; `fold` has shape (n_steps,)."""
    size = len(x) if len(x) <= MOST_EXACT else _ROWS_AT_ONCE
    parts = []
    for start in range(0, len(x), size):
        own = slice(start, start + size)
        distances = neighbours.distances(members, x[own])
        distances[fold[own][:, None] == fold[None]] = np.inf
        parts.append(evidence_of(distances, error, boosted[own], defect[own], sparse[own]))
    return np.vstack(parts)


def without_analogues(data: TrainingSet, members: Members, neighbours: Neighbours) -> tuple[Floats, Ints] | None:
    """Micro pKa of the training edges by trends that saw neither the acid nor its near analogues.

    Acids within `ANALOGUE_DISTANCE` of a leading one stay together (sphere exclusion), and whole groups are dealt
    out to `STRANGER_FOLDS` folds.

    Returns
    -------
    micro : ndarray, shape (n_edges,)
    fold : ndarray of int, shape (n_acids,)
        None instead of both where every acid is an analogue of every other: nothing would be left to learn from.
    """
    place = coordinates(members, neighbours.weights, data.x[data.first[:-1]])
    group = np.full(len(place), -1)
    length = np.einsum("ij,ij->i", place, place)
    for leader in np.random.default_rng(members.settings.seed).permutation(len(place)):
        if group[leader] < 0:
            # The fast form of the distance picks out who may be near; the exact one, which takes longer, decides.
            rough = length + length[leader] - 2.0 * (place @ place[leader])
            maybe = np.flatnonzero((rough < 2.0 * ANALOGUE_DISTANCE**2) & (group < 0))
            near = np.linalg.norm(place[maybe] - place[leader], axis=1) < ANALOGUE_DISTANCE
            group[maybe[near]] = leader
    fold = np.empty(len(place), dtype=np.int64)
    load = np.zeros(STRANGER_FOLDS)
    leaders, sizes = np.unique(group, return_counts=True)
    if len(leaders) == 1:
        return None
    for leader, size in sorted(zip(leaders, sizes, strict=True), key=lambda pair: -pair[1]):
        emptiest = int(load.argmin())
        fold[group == leader] = emptiest
        load[emptiest] += size
    micro = np.empty(len(data.x))
    for k in range(STRANGER_FOLDS):
        held = fold[data.owner] == k
        if held.any():
            micro[held] = trend_without(data, members, fold[data.step_acid] != k)[held]
    return micro, fold


def _view(data: TrainingSet, acid: int, edge: int) -> SiteView:
    sites = data.acids[acid].sites
    network = cube(len(sites))
    local = edge - int(data.first[acid])
    state = int(network.start[local])
    ionised = frozenset(s for k, s in enumerate(sites) if state >> k & 1)
    return SiteView(Molecule(data.acids[acid].graph), sites[int(network.site[local])], ionised)


def _defects(data: TrainingSet, micro: Floats) -> Floats:
    from qsar.ionisation import closure_defect

    result = np.zeros(len(data.pka))
    for row, acid in enumerate(data.step_acid):
        n = len(data.acids[acid].sites)
        if n > 1:
            result[row] = closure_defect(micro[data.edges(int(acid))], n)
    return result


def _card(
    data: TrainingSet,
    members: Members,
    domain: Domain,
    name: str,
    provenance: dict[str, Any],
    error: Floats,
    withheld: bool,
) -> dict[str, Any]:
    import rdkit
    import scipy
    import sklearn

    return {
        "kind": KIND,
        "schema": SCHEMA,
        "name": name,
        "date": date.today().isoformat(),
        "acids": len(data.acids),
        "steps": len(data.pka),
        **provenance,
        "structures_withheld": withheld,
        "libraries": {
            "python": platform.python_version(),
            "numpy": np.__version__,
            "scipy": scipy.__version__,
            "scikit-learn": sklearn.__version__,
            "rdkit": rdkit.__version__,
        },
        "settings": settings_to(members.settings),
        "descriptors": list(NAMES),
        "tree_depth": members.trees.depth,
        "borderline_above": domain.borderline_above,
        "outside_above": domain.outside_above,
        "metrics": {
            "out_of_fold_mean_absolute_error": float(error.mean()),
            "out_of_fold_median_absolute_error": float(np.median(error)),
        },
    }
