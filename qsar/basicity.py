r"""Whether basic nitrogen is protonated where the carboxyl proton leaves.

Ring nitrogen, anilines and amines follow their own published linear free-energy relationships (Perrin, Dempsey &
Serjeant, pKa Prediction for Organic Acids and Bases, 1981; coefficients from memory):

.. math:: \mathrm{p}K_a(\text{pyridinium}) = 5.25 - 5.90\,\Sigma\sigma, \qquad
          \mathrm{p}K_a(\text{anilinium}) = 4.58 - 2.88\,\Sigma\sigma

Groups on the carbon chains of an amine weaken it by :math:`9.3\,\sigma_I\,0.4^{n}`, n saturated carbons beyond the
first; 9.3 reproduces aminoacetonitrile (5.34), glycine ethyl ester (7.7), glycinamide (7.9) and N-phenylglycine ethyl
ester (2.1), the attenuation 2-aminoethanol (9.5).

An aniline and a carboxyl group exchange a proton. The ratio of the zwitterion to the uncharged acid is

.. math:: \log_{10} K_z = \mathrm{p}K_a(\text{anilinium of the acid}) - \mathrm{p}K_a(\text{COOH of the anilinium})

(Ebert, Z. Phys. Chem. 1926, 121, 385); where it is above 0 the carboxyl proton leaves first.
"""

from __future__ import annotations

from qsar.constants.functional_groups import functional_groups
from qsar.graph import Graph
from qsar.groups import WITHDRAWING, Group

PYRIDINE, PYRIDINE_RHO = 5.25, 5.90
ANILINE, ANILINE_RHO = 4.58, 2.88
AMINES = {1: 10.6, 2: 11.0, 3: 10.2}
"""pKa of the ammonium ions of alkylamines by number of carbons on nitrogen: methyl-, diethyl- and trialkylamines."""

_CHAIN, _CHAIN_DECAY = 9.3, 0.4
_PER_ALKYL = 0.25  # N-methylaniline 4.85, N,N-dimethylaniline 5.07
_ORTHO_INDUCTIVE = 1.65  # with 0.2 sigma_R: 2-chloropyridine 0.9 (measured 0.7), 2-methoxypyridine 3.2 (3.3)
_ACCEPTING_PARA = 3.0  # an acceptor takes the free electron pair: sigma- of COOR 0.74, CN 0.88
_TWISTED_DIALKYLAMINO = 1.5  # out of the ring's plane and hydrogen-bonded: N,N-dimethylanthranilic acid is a zwitterion
_BONDED_NH = -0.3  # the neutral N-H...O=C of anthranilic acids
_BENZOIC = 4.20
_AMMONIO = {1: 1.55, 2: 0.86, 3: 0.60}  # what an ammonio group in ortho, meta, para takes off a benzoic acid
_BY_CHAIN = {2: 2.2, 3: 3.3, 4: 3.9}  # COOH of ammonium acids by bonds from carboxyl carbon to nitrogen
_ELSEWHERE = 4.2
_ORIENTED = {
    "ester": "alkoxycarbonyl",
    "amide": "carbamoyl",
    "urea": "carbamoyl",
    "carbamate": "alkoxycarbonyl",
    "sulfonamide": "sulfonamide_s",
    "ether": "alkoxy",
    "sulfide": "alkylthio",
}


def pyridinium_pka(graph: Graph, group: Group, group_of: dict[int, Group]) -> float:
    """Estimated pKa of the protonated ring nitrogen of a pyridine-like system, carboxyl groups ionised."""
    nitrogen = next(a for a in group.atoms if graph.numbers[a] == 7)
    constants, total = functional_groups(), 0.0
    for position, kind in _on_ring(graph, set(group.atoms), nitrogen, group_of, ionised=True):
        c = constants[kind]
        if position == 1:
            total += _ORTHO_INDUCTIVE * c.sigma_i + 0.2 * c.sigma_r
        else:
            total += c.sigma_i + _resonance(position) * c.sigma_r
    return PYRIDINE - PYRIDINE_RHO * total


def anilinium_pka(graph: Graph, nitrogen: int, group_of: dict[int, Group]) -> float | None:
    """Estimated pKa of a protonated aniline, carboxyl groups un-ionised; None where the nitrogen is no basic aniline.

    Halogen, cyano and nitro groups on saturated carbon are not counted, so that no edit of such a group changes the
    form that is predicted.

    Parameters
    ----------
    graph : Graph
    nitrogen : int
        Atom of an amino group.
    group_of : dict
        Group of each atom.
    """
    found = _aniline(graph, nitrogen, group_of)
    if found is None:
        return None
    ipso, system = found
    constants, total = functional_groups(), 0.0
    dialkyl = sum(graph.saturated(b) for b in graph.neighbours[nitrogen]) == 2
    pka = ANILINE + _PER_ALKYL * sum(graph.saturated(b) for b in graph.neighbours[nitrogen])
    for position, kind in _on_ring(graph, system, ipso, group_of, skip=nitrogen):
        c = constants[kind]
        if c.sigma_r > 0.0 and position in (1, 3):
            total += c.sigma_i + _ACCEPTING_PARA * c.sigma_r
        else:
            total += c.sigma_i + (0.5 if position == 1 else _resonance(position)) * c.sigma_r
        if position == 1 and kind == "carboxyl":
            pka += _TWISTED_DIALKYLAMINO if dialkyl else _BONDED_NH
    return pka - ANILINE_RHO * total - _along_chains(graph, nitrogen, group_of, withdrawing=False)


def zwitterion_ratio(graph: Graph, nitrogen: int, group_of: dict[int, Group]) -> float | None:
    """log10 of the ratio of zwitterion to uncharged acid for an aniline; None where the nitrogen is no basic aniline.

    Parameters
    ----------
    graph, nitrogen, group_of
        As for `anilinium_pka`.
    """
    base = anilinium_pka(graph, nitrogen, group_of)
    return None if base is None else base - _acid_of_anilinium(graph, nitrogen, group_of)


def amine_pka(graph: Graph, nitrogen: int, group_of: dict[int, Group]) -> float:
    """Estimated pKa of an aliphatic ammonium ion, carboxyl groups ionised and other amines protonated."""
    carbons = sum(graph.numbers[b] == 6 for b in graph.neighbours[nitrogen])
    return AMINES[min(max(carbons, 1), 3)] - _along_chains(graph, nitrogen, group_of, withdrawing=True, ionised=True)


def _aniline(graph: Graph, nitrogen: int, group_of: dict[int, Group]) -> tuple[int, set[int]] | None:
    """Carbon that carries the nitrogen of a basic aniline, and its aromatic system."""
    carriers = [b for b in graph.neighbours[nitrogen] if not graph.saturated(b)]
    if len(carriers) != 1 or not graph.aromatic[carriers[0]]:
        return None  # diarylamines, enamines and amides are not basic here
    group = group_of.get(carriers[0])
    system = {carriers[0]} if group is None else set(group.atoms)
    return None if any(graph.numbers[a] != 6 for a in system) else (carriers[0], system)


def _resonance(position: int) -> float:
    """Weight of sigma_R: 0.45 in meta, 1.3 in ortho and para position."""
    return {1: 1.3, 2: 0.45, 3: 1.3}.get(position, 0.0)


def _on_ring(
    graph: Graph, system: set[int], start: int, group_of: dict[int, Group], *, ionised: bool = False, skip: int = -1
) -> list[tuple[int, str]]:
    """Substituents of an aromatic system within three bonds of an atom: position (1 is ortho) and kind of group."""
    dist = _bonds_from(graph, start, system)
    found = []
    for a, position in dist.items():
        for b in graph.neighbours[a]:
            if b not in system and b != skip and 1 <= position <= 3:
                found.append((position, _kind(group_of.get(b), ionised)))
    return found


def _kind(group: Group | None, ionised: bool) -> str:
    if group is None:
        return "alkyl"
    if group.kind == "carboxyl" and ionised:
        return "carboxylate"
    return _ORIENTED.get(group.kind, group.kind)


def _bonds_from(graph: Graph, start: int, within: set[int] | None = None) -> dict[int, int]:
    dist = {start: 0}
    queue = [start]
    for a in queue:
        for b in graph.neighbours[a]:
            if b not in dist and (within is None or b in within):
                dist[b] = dist[a] + 1
                queue.append(b)
    return dist


def _along_chains(
    graph: Graph, nitrogen: int, group_of: dict[int, Group], *, withdrawing: bool, ionised: bool = False
) -> float:
    """By how much groups on the saturated carbons around a nitrogen lower its pKa."""
    constants, total = functional_groups(), 0.0
    queue = [(b, nitrogen, 0) for b in graph.neighbours[nitrogen] if b not in group_of and graph.saturated(b)]
    seen = {nitrogen, *(a for a, _, _ in queue)}
    for a, before, n in queue:
        for b in graph.neighbours[a]:
            if b in (before, nitrogen) or n > 2:
                continue
            group = group_of.get(b)
            if group is None:
                if b not in seen and graph.saturated(b):
                    seen.add(b)
                    queue.append((b, a, n + 1))
            elif withdrawing or group.kind not in WITHDRAWING:
                total += max(constants[_kind(group, ionised)].sigma_i, 0.0) * _CHAIN_DECAY**n
    return _CHAIN * total


def _acid_of_anilinium(graph: Graph, nitrogen: int, group_of: dict[int, Group]) -> float:
    """Rough pKa of the strongest COOH of the form whose aniline is protonated."""
    dist = _bonds_from(graph, nitrogen)
    found = [_ELSEWHERE]
    for a, bonds in dist.items():
        group = group_of.get(a)
        if group is None or group.kind != "carboxyl" or group.atoms[0] != a:
            continue
        alpha = next((b for b in graph.neighbours[a] if b not in group.atoms), -1)
        ring = group_of.get(alpha)
        beside = graph.neighbours[alpha] if alpha >= 0 else []
        if ring is not None and graph.aromatic[alpha]:
            found.append(_benzoic(graph, set(ring.atoms), alpha, nitrogen, group_of))
        elif any(b in group_of and group_of[b].kind == "ammonium" for b in beside):
            found.append(_BY_CHAIN[2])
        else:
            found.append(_BY_CHAIN.get(bonds, _ELSEWHERE))
    return min(found)


def _benzoic(graph: Graph, system: set[int], alpha: int, nitrogen: int, group_of: dict[int, Group]) -> float:
    constants, pka = functional_groups(), _BENZOIC
    position = _bonds_from(graph, alpha, system)
    carrier = next((b for b in graph.neighbours[nitrogen] if b in position), -1)
    pka -= _AMMONIO.get(position.get(carrier, 9), 0.2)
    for place, kind in _on_ring(graph, system, alpha, group_of, skip=nitrogen):
        c = constants[kind]
        if kind == "carboxyl" and place == 0:
            continue
        if place == 1:
            pka -= 1.2 if kind == "hydroxy" else 2.2 * c.sigma_i
        else:
            pka -= c.sigma_i + _resonance(place) * c.sigma_r
    return pka
