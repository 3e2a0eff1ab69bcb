r"""Whether basic ring nitrogen and anilines are protonated where the carboxyl proton leaves.

Both follow their own published linear free-energy relationships (Perrin, Dempsey & Serjeant, pKa Prediction for
Organic Acids and Bases, 1981; coefficients from memory):

.. math:: \mathrm{p}K_a(\text{pyridinium}) = 5.25 - 5.90\,\Sigma\sigma, \qquad
          \mathrm{p}K_a(\text{anilinium}) = 4.58 - 2.88\,\Sigma\sigma

Substituents next to the ring nitrogen act through the inductive effect mostly; 1.65 sigma_I reproduces
2-chloropyridine (0.72) and 2-fluoropyridine (-0.44).
"""

from __future__ import annotations

from qsar.constants.functional_groups import functional_groups
from qsar.graph import Graph
from qsar.groups import Group

PYRIDINE, PYRIDINE_RHO = 5.25, 5.90
ANILINE, ANILINE_RHO = 4.58, 2.88
_ORTHO_INDUCTIVE = 1.65
_ORIENTED = {
    "ester": "alkoxycarbonyl",
    "amide": "carbamoyl",
    "urea": "carbamoyl",
    "carbamate": "alkoxycarbonyl",
    "sulfonamide": "sulfonamide_s",
    "ether": "alkoxy",
    "sulfide": "alkylthio",
    "carboxyl": "carboxylate",  # in the form that the nitrogen's proton leaves
}


def pyridinium_pka(graph: Graph, group: Group, group_of: dict[int, Group]) -> float:
    """Estimated pKa of the protonated ring nitrogen of a pyridine-like system."""
    nitrogen = next(a for a in group.atoms if graph.numbers[a] == 7)
    return PYRIDINE - PYRIDINE_RHO * _sigma(graph, set(group.atoms), nitrogen, group_of, aza=True)


def anilinium_pka(graph: Graph, nitrogen: int, group_of: dict[int, Group]) -> float | None:
    """Estimated pKa of a protonated aniline, None where the nitrogen is no basic aniline.

    Parameters
    ----------
    graph : Graph
    nitrogen : int
        Atom of an amino group.
    group_of : dict
        Group of each atom.
    """
    carriers = [b for b in graph.neighbours[nitrogen] if not graph.saturated(b)]
    if len(carriers) != 1 or not graph.aromatic[carriers[0]]:
        return None  # diarylamines, enamines and amides are not basic here
    ipso = carriers[0]
    system = next((set(g.atoms) for g in (group_of.get(ipso),) if g is not None), {ipso})
    if any(graph.numbers[a] != 6 for a in system):
        return None
    return ANILINE - ANILINE_RHO * _sigma(graph, system, ipso, group_of, aza=False, skip=nitrogen)


def _sigma(
    graph: Graph, system: set[int], start: int, group_of: dict[int, Group], *, aza: bool, skip: int = -1
) -> float:
    constants = functional_groups()
    dist = {start: 0}
    queue = [start]
    for a in queue:
        for b in graph.neighbours[a]:
            if b in system and b not in dist:
                dist[b] = dist[a] + 1
                queue.append(b)
    total = 0.0
    for a, position in dist.items():
        for b in graph.neighbours[a]:
            if b in system or b == skip:
                continue
            group = group_of.get(b)
            kind = "alkyl" if group is None else _ORIENTED.get(group.kind, group.kind)
            c = constants[kind]
            if position == 1 and aza:
                total += _ORTHO_INDUCTIVE * c.sigma_i + 0.5 * c.sigma_r
            elif position == 2:
                total += c.sigma_i + 0.45 * c.sigma_r
            elif position in (1, 3):
                total += c.sigma_i + 1.3 * c.sigma_r
    return total
