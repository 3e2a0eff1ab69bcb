"""``acidity validate`` from end to end on a small model."""

from __future__ import annotations

import csv
import re
from pathlib import Path

import pytest
from small_models import small_model

from qsar.cli import main
from qsar.curation.iupac import COLUMNS, read_iupac
from qsar.model import save
from qsar.validation import studies
from qsar.validation.judged import judge
from qsar.validation.with_open_rows import compare, open_measurements, train_with

#: Invented values, written under the header of the IUPAC Digitized pKa Dataset.
INVENTED = (
    ("CCCCCCCC(F)C(=O)O", "pKa1", "2.61", "Reliable"),
    ("OC(=O)CCC(F)CCCC(=O)O", "pKa1", "4.55", "Approximate"),
    ("OC(=O)CCC(F)CCCC(=O)O", "pKa2", "5.45", "Approximate"),
    ("CC(=O)O", "pKa1", "4.75", "Reliable"),
)


@pytest.fixture(scope="module")
def bundle(tmp_path_factory: pytest.TempPathFactory) -> Path:
    folder = tmp_path_factory.mktemp("models") / "small"
    save(small_model(), folder)
    return folder


@pytest.fixture
def invented(tmp_path: Path) -> Path:
    folder = tmp_path / "open"
    folder.mkdir()
    with (folder / "rows.csv").open("w", encoding="utf-8", newline="") as handle:
        writer = csv.DictWriter(handle, COLUMNS, restval="")
        writer.writeheader()
        for smiles, label, value, grade in INVENTED:
            writer.writerow({"SMILES": smiles, "pka_type": label, "pka_value": value, "T": "25", "assessment": grade})
    return folder


@pytest.fixture(autouse=True)
def _own_cache(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr("platformdirs.user_cache_dir", lambda *_: str(tmp_path / "cache"))


@pytest.mark.slow
def test_report(
    bundle: Path, tmp_path: Path, capsys: pytest.CaptureFixture[str], monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr(studies, "QUICK", studies.Scale(1, 3, "trend", (0.5, 1.0), 1, 2, 1))
    out = tmp_path / "reports"
    assert main(["validate", "--model", str(bundle), "--quick", "--jobs", "1", "--output", str(out)]) == 0
    page = (out / "small.html").read_text(encoding="utf-8")
    for title in ("Repeated cross-validation", "family out", "substituent out", "Learning curve", "Y-randomisation"):
        assert title in page
    for title in ("Predicted against measured", "Intervals", "Domain", "Williams", "Robustness"):
        assert title in page
    assert "http" not in page  # carries everything it shows
    assert page.count("data:image/png;base64,") == len(list(out.glob("*.png"))) >= 11
    with (out / "small.csv").open(encoding="utf-8", newline="") as handle:
        rows = list(csv.DictReader(handle))
    # every row of numbers states how many values are behind it
    with_n = {(r["section"], r["row"]) for r in rows if r["column"] == "n"}
    assert with_n == {(r["section"], r["row"]) for r in rows}
    assert sum(p.stat().st_size for p in out.iterdir()) < 2e6
    shown = capsys.readouterr()
    assert "Written:" in shown.out
    assert "100%" in shown.err


def test_open_rows_are_printed(bundle: Path, invented: Path, capsys: pytest.CaptureFixture[str]) -> None:
    assert main(["validate", "--model", str(bundle), "--open-data", str(invented)]) == 0
    text = capsys.readouterr().out
    assert "4 measured steps of 3 acids" in text
    assert re.search(r"dibasic, second step +\d\.\d{3} \( +1\)", text)
    assert "bootstrap 5 % bound" in text


def test_a_folder_without_data_is_one_line(bundle: Path, tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    assert main(["validate", "--model", str(bundle), "--open-data", str(tmp_path)]) == 2
    assert "no CSV files there" in capsys.readouterr().err
    assert main(["validate", "--train-on-it"]) == 2
    assert "--open-data" in capsys.readouterr().err


def test_a_place_that_cannot_be_written_is_said_before_the_work(
    bundle: Path, tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    (tmp_path / "file").write_text("x", encoding="utf-8")
    assert main(["validate", "--model", str(bundle), "--output", str(tmp_path / "file")]) == 2
    assert capsys.readouterr().err.strip().endswith("it is a file; give the name of a folder")
    assert main(["validate", "--model", str(bundle), "--output", str(tmp_path), "--name", "a/b"]) == 2
    assert "without a folder" in capsys.readouterr().err


def test_training_on_open_rows_too(bundle: Path, invented: Path, tmp_path: Path) -> None:
    """The path of a user who may use that dataset; every acid is still judged without it."""
    model = small_model()
    steps = read_iupac(invented / "rows.csv")
    added = open_measurements(model, steps)
    assert {m.acid.smiles for m in added} >= {"CCCCCCCC(F)C(=O)O", "O=C(O)CCCC(F)CCC(=O)O"}
    assert {m.uncertainty for m in added} <= {0.02, 0.06}
    richer = train_with(model, steps)
    assert len(richer.library.pka) == len(model.library.pka) + len(added)
    after = judge(richer, steps)
    assert after.trained_on.all()
    sections = compare(model, richer, steps)
    assert sections[0].tables[0].rows[-1][1] == len(steps)
    arguments = ["validate", "--model", str(bundle), "--open-data", str(invented), "--train-on-it"]
    assert main([*arguments, "--jobs", "1", "--output", str(tmp_path / "reports")]) == 0
    page = (tmp_path / "reports" / "with-open-rows.html").read_text(encoding="utf-8")
    assert "CC BY-NC 4.0" in page
    assert "CCCCCCCC(F)C(=O)O" not in page  # numbers only, no row of the dataset


@pytest.mark.slow
def test_training_on_the_open_rows_themselves(open_data_path: Path) -> None:
    model = small_model()
    steps = read_iupac(open_data_path)
    richer = train_with(model, steps)
    before, after = (judge(m, steps) for m in (model, richer))
    assert abs(after.error).mean() < abs(before.error).mean()
