"""From a spreadsheet with every fault to the sentence that says whether retraining helped.

The table is ``training_data/demo_in_house.csv``, whose values are invented. What must be found in it is known because
it was put there.
"""

from __future__ import annotations

import csv
import json
from pathlib import Path

import openpyxl
import pytest

from qsar import cli
from qsar.model import load_model, read_card

REFUSED = {
    42: "not a SMILES",
    43: "no structure",
    44: "no carboxyl group",
    45: "limit",
    46: "limit",
    50: "temperature 60",
    51: "ionic strength 1",
    54: "2 values",
    59: "look exchanged",
    60: "each other's column",
    67: "impossible",
    68: "mV",
}
CONFLICTS = {57: "row 58", 58: "row 57"}
CHANGED = {
    11: "weighted median of 3 rows",
    47: "Ka 3.1e-05",
    48: "decimal comma",
    49: "conditions read from the cell",
    52: "concentration constant",
    53: "kind of constant not stated",
    61: "pKb",
    69: "step not stated",
}
SUSPECTED = {
    "62": {"pKb typed as pKa"},
    "63": {"transposed digits"},
    "64": {"another proton"},
    "65": {"swapped step"},
    "66": {"swapped step"},
}


@pytest.fixture
def demo(checkout: Path) -> Path:
    return checkout / "training_data" / "demo_in_house.csv"


def rows_of(path: Path) -> list[dict[str, str]]:
    with path.open(encoding="utf-8", newline="") as handle:
        return list(csv.DictReader(handle))


def test_the_demo_says_that_it_is_invented(demo: Path) -> None:
    rows = rows_of(demo)
    assert 55 <= len(rows) <= 75
    assert {row["Invented"] for row in rows} == {"yes"}


@pytest.mark.slow
def test_the_whole_path(
    demo: Path, tmp_path: Path, shipped_model: Path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    monkeypatch.chdir(tmp_path)
    monkeypatch.setenv("QSAR_MODELS", str(tmp_path / "models"))

    assert cli.main(["curate", str(demo)]) == 3
    out, err = capsys.readouterr()
    check_curated(demo, tmp_path, out)
    assert "column 'Kind' is read as constant" in err

    train = ["train", "--folds", "3"]
    assert cli.main([*train, "--name", "plain"]) == 0
    early = ["--data", "demo_in_house_clean.csv", "--name", "ours", "--until", "2024-12-31"]
    assert cli.main([*train, *early]) == 0
    out, err = capsys.readouterr()
    assert "in-house minus reference" in out and "over 6 acids that both tables hold" in out
    assert "suspected of an artefact left out" in err
    card = read_card(tmp_path / "models" / "ours")
    assert [t["name"] for t in card["tables"]] == ["carboxylic_acids.csv", "demo_in_house_clean.csv"]
    assert card["newest_measurement"] <= "2024-12-31" and card["offset"]["corrected"] is False

    compare = ["compare", "plain", "ours", "--data", "demo_in_house_clean.csv"]
    assert cli.main([*compare, "--by-date"]) == 0
    out, err = capsys.readouterr()
    sentence = out.splitlines()[0]
    assert any(words in sentence for words in ("is better than", "is worse than", "equally good", "not enough data"))
    tested = [r for r in rows_of(tmp_path / "demo_in_house_clean.csv") if r["date"] >= "2025" and not r["suspected"]]
    assert f"over {len(tested)} steps of {len(tested)} acids" in sentence

    assert cli.main(["models", "use", "ours"]) == 0
    assert load_model().name == "ours"
    assert cli.main(["models"]) == 0
    listed = capsys.readouterr().out
    assert "plain" in listed and "* " in listed
    assert json.loads((tmp_path / "models" / "in_use.json").read_text())["name"] == "ours"


def check_curated(demo: Path, folder: Path, out: str) -> None:
    n = len(rows_of(demo))
    clean, left = rows_of(folder / "demo_in_house_clean.csv"), rows_of(folder / "demo_in_house_left.csv")
    outcome = {int(r["row"]): r for r in left}
    refused = {k for k, r in outcome.items() if r["outcome"] in ("refused", "conflict")}
    merged = {k for k, r in outcome.items() if r["outcome"] == "merged"}
    assert f"{n} in = {len(clean)} kept + {len(merged)} merged + {len(refused)} refused" in out
    assert n == len(clean) + len(merged) + len(refused)
    kept = {int(k) for r in clean for k in r["rows"].split()}
    assert kept | refused == set(range(2, n + 2)) and not kept & refused
    for number, words in {**REFUSED, **CONFLICTS, **CHANGED}.items():
        assert words in outcome[number]["reason"], (number, outcome[number])
    assert refused == set(REFUSED) | set(CONFLICTS)
    assert merged == {55, 56}
    questions = rows_of(folder / "demo_in_house_questions.csv")
    for number, kinds in SUSPECTED.items():
        listed = [q for q in questions if q["rows"] == number and float(q["likelihood"]) >= 0.1]
        assert kinds <= {q["artefact"] for q in listed}, (number, listed)
        assert all(q["decided_by"] for q in listed)


def test_other_files_with_the_same_rows_give_the_same_table(
    demo: Path, tmp_path: Path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    """TSV, a workbook and an SD file of the sound rows; the SD file is written with RDKit."""
    from rdkit import Chem

    monkeypatch.chdir(tmp_path)
    rows = rows_of(demo)[:40]
    headers = list(rows[0])
    with Path("rows.csv").open("w", encoding="utf-8", newline="") as handle:
        writer = csv.writer(handle)
        writer.writerows([headers, *([r[h] for h in headers] for r in rows)])
    with Path("tabs.tsv").open("w", encoding="utf-8", newline="") as handle:
        writer = csv.writer(handle, delimiter="\t")
        writer.writerows([headers, *([r[h] for h in headers] for r in rows)])
    book = openpyxl.Workbook()
    for row in [headers, *([r[h] for h in headers] for r in rows)]:
        book.active.append(row)
    book.save("book.xlsx")
    with Chem.SDWriter("structures.sdf") as sd:
        for r in rows:
            mol = Chem.MolFromSmiles(r["SMILES"])
            for h in headers[2:]:
                mol.SetProp(h, r[h])
            mol.SetProp("_Name", r["Compound"])
            sd.write(mol)
    tables = []
    for name in ("rows.csv", "tabs.tsv", "book.xlsx", "structures.sdf"):
        assert cli.main(["curate", name, "--output", "out.csv", "--no-examination"]) == 0, capsys.readouterr()
        assert "40 in = 40 kept + 0 merged + 0 refused" in capsys.readouterr().out
        tables.append([(r["name"], r["smiles"], r["pka"], r["uncertainty"]) for r in rows_of(Path("out.csv"))])
    assert tables[0] == tables[1] == tables[2] == tables[3]


def test_headers_can_be_named_and_what_is_missing_is_said(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    monkeypatch.chdir(tmp_path)
    Path("odd.csv").write_text("Struktur;Wert\nCC(=O)O;1,75e-5\nCCC(=O)O;1,34e-5\n", encoding="utf-8")
    argv = ["curate", "odd.csv", "--no-examination", "--temperature", "25", "--ionic-strength", "0"]
    assert cli.main(argv) == 2
    assert "--column smiles=HEADER" in capsys.readouterr().err
    named = ["--column", "smiles=Struktur", "--column", "pka=Wert", "--quantity", "ka"]
    assert cli.main([*argv, *named]) == 0
    values = [float(r["pka"]) for r in rows_of(Path("odd_clean.csv"))]
    assert values == pytest.approx([4.757, 4.873], abs=1e-3)  # acetic and propanoic acid, general chemistry tables
    assert cli.main([*argv, "--column", "pka=Value"]) == 2
    assert "no column Value" in capsys.readouterr().err
    assert cli.main(["curate", "nowhere.csv"]) == 2
    Path("wide.csv").write_text("smiles,pKa1,pKa2\nOC(=O)CC(=O)O,2.85,5.70\n", encoding="utf-8")
    assert cli.main(["curate", "wide.csv", "--no-examination", "--temperature", "25", "--ionic-strength", "0"]) == 0
    steps = [(r["step"], float(r["pka"])) for r in rows_of(Path("wide_clean.csv"))]
    assert [step for step, _ in steps] == ["1", "2"]
    assert steps[0][1] < steps[1][1]


def test_the_iupac_header_is_known(
    open_data_path: Path, tmp_path: Path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    monkeypatch.chdir(tmp_path)
    assert cli.main(["curate", str(open_data_path), "--output", "iupac.csv"]) == 3
    out, err = capsys.readouterr()
    assert "IUPAC Digitized pKa Dataset" in err
    total, kept, merged, refused = (int(w) for w in out.splitlines()[0].split() if w.isdigit())
    with open_data_path.open(encoding="utf-8", newline="") as handle:
        assert total == sum(1 for _ in csv.DictReader(handle))
    assert total == kept + merged + refused and kept == len(rows_of(Path("iupac.csv"))) > 300
    acetic = [r for r in rows_of(Path("iupac.csv")) if r["smiles"] == "CC(=O)O"]
    assert all(abs(float(r["pka"]) - 4.756) < 0.05 for r in acetic)  # Robinson & Stokes 1959, app. 12.1
    assert all(row["reason"] for row in rows_of(Path("iupac_left.csv")))
