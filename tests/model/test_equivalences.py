"""One acid, one prediction, however it is written; and what the drawing leaves open is said and widens the interval."""

from __future__ import annotations

import random
from itertools import pairwise
from math import log10

import numpy as np
import pytest
from rdkit import Chem

from qsar.errors import UserError
from qsar.ionisation import cube, edge_descriptors, macroscopic
from qsar.model import Model, Prediction
from qsar.structures import StructureError, read_acid

EXACT = 1e-9


def pka(p: Prediction) -> list[float]:
    assert p.error is None
    return [s.pka for s in p.steps]


def mirrored(smiles: str) -> str:
    return smiles.replace("@@", "!").replace("@", "@@").replace("!", "@")


SAME = [
    [
        "C[C@H](N)C(=O)O",
        "C[C@@H](N)C(=O)O",
        "C[C@H]([NH3+])C(=O)[O-]",
        "C[C@H](N)C(=O)O.Cl",
        "C[C@@H]([NH3+])C(=O)O.[Cl-]",
    ],
    ["NCC(=O)O", "[NH3+]CC(=O)[O-]", "[NH3+]CC(=O)O.[Cl-]", "NCC(=O)[O-].[Na+]", "[15NH3+]CC(=O)[O-]"],
    ["NCCCC[C@H](N)C(=O)O", "[NH3+]CCCC[C@H](N)C(=O)[O-]", "NCCCC[C@@H](N)C(=O)O.Cl.Cl"],
    ["N[C@@H](CC(=O)O)C(=O)O", "[NH3+][C@@H](CC(=O)[O-])C(=O)[O-].[Na+]", "N[C@H](CC(=O)O)C(=O)O"],
    ["OC=O", "C(=O)O", "[O-]C=O.[Na+]", "[H]C(=O)O[H]", "[2H]C(=O)O"],
    ["OC(=O)C(=O)O", "[O-]C(=O)C(=O)[O-].[Na+].[Na+]", "OC(=O)C(=O)O.O.O", "OC(=O)C([O-])=O.[K+]"],
    ["CC(=O)O", "CC(=O)[O-].[Na+]", "[13CH3]C(=O)O", "CC(=O)O.O", "[2H]OC(C)=O"],
    ["Oc1ccccc1C(=O)O", "OC1=CC=CC=C1C(O)=O", "OC1=C(C(O)=O)C=CC=C1", "[Na+].[O-]C(=O)c1ccccc1O"],
    ["OC(=O)c1ccc2ccccc2c1", "OC(=O)C1=CC2=CC=CC=C2C=C1", "OC(=O)C1=CC=C2C=CC=CC2=C1"],
    ["OC(=O)c1ccncc1", "OC(=O)C1=CC=NC=C1", "[O-]C(=O)c1cc[nH+]cc1", "OC(=O)c1cc[nH+]cc1.[Cl-]"],
    ["O=[N+]([O-])CC(=O)O", "OC(=O)C[N+]([O-])=O"],
    ["C[N+](C)(C)CC(=O)[O-]", "C[N+](C)(C)CC(=O)O.[Cl-]", "C[N+](C)(C)CC(=O)O"],
]


@pytest.mark.parametrize("written", SAME, ids=lambda w: w[0])
def test_same_prediction(model: Model, written: list[str]) -> None:
    first, *others = model.predict(written)
    for smiles, other in zip(written[1:], others, strict=True):
        assert pka(other) == pytest.approx(pka(first), abs=EXACT), smiles
        for a, b in zip(first.steps, other.steps, strict=True):
            assert (b.low, b.high) == pytest.approx((a.low, a.high), abs=EXACT)
            assert (b.domain, b.measured, b.pka_without) == (a.domain, a.measured, a.pka_without)


CHIRAL = [
    "O[C@H]([C@@H](O)C(=O)O)C(=O)O",
    "OC(=O)[C@H]1C[C@@H]1C(=O)O",
    "OC(=O)[C@H]1CCC[C@@H]1C(=O)O",
    "C[C@@H]1CCC[C@H](C(=O)O)C1",
    "O=C(O)[C@H]1CC[C@@H](C(=O)O)C1(C)C",
    "N[C@@H](Cc1ccc(O)cc1)C(=O)O",
    "OC(=O)[C@@H]1C[C@@H](O)CN1",
    "C[C@]12CC[C@H](C1(C)C)C(C(=O)O)C2=O",
    "O=C(O)/C=C/[C@H](Cl)C",
]


@pytest.mark.parametrize("smiles", CHIRAL)
def test_mirror_images_agree(model: Model, smiles: str) -> None:
    one, other = model.predict([smiles, mirrored(smiles)])
    assert pka(other) == pytest.approx(pka(one), abs=EXACT)
    for a, b in zip(one.steps, other.steps, strict=True):
        assert (b.low, b.high) == pytest.approx((a.low, a.high), abs=EXACT)
        assert (b.domain, b.measured, b.pka_without, b.nearest_pka) == (
            a.domain,
            a.measured,
            a.pka_without,
            a.nearest_pka,
        )


@pytest.mark.parametrize("smiles", [*CHIRAL[:4], "OC(=O)CC(O)(C(=O)O)CC(=O)O", "Cc1cc(Cl)c(OCC(=O)O)cc1[N+](=O)[O-]"])
def test_renumbered_atoms_agree(model: Model, smiles: str) -> None:
    mol = Chem.MolFromSmiles(smiles)
    written = []
    for seed in range(5):
        order = list(range(mol.GetNumAtoms()))
        random.Random(seed).shuffle(order)
        written.append(Chem.MolToSmiles(Chem.RenumberAtoms(mol, order), canonical=False))
    first, *others = (pka(p) for p in model.predict([smiles, *written]))
    for other in others:
        assert other == pytest.approx(first, abs=EXACT)


def test_a_prediction_does_not_depend_on_its_company(model: Model) -> None:
    some = ["CC(=O)O", "OC(=O)CC(O)(C(=O)O)CC(=O)O", "CC", "CC=CC(=O)O", "NCC(=O)O"]
    together = model.predict(some)
    for smiles, p in zip(some, together, strict=True):
        (alone,) = model.predict([smiles])
        assert alone.error == p.error
        assert [s.pka for s in alone.steps] == pytest.approx([s.pka for s in p.steps], abs=EXACT)
        assert [s.low for s in alone.steps] == pytest.approx([s.low for s in p.steps], abs=EXACT)


def test_measured_value_is_found_for_either_enantiomer(model: Model) -> None:
    found = 0
    for smiles in dict.fromkeys(model.library.smiles):
        if "@" not in smiles or found == 10:
            continue
        found += 1
        one, other = model.predict([smiles, mirrored(smiles)])
        assert any(s.measured is not None for s in one.steps)
        assert [s.measured for s in other.steps] == [s.measured for s in one.steps]
    assert found


def test_measured_and_predicted_without_are_those_of_the_library(model: Model) -> None:
    library = model.library
    for row in range(0, len(library.pka), 97):
        step = model.predict([library.smiles[row]])[0].steps[int(library.step[row]) - 1]
        assert step.measured == library.pka[row]
        assert step.pka_without == library.pka_without[row]
    (new,) = model.predict(["OC(=O)C(F)(I)CCCCCC#N"])[0].steps
    assert new.measured is None and new.pka_without is None


@pytest.mark.parametrize(
    ("drawn", "isomers"),
    [
        ("CC=CC(=O)O", ["C/C=C/C(=O)O", "C/C=C\\C(=O)O"]),
        ("OC(=O)C=CC(=O)O", ["OC(=O)/C=C/C(=O)O", "OC(=O)/C=C\\C(=O)O"]),
        ("OC(=O)C1CC1C(=O)O", ["OC(=O)[C@H]1C[C@@H]1C(=O)O", "OC(=O)[C@H]1C[C@H]1C(=O)O"]),
        ("OC(=O)C1CCCCC1C(=O)O", ["OC(=O)[C@H]1CCCC[C@@H]1C(=O)O", "OC(=O)[C@H]1CCCC[C@H]1C(=O)O"]),
    ],
)
def test_undefined_configuration_is_predicted_over_its_isomers(model: Model, drawn: str, isomers: list[str]) -> None:
    joined, *each = model.predict([drawn, *isomers])
    for k, step in enumerate(joined.steps):
        same = [p.steps[k] for p in each]
        assert step.pka == pytest.approx(np.mean([s.pka for s in same]), abs=EXACT)
        assert step.low <= min(s.low for s in same) + EXACT
        assert step.high >= max(s.high for s in same) - EXACT
        assert step.high - step.low >= max(s.high - s.low for s in same) - EXACT
        assert any("not stated" in reason for reason in step.reasons)
        assert not any("not stated" in reason for s in same for reason in s.reasons)


def test_symmetric_sites_are_equal_and_statistics_are_exact(model: Model) -> None:
    for smiles in ("OC(=O)CCCCC(=O)O", "OC(=O)/C=C/C(=O)O", "OC(=O)c1ccc(C(=O)O)cc1", "OC(=O)[C@H]1C[C@@H]1C(=O)O"):
        acid = read_acid(smiles)
        micro = model.micro(edge_descriptors(acid)).mean(axis=0)
        assert micro[0] == pytest.approx(micro[1], abs=EXACT)
        assert micro[2] == pytest.approx(micro[3], abs=EXACT)
        first, second = pka(model.predict([acid])[0])
        assert first == pytest.approx(micro[0] - log10(2), abs=EXACT)
        assert second == pytest.approx(micro[2] + log10(2), abs=EXACT)


@pytest.mark.parametrize(
    "smiles", ["OC(=O)CC(O)(C(=O)O)CC(=O)O", "OC(=O)CC(CC(=O)O)C(=O)O", "OC(=O)CN(CC(=O)O)CCN(CC(=O)O)CC(=O)O"]
)
def test_steps_follow_from_the_micro_constants(model: Model, smiles: str) -> None:
    acid = read_acid(smiles)
    n = len(acid.sites)
    micro = model.micro(edge_descriptors(acid)).mean(axis=0)
    assert len(micro) == len(cube(n).start)
    steps = model.predict([acid])[0].steps
    assert [s.step for s in steps] == list(range(1, n + 1))
    assert [s.pka for s in steps] == pytest.approx(list(macroscopic(micro, n)), abs=EXACT)


def test_later_protons_leave_less_easily(model: Model) -> None:
    # electrostatics and statistics both ask for it (Bjerrum 1923)
    for smiles in ("OC(=O)C(=O)O", "OC(=O)CC(=O)O", "OC(=O)CC(O)(C(=O)O)CC(=O)O", "OC(=O)c1ccccc1C(=O)O"):
        steps = pka(model.predict([smiles])[0])
        assert all(b > a for a, b in pairwise(steps))


REFUSED = [
    "", "NC(=O)O", "COC(=O)O", "CSC(=O)O", "CC(=O)OO", "C[Hg]CC(=O)O", "C" * 199 + "C(=O)O",
    "OC(=O)" + "C(C(=O)O)" * 5 + "C(=O)O", "[Na+].[Cl-]", "[CH2]C(=O)O", "*CC(=O)O", "C1CC", "CCO",
]  # fmt: skip


def test_what_cannot_be_predicted_is_said_and_the_others_are_answered(model: Model) -> None:
    mixed = [s for bad in REFUSED for s in (bad, "CC(=O)O")]
    found = model.predict(mixed)
    assert len(found) == len(mixed)
    for bad, good in zip(found[::2], found[1::2], strict=True):
        assert bad.error and "\n" not in bad.error
        assert (bad.structure, bad.steps) == ("", [])
        assert good.error is None and len(good.steps) == 1


def test_an_input_that_could_not_be_read_keeps_its_place_and_its_reason(model: Model) -> None:
    first, second = model.predict([StructureError("row 3: damaged"), read_acid("CC(=O)O")])
    assert first.error == "row 3: damaged"
    assert second.structure == "CC(=O)O"


def test_intervals_hold_the_prediction_and_grow_with_coverage(model: Model) -> None:
    some = ["CC(=O)O", "OC(=O)CC(=O)O", "NCC(=O)O", "OC(=O)C(F)(F)C(F)(F)Br", "CC=CC(=O)O"]
    widths = []
    for coverage in (0.5, 0.8, 0.9, 0.95):
        steps = [s for p in model.predict(some, coverage) for s in p.steps]
        assert all(s.low <= s.pka <= s.high and s.coverage == coverage for s in steps)
        widths.append([s.high - s.low for s in steps])
    assert np.all(np.diff(np.array(widths), axis=0) >= -EXACT)


@pytest.mark.parametrize("coverage", [0.0, 0.4, 0.995, 1.0, float("nan")])
def test_coverage_out_of_range(model: Model, coverage: float) -> None:
    with pytest.raises(UserError, match="coverage"):
        model.predict(["CC(=O)O"], coverage)


def test_nothing_to_predict(model: Model) -> None:
    assert model.predict([]) == []


def test_acts_on_the_structure_are_among_the_reasons(model: Model) -> None:
    (step,) = model.predict(["CC(=O)[O-].[Na+]"])[0].steps
    assert any("[Na+]" in r for r in step.reasons)
    assert any("re-protonated" in r for r in step.reasons)
    (hydrate,) = model.predict(["CC(=O)C(=O)O"])[0].steps
    assert any("hydrated" in r for r in hydrate.reasons)
