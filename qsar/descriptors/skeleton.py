"""The skeleton: what the alpha atom is, how the chain branches, which ring carries the carboxyl group.

Alkyl groups raise the pKa a little (Taft 1956); hetero atoms of the ring that carries the carboxyl group act by
their place in it (2-furoic 3.2 against 3-furoic 4.0).
"""

from __future__ import annotations

from math import log

from qsar.descriptors.effect import Effect, columns, decay
from qsar.descriptors.resonance import ring_positions
from qsar.descriptors.view import SiteView

_COLUMNS = columns(
    "formic alpha_hydrogens alpha_carbons alpha_quaternary alpha_unsaturated alpha_hetero gamma_carbons "
    "beta_branching alkyl_g40 saturated_carbons "
    "ring3 ring4 ring5 ring6 ring_larger ring_bridged log_atoms longest "
    "ring_hetero5 ring_o_adjacent ring_s_adjacent ring_nh_adjacent ring_n_adjacent ring_o_remote ring_s_remote "
    "ring_nh_remote ring_n_remote ring_hetero_saturated"
)

_DECAY_40 = decay(0.4)


def _alpha(view: SiteView) -> list[float]:
    graph, dist, alpha = view.graph, view.distance, view.alpha
    if alpha < 0:
        return [1.0] + [0.0] * 9
    unsaturated, numbers = view.molecule.unsaturated, graph.numbers
    next_ = view.carbons_on(alpha)
    carbons = [a for a in view.atoms if numbers[a] == 6]
    saturated = [dist[a] for a in carbons if not unsaturated[a]]
    branching = sum([max(len(view.carbons_on(b)) - 1, 0) for b in next_ if not unsaturated[b]])
    return [
        0.0,
        float(view.molecule.scaffold_hydrogens[alpha]),
        float(sum([numbers[b] == 6 for b in next_])),
        float(len(next_) == 3),
        float(unsaturated[alpha]),
        float(sum([numbers[b] != 6 for b in next_])),
        float([dist[a] for a in carbons].count(3)),
        float(branching),
        sum([_DECAY_40[d] for d in saturated]),
        float(len(saturated)),
    ]


def _rings(view: SiteView) -> list[float]:
    graph, alpha = view.graph, view.alpha
    mine = [ring for ring in graph.rings if alpha in ring]
    sizes = [0.0] * 5
    for ring in mine:
        sizes[min(max(len(ring), 3), 7) - 3] += 1.0
    bridged = float(len(mine) > 1)
    dist = view.distance
    outer = max([dist[a] for a in view.atoms], default=0)
    return [*sizes, bridged, log(len(view.atoms) + 1.0), float(min(outer, 10))]


def _hetero(view: SiteView) -> list[float]:
    """Hetero atoms of the ring that carries the carboxyl group, adjacent to the alpha atom or further."""
    graph, alpha = view.graph, view.alpha
    out = [0.0] * 10
    system = view.alpha_system
    if system is None:
        out[9] = sum(1.0 for ring in graph.rings if alpha in ring for a in ring if graph.numbers[a] != 6)
        return out
    out[0] = float(graph.ring_size[alpha] == 5)
    for a, position in ring_positions(view, system, alpha).items():
        number = graph.numbers[a]
        if number == 6:
            continue
        if number == 7:
            column = 2 if len(graph.neighbours[a]) + graph.hydrogens[a] == 3 else 3
        else:
            column = {8: 0, 16: 1, 34: 1}.get(number, 1)
        weight = 1.0 if position <= 2 else 0.5
        out[1 + column + (0 if position == 1 else 4)] += weight if position > 1 else 1.0
    return out


def _compute(view: SiteView) -> list[float]:
    return _alpha(view) + _rings(view) + _hetero(view)


SKELETON = Effect(
    "skeleton",
    _COLUMNS,
    _compute,
    ("Taft R. W. In: Newman M. S. (ed.) Steric Effects in Organic Chemistry. Wiley, 1956",),
)
