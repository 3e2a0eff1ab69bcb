"""Ortho and steric effects: bulk beside the carboxyl group.

Bulk is Charton's constant nu (J. Am. Chem. Soc. 1975, 97, 1552) of a group, summed where groups crowd the carboxyl
group: on the alpha and beta atoms of a chain, in the ortho positions of a ring. Crowding hinders the solvation of the
carboxylate (pKa up) or twists an aromatic acid out of conjugation (pKa down). Newman's rule of six
(Steric Effects in Organic Chemistry, 1956) counts atoms six bonds from the carbonyl oxygen.
"""

from __future__ import annotations

from qsar.descriptors.effect import Effect, columns
from qsar.descriptors.resonance import ring_substituents
from qsar.descriptors.view import SiteView

_COLUMNS = columns(
    "ortho_count ortho_bulk ortho_largest ortho_both ortho_alkyl ortho_halogen ortho_fused ortho_ether ortho_nitro "
    "ortho_carbonyl ortho_ring_carbonyl ortho_pair_sigma "
    "alpha_bulk beta_bulk atoms_at_three atoms_at_four atoms_at_five"
)
_HALOGEN = ("fluoro", "chloro", "bromo", "iodo")
_CARBONYL = (
    "ketone",
    "aldehyde",
    "alkoxycarbonyl",
    "carbamoyl",
    "carboxyl",
    "carboxylate",
    "phenyl",
    "sulfonyl",
)
_BRANCH_BULK = (0.52, 0.56, 0.76, 1.24)


def alkyl_bulk(view: SiteView, atom: int) -> float:
    """Charton's nu of the alkyl group that begins at `atom`: methyl 0.52, ethyl 0.56, isopropyl 0.76, t-butyl 1.24."""
    return _BRANCH_BULK[min(len(view.carbons_on(atom)), 3)]


def _ortho(view: SiteView) -> list[float]:
    system = view.alpha_system
    if system is None:
        return [0.0] * 12
    bulks = []
    sigmas = []
    alkyl = halogen = ether = nitro = carbonyl = ring_carbonyl = 0.0
    for position, c, atom in ring_substituents(view, system, view.alpha):
        if position != 1 or atom == view.site:
            continue
        plain = c.kind == "alkyl"
        bulks.append(alkyl_bulk(view, atom) if plain else c.bulk)
        sigmas.append(c.sigma_i)
        alkyl += float(plain)
        halogen += float(c.kind in _HALOGEN)
        ether += float(c.kind in ("alkoxy", "aryloxy", "acyloxy", "alkylthio", "arylthio"))
        nitro += float(c.kind == "nitro")
        carbonyl += float(c.kind in _CARBONYL)
        ring_carbonyl += float(c.kind == "ring_carbonyl")  # takes the COOH proton in a hydrogen bond
    members = set(system.atoms)
    fused = sum(
        1.0
        for b in view.graph.neighbours[view.alpha]
        if b in members and sum(x in members for x in view.graph.neighbours[b]) == 3
    )
    return [
        float(len(bulks)),
        sum(bulks),
        max(bulks, default=0.0),
        float(len(bulks) + fused >= 2),
        alkyl,
        halogen,
        fused,
        ether,
        nitro,
        carbonyl,
        ring_carbonyl,
        # two groups together turn the COOH out of the ring's plane, and their field effects then count in full
        sum(sigmas) * float(len(sigmas) >= 2),
    ]


def _compute(view: SiteView) -> list[float]:
    alpha_bulk = beta_bulk = 0.0
    if view.alpha >= 0 and not view.graph.aromatic[view.alpha]:
        for b in view.carbons_on(view.alpha):
            term = view.term_of.get(b)
            alpha_bulk += term.constants.bulk if term else alkyl_bulk(view, b)
            for c in view.carbons_on(b):
                inner = view.term_of.get(c)
                beta_bulk += inner.constants.bulk if inner else alkyl_bulk(view, c)
    dist = view.distance
    bonds = [dist[a] for a in view.atoms]
    return [*_ortho(view), alpha_bulk, beta_bulk, *(float(bonds.count(d)) for d in (3, 4, 5))]


STERIC = Effect(
    "steric",
    _COLUMNS,
    _compute,
    (
        "Charton M. J. Am. Chem. Soc. 1975, 97, 1552",
        "Newman M. S. (ed.) Steric Effects in Organic Chemistry. Wiley, 1956",
    ),
)
