"""Electronegativity of a group from its graph, so that a group never seen before has a value.

Both formulas take plain lists and need no toolkit. Hydrogens are counted, not listed; the atom a group is
attached to is no member of the group.
"""

from __future__ import annotations

from collections.abc import Collection, Sequence
from functools import cache, lru_cache

from qsar.constants.reader import element_by_number

_CARBON = 6
#: Rise of the electronegativity of carbon over sp3, Pauling scale, by the number of atoms bonded to it
#: (Hinze, Jaffe, J. Am. Chem. Soc. 1962, 84, 540: sp3 2.48, sp2 2.75, sp 3.29; from memory).
_CARBON_RISE = {1: 0.81, 2: 0.81, 3: 0.27}
#: Part of the formal charges of a dipolar bond (N+-O-, S+-O-, P+-O-) that stays on its ends, in elementary
#: charges. An own choice: Pauling's partial ionic character of an S-O bond, 1 - exp(-(3.44 - 2.58)**2 / 4),
#: is 0.17, and the rank correlations with published scales change by less than 0.03 between 0.2 and 0.5.
_DIPOLE = 0.25
_OXYGEN = 8
#: P, S, Se, I: a bare oxygen on these is drawn with a double bond but is as dipolar as that of an N-oxide.
_DATIVE = frozenset({15, 16, 34, 53})


def group_electronegativity(
    numbers: Sequence[int],
    neighbours: Sequence[Sequence[int]],
    atoms: Collection[int],
    anchor: int,
    hydrogens: Sequence[int],
    charges: Sequence[int],
) -> float:
    """Electronegativity of a group in which the attached atom counts most.

    Bratsch's equalisation with a weight on each atom that halves with each bond from the attached atom, ``w =
    2**-d``, where ``d`` is the shortest path within the group::

        chi = sum(w * (1 + q)) / sum(w / chi_atom)

    The formal charges of bonded atoms that cancel (nitro, azide, N-oxide) count a quarter. An oxygen drawn
    with a double bond on phosphorus, sulfur, selenium or iodine counts as such a dipole, so that a sulfoxide
    has one value however it is drawn. Carbon bonded to three or two atoms takes the value of the sp2 or sp
    hybrid.

    Parameters
    ----------
    numbers : sequence of int
        Atomic number of each atom of the molecule, 0 for a dummy.
    neighbours : sequence of sequence of int
        Indices of the bonded atoms, for each atom of the molecule.
    atoms : collection of int
        Indices of the atoms of the group.
    anchor : int
        Index of the atom of the group that is attached.
    hydrogens : sequence of int
        Number of hydrogens on each atom that are not listed as atoms.
    charges : sequence of int
        Formal charge of each atom, in elementary charges.

    Returns
    -------
    float
        Group electronegativity, Pauling scale. May be zero or less for small anions.

    Raises
    ------
    ValueError
        If the anchor is not in the group or an atom of the group cannot be reached from it.
    KeyError
        If an element is not tabulated.

    References
    ----------
    S. G. Bratsch, J. Chem. Educ. 1985, 62, 101. J. Hinze, H. H. Jaffe, J. Am. Chem. Soc. 1962, 84, 540.
    """
    members = frozenset(atoms)
    weights = {atom: 0.5**depth for atom, depth in _depths(neighbours, members, anchor).items()}
    charge = _shared_charges(numbers, neighbours, members, hydrogens, charges)
    hydrogen = _pauling(1)
    top = bottom = 0.0
    for atom, weight in weights.items():
        bonded = len(neighbours[atom]) + hydrogens[atom]
        top += weight * (1 + charge[atom] + hydrogens[atom] / 2)
        own = _hybrid(numbers[atom], bonded, charges[atom])
        bottom += weight * (1 / own + hydrogens[atom] / 2 / hydrogen)
    return top / bottom


def equalised_electronegativity(
    numbers: Sequence[int],
    neighbours: Sequence[Sequence[int]],
    atoms: Collection[int],
    anchor: int,
    hydrogens: Sequence[int],
    charges: Sequence[int],
) -> float:
    """Electronegativity of a group after Bratsch, in which all atoms count alike.

    The number of atoms plus the charge of the group, over the sum of the reciprocal electronegativities::

        chi = (n + q) / sum(1 / chi_atom)

    Parameters
    ----------
    numbers, neighbours, atoms, anchor, hydrogens, charges
        As for `group_electronegativity`; the anchor only serves to check that the group hangs together.

    Returns
    -------
    float
        Group electronegativity, Pauling scale. Zero for a single atom with one negative charge.

    Raises
    ------
    ValueError
        If the anchor is not in the group or an atom of the group cannot be reached from it.
    KeyError
        If an element is not tabulated.

    References
    ----------
    S. G. Bratsch, J. Chem. Educ. 1984, 61, 588; 1985, 62, 101.
    """
    members = frozenset(atoms)
    _depths(neighbours, members, anchor)
    top = bottom = 0.0
    for atom in members:
        top += 1 + hydrogens[atom] + charges[atom]
        bottom += 1 / _pauling(numbers[atom]) + hydrogens[atom] / _pauling(1)
    return top / bottom


@lru_cache(maxsize=4096)
def group_electronegativity_of_smiles(smiles: str) -> float:
    """`group_electronegativity` of a group written as SMILES with a dummy atom where it is attached.

    Parameters
    ----------
    smiles : str
        For instance ``"[*]C#N"``.

    Returns
    -------
    float
        Group electronegativity, Pauling scale.

    Raises
    ------
    ValueError
        If the SMILES cannot be read or has not exactly one dummy atom with one bond.
    KeyError
        If an element is not tabulated.
    """
    return group_electronegativity(*group_graph(smiles))


Graph = tuple[list[int], list[list[int]], list[int], int, list[int], list[int]]


def group_graph(smiles: str) -> Graph:
    """Plain lists of a group written as SMILES, in the order of the arguments of `group_electronegativity`.

    Parameters
    ----------
    smiles : str
        SMILES with exactly one dummy atom, bonded once.

    Returns
    -------
    tuple
        Atomic numbers, neighbours, atoms of the group, anchor, hydrogens, charges.

    Raises
    ------
    ValueError
        If the SMILES cannot be read or has not exactly one dummy atom with one bond.
    """
    # Imported here, so that the formulas above stay free of the toolkit.
    from rdkit import Chem, rdBase

    with rdBase.BlockLogs():  # a hydrogen on a dummy is meant; what cannot be read is raised below
        molecule = Chem.MolFromSmiles(smiles)
    if molecule is None:
        raise ValueError(f"{smiles!r} cannot be read as SMILES; write a group as in '[*]C#N'")
    listed = list(molecule.GetAtoms())
    dummies = [atom for atom in listed if atom.GetAtomicNum() == 0]
    if len(dummies) != 1 or dummies[0].GetDegree() != 1:
        raise ValueError(f"{smiles!r} needs exactly one dummy atom with one bond, as in '[*]C#N'")
    neighbours = [[other.GetIdx() for other in atom.GetNeighbors()] for atom in listed]
    return (
        [atom.GetAtomicNum() for atom in listed],
        neighbours,
        [atom.GetIdx() for atom in listed if atom.GetAtomicNum() != 0],
        neighbours[dummies[0].GetIdx()][0],
        [atom.GetTotalNumHs() for atom in listed],
        [atom.GetFormalCharge() for atom in listed],
    )


@cache
def _pauling(number: int) -> float:
    return element_by_number(number).electronegativity


def _hybrid(number: int, bonded: int, charge: int) -> float:
    """Pauling electronegativity; for carbon that of its hybrid, a lone pair counted as a bonded atom."""
    value = _pauling(number)
    return value + _CARBON_RISE.get(bonded + (charge < 0), 0.0) if number == _CARBON else value


def _depths(neighbours: Sequence[Sequence[int]], members: frozenset[int], anchor: int) -> dict[int, int]:
    """Bonds from the anchor to each member along the shortest path within the group."""
    if anchor not in members:
        raise ValueError(f"the anchor {anchor} is no atom of the group {sorted(members)}")
    depths = {anchor: 0}
    shell = [anchor]
    while shell:
        reached: list[int] = []
        for atom in shell:
            for other in neighbours[atom]:
                if other in members and other not in depths:
                    depths[other] = depths[atom] + 1
                    reached.append(other)
        shell = reached
    if len(depths) != len(members):
        lost = sorted(members - depths.keys())
        raise ValueError(f"atoms {lost} of the group are not joined to the anchor {anchor} within the group")
    return depths


def _shared_charges(
    numbers: Sequence[int],
    neighbours: Sequence[Sequence[int]],
    members: frozenset[int],
    hydrogens: Sequence[int],
    charges: Sequence[int],
) -> dict[int, float]:
    """Formal charges, those of dipolar bonds reduced to the part that stays."""
    formal = {atom: charges[atom] for atom in sorted(members)}
    for atom in formal:
        if numbers[atom] != _OXYGEN or len(neighbours[atom]) != 1 or hydrogens[atom] or charges[atom]:
            continue
        centre = neighbours[atom][0]
        if centre in members and numbers[centre] in _DATIVE:
            formal[atom] -= 1
            formal[centre] += 1
    net = dict(formal)
    for atom in net:
        for other in neighbours[atom]:
            if other in members and net[atom] > 0 > net[other]:
                moved = min(net[atom], -net[other])
                net[atom] -= moved
                net[other] += moved
    return {atom: net[atom] + _DIPOLE * (formal[atom] - net[atom]) for atom in net}
