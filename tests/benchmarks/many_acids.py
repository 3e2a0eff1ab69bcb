"""As many distinct carboxylic acids as a measurement needs, the n-th always the same.

Invented for measurements: a skeleton with three places, and what sits there. The places of a skeleton differ from one
another, so that two numbers never stand for one structure but by accident.
"""

from __future__ import annotations

from collections.abc import Iterator

SKELETONS = (
    "OC(=O)c1c({0})cc({1})c({2})c1",
    "OC(=O)Cc1c({0})cc({1})c({2})c1",
    "OC(=O)COc1c({0})cc({1})c({2})c1",
    "OC(=O)/C=C/c1c({0})cc({1})c({2})c1",
    "OC(=O)C(NC(=O)CC{1})Cc1ccc({0})c({2})c1",
    "OC(=O)c1cn(CC{0})c2cc({1})c({2})cc12",
    "OC(=O)c1c({0})nc({1})cc1{2}",
    "OC(=O)c1sc({0})c({1})c1{2}",
    "OC(=O)C1CN(C(=O)CC{0})CC1c1cc({1})c({2})cc1",
    "OC(=O)CCC({0})CC(=O)Nc1cc({1})c({2})cc1",
    "OC(=O)[C@@H]1CCCN1C(=O)c1c({0})cc({1})c({2})c1",
    "OC(=O)CSc1nc({0})c(CC{1})n1C{2}",
    "OC(=O)C1CCC({0})(c2cc({1})c({2})cc2)CC1",
    "OC(=O)c1oc2c({0})cc({1})cc2c1{2}",
    "OC(=O)CN(C{0})S(=O)(=O)c1cc({1})c({2})cc1",
    "OC(=O)CC(C(=O)O)Cc1c({0})cc({1})c({2})c1",
)
# fmt: off
GROUPS = [
    "C", "CC", "C(C)C", "C(C)(C)C", "CCC", "C7CC7", "C7CCCCC7", "F", "Cl", "Br", "C#N", "C(F)(F)F", "O",
    "OC", "OCC", "OC(F)(F)F", "OC(C)C", "Oc7ccccc7", "OCc7ccccc7", "N(C)C", "NC(C)=O", "NC(=O)c7ccccc7",
    "N7CCOCC7", "C(C)=O", "C(=O)OC", "C(=O)N", "C(=O)NC", "C(=O)N(C)C", "S(C)(=O)=O", "SC", "[N+](=O)[O-]",
    "c7ccccc7", "c7ccc(F)cc7", "c7ccc(OC)cc7", "c7ccncc7", "c7cccs7", "n7cccn7", "C=C", "C#C", "CO",
]
# fmt: on
LIMIT = len(SKELETONS) * len(GROUPS) ** 3
_STRIDE = 7_368_787  # a prime that divides no limit here: neighbours in the list have little in common


def parts(number: int) -> tuple[int, tuple[str, str, str]]:
    """Number of the skeleton of one acid, and its groups; for numbers from 0 to ``LIMIT - 1``."""
    place = number * _STRIDE % LIMIT
    place, skeleton = divmod(place, len(SKELETONS))
    place, first = divmod(place, len(GROUPS))
    third, second = divmod(place, len(GROUPS))
    return skeleton, (GROUPS[first], GROUPS[second], GROUPS[third])


def acid(number: int) -> str:
    """SMILES of one acid, for numbers from 0 to ``LIMIT - 1``."""
    skeleton, groups = parts(number)
    return SKELETONS[skeleton].format(*groups)


def acids(count: int, start: int = 0) -> Iterator[str]:
    """SMILES of `count` acids."""
    return (acid(number) for number in range(start, start + count))
