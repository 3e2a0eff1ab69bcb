r"""Inductive effect: electronegativity, count and through-bond distance of substituents.

Each substituent contributes its inductive constant :math:`\sigma_I` (or its group electronegativity in excess of
hydrogen's), attenuated by a constant factor :math:`g` for each bond between the atom that carries it and the
alpha atom:

.. math:: S(g) = \sum_j \sigma_{I,j}\, g^{\,n_j - 1}

where :math:`n_j` is the number of bonds from the carboxyl carbon to the carrier. Branch and Calvin found
:math:`g = 1/2.8` per atom, Taft 0.36-0.5 per methylene.

Withdrawing groups on saturated carbon enter through ``withdrawing_*`` columns. All of them grow when such a group
is added, when a second one is added, and none grows when it moves one bond away; the model may only fall along them.
The count over shells is cumulative for that reason: a plain count in each shell would rise in the next shell.
"""

from __future__ import annotations

from math import log, sqrt

from qsar.constants.electronegativity import group_electronegativity_of_smiles
from qsar.constants.functional_groups import functional_groups
from qsar.descriptors.effect import Effect, columns, decay
from qsar.descriptors.view import SiteView, Term
from qsar.groups import ANIONIC, CATIONIC

ATTENUATION = (0.25, 0.4, 0.6)
_DECAYS = tuple(decay(g) for g in ATTENUATION)
_DECAY_40, _DECAY_60 = _DECAYS[1:]
_HYDROGEN_ELECTRONEGATIVITY = 2.20
_BASE = 0.15  # sigma_I units; keeps the damping finite for a bare chain
_CHARGED = frozenset(CATIONIC) | frozenset(ANIONIC)

_excess: dict[str, float] = {}


def electronegativity_excess(kind: str) -> float:
    """Group electronegativity of a kind in excess of hydrogen's, Pauling units.

    Never negative for the withdrawing groups that are constrained, so that they can only lower the pKa.
    """
    if not _excess:
        for key, group in functional_groups().items():
            value = group_electronegativity_of_smiles(group.smiles) if group.smiles else 2.6
            _excess[key] = value - _HYDROGEN_ELECTRONEGATIVITY
    return _excess[kind]


def _sums(terms: list[tuple[float, int]]) -> list[float]:
    return [sum([s * table[n] for s, n in terms]) for table in _DECAYS]


_LOWERS = columns(
    "withdrawing_g25 withdrawing_g40 withdrawing_g60 withdrawing_pi_g60 withdrawing_pi_g80 withdrawing_largest "
    "withdrawing_second withdrawing_squares withdrawing_root withdrawing_within1 withdrawing_within2 "
    "withdrawing_within3 withdrawing_within4 withdrawing_damped_root withdrawing_damped_log",
    lowers=True,
) + columns("withdrawing_chi_g40", "Pauling", lowers=True)


def _withdrawing(view: SiteView) -> list[float]:
    if not view.withdrawing:
        return [0.0] * len(_LOWERS)
    terms = [(t.constants.sigma_i, t.bonds) for t in view.withdrawing]
    pi = [(t.constants.sigma_i, t.bonds) for t in view.withdrawing if t.pi]
    attenuated = sorted((s * 0.4 ** (n - 1) for s, n in terms), reverse=True)
    sums = _sums(terms)
    # What withdraws already leaves less for the next group to take: both damped columns grow with the new
    # groups and grow more slowly where the scaffold itself withdraws, which no edit of the groups changes.
    present = _BASE + sum(
        max(t.constants.sigma_i, 0.0) * 0.4 ** max(t.bonds - 1, 0) for t in view.terms if t is not view.alpha_system
    )
    return [
        *sums,
        sum(s * 0.6 ** (n - 1) for s, n in pi),
        sum(s * 0.8 ** (n - 1) for s, n in pi),
        attenuated[0] if attenuated else 0.0,
        attenuated[1] if len(attenuated) > 1 else 0.0,
        sum(x * x for x in attenuated),
        sqrt(max(sums[1], 0.0)),
        *(sum(s for s, n in terms if n <= k) for k in (1, 2, 3, 4)),
        sqrt(sums[1] + present) - sqrt(present),
        log(1.0 + sums[1] / present),
        sum(max(electronegativity_excess(t.kind), 0.0) * 0.4 ** (t.bonds - 1) for t in view.withdrawing),
    ]


_SCAFFOLD = columns(
    "scaffold_sigma_g25 scaffold_sigma_g40 scaffold_sigma_g60 scaffold_sigma_pi_g60 scaffold_largest "
    "groups_alpha groups_beta groups_gamma groups_further "
) + columns("scaffold_chi_g40 scaffold_chi_atoms", "Pauling")


def _counts_as_substituent(view: SiteView, term: Term) -> bool:
    return term.kind not in _CHARGED and term is not view.alpha_system and term.kind != "carboxyl"


def _scaffold(view: SiteView) -> list[float]:
    kept = [t for t in view.terms if _counts_as_substituent(view, t)]
    terms = [(t.constants.sigma_i, t.bonds) for t in kept]
    shells = [0.0, 0.0, 0.0, 0.0]
    for _, n in terms:
        shells[min(max(n, 1), 4) - 1] += 1.0
    chi = sum([electronegativity_excess(t.kind) * _DECAY_40[t.bonds] for t in kept])
    return [
        *_sums(terms),
        sum([t.constants.sigma_i * _DECAY_60[t.bonds] for t in kept if t.pi]),
        max([s * _DECAY_40[n] for s, n in terms], default=0.0),
        *shells,
        chi,
        _atom_electronegativity(view),
    ]


_PAULING = {
    1: 2.20,
    5: 2.04,
    6: 2.55,
    7: 3.04,
    8: 3.44,
    9: 3.98,
    14: 1.90,
    15: 2.19,
    16: 2.58,
    17: 3.16,
    34: 2.55,
    35: 2.96,
    53: 2.66,
}


def _atom_electronegativity(view: SiteView) -> float:
    """Electronegativity of the scaffold's hetero atoms in excess of carbon's, 0.5 a bond."""
    numbers, dist = view.graph.numbers, view.distance
    return sum([(_PAULING[numbers[a]] - 2.55) * 0.5 ** (dist[a] - 2) for a in view.atoms if numbers[a] != 6])


def _compute(view: SiteView) -> list[float]:
    return _withdrawing(view) + _scaffold(view)


INDUCTIVE = Effect(
    "inductive",
    _LOWERS + _SCAFFOLD,
    _compute,
    (
        "Branch G. E. K., Calvin M. The Theory of Organic Chemistry. Prentice-Hall, 1941",
        "Taft R. W. In: Newman M. S. (ed.) Steric Effects in Organic Chemistry. Wiley, 1956",
        "Charton M. Prog. Phys. Org. Chem. 1981, 13, 119",
    ),
)
