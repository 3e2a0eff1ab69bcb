"""Formal charges and other carboxyl groups, with distance decay.

The idea is Kirkwood and Westheimer's (J. Chem. Phys. 1938, 6, 506): a charge q at distance r shifts the pKa by an
amount proportional to q / r. Through-bond distance stands for r; several decays are offered.
"""

from __future__ import annotations

from qsar.descriptors.effect import Effect, columns, decay
from qsar.descriptors.view import SiteView, Term
from qsar.groups import CATIONIC

_COLUMNS = columns(
    "cations cation_g50 cation_g75 cation_inverse cation_alpha "
    "anions anion_g50 anion_g75 anion_inverse anion_nearest "
    "carboxyls carboxyl_g40 carboxyl_g70 carboxyl_nearest carboxyl_path_bulk carboxyl_path_quaternary "
    "carboxyl_path_unsaturated carboxyl_cis carboxyl_geminal net_charge "
    "cation_in_ring cation_pairs anion_path_bulk anion_path_quaternary geminal_bulk geminal_bulk_anion "
    "geminal_small_ring geminal_small_ring_anion anion_cis vicinal_splay vicinal_splay_anion "
    "cis_small_ring cis_small_ring_anion cation_substituents cation_delocalised vicinal_crowd vicinal_crowd_anion"
)

_DECAY_40, _DECAY_50, _DECAY_70, _DECAY_75 = decay(0.4), decay(0.5), decay(0.7), decay(0.75)


def _decays(terms: list[Term]) -> list[float]:
    return [
        float(len(terms)),
        sum([_DECAY_50[t.bonds] for t in terms]),
        sum([_DECAY_75[t.bonds] for t in terms]),
        sum(1.0 / max(t.bonds, 1) for t in terms),
    ]


def _compute(view: SiteView) -> list[float]:
    cations = [t for t in view.terms if t.kind in CATIONIC]
    carboxylates = [t for t in view.terms if t.kind == "carboxylate"]
    anions = carboxylates + [t for t in view.terms if t.kind in ("sulfonate", "phosphonate")]
    neutral = [t for t in view.terms if t.kind == "carboxyl"]
    acids = neutral + carboxylates
    if not (acids or cations or anions):
        return [0.0] * len(_COLUMNS)
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
        sum([_DECAY_40[t.bonds] for t in neutral]),
        sum([_DECAY_70[t.bonds] for t in neutral]),
        1.0 / nearest if nearest else (2.0 if acids else 0.0),
        bulk,
        quaternary,
        unsaturated,
        cis,
        float(sum(t.bonds == 1 for t in acids)),
        float(len(cations) - len(anions)),
        float(sum(view.alpha_system is t for t in cations)),
        float(len(cations) * (len(cations) - 1)),
        *_between(view, neutral, carboxylates),
        sum(_cis(view, t) for t in neutral) * _smallness(view),
        sum(_cis(view, t) for t in carboxylates) * _smallness(view),
        sum(0.5 ** max(t.bonds - 1, 0) * (_carbons(view, t) - 1) for t in cations if t.kind in _AMMONIUM),
        sum(0.5 ** max(t.bonds - 1, 0) for t in cations if t.kind not in _AMMONIUM),
        sum(_vicinal_crowd(view, t) for t in neutral),
        sum(_vicinal_crowd(view, t) for t in carboxylates),
    ]


_AMMONIUM = ("ammonium", "quaternary_n")
_SMALL = {3: 1.0, 4: 0.5}


def _smallness(view: SiteView) -> float:
    """1 where the carboxyl group is on a three-membered ring, 1/2 on a four-membered one."""
    return _SMALL.get(view.graph.ring_size[view.alpha], 0.0) if view.alpha >= 0 else 0.0


def _carbons(view: SiteView, term: Term) -> int:
    """Carbons on the nitrogen of an ammonium group."""
    return sum(view.graph.numbers[b] == 6 for b in view.graph.neighbours[term.anchor])


def _vicinal_crowd(view: SiteView, term: Term) -> float:
    """Bulk on both carbons of a succinic acid: the product of what is on either, which turns the groups gauche."""
    graph, alpha = view.graph, view.alpha
    if term.bonds != 2 or alpha < 0 or view.molecule.unsaturated[alpha]:
        return 0.0
    other = next((b for b in graph.neighbours[term.anchor] if b in graph.neighbours[alpha]), -1)
    if other < 0 or view.molecule.unsaturated[other]:
        return 0.0
    skip = view.molecule.set_apart | {alpha, other, view.site, term.anchor}

    def bulk(a: int) -> float:
        side = [b for b in graph.neighbours[a] if b not in skip and graph.numbers[b] == 6]
        return sum(1.0 + 0.5 * sum(c not in skip and c != a for c in graph.neighbours[b]) for b in side)

    return bulk(alpha) * bulk(other)


def _between(view: SiteView, neutral: list[Term], ionised: list[Term]) -> list[float]:
    """What crowds or holds two carboxyl groups together, apart for COOH (it donates) and COO- (it accepts).

    Alkyl groups on the carbon between two carboxyl groups press them together (Thorpe and Ingold, J. Chem. Soc. 1915,
    107, 1080), which strengthens the hydrogen bond of the monoanion: first step down, second step up.
    """
    bulk = quaternary = cis = splay_neutral = splay_anion = 0.0
    for t in ionised:
        b, q, _ = _path(view, t)
        weight = 0.5 ** max(t.bonds - 2, 0)
        bulk += b * weight
        quaternary += q * weight
        cis += _cis(view, t)
        splay_anion += _splay(view, t)
    for t in neutral:
        splay_neutral += _splay(view, t)
    crowd, ring = _geminal_crowd(view)
    geminal = float(any(t.bonds == 1 for t in neutral))
    geminal_anion = float(any(t.bonds == 1 for t in ionised))
    return [
        bulk,
        quaternary,
        crowd * geminal,
        crowd * geminal_anion,
        ring * geminal,
        ring * geminal_anion,
        cis,
        splay_neutral,
        splay_anion,
    ]


def _geminal_crowd(view: SiteView) -> tuple[float, float]:
    """Branching of the alkyl groups on the alpha carbon, and 1 or 1/2 for it in a three- or four-membered ring."""
    if view.alpha < 0 or view.molecule.unsaturated[view.alpha]:
        return 0.0, 0.0
    carboxyl = ("carboxyl", "carboxylate")
    terms = view.term_of
    groups = [
        b
        for b in view.carbons_on(view.alpha)
        if view.graph.numbers[b] == 6 and (b not in terms or terms[b].kind not in carboxyl)
    ]
    size = view.graph.ring_size[view.alpha]
    crowd = float(len(groups) == 2) + 0.5 * sum(len(view.carbons_on(b)) for b in groups if not size)
    return crowd, _SMALL.get(size, 0.0)


def _splay(view: SiteView, term: Term) -> float:
    """How far a small ring spreads two carboxyl groups that its double bond holds cis, 0 for a six-membered one.

    The outer angle of a double bond in an n-membered ring is larger the smaller the ring, which makes the
    hydrogen bond between vicinal groups straighter.
    """
    graph, alpha = view.graph, view.alpha
    if alpha < 0 or not view.molecule.unsaturated[alpha] or term.bonds != 2:
        return 0.0
    carrier = next(
        (b for b in graph.neighbours[term.anchor] if view.distance[b] == 2 and b in graph.neighbours[alpha]),
        -1,
    )
    if carrier < 0 or not graph.order(alpha, carrier) > 1.0:
        return 0.0
    sizes = [len(ring) for ring in graph.rings if alpha in ring and carrier in ring]
    return float(max(6 - min(sizes), 0)) if sizes else 0.0


def _path(view: SiteView, term: Term) -> tuple[float, float, float]:
    """Substituent atoms, quaternary carbons and unsaturated atoms on the way to another group.

    The mean over all shortest paths, so that no atom order decides between equal ones.
    """
    paths = _shortest_paths(view, term.anchor)
    found = [_along(view, term, path) for path in paths]
    n = len(found)
    return sum(f[0] for f in found) / n, sum(f[1] for f in found) / n, sum(f[2] for f in found) / n


def _shortest_paths(view: SiteView, end: int) -> list[list[int]]:
    """All shortest paths from the alpha atom to the atom before `end`."""
    dist, graph = view.distance, view.graph
    paths: list[list[int]] = [[end]]
    while dist[paths[0][-1]] > 1:
        paths = [[*p, b] for p in paths for b in graph.neighbours[p[-1]] if dist[b] == dist[p[-1]] - 1]
    return [p[1:] for p in paths]


def _along(view: SiteView, term: Term, path: list[int]) -> tuple[float, float, float]:
    skip = view.molecule.set_apart
    bulk = quaternary = unsaturated = 0.0
    for x in path:
        side = [
            b for b in view.graph.neighbours[x] if b not in skip and b not in path and b not in (view.site, term.anchor)
        ]
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
    carrier = next(
        (b for b in graph.neighbours[term.anchor] if view.distance[b] == term.bonds and b not in term.atoms),
        -1,
    )
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
