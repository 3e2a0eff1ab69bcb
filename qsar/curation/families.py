"""A coarse family for acids whose table names none, in the words of the reference table."""

from __future__ import annotations

from qsar.descriptors import Molecule, SiteView
from qsar.groups import CATIONIC
from qsar.structures import Acid


def family_of(acid: Acid) -> str:
    """Family of an acid: by the number of COOH, a charge, and what carries the first COOH."""
    n = len(acid.sites)
    if n > 1:
        return "dicarboxylic" if n == 2 else "tricarboxylic_more"
    view = SiteView(Molecule(acid.graph), acid.sites[0])
    kinds = {term.kind for term in view.terms}
    if kinds & set(CATIONIC):
        return "amino_acid"
    system = view.alpha_system
    if system is not None:
        graph = acid.graph
        if any(graph.numbers[a] != 6 for a in system.atoms):
            return "heteroaromatic"
        if len(system.atoms) > 6:
            return "naphthoic_fused"
        ortho = any(len(graph.neighbours[b]) > 2 for b in graph.neighbours[view.alpha] if b in system.atoms)
        return "benzoic_ortho" if ortho else "benzoic_meta_para"
    if view.alpha >= 0 and view.molecule.unsaturated[view.alpha]:
        return "alkenoic_alkynoic"
    if any(term.kind in ("fluoro", "chloro", "bromo", "iodo") for term in view.withdrawing):
        return "halogenoalkanoic"
    if any(acid.graph.aromatic):
        return "arylalkanoic"
    return "alkanoic" if acid.graph.numbers.count(6) + 2 == len(acid.graph.numbers) else "substituted_alkanoic"
