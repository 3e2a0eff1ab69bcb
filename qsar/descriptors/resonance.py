r"""Resonance: Hammett positions of aromatic acids, conjugation of the alpha atom, vinylogy, remote rings.

A substituent of an aromatic acid acts through its inductive constant :math:`\sigma_I` and its resonance constant
:math:`\sigma_R`; the dual-substituent form of Hammett's equation (Ehrenson, Brownlee and Taft 1973) is
:math:`\sigma_m \approx \sigma_I + 0.45\,\sigma_R` and :math:`\sigma_p \approx \sigma_I + 1.3\,\sigma_R`.
Those two constants are used instead of tabulated :math:`\sigma_m, \sigma_p`, which are themselves differences of
benzoic acid pKa values and would hand a held-out acid its own answer.
"""

from __future__ import annotations

from qsar.constants.functional_groups import FunctionalGroup, functional_groups
from qsar.descriptors.effect import Effect, columns, decay
from qsar.descriptors.view import SiteView, Term

META_RESONANCE = 0.45
PARA_RESONANCE = 1.3
_DECAY_45, _DECAY_60 = decay(0.45), decay(0.6)

_COLUMNS = columns(
    "aromatic_acid meta_sigma_i meta_sigma_r para_sigma_i para_sigma_r hammett_meta hammett_para hammett_sum "
    "ortho_sigma_i ortho_sigma_r ring_substituents "
    "vinyl_acid alkynyl_acid allyl_acid beta_cis_sigma_i beta_trans_sigma_i beta_cis_sigma_r beta_trans_sigma_r "
    "beta_cis_bulk beta_trans_bulk beta_aryl "
    "remote_hammett remote_conjugated remote_ortho alpha_aryl conjugated_groups"
)


def ring_positions(view: SiteView, system: Term, ipso: int) -> dict[int, int]:
    """Bonds within an aromatic system from `ipso` to each of its atoms (1 ortho, 2 meta, 3 para)."""
    members = set(system.atoms)
    dist = {ipso: 0}
    queue = [ipso]
    for a in queue:
        for b in view.graph.neighbours[a]:
            if b in members and b not in dist:
                dist[b] = dist[a] + 1
                queue.append(b)
    return dist


def ring_substituents(view: SiteView, system: Term, ipso: int) -> list[tuple[int, FunctionalGroup, int]]:
    """Substituents on an aromatic system.

    Returns
    -------
    list of (position, constants, atom)
        Position in bonds from `ipso`; alkyl groups count as substituents; the bond towards the carboxyl group
        does not.
    """
    known = view.on_rings.get((id(system), ipso))
    if known is not None:
        return known
    members = set(system.atoms)
    skip = view.molecule.set_apart
    constants = functional_groups()
    found = []
    for a, position in ring_positions(view, system, ipso).items():
        for b in view.graph.neighbours[a]:
            if b in members or b in skip or (a == ipso and view.distance[b] < view.distance[a]):
                continue
            term = view.term_of.get(b)
            found.append((position, term.constants if term else constants["alkyl"], b))
    view.on_rings[id(system), ipso] = found
    return found


def _aromatic(view: SiteView) -> list[float]:
    system = view.alpha_system
    if system is None:
        return [0.0] * 11
    mi = mr = pi = pr = oi = orr = 0.0
    found = ring_substituents(view, system, view.alpha)
    for position, c, atom in found:
        if atom == view.site:
            continue
        if position == 1:
            oi += c.sigma_i
            orr += c.sigma_r
        elif position == 2:
            mi += c.sigma_i
            mr += c.sigma_r
        elif position >= 3:
            weight = 1.0 if position == 3 else 0.6
            pi += weight * c.sigma_i
            pr += weight * c.sigma_r
    meta, para = mi + META_RESONANCE * mr, pi + PARA_RESONANCE * pr
    return [1.0, mi, mr, pi, pr, meta, para, meta + para, oi, orr, float(len(found))]


def _olefinic(view: SiteView) -> list[float]:
    """Conjugation of the alpha atom and what sits at the far end of its double bond, by configuration."""
    graph, alpha, dist = view.graph, view.alpha, view.distance
    out = [0.0] * 10
    if alpha < 0 or graph.aromatic[alpha]:
        return out
    skip = view.molecule.set_apart
    for b, order in zip(graph.neighbours[alpha], graph.orders[alpha], strict=True):
        if b == view.site or b in skip:
            continue
        if order == 1.0:
            multiple = any(
                o >= 2.0 and graph.numbers[c] == 6 and c != alpha
                for c, o in zip(graph.neighbours[b], graph.orders[b], strict=True)
            )
            out[2] += float(multiple and not graph.aromatic[b])
            continue
        if graph.numbers[b] != 6:
            continue
        out[0 if order == 2.0 else 1] = 1.0
        for c in graph.neighbours[b]:
            if c == alpha or c in skip or dist[c] < dist[b]:
                continue
            term = view.term_of.get(c)
            constants = term.constants if term else functional_groups()["alkyl"]
            cis = view.path_pairs.get((view.site, c), 0)
            w_cis, w_trans = (0.5 + 0.5 * cis, 0.5 - 0.5 * cis)
            for k, value in ((3, constants.sigma_i), (5, constants.sigma_r), (7, constants.bulk)):
                out[k] += w_cis * value
                out[k + 1] += w_trans * value
            out[9] += float(graph.aromatic[c])
    return out


def _remote(view: SiteView) -> list[float]:
    """Hammett sums of aromatic systems that do not carry the carboxyl group, weakened by their distance."""
    hammett = conjugated = ortho = alpha_aryl = groups = 0.0
    for term in view.terms:
        if term is view.alpha_system or not view.graph.aromatic[term.anchor]:
            continue
        weight = _DECAY_45[term.bonds]
        alpha_aryl += float(term.bonds == 1)
        total = 0.0
        for position, c, _ in ring_substituents(view, term, term.anchor):
            factor = PARA_RESONANCE if position != 2 else META_RESONANCE
            total += c.sigma_i + factor * c.sigma_r
            ortho += weight * float(position == 1)
        hammett += weight * total
        conjugated += _DECAY_60[term.bonds] * total * float(term.pi)
    if view.alpha >= 0 and view.molecule.unsaturated[view.alpha]:
        groups = float(sum(t.bonds == 1 for t in view.terms))
    return [hammett, conjugated, ortho, alpha_aryl, groups]


def _compute(view: SiteView) -> list[float]:
    return _aromatic(view) + _olefinic(view) + _remote(view)


RESONANCE = Effect(
    "resonance",
    _COLUMNS,
    _compute,
    (
        "Hammett L. P. J. Am. Chem. Soc. 1937, 59, 96",
        "Ehrenson S., Brownlee R. T. C., Taft R. W. Prog. Phys. Org. Chem. 1973, 10, 1",
    ),
)
