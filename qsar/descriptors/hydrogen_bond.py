"""Hydrogen bonds from a donor of the same molecule to the carboxylate, which make the acid stronger.

A donor X-H whose X is d bonds from the carboxyl carbon closes a ring of d + 3 atoms (O, C, ..., X, H); five- to
seven-membered rings are counted, those that a double bond, an aromatic ring or a ring holds in place apart.
Source of the idea: Dippy, Chem. Rev. 1939, 25, 151 (salicylic and maleic acids).
"""

from __future__ import annotations

from qsar.descriptors.effect import Effect, columns
from qsar.descriptors.resonance import ring_substituents
from qsar.descriptors.view import SiteView, Term

_COLUMNS = columns(
    "oh_ring5 oh_ring6 oh_ring7 oh_ring6_rigid oh_ring7_rigid oh_ortho_pair oh_ortho_buttressed "
    "nh_ring5 nh_ring6 nh_ring7 nh_ring6_rigid "
    "cooh_ring6 cooh_ring7 cooh_ring7_rigid hindered_monoanion"
)
_NOTHING = dict.fromkeys((c.name for c in _COLUMNS), 0.0)
_CARBOXYL = ("carboxyl",)


def donors(view: SiteView, term: Term) -> list[int]:
    """Hydrogen-bond donor atoms of a group."""
    graph = view.graph
    if term.kind == "carboxyl":
        return [a for a in term.atoms if graph.numbers[a] == 8 and graph.hydrogens[a]]
    found = [a for a in term.atoms if graph.numbers[a] in (7, 8) and graph.hydrogens[a]]
    if term.kind == "ammonium":
        found = [a for a in term.atoms if graph.numbers[a] == 7]
    return found


def _rigid(view: SiteView, anchor: int) -> bool:
    """Whether the donor's carrier is held cis to the carboxyl group."""
    pair = view.path_pairs.get((view.site, anchor))
    if pair is not None:
        return pair > 0
    if view.alpha < 0 or not view.graph.aromatic[view.alpha]:
        return False
    return any(b in view.graph.neighbours[view.alpha] and view.graph.aromatic[b] for b in view.graph.neighbours[anchor])


def _compute(view: SiteView) -> list[float]:
    out = _NOTHING.copy()
    ortho_oh = 0
    for term in view.terms:
        for x in donors(view, term):
            size = view.distance[x] + 3
            rigid = _rigid(view, term.anchor)
            if term.kind in _CARBOXYL:
                if size in (6, 7):
                    out[f"cooh_ring{size}"] += 1.0
                    if rigid and size == 7:
                        out["cooh_ring7_rigid"] += 1.0
                continue
            element = "oh" if view.graph.numbers[x] == 8 else "nh"
            if 5 <= size <= 7 and f"{element}_ring{size}" in out:
                out[f"{element}_ring{size}"] += 1.0
            if rigid and f"{element}_ring{size}_rigid" in out:
                out[f"{element}_ring{size}_rigid"] += 1.0
                ortho_oh += element == "oh" and size == 6
    out["oh_ortho_pair"] = float(ortho_oh >= 2)
    system = view.alpha_system
    if ortho_oh and system is not None:
        # a second ortho group pushes the COOH towards the OH
        ortho = sum(position == 1 and a != view.site for position, _, a in ring_substituents(view, system, view.alpha))
        out["oh_ortho_buttressed"] = float(ortho >= 2)
    # The proton of a hydrogen-bonded monoanion is hard to take: a carboxylate held near the site whose proton leaves.
    for term in view.terms:
        if term.kind == "carboxylate" and term.bonds in (1, 2):
            out["hindered_monoanion"] += 1.0 + float(_rigid(view, term.anchor))
    return list(out.values())


HYDROGEN_BOND = Effect("hydrogen bond", _COLUMNS, _compute, ("Dippy J. F. J. Chem. Rev. 1939, 25, 151",))
