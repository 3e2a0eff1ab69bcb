"""The domain: what was measured, and one verdict with its reasons for a new acid.

Verdicts follow the expected error of the step, whose thresholds come from the out-of-fold errors of the training
acids, and what was never measured: a kind of group, a group at a distance, an environment of the carboxyl group.
"""

from __future__ import annotations

from collections import Counter
from collections.abc import Iterable
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from qsar.basicity import amine_pka, anilinium_pka, pyridinium_pka, zwitterion_ratio
from qsar.descriptors import SiteView
from qsar.groups import CATIONIC, owners

Floats = NDArray[np.float64]

INSIDE, BORDERLINE, OUTSIDE, UNUSABLE = "inside", "borderline", "outside", "unusable"
VERDICTS = (INSIDE, BORDERLINE, OUTSIDE)
_FEW = 2
_PLACES = {
    1: "on the α atom",
    2: "two bonds from the COOH",
    3: "three bonds from the COOH",
    4: "further away",
}
_RING_PLACES = {1: "ortho", 2: "meta", 3: "para"}


def features_seen(view: SiteView) -> list[tuple[str, ...]]:
    """What one site shows that the training acids may or may not have shown.

    Returns
    -------
    list of tuple
        ``("group", kind)``, ``("place", kind, bonds)`` for groups up to three bonds away, and
        ``("site", environment)``.
    """
    if view.features is not None:
        return view.features
    seen: list[tuple[str, ...]] = []
    for term in [*view.terms, *view.withdrawing]:
        if term is view.alpha_system:
            continue
        kind = term.kind
        if kind in ("carboxyl", "carboxylate"):
            kind = "carboxyl"
        seen.append(("group", kind))
        if term.bonds <= 3:
            seen.append(("place", kind, str(max(term.bonds, 1)), "ring" if view.alpha_system else "chain"))
    seen.append(("site", environment(view)))
    view.features = list(dict.fromkeys(seen))
    return view.features


def environment(view: SiteView) -> str:
    """What carries the carboxyl group, in words."""
    graph, alpha = view.graph, view.alpha
    if alpha < 0:
        return "hydrogen"
    system = view.alpha_system
    if system is not None:
        hetero = sorted(graph.numbers[a] for a in system.atoms if graph.numbers[a] != 6)
        names = "".join({7: "N", 8: "O", 16: "S", 34: "Se"}.get(h, "?") for h in hetero)
        return f"an aromatic system of {len(system.atoms)} atoms" + (f" with {names}" if names else "")
    if any(order == 3.0 for order in graph.orders[alpha]):
        return "an alkynyl carbon"
    if view.molecule.unsaturated[alpha]:
        return "an unsaturated carbon" + (
            f" in a {graph.ring_size[alpha]}-membered ring" if graph.ring_size[alpha] else ""
        )
    if graph.ring_size[alpha]:
        return f"a saturated carbon of a {graph.ring_size[alpha]}-membered ring"
    return "a saturated carbon of a chain"


@dataclass(frozen=True)
class Domain:
    """What the training acids showed and where the verdicts change.

    Attributes
    ----------
    counts : dict
        How many measured acids show a feature; see :func:`features_seen`.
    borderline_above, outside_above : float
        Expected errors, pKa units.
    """

    counts: dict[tuple[str, ...], int]
    borderline_above: float
    outside_above: float

    @classmethod
    def of(cls, views: Iterable[Iterable[SiteView]], expected: Floats) -> Domain:
        """Count features over acids; thresholds at the 72nd and 92nd percentile of the expected error."""
        counts: Counter[tuple[str, ...]] = Counter()
        for sites in views:
            counts.update({feature for view in sites for feature in features_seen(view)})
        return cls(dict(counts), float(np.quantile(expected, 0.72)), float(np.quantile(expected, 0.92)))

    def sparse(self, view: SiteView, less: int = 0) -> float:
        """How thinly the groups of a site are covered: the sum of 1 / (1 + n) over its features.

        Parameters
        ----------
        view : SiteView
        less : int
            Acids to take off each count: 1 for an acid that was counted itself.
        """
        return sum(1.0 / (1.0 + max(self.counts.get(f, 0) - less, 0)) for f in features_seen(view))

    def judge(self, view: SiteView, expected: float, nearest: str, distance: float) -> tuple[str, list[str]]:
        """Verdict and reasons of one step.

        Parameters
        ----------
        view : SiteView
            The site whose proton leaves, in its charge state.
        expected : float
            Expected absolute error, pKa units.
        nearest : str
            Name or SMILES of the nearest measured acid.
        distance : float
            To it, pKa units.
        """
        level = 0
        reasons: list[str] = []
        away = f"the nearest is {nearest}, {distance:.1f} away"
        for feature in features_seen(view):
            n = self.counts.get(feature, 0)
            if feature[0] == "group" and n == 0:
                level = max(level, 2)
                reasons.append(f"no measured acid has {_with_article(label(feature[1]))} group – {away}")
            elif feature[0] == "site" and n == 0:
                level = max(level, 2)
                reasons.append(f"no measured acid has its COOH on {feature[1]} – {away}")
            elif feature[0] == "site" and n <= _FEW:
                level = max(level, 1)
                reasons.append(f"only {_number(n)} a COOH on {feature[1]}")
            elif feature[0] == "place" and n == 0 and self.counts.get(("group", feature[1]), 0):
                level = max(level, 1)
                reasons.append(
                    f"no measured acid has {_with_article(label(feature[1]))} group {place(feature)} – {away}"
                )
        for doubt, sentence in basic_nitrogen(view):
            level = max(level, doubt)
            reasons.append(sentence)
        if expected > self.outside_above:
            level = 2
            reasons.append(f"expected error {expected:.2f}, larger than for 92 % of the measured acids – {away}")
        elif expected > self.borderline_above:
            level = max(level, 1)
            reasons.append(f"expected error {expected:.2f}, larger than for 72 % of the measured acids – {away}")
        if level == 0:
            reasons.append(f"close to measured acids – {away}")
        return VERDICTS[level], reasons


_SURE, _LIKELY = 1.0, 0.5  # of log10 of the two forms' ratio, whose estimate errs by about 0.4
_STRONG_PYRIDINE = 4.0  # a ring nitrogen above it keeps its proton while a carboxyl group loses its own
_WEAK_AMINE = 5.0  # an amine below it may lose its proton before a carboxyl group does
_TWO_PROTONS = "a measured constant may belong to the N-H proton"


def basic_nitrogen(view: SiteView) -> list[tuple[int, str]]:
    """What basic nitrogen means for the value: a doubt from 0 (none) to 2 (outside) and a sentence each.

    The form that is predicted is settled by the relationships of :mod:`qsar.basicity`.
    """
    if not any(t.kind in ("pyridinium", "imidazolium", "amino", "ammonium") for t in view.terms):
        return []
    group_of = owners(view.molecule.groups)
    graph = view.graph
    found: dict[str, int] = {}
    for term in view.terms:
        if term.kind == "imidazolium":
            found["the value is for the COOH of the imidazolium form"] = 0
        elif term.kind == "pyridinium":
            pka = pyridinium_pka(graph, group_of[term.anchor], group_of)
            sentence = f"the value is for the COOH of the form protonated on ring nitrogen (estimated pKa {pka:.1f})"
            weak = pka < _STRONG_PYRIDINE
            found[f"{sentence}; so weak a base may be neutral: {_TWO_PROTONS}" if weak else sentence] = 2 * weak
        elif term.kind in ("amino", "ammonium"):
            ratio = zwitterion_ratio(graph, term.anchor, group_of)
            if ratio is not None:
                doubt, sentence = _aniline_sentence(ratio, anilinium_pka(graph, term.anchor, group_of))
                found.update({sentence: doubt} if sentence else {})
            elif term.kind == "ammonium" and (pka := amine_pka(graph, term.anchor, group_of)) < _WEAK_AMINE:
                found[f"an amine made weak by what it carries (estimated pKa {pka:.1f}) is taken as protonated: "
                      f"{_TWO_PROTONS}"] = 2  # fmt: skip
    return [(doubt, sentence) for sentence, doubt in found.items()]


def _aniline_sentence(ratio: float, pka: float | None) -> tuple[int, str]:
    if pka is None or pka < 0.5:
        return 0, ""  # no base in water
    form = "whose aniline is protonated" if ratio > 0 else "with a neutral amino group"
    sentence = f"the value is for the COOH of the form {form} (estimated pKa of the anilinium {pka:.1f})"
    if abs(ratio) >= _SURE:
        return 0, sentence
    return (1 if abs(ratio) >= _LIKELY else 2), f"{sentence}; both forms may be there: {_TWO_PROTONS}"


def label(kind: str) -> str:
    """Name of a kind of group for people."""
    from qsar.constants.functional_groups import functional_groups

    return functional_groups()[kind].label


def _with_article(word: str) -> str:
    return f"{'an' if word[0] in 'aeiou' else 'a'} {word}"


def place(feature: tuple[str, ...]) -> str:
    """Where a group sits, in words."""
    bonds = int(feature[2])
    if feature[3] == "ring" and bonds > 1:
        return "in " + _RING_PLACES.get(bonds - 1, "that") + " position"
    return _PLACES[min(bonds, 4)]


def _number(n: int) -> str:
    return "one measured acid has" if n == 1 else f"{n} measured acids have"


def has_cation(view: SiteView) -> bool:
    """Whether the acid carries a protonated or permanent cation."""
    return any(term.kind in CATIONIC for term in view.terms)
