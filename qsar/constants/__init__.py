"""Published constants of elements and substituents, each with its source, and group electronegativity."""

from qsar.constants.electronegativity import (
    equalised_electronegativity,
    group_electronegativity,
    group_electronegativity_of_smiles,
    group_graph,
)
from qsar.constants.reader import (
    Element,
    Source,
    Substituent,
    canonical_group,
    element,
    element_by_number,
    elements,
    sources,
    substituent_by_smiles,
    substituents,
)

__all__ = [
    "Element",
    "Source",
    "Substituent",
    "canonical_group",
    "element",
    "element_by_number",
    "elements",
    "equalised_electronegativity",
    "group_electronegativity",
    "group_electronegativity_of_smiles",
    "group_graph",
    "sources",
    "substituent_by_smiles",
    "substituents",
]
