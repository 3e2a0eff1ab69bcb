"""Slopes and series of physical organic chemistry, from predictions made without the acid in question."""

from __future__ import annotations

from itertools import pairwise
from math import log10

import numpy as np
import pytest

from qsar.constants import substituent_by_smiles
from qsar.groups import CATIONIC, perceive
from qsar.model import Model, load_model
from qsar.structures import Acid, read_acid
from qsar.validation.lines import hammett_sum, ring_groups, taft_star
from qsar.validation.without import Judge


@pytest.fixture(scope="module")
def model(shipped_model: object) -> Model:
    return load_model()


@pytest.fixture(scope="module")
def judge(model: Model) -> Judge:
    return Judge(model)


@pytest.fixture(scope="module")
def monobasic(model: Model) -> list[tuple[Acid, float]]:
    """Neutral monobasic acids of the training table, each with the prediction made without it."""
    acids = [(read_acid(s), float(w)) for s, w in zip(model.library.smiles, model.library.pka_without, strict=True)]
    return [
        (acid, value)
        for acid, value in acids
        if len(acid.sites) == 1 and not any(g.kind in (*CATIONIC, "amino") for g in perceive(acid.graph))
    ]


def first_steps(judge: Judge, smiles: list[str]) -> list[float]:
    predictions, _ = judge.predict([read_acid(s) for s in smiles])
    return [p.steps[0].pka for p in predictions]


def slope(x: list[float], y: list[float]) -> float:
    return float(np.polyfit(x, y, 1)[0])


def test_benzoic_acids_define_rho_one(monobasic: list[tuple[Acid, float]]) -> None:
    """Hammett, J. Am. Chem. Soc. 1937, 59, 96: rho = 1 by definition; sigma of Hansch, Leo & Taft 1991.

    The model knows a group by sigma_I and sigma_R of Charton, which do not come from benzoic acids.
    """
    points = [(hammett_sum(acid), value) for acid, value in monobasic]
    known = [(x, y) for x, y in points if x is not None]
    assert len(known) >= 30
    assert -slope([x for x, _ in known], [y for _, y in known]) == pytest.approx(1.0, abs=0.1)


#: Ring substituents that are no acids or bases themselves, by their SMILES in front of the ring.
RING = ("C", "OC", "F", "Cl", "Br", "I", "C(F)(F)F", "C#N", "[N+](=O)[O-]")


@pytest.mark.parametrize(
    ("tail", "rho"), [("CC(=O)O", 0.49), ("CCC(=O)O", 0.21), ("/C=C/C(=O)O", 0.47)], ids=lambda v: str(v)
)
def test_rho_of_series_that_do_not_define_sigma(judge: Judge, tail: str, rho: float) -> None:
    """Jaffe, Chem. Rev. 1953, 53, 191 (from memory); as far off as the benzoic acids may be."""
    acids, sigma = [f"c1ccccc1{tail}"], [0.0]
    for group in RING:
        constants = substituent_by_smiles(f"*{group}")
        assert constants is not None
        assert constants.sigma_meta is not None
        assert constants.sigma_para is not None
        acids += [f"c1c({group})cccc1{tail}", f"c1cc({group})ccc1{tail}"]
        sigma += [constants.sigma_meta, constants.sigma_para]
    assert -slope(sigma, first_steps(judge, acids)) == pytest.approx(rho, abs=0.1)


def test_taft_line_of_aliphatic_acids(monobasic: list[tuple[Acid, float]]) -> None:
    """Taft 1956; Perrin, Dempsey & Serjeant 1981: pKa = 4.66 - 1.62 sigma* (from memory)."""
    points = [(taft_star(acid), value) for acid, value in monobasic]
    known = [(x, y) for x, y in points if x is not None]
    assert len(known) >= 50
    assert slope([x for x, _ in known], [y for _, y in known]) == pytest.approx(-1.62, abs=0.1)


#: pK2 - pK1 of HOOC(CH2)nCOOH, n = 1 to 8, from the constants in the CRC Handbook (from memory).
DIBASIC = (2.85, 1.43, 1.08, 0.99, 0.94, 0.89, 0.80, 0.86)


def test_the_two_steps_of_dibasic_acids_draw_together(judge: Judge) -> None:
    """Bjerrum 1923; Gane & Ingold 1931: the difference falls with the chain towards log10 4, and never below."""
    predictions, _ = judge.predict([read_acid(f"OC(=O){'C' * n}C(=O)O") for n in range(1, 9)])
    differences = [p.steps[1].pka - p.steps[0].pka for p in predictions]
    assert all(a > b for a, b in pairwise(differences[:4])), differences
    assert all(d > log10(4.0) for d in differences), differences
    assert np.mean(np.abs(np.array(differences) - DIBASIC)) < 0.15, differences


ALPHA = ("NCC(=O)O", "CC(N)C(=O)O", "CCC(N)C(=O)O", "CC(C)C(N)C(=O)O", "CC(C)CC(N)C(=O)O", "CCC(C)C(N)C(=O)O")


def test_alpha_amino_acids_are_near_2_3(judge: Judge) -> None:
    """Perrin 1965 gives 2.29 to 2.35 for glycine to isoleucine (from memory)."""
    assert first_steps(judge, list(ALPHA)) == pytest.approx([2.3] * len(ALPHA), abs=0.2)


#: Glycine to 6-aminohexanoic acid, CRC Handbook (from memory).
DISTANT = (2.35, 3.55, 4.03, 4.27, 4.37)


def test_the_pka_climbs_with_the_distance_of_the_ammonium_group(judge: Judge) -> None:
    values = first_steps(judge, [f"N{'C' * n}C(=O)O" for n in range(1, 6)])
    assert all(a < b for a, b in pairwise(values)), values
    assert values[-1] < first_steps(judge, ["CCCCCC(=O)O"])[0]
    assert values == pytest.approx(list(DISTANT), abs=0.2)


def test_groups_on_a_ring_are_found_at_their_positions() -> None:
    """3-Chloro-4-methylbenzoic acid, worked by hand: sigma 0.37 - 0.17 (Hansch, Leo & Taft 1991)."""
    acid = read_acid("Cc1ccc(cc1Cl)C(=O)O")
    assert sorted(ring_groups(acid) or []) == [(2, "*Cl"), (3, "*C")]
    assert hammett_sum(acid) == pytest.approx(0.20, abs=1e-9)
    assert hammett_sum(read_acid("Cc1ccccc1C(=O)O")) is None
    assert taft_star(read_acid("OC(=O)CCl")) == 1.05
    assert taft_star(read_acid("CC(Cl)C(=O)O")) == pytest.approx((2.96 - 0.49 - 0.49 + 0.0) / 2.8 + 0.0, abs=1e-9)
