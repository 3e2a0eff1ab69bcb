"""A trained model: from acids to pKa steps with interval, verdict, reasons and evidence."""

from __future__ import annotations

import gc
from collections.abc import Iterator, Sequence
from contextlib import contextmanager
from dataclasses import dataclass, replace
from functools import cache, cached_property
from typing import TYPE_CHECKING, Any, NamedTuple

import numpy as np
from numpy.typing import NDArray

from qsar.advisories import advise
from qsar.descriptors import SiteView, rounded, site_descriptors
from qsar.errors import UserError
from qsar.ionisation import edge_views
from qsar.isomers import configurations
from qsar.model.domain import VERDICTS, Domain, has_cation
from qsar.model.intervals import Calibration
from qsar.model.library import Library
from qsar.model.members import Members
from qsar.model.neighbours import Neighbours, nearest
from qsar.model.network_steps import steps_of
from qsar.notebook import Predictions
from qsar.sources import printed
from qsar.structures import Acid, StructureError, read_acid

if TYPE_CHECKING:
    from qsar.attribution import Explanation

Floats = NDArray[np.float64]
_NEAR = 5
_AT_ONCE = 128  # acids; the matrices between them and the measured steps then stay in the processor's cache


class Neighbour(NamedTuple):
    """A measured acid as evidence."""

    smiles: str
    name: str
    step: int
    pka: float
    distance: float
    source: str


@dataclass(frozen=True)
class StepPrediction:
    """Prediction of one carboxyl step; the fields are those of the table of predictions.

    Attributes
    ----------
    neighbours : tuple of Neighbour
        The nearest measured steps, nearest first.
    expected_error : float
        Expected absolute error, pKa units.
    """

    step: int
    pka: float
    low: float
    high: float
    coverage: float
    domain: str
    reasons: tuple[str, ...]
    nearest: str
    nearest_pka: float | None
    nearest_distance: float | None
    measured: float | None
    pka_without: float | None
    model: str
    expected_error: float
    neighbours: tuple[Neighbour, ...] = ()
    measured_source: str = ""
    measured_uncertainty: float | None = None


@dataclass(frozen=True)
class Prediction:
    """Prediction of one input.

    Attributes
    ----------
    structure : str
        Canonical SMILES; empty where the input could not be used.
    steps : list of StepPrediction
    error : str or None
        Why the input could not be used.
    acid : Acid or None
    """

    structure: str
    steps: list[StepPrediction]
    error: str | None = None
    acid: Acid | None = None


@dataclass(frozen=True)
class _Case:
    """One configuration of one input while it is predicted.

    `measured` holds the row in the library of each step that was measured of the input itself, `remarks` what else a
    user should know about it.
    """

    acid: Acid
    views: list[SiteView]
    x: list[list[float]]
    measured: dict[int, int]
    remarks: tuple[str, ...]


@contextmanager
def _no_collection() -> Iterator[None]:
    """Spare Python the search for cycles: a chunk makes many small objects, and none that refers back to itself."""
    enabled = gc.isenabled()
    gc.disable()
    try:
        yield
    finally:
        if enabled:
            gc.enable()


@cache
def _keep_freed_memory() -> None:
    """Have the allocator keep what chunks free for the next one, once a process.

    The matrices of a chunk are a few MB each. The C library hands such blocks back to the system at once, and gets
    them again page by page, until it has seen a larger one freed. This one is never written to, so it costs nothing.
    """
    np.empty(1 << 24, dtype=np.uint8)


@dataclass(frozen=True, eq=False)
class Model:
    """A trained model.

    Attributes
    ----------
    card : dict
        What ``card.json`` says.
    members : Members
    neighbours : Neighbours
    calibration : Calibration
    domain : Domain
    library : Library
    """

    card: dict[str, Any]
    members: Members
    neighbours: Neighbours
    calibration: Calibration
    domain: Domain
    library: Library

    @property
    def name(self) -> str:
        """Name of the bundle."""
        return str(self.card["name"])

    def micro(self, x: Floats) -> Floats:
        """Micro pKa of edges by each member; shape (n_members, n).

        Parameters
        ----------
        x : ndarray, shape (n, n_descriptors)
        """
        trend, boosted = self.members.predict(x)
        return trend + boosted

    def predict(self, acids: Sequence[str | Acid | StructureError], coverage: float = 0.9) -> list[Prediction]:
        """Predict acids.

        Parameters
        ----------
        acids : sequence of str, Acid or StructureError
            SMILES or standardised acids; an error stands for an input that could not be read.
        coverage : float
            Fraction of acids that the intervals are meant to hold, in [0.5, 0.99].

        Returns
        -------
        list of Prediction
            One for each input, in order.

        Raises
        ------
        UserError
            If `coverage` is out of range.
        """
        if not 0.5 <= coverage <= 0.99:
            raise UserError(f"coverage {coverage:g} is out of range; give a fraction from 0.5 to 0.99")
        results: list[Prediction] = []
        if len(acids) >= _AT_ONCE:
            _keep_freed_memory()
        with _no_collection():
            for start in range(0, len(acids), _AT_ONCE):
                results += self._predict(acids[start : start + _AT_ONCE], coverage)
        return results

    def _predict(self, acids: Sequence[str | Acid | StructureError], coverage: float) -> list[Prediction]:
        results: list[Prediction | None] = [None] * len(acids)
        cases: list[_Case] = []
        places: list[tuple[int, list[int], str]] = []
        for i, given in enumerate(acids):
            try:
                if isinstance(given, StructureError):
                    raise given
                acid = given if isinstance(given, Acid) else read_acid(given)
            except StructureError as error:
                results[i] = Prediction("", [], str(error))
                continue
            isomers, note = configurations(acid)
            own = list(range(len(cases), len(cases) + len(isomers)))
            measured = self.library.rows_of(acid.smiles)
            remarks = (*acid.notes, *advise(acid.drawn, acid.graph))
            for isomer in isomers:
                views = edge_views(isomer)
                cases.append(_Case(isomer, views, [site_descriptors(view) for view in views], measured, remarks))
            places.append((i, own, note))
            results[i] = Prediction(acid.smiles, [], None, acid)
        if cases:
            steps = self._predict_cases(cases, coverage)
            for i, own, note in places:
                first = results[i]
                assert first is not None and first.acid is not None
                results[i] = Prediction(first.structure, _join([steps[k] for k in own], note), None, first.acid)
                if not isinstance(acids[i], Acid):
                    first.acid.forget_graph()  # the largest part of what would stay in memory
        return Predictions(r for r in results if r is not None)

    def _predict_cases(self, cases: list[_Case], coverage: float) -> list[list[StepPrediction]]:
        all_x = rounded([row for case in cases for row in case.x])
        trend, boosted = self.members.predict(all_x)
        rows = steps_of([len(case.acid.sites) for case in cases], trend + boosted)
        first = np.concatenate([[0], np.cumsum([len(case.x) for case in cases])])
        x = all_x[rows.edge]
        views = [cases[c].views[e - first[c]] for c, e in zip(rows.case, rows.edge, strict=True)]
        distances = self.neighbours.distances(self.members, x)
        near = nearest(distances, _NEAR)
        evidence = evidence_of(
            distances,
            np.abs(self.library.pka - self.library.pka_without),
            np.abs(boosted[:, rows.edge]).mean(axis=0),
            rows.defect,
            np.array([self.domain.sparse(view) for view in views]),
            near,
        )
        scale = self.calibration.expected_error(evidence)
        pka = rows.pka
        label = np.array(
            [
                class_of(view, len(cases[c].acid.sites), int(step))
                for view, c, step in zip(views, rows.case, rows.step, strict=True)
            ]
        )
        low, high = self.calibration.interval(rows.by_member, scale, label, coverage)
        result: list[list[StepPrediction]] = [[] for _ in cases]
        for k, (c, step) in enumerate(zip(rows.case.tolist(), rows.step.tolist(), strict=True)):
            found = tuple(map(self._neighbour, near[k].tolist(), distances[k, near[k]].tolist()))
            best = found[0]
            verdict, reasons = self.domain.judge(
                views[k], float(scale[k]), best.name or best.smiles or "an acid without a name", best.distance
            )
            row = cases[c].measured.get(step)
            result[c].append(
                StepPrediction(
                    step,
                    float(pka[k]),
                    float(min(low[k], pka[k])),
                    float(max(high[k], pka[k])),
                    coverage,
                    verdict,
                    tuple(dict.fromkeys((*reasons, *cases[c].remarks, *self._about_value(row)))),
                    best.smiles,
                    best.pka,
                    best.distance,
                    None if row is None else float(self.library.pka[row]),
                    None if row is None else float(self.library.pka_without[row]),
                    self.name,
                    float(scale[k]),
                    found,
                    "" if row is None else self.library.source[row],
                    None if row is None else float(self.library.uncertainty[row]),
                )
            )
        return result

    def _about_value(self, row: int | None) -> tuple[str, ...]:
        """What to say of the measured value of a row."""
        text = "" if row is None else printed(self.library.source[row])
        return (f"the measured value was brought to ionic strength 0 – {text}",) if text else ()

    def _neighbour(self, row: int, distance: float) -> Neighbour:
        smiles, name, step, pka, source = self._measured[row]
        return Neighbour(smiles, name, step, pka, distance, source)

    @cached_property
    def _measured(self) -> list[tuple[str, str, int, float, str]]:
        """What a `Neighbour` says about each measured step but its distance."""
        library = self.library
        return list(
            zip(library.smiles, library.name, library.step.tolist(), library.pka.tolist(), library.source, strict=True)
        )

    def explain(self, acid: str | Acid, coverage: float = 0.9) -> tuple[Explanation, ...]:
        """What each substituent of an acid contributed, one `Explanation` a step.

        Parameters
        ----------
        acid : str or Acid
        coverage : float
            Of the intervals.

        Raises
        ------
        StructureError
            If the structure cannot be used.
        """
        from qsar.attribution import explain  # slow to import, and it imports this module

        return explain(self, acid, coverage)


def _join(isomers: list[list[StepPrediction]], note: str) -> list[StepPrediction]:
    """One prediction over all isomers: the mean, an interval that holds theirs, the worst verdict."""
    if len(isomers) == 1:
        return isomers[0]
    joined = []
    for same in zip(*isomers, strict=True):
        closest = min(same, key=lambda s: s.nearest_distance or 0.0)
        worst = max(same, key=lambda s: VERDICTS.index(s.domain))
        joined.append(
            replace(
                closest,
                pka=float(np.mean([s.pka for s in same])),
                low=min(s.low for s in same),
                high=max(s.high for s in same),
                domain=worst.domain,
                reasons=(note, *worst.reasons),
                expected_error=max(s.expected_error for s in same),
            )
        )
    return joined


def class_of(view: SiteView, n_sites: int, step: int) -> int:
    """Position in :data:`qsar.model.intervals.CLASSES` of a step."""
    if n_sites > 1:
        return (1 if n_sites == 2 else 4) + (step > 1)
    return 3 if has_cation(view) else 0


def evidence_of(
    distances: Floats,
    errors: Floats,
    boosted: Floats,
    defect: Floats,
    sparse: Floats,
    near: NDArray[np.int64] | None = None,
) -> Floats:
    """Evidence of difficulty; columns as in :data:`qsar.model.intervals.EVIDENCE`.

    Parameters
    ----------
    distances : ndarray, shape (n, n_steps)
        To the measured steps; infinite where one must not be used.
    errors : ndarray, shape (n_steps,)
        Absolute out-of-fold errors of the measured steps.
    boosted : ndarray, shape (n,)
        Size of the booster's correction.
    defect : ndarray, shape (n,)
        Closure defect of the network.
    sparse : ndarray, shape (n,)
        How thinly the groups are covered.
    near : ndarray of int, shape (n, 5), optional
        The nearest measured steps of each, where they have been found already.

    Returns
    -------
    ndarray, shape (n, n_evidence)
    """
    if near is None:
        near = nearest(distances, _NEAR)
    ordered = np.take_along_axis(distances, near, axis=1)
    weight = 1.0 / (ordered + 0.1)
    local = (np.minimum(errors[near], 1.0) * weight).sum(axis=1) / weight.sum(axis=1)
    return np.column_stack(
        [
            np.ones(len(distances)),
            np.minimum(ordered[:, 0], 3.0),
            np.minimum(ordered[:, :3].mean(axis=1), 3.0),
            local,
            boosted,
            defect,
            sparse,
        ]
    )
