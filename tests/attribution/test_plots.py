"""Drawings and figures: what they say, in which colours."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest
from rdkit import Chem
from rdkit.Chem import rdDepictor

from qsar.attribution import explain, explain_many
from qsar.attribution.drawing import LOWERS, RAISES, signed, structure_png, structure_svg, sum_in_words, tint
from qsar.attribution.gallery import chain
from qsar.attribution.labels import place_labels
from qsar.attribution.plots import analogues_figure, distance_figure, save, steps_figure
from qsar.model import Model

# G. M. Machado, M. M. Oliveira, L. A. F. Fernandes, IEEE Trans. Vis. Comput. Graph. 2009, 15, 1291: severity 1.0,
# linear RGB; from memory
MACHADO = {
    "protanopia": [[0.152286, 1.052583, -0.204868], [0.114503, 0.786281, 0.099216], [-0.003882, -0.048116, 1.051998]],
    "deuteranopia": [[0.367322, 0.860646, -0.227968], [0.280085, 0.672501, 0.047413], [-0.011820, 0.042940, 0.968881]],
    "tritanopia": [[1.255528, -0.076749, -0.178779], [-0.078411, 0.930809, 0.147602], [0.004733, 0.691367, 0.303900]],
}


def linear(colour: tuple[float, float, float]) -> np.ndarray:
    """IEC 61966-2-1 (sRGB) to linear RGB."""
    c = np.array(colour)
    return np.where(c <= 0.04045, c / 12.92, ((c + 0.055) / 1.055) ** 2.4)


def lab(rgb: np.ndarray) -> np.ndarray:
    """CIE 1976 L*a*b* of linear RGB, white D65."""
    to_xyz = np.array([[0.4124, 0.3576, 0.1805], [0.2126, 0.7152, 0.0722], [0.0193, 0.1192, 0.9505]])
    x = to_xyz @ np.clip(rgb, 0, 1) / np.array([0.9505, 1.0, 1.089])
    f = np.where(x > 0.008856, np.cbrt(x), 7.787 * x + 16 / 116)
    return np.array([116 * f[1] - 16, 500 * (f[0] - f[1]), 200 * (f[1] - f[2])])


@pytest.mark.parametrize("kind", sorted(MACHADO))
@pytest.mark.parametrize("size", [0.5, 1.0, 2.0])
def test_lowering_and_raising_differ_for_colour_blind_readers(kind: str, size: float) -> None:
    matrix = np.array(MACHADO[kind])
    seen = [lab(matrix @ linear(tint(v))) for v in (-size, size)]
    # a difference of 2.3 in L*a*b* is just noticeable (M. Mahy et al., Color Res. Appl. 1994, 19, 105)
    assert np.linalg.norm(seen[0] - seen[1]) > 5 * 2.3


def test_tint_is_darker_the_larger_the_contribution() -> None:
    for sign in (-1, 1):
        light = [lab(linear(tint(sign * v)))[0] for v in (0.05, 0.3, 0.8, 1.5)]
        assert light == sorted(light, reverse=True)
        assert light[-1] < light[0] - 10  # also in grey print
    assert LOWERS[0] > LOWERS[2] and RAISES[2] > RAISES[0]


@pytest.mark.parametrize(("value", "text"), [(-1.234, "−1.23"), (0.5, "+0.50"), (0.001, "0.00"), (-0.004, "0.00")])
def test_numbers_carry_their_sign(value: float, text: str) -> None:
    assert signed(value) == text


def test_sum_is_told_in_words(model: Model) -> None:
    first, _ = explain(model, "OC(=O)CCC(=O)O")
    words = sum_in_words(first)
    assert words.startswith(f"pKa1 {first.pka:.2f} = {first.parent_pka:.2f} (parent)")
    assert words.endswith("−0.30 (site statistics)")


CASES = ["ClC(Cl)C(=O)O", "COc1cc(cc(c1Oc1ccc(Cl)cc1C(F)(F)F)[N+](=O)[O-])CC(NC(C)=O)C(=O)O", "OC(=O)CC(N)C(=O)O"]


@pytest.mark.parametrize("smiles", CASES)
def test_structure_is_tinted_and_drawn_in_both_formats(model: Model, smiles: str) -> None:
    for e in explain(model, smiles):
        svg = structure_svg(e).upper()
        for line in e.contributions:
            if line.atoms:
                r, g, b = (int(255 * part) for part in tint(line.contribution))
                shades = {f"#{r + i:02X}{g + j:02X}{b + k:02X}" for i in (0, 1) for j in (0, 1) for k in (0, 1)}
                assert any(shade in svg for shade in shades), line.substituent
        assert structure_png(e).startswith(b"\x89PNG")


def test_numbers_stand_clear_of_bonds_and_of_each_other() -> None:
    """On a hexagon with a chain, as RDKit draws them: no box holds a point of a bond, and no two boxes meet."""
    mol = Chem.MolFromSmiles("CC(C)Cc1ccc(cc1)C(C)C(=O)O")
    rdDepictor.Compute2DCoords(mol)
    places = 60 * mol.GetConformer().GetPositions()[:, :2] + np.array([500.0, 300.0])
    lines = places[[(b.GetBeginAtomIdx(), b.GetEndAtomIdx()) for b in mol.GetBonds()]]
    texts, groups = ["-0.36", "+0.07", "-0.12"], [places[4:10], places[:4], places[11:12]]
    found = np.array(place_labels(texts, groups, lines, 24.0, (1000.0, 600.0)))
    half = np.array([0.5 * 5 * 0.5, 0.5]) * 24.0  # half a character is what digits are wide at least
    for k, middle in enumerate(found):
        assert ((middle > half) & (middle < np.array([1000.0, 600.0]) - half)).all()
        for share in np.linspace(0.0, 1.0, 21):
            points = lines[:, 0] * (1 - share) + lines[:, 1] * share
            assert (np.abs(points - middle) > half).any(axis=1).all()
        for other in found[k + 1 :]:
            assert (np.abs(middle - other) > 2 * half).any()
        nearest = np.linalg.norm(groups[k] - middle, axis=1).min()
        assert nearest < 2.5 * 90  # bonds of 1.5 units


def test_steps_show_every_contribution_with_its_sign(model: Model) -> None:
    (e,) = explain(model, CASES[1])
    figure = steps_figure(e)
    texts = [t.get_text() for t in figure.axes[0].texts]
    assert texts == [f"{e.parent_pka:.2f}", *(signed(x.contribution) for x in e.contributions), f"{e.pka:.2f}"]


def test_analogues_show_each_pka_and_the_sum_of_equal_groups(model: Model) -> None:
    smiles = ["CC(=O)O", "ClCC(=O)O", "ClC(Cl)C(=O)O"]
    steps = [a.steps[0] for a in explain_many(model, smiles)]
    texts = [t.get_text() for t in analogues_figure(steps, ["a", "b", "c"]).axes[0].texts]
    assert all(f"{e.pka:.2f}" in texts for e in steps)
    both = sum(x.contribution for x in steps[2].contributions)
    assert f"{signed(both)}\n(2 of them)" in texts


def test_distance_figure_takes_the_chain_only(model: Model, tmp_path: Path) -> None:
    steps = [a.steps[0] for a in explain_many(model, [*chain("Cl", 5), "OC(=O)c1ccc(Cl)cc1"])]
    figure = distance_figure(steps, "chloro")
    texts = [t.get_text() for t in figure.axes[0].texts]
    assert texts == [signed(e.contributions[0].contribution) for e in steps[:-1]]
    # chlorine acts less the further away it is (G. E. K. Branch, M. Calvin, 1941: 1/2.8 a bond)
    sizes = [abs(e.contributions[0].contribution) for e in steps[:-1]]
    assert sizes == sorted(sizes, reverse=True)
    save(figure, tmp_path / "distance")
    assert {p.suffix for p in tmp_path.iterdir()} == {".png", ".svg"}
    with pytest.raises(ValueError, match="bromo"):
        distance_figure(steps, "bromo")
