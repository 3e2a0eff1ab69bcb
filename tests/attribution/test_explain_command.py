"""``acidity explain``: its files, its report, its exit status."""

from __future__ import annotations

import csv
import re
from html.parser import HTMLParser
from pathlib import Path

import pytest
from rdkit import Chem

from qsar.cli import main
from qsar.model import Model, load_model

COLUMNS = [
    "id",
    "smiles",
    "step",
    "parent",
    "parent_pka",
    "substituent",
    "atoms",
    "path_length",
    "electronegativity",
    "contribution",
    "low",
    "high",
    "alone",
    "strongest_pair",
    "pair_interaction",
    "pka",
]
ACIDS = [
    ("two chlorines", "ClC(Cl)C(=O)O"),
    ("salt", "[Na+].[O-]C(=O)CC[NH3+]"),
    ("dibasic", "OC(=O)CCC(=O)O"),
    ("no acid", "CCO"),
    ("bare", "CC(=O)O"),
    ("=1+1", "OC(=O)CBr"),
]


@pytest.fixture
def table(tmp_path: Path) -> Path:
    path = tmp_path / "acids.csv"
    with path.open("w", encoding="utf-8", newline="") as handle:
        writer = csv.writer(handle)
        writer.writerow(["id", "smiles"])
        writer.writerows(ACIDS)
    return path


def read(path: Path) -> list[dict[str, str]]:
    with path.open(encoding="utf-8", newline="") as handle:
        reader = csv.DictReader(handle)
        assert reader.fieldnames == COLUMNS
        return list(reader)


@pytest.fixture
def written(model: Model, table: Path, tmp_path: Path) -> Path:
    folder = tmp_path / "out"
    assert main(["explain", str(table), "--output", str(folder)]) == 3
    return folder


def test_table_of_contributions_keeps_its_columns_and_adds_up(written: Path) -> None:
    rows = read(written / "contributions.csv")
    steps: dict[tuple[str, str], list[dict[str, str]]] = {}
    for row in rows:
        if row["step"]:
            steps.setdefault((row["id"], row["step"]), []).append(row)
    assert len(steps) == 6
    for lines in steps.values():
        shares = [float(row["contribution"]) for row in lines if row["contribution"]]
        assert float(lines[0]["parent_pka"]) + sum(shares) == pytest.approx(float(lines[0]["pka"]), abs=1e-9)
    assert [row["substituent"] for row in rows if row["id"] == "dibasic"] == [
        "β-carboxy",
        "site statistics",
        "β-carboxylate",
        "site statistics",
    ]


def test_every_input_is_in_the_table_in_order(written: Path) -> None:
    names = list(dict.fromkeys(row["id"] for row in read(written / "contributions.csv")))
    assert names == ["two chlorines", "salt", "dibasic", "no acid", "bare", "'=1+1"]


def test_atoms_are_those_of_the_smiles_as_given(written: Path) -> None:
    wanted = {"α-chloro": {17}, "β-ammonio": {7}, "α-bromo": {35}, "β-carboxy": {6, 8}, "β-carboxylate": {6, 8}}
    seen = 0
    for row in read(written / "contributions.csv"):
        if row["atoms"]:
            mol = Chem.MolFromSmiles(row["smiles"])
            numbers = {mol.GetAtomWithIdx(int(a)).GetAtomicNum() for a in row["atoms"].split()}
            assert numbers == wanted[row["substituent"]]
            seen += 1
    assert seen == 6


def test_pka_is_that_of_predict(written: Path, table: Path, tmp_path: Path) -> None:
    other = tmp_path / "predicted.csv"
    main(["predict", str(table), "--output", str(other)])
    with other.open(encoding="utf-8", newline="") as handle:
        predicted = {(r["id"], r["step"]): r["pka"] for r in csv.DictReader(handle)}
    for row in read(written / "contributions.csv"):
        if row["pka"]:
            assert float(row["pka"]) == pytest.approx(float(predicted[row["id"], row["step"]]), abs=1e-9)


def test_plots_are_there_as_png_and_svg(written: Path) -> None:
    stems = {p.stem for p in written.iterdir() if p.suffix == ".png"}
    assert stems == {p.stem for p in written.iterdir() if p.suffix == ".svg"}
    assert {"001-two_chlorines-step1-structure", "003-dibasic-step2-steps", "analogues"} <= stems
    for path in written.iterdir():
        if path.suffix == ".png":
            assert path.read_bytes().startswith(b"\x89PNG")
    assert not list(written.glob(".*"))


class _Links(HTMLParser):
    def __init__(self) -> None:
        super().__init__()
        self.links: list[str] = []
        self.text: list[str] = []

    def handle_starttag(self, tag: str, attrs: list[tuple[str, str | None]]) -> None:
        self.links += [value or "" for name, value in attrs if name in ("src", "href", "data", "xlink:href")]

    def handle_data(self, data: str) -> None:
        self.text.append(data)


@pytest.mark.slow
def test_report_is_one_file_that_needs_nothing_else(model: Model, table: Path, tmp_path: Path) -> None:
    target = tmp_path / "report.html"
    assert main(["explain", str(table), "--report-file", str(target)]) == 3
    html = target.read_text(encoding="utf-8")
    parser = _Links()
    parser.feed(html)
    assert parser.links and all(link.startswith("#") for link in parser.links)
    assert "<script" not in html and "@import" not in html and "url(" not in html
    targets = set(re.findall(r'id="([^"]+)"', html))
    assert {link[1:] for link in parser.links} <= targets
    text = " ".join(parser.text)
    # OECD Series on Testing and Assessment No. 69, 2007: the five principles
    for principle in ("endpoint", "unambiguous algorithm", "domain", "Goodness of fit", "mechanistic interpretation"):
        assert principle in text
    assert text.count("Statement of prediction") == 6
    assert "unusable: no carboxyl group" in text


def test_ids_cannot_inject_markup_into_a_report(model: Model, tmp_path: Path) -> None:
    from qsar.attribution import explain_many
    from qsar.reading import Record
    from qsar.report.html import _Drawings, _sheet

    (answer,) = explain_many(model, ["CC(=O)O"])
    sheet = _sheet(1, Record("<script>x</script>", "CC(=O)O"), answer.steps[0], _Drawings())
    assert "<script>" not in sheet.anchor + sheet.drawing + sheet.ruler


def test_screen_shows_the_sum_and_the_pairs(model: Model, capsys: pytest.CaptureFixture[str]) -> None:
    assert main(["explain", "ClC(Cl)C(=O)O"]) == 0
    shown = capsys.readouterr().out
    assert shown.count("α-chloro") == 2 and "(parent)" in shown


def test_what_cannot_be_read_or_written_is_said_in_one_line(
    tmp_path: Path, capsys: pytest.CaptureFixture[str], shipped_model: Path
) -> None:
    blocked = tmp_path / "file"
    blocked.write_text("x")
    assert main(["explain", "CC(=O)O", "--output", str(blocked)]) == 2
    assert main(["explain", str(tmp_path / "none.csv"), "--output", str(tmp_path / "out")]) == 2
    assert main(["explain", "CC(=O)O", "--report-file", str(tmp_path / "report.docx")]) == 2
    lines = capsys.readouterr().err.strip().splitlines()
    assert "it is a file; give the name of a folder" in lines[0]
    assert all(line.startswith("acidity: ") for line in lines)
    assert load_model(shipped_model).name
