"""Formal charges and other carboxyl groups, with distance decay.

The idea is Kirkwood and Westheimer's (J. Chem. Phys. 1938, 6, 506): a charge q at distance r shifts the pKa by an
amount proportional to q / r. Through-bond distance stands for r; several decays are offered.
"""

from __future__ import annotations

from qsar.descriptors.effect import Effect, columns
from qsar.descriptors.view import SiteView, Term
from qsar.groups import CATIONIC

_COLUMNS = columns(
    "cations cation_g50 cation_g75 cation_inverse cation_alpha "
    "anions anion_g50 anion_g75 anion_inverse anion_nearest "
    "carboxyls carboxyl_g40 carboxyl_g70 carboxyl_nearest carboxyl_path_bulk carboxyl_path_quaternary "
    "carboxyl_path_unsaturated carboxyl_cis carboxyl_geminal net_charge",
)


def _decays(terms: list[Term]) -> list[float]:
    return [
        float(len(terms)),
        sum(0.5 ** max(t.bonds - 1, 0) for t in terms),
        sum(0.75 ** max(t.bonds - 1, 0) for t in terms),
        sum(1.0 / max(t.bonds, 1) for t in terms),
    ]


def _compute(view: SiteView) -> list[float]:
    cations = [t for t in view.terms if t.kind in CATIONIC]
    carboxylates = [t for t in view.terms if t.kind == "carboxylate"]
    anions = carboxylates + [t for t in view.terms if t.kind in ("sulfonate", "phosphonate")]
    neutral = [t for t in view.terms if t.kind == "carboxyl"]
    acids = neutral + carboxylates
    nearest = min((t.bonds for t in acids), default=0)
    bulk = quaternary = unsaturated = cis = 0.0
    for t in acids:
        b, q, u = _path(view, t)
        weight = 0.5 ** max(t.bonds - 2, 0)
        bulk += b * weight
        quaternary += q * weight
        unsaturated += u * weight
        cis += _cis(view, t)
    return [
        *_decays(cations),
        float(sum(t.bonds <= 1 for t in cations)),
        *_decays(anions),
        1.0 / max(min((t.bonds for t in anions), default=0), 1) if anions else 0.0,
        float(len(neutral)),
        sum(0.4 ** max(t.bonds - 1, 0) for t in neutral),
        sum(0.7 ** max(t.bonds - 1, 0) for t in neutral),
        1.0 / nearest if nearest else (2.0 if acids else 0.0),
        bulk,
        quaternary,
        unsaturated,
        cis,
        float(sum(t.bonds == 1 for t in acids)),
        float(len(cations) - len(anions)),
    ]


def _path(view: SiteView, term: Term) -> tuple[float, float, float]:
    """Substituent atoms, quaternary carbons and unsaturated atoms on the shortest path to another group."""
    dist, graph = view.distance, view.graph
    a = term.anchor
    on_path: list[int] = []
    while dist[a] > 1:
        a = min(b for b in graph.neighbours[a] if dist[b] == dist[a] - 1)
        on_path.append(a)
    skip = view.molecule.set_apart
    bulk = quaternary = unsaturated = 0.0
    for x in on_path:
        side = [b for b in graph.neighbours[x] if b not in skip and b not in on_path and b not in (view.site, term.anchor)]
        bulk += len(side)
        if view.molecule.unsaturated[x]:
            unsaturated += 1.0
        elif len(side) == 2:
            quaternary += 1.0
    return bulk, quaternary, unsaturated


def _cis(view: SiteView, term: Term) -> float:
    """+1 where two carboxyl groups are cis on a double bond or ring, -1 trans, 0 where it makes no sense."""
    pair = view.path_pairs.get((view.site, term.anchor))
    if pair is not None:
        return float(pair)
    graph = view.graph
    carrier = next((b for b in graph.neighbours[term.anchor] if view.distance[b] == term.bonds and b not in term.atoms), -1)
    for index, ring in enumerate(graph.rings):
        if view.alpha in ring and carrier in ring and carrier != view.alpha:
            mine = graph.side.get((index, view.alpha, view.site))
            other = graph.side.get((index, carrier, term.anchor))
            if mine is not None and other is not None:
                return float(mine * other)
    return 0.0


CHARGE = Effect(
    "charge",
    _COLUMNS,
    _compute,
    ("Kirkwood J. G., Westheimer F. H. J. Chem. Phys. 1938, 6, 506 and 513",),
)
