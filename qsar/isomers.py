"""Isomers that an incompletely drawn acid leaves open and that differ in pKa: E/Z, and cis/trans on rings."""

from __future__ import annotations

from rdkit import Chem
from rdkit.Chem.EnumerateStereoisomers import EnumerateStereoisomers, StereoEnumerationOptions

from qsar.structures import Acid, read_acid

MOST = 16


def configurations(acid: Acid) -> tuple[list[Acid], str]:
    """The configurations that the drawing leaves open.

    Parameters
    ----------
    acid : Acid

    Returns
    -------
    acids : list of Acid
        One entry, the acid itself, where nothing that matters is open.
    note : str
        What was left open, for the user; empty where nothing is.
    """
    outside = _double_bonds_outside_rings(acid)
    if len(acid.sites) == 1 and not outside:
        return [acid], ""
    ring_pairs = _open_ring_pairs(acid)
    if not outside and not ring_pairs:
        return [acid], ""
    mol = Chem.Mol(acid.mol)
    bonds = _open_double_bonds(mol, acid)
    if not bonds and not ring_pairs:
        return [acid], ""
    if ring_pairs:
        options = StereoEnumerationOptions(  # type: ignore[no-untyped-call]
            onlyUnassigned=True, unique=True, maxIsomers=MOST
        )
        keep = {a for pair in ring_pairs for a in pair}
        found = EnumerateStereoisomers(mol, options=options)  # type: ignore[no-untyped-call]
        smiles = {Chem.MolToSmiles(_forget(m, acid.mol, keep)) for m in found}
    else:
        smiles = _over_double_bonds(mol, bonds)
    isomers = _without_mirror_images([read_acid(s) for s in sorted(smiles)])
    what = "E/Z" if bonds and not ring_pairs else "cis/trans" if not bonds else "E/Z and cis/trans"
    if len(isomers) < 2:
        return [acid], ""
    return (
        isomers,
        f"{what} configuration not stated: predicted over {len(isomers)} isomers, interval widened to hold them",
    )


def _double_bonds_outside_rings(acid: Acid) -> bool:
    """Whether there is any C=C that may be E or Z and does not say; told from the graph, quicker than by RDKit."""
    graph = acid.graph
    stated = graph.double_stereo
    for a, orders in enumerate(graph.orders):
        if 2.0 not in orders or graph.numbers[a] != 6 or graph.hydrogens[a] > 1:
            continue
        for b, order in zip(graph.neighbours[a], orders, strict=True):
            if order != 2.0 or graph.numbers[b] != 6 or graph.hydrogens[b] > 1 or (a, b) in stated or (b, a) in stated:
                continue
            if not any(a in ring and b in ring for ring in graph.rings):
                return True
    return False


def _without_mirror_images(isomers: list[Acid]) -> list[Acid]:
    """One of each pair of enantiomers, which have the same pKa and must not count twice in a mean."""
    kept: dict[str, Acid] = {}
    for acid in isomers:
        mirrored = acid.smiles.replace("@@", "\0").replace("@", "@@").replace("\0", "@")
        kept.setdefault(min(acid.smiles, Chem.MolToSmiles(Chem.MolFromSmiles(mirrored))), acid)
    return list(kept.values())


def _open_double_bonds(mol: Chem.Mol, acid: Acid) -> list[int]:
    """Double bonds without configuration, the nearest to a carboxyl group first."""
    Chem.FindPotentialStereoBonds(mol, cleanIt=False)
    distances = [acid.graph.distances(site) for site in acid.sites]
    found = [
        b
        for b in mol.GetBonds()
        if b.GetStereo() == Chem.BondStereo.STEREOANY
        and b.GetBondType() == Chem.BondType.DOUBLE
        and b.GetBeginAtom().GetAtomicNum() == b.GetEndAtom().GetAtomicNum() == 6
        and not b.IsInRing()
    ]
    found.sort(key=lambda b: min(d[a] for d in distances for a in (b.GetBeginAtomIdx(), b.GetEndAtomIdx())))
    return [b.GetIdx() for b in found]


def _over_double_bonds(mol: Chem.Mol, bonds: list[int]) -> set[str]:
    bonds = bonds[:4]
    found = set()
    for code in range(2 ** len(bonds)):
        copy = Chem.Mol(mol)
        for k, index in enumerate(bonds):
            bond = copy.GetBondWithIdx(index)
            a = next(n.GetIdx() for n in bond.GetBeginAtom().GetNeighbors() if n.GetIdx() != bond.GetEndAtomIdx())
            b = next(n.GetIdx() for n in bond.GetEndAtom().GetNeighbors() if n.GetIdx() != bond.GetBeginAtomIdx())
            bond.SetStereoAtoms(a, b)
            bond.SetStereo(Chem.BondStereo.STEREOCIS if code >> k & 1 else Chem.BondStereo.STEREOTRANS)
        Chem.AssignStereochemistry(copy, cleanIt=False, force=True)
        found.add(Chem.MolToSmiles(copy))
    return found


def _open_ring_pairs(acid: Acid) -> list[tuple[int, int]]:
    """Pairs of saturated ring atoms that both carry COOH and whose relative configuration is not stated."""
    graph = acid.graph
    carriers = []
    for site in acid.sites:
        alpha = [b for b in graph.neighbours[site] if graph.numbers[b] == 6]
        if alpha and graph.ring_size[alpha[0]] and graph.saturated(alpha[0]):
            carriers.append(alpha[0])
    if len(carriers) < 2:
        return []
    found = Chem.FindMolChiralCenters(  # type: ignore[no-untyped-call]
        acid.mol, includeUnassigned=True, useLegacyImplementation=False
    )
    centres = {a for a, _ in found}
    carriers = [a for a in carriers if a in centres]
    unspecified = [a for a in carriers if acid.mol.GetAtomWithIdx(a).GetChiralTag() == Chem.ChiralType.CHI_UNSPECIFIED]
    return [
        (a, b)
        for i, a in enumerate(unspecified)
        for b in unspecified[i + 1 :]
        if any(a in ring and b in ring for ring in graph.rings)
    ]


def _forget(mol: Chem.Mol, original: Chem.Mol, keep: set[int]) -> Chem.Mol:
    """Drop the centres that were enumerated but make no difference to the pKa."""
    mol = Chem.Mol(mol)
    for atom in mol.GetAtoms():
        i = atom.GetIdx()
        tagged = original.GetAtomWithIdx(i).GetChiralTag() != Chem.ChiralType.CHI_UNSPECIFIED
        if not tagged and i not in keep:
            atom.SetChiralTag(Chem.ChiralType.CHI_UNSPECIFIED)
    Chem.AssignStereochemistry(mol, cleanIt=True, force=True)
    return mol
