"""Exchanging substituents: the acid that comes out is the one that a chemist would draw."""

from __future__ import annotations

from pathlib import Path

import pytest
from rdkit import Chem

from qsar.analogues import analogues, find_position, group_named, group_words, known_groups, positions, swap
from qsar.cli import main
from qsar.model import load_model
from qsar.structures import StructureError, read_acid


def exchanged(smiles: str, place: str, group: str) -> str:
    acid = read_acid(smiles)
    return swap(acid, find_position(acid, place), group_named(group)).smiles


def canonical(smiles: str) -> str:
    return str(Chem.CanonSmiles(smiles))


# Structures drawn by hand from their systematic names (IUPAC nomenclature of organic chemistry, 2013).
@pytest.mark.parametrize(
    ("start", "place", "group", "result"),
    [
        ("OC(=O)c1ccccc1", "para", "NO2", "OC(=O)c1ccc([N+](=O)[O-])cc1"),
        ("OC(=O)c1ccc(Cl)cc1", "para", "OCH3", "COc1ccc(C(=O)O)cc1"),
        ("OC(=O)c1ccc(Cl)cc1", "para", "H", "OC(=O)c1ccccc1"),
        ("CC(=O)O", "α", "Cl", "OC(=O)CCl"),
        ("OC(=O)CCl", "α: chloro", "*C#N", "N#CCC(=O)O"),
        ("OC(=O)CCC(=O)O", "β: carboxy", "F", "OC(=O)CCF"),
        ("C/C=C/C(=O)O", "β: methyl", "C6H5", "OC(=O)/C=C/c1ccccc1"),
        ("C/C=C/C(=O)O", "β: methyl", "H", "C=CC(=O)O"),
        ("Clc1c[nH]cc1C(=O)O", "on N", "CH3", "Cn1cc(Cl)c(C(=O)O)c1"),
        ("O=CO", "on the carboxyl carbon", "C6H5", "OC(=O)c1ccccc1"),
    ],
)
def test_a_group_takes_the_place_of_another(start: str, place: str, group: str, result: str) -> None:
    assert exchanged(start, place, group) == canonical(result)


def test_configuration_beside_the_place_stays() -> None:
    """(S)-alanine by priority rules becomes (S)-2-hydroxypropanoic acid when OH takes the place of NH2.

    Cahn, R. S.; Ingold, C. K.; Prelog, V. Angew. Chem. Int. Ed. 1966, 5, 385: N and O both rank first here, so
    the descriptor is kept when the arrangement is.
    """
    start = read_acid("C[C@H](N)C(=O)O")
    place = next(p for p in positions(start) if "amm" in p.group or "amino" in p.group)
    made = swap(start, place, group_named("OH"))
    before = Chem.FindMolChiralCenters(start.mol, useLegacyImplementation=False)
    after = Chem.FindMolChiralCenters(made.mol, useLegacyImplementation=False)
    assert [label for _, label in before] == [label for _, label in after] == ["S"]


@pytest.mark.parametrize(
    "smiles", ["OC(=O)c1ccc(Cl)cc1", "CC(C)Cc1ccc(C(C)C(=O)O)cc1", "C[C@H](O)C(=O)O", "C/C=C/C(=O)O"]
)
def test_putting_back_what_was_there_gives_the_acid_back(smiles: str) -> None:
    acid = read_acid(smiles)
    for place in positions(acid):
        if place.root is None:
            assert swap(acid, place, group_named("H")).smiles == acid.smiles


def test_every_hydrogen_and_every_group_can_be_chosen() -> None:
    """4-Chlorobenzoic acid has two ortho and two meta hydrogens, a chlorine, and the ring itself."""
    acid = read_acid("OC(=O)c1ccc(Cl)cc1")
    assert [p.label for p in positions(acid)][1:] == ["ortho: H", "ortho: H", "meta: H", "meta: H", "para: chloro"]
    assert len({p.key for p in positions(acid)}) == 6


def test_every_known_group_can_be_put_on_a_ring() -> None:
    acid = read_acid("OC(=O)c1ccccc1")
    place = find_position(acid, "para")
    made = {swap(acid, place, group).smiles for group in known_groups()}
    assert len(known_groups()) > 150 and len(made) > 0.97 * len(known_groups())


@pytest.mark.parametrize(
    ("name", "words"), [("NO2", "nitro"), ("OCH3", "methoxy"), ("CF3", "methyl fluoro"), ("H", "")]
)
def test_groups_are_found_by_words(name: str, words: str) -> None:
    assert group_words(group_named(name)) == words


@pytest.mark.parametrize("group", ["", "nonsense", "*C*", "CC", "*=O", "*.*C", "*" + "C" * 60, "*[U]"])
def test_what_is_no_group_is_refused(group: str) -> None:
    with pytest.raises(StructureError):
        exchanged("OC(=O)c1ccccc1", "para", group)


@pytest.mark.parametrize("place", ["", "nowhere", "0", "99", "h77"])
def test_what_is_no_place_is_refused(place: str) -> None:
    with pytest.raises(StructureError, match="there are"):
        exchanged("OC(=O)c1ccccc1", place, "F")


def test_the_series_goes_with_the_constants_of_its_groups(shipped_model: Path) -> None:
    """In para-substituted benzoic acids pKa falls as sigma rises (Hammett 1937; Hansch, Leo & Taft 1991)."""
    acid = read_acid("OC(=O)c1ccccc1")
    sigma = {"NO2": 0.78, "CN": 0.66, "Cl": 0.23, "H": 0.0, "CH3": -0.17, "OCH3": -0.27}
    found = analogues(load_model(shipped_model), acid, find_position(acid, "para"), [group_named(g) for g in sigma])
    assert [a.group.name for a in found] == sorted(sigma, key=lambda g: -sigma[g])
    for a in found:
        assert a.step is not None and a.change is not None
        assert a.change == pytest.approx(-sigma[a.group.name], abs=0.25)  # rho is 1 by definition


def test_a_range_of_pka_keeps_what_lies_in_it(shipped_model: Path) -> None:
    acid = read_acid("OC(=O)c1ccccc1")
    found = analogues(load_model(shipped_model), acid, find_position(acid, "meta: H"), low=3.4, high=3.5)
    assert found and all(a.step is not None and 3.4 <= a.step.pka <= 3.5 for a in found)
    values = [a.step.pka for a in found if a.step is not None]
    assert values == sorted(values)


def test_the_command_lists_places_and_writes_a_table(
    shipped_model: Path, tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    assert main(["analogues", "OC(=O)c1ccccc1"]) == 0
    assert "para: H" in capsys.readouterr().out
    target = tmp_path / "a.csv"
    assert main(["analogues", "OC(=O)c1ccccc1", "--at", "para", "--groups", "F CF3", "--output", str(target)]) == 0
    lines = target.read_text(encoding="utf-8").splitlines()
    assert lines[0].startswith("group,smiles,step,pka,low,high,coverage,domain") and len(lines) == 3
    assert main(["analogues", "OC(=O)c1ccccc1", "--at", "elsewhere"]) == 2
    assert "no position" in capsys.readouterr().err


def test_the_command_shows_what_is_measured(shipped_model: Path, capsys: pytest.CaptureFixture[str]) -> None:
    """4-Cyanobenzoic acid, 3.55 at 25 °C: CRC Handbook, from memory."""
    assert main(["analogues", "OC(=O)c1ccccc1", "--at", "para", "--groups", "CN"]) == 0
    heading, row = capsys.readouterr().out.splitlines()[1:3]
    start = heading.index("measured")
    assert float(row[start : start + len("measured")]) == pytest.approx(3.55, abs=0.02)


def test_each_acid_of_a_series_comes_once(shipped_model: Path) -> None:
    acid = read_acid("OC(=O)c1ccccc1")
    found = analogues(load_model(), acid, find_position(acid, "para"))
    smiles = [a.smiles for a in found if a.smiles]
    assert len(smiles) == len(set(smiles)) > 200
    names = {a.group.name for a in found}
    assert len({"CO2H", "CO2-"} & names) == 1


@pytest.mark.parametrize(
    ("arguments", "words"),
    [
        (["--at", "para", "--low", "5", "--high", "3"], "lies above --high"),
        (["-o", "a.csv"], "choose a place with --at"),
        (["--at", "para", "-o", "nowhere/a.csv"], "does not exist"),
        (["--at", "para", "--step", "0"], "from 1 to 6"),
    ],
)
def test_what_cannot_be_answered_is_refused_at_once(
    arguments: list[str], words: str, capsys: pytest.CaptureFixture[str]
) -> None:
    assert main(["analogues", "OC(=O)c1ccccc1", *arguments]) == 2
    assert words in capsys.readouterr().err
