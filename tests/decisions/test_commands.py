"""The commands ionise, workup and buffer from end to end, with known constants."""

from __future__ import annotations

import csv
import json
from pathlib import Path

import pytest

from qsar.cli import main


def rows(path: Path) -> list[dict[str, str]]:
    with path.open(encoding="utf-8", newline="") as handle:
        return list(csv.DictReader(handle))


def test_ionise_table_and_plot(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    table, plot = tmp_path / "a.csv", tmp_path / "a.png"
    arguments = ["ionise", "OC(=O)c1ccccc1", "--pka", "4.20", "--ph-step", "0.5", "--ionic-strength", "0.1"]
    assert main([*arguments, "-o", str(table), "--plot", str(plot)]) == 0
    written = rows(table)
    assert len(written) == 29 * 2
    for pair in zip(written[::2], written[1::2], strict=True):
        assert sum(float(row["fraction"]) for row in pair) == pytest.approx(1.0)
    assert all(float(row["low"]) <= float(row["fraction"]) <= float(row["high"]) for row in written)
    assert "Crippen" in written[0]["log_p_source"]
    assert plot.read_bytes().startswith(b"\x89PNG")
    out = capsys.readouterr().out
    assert "set pH" in out and "any pKa below" in out


def test_ionise_asks_about_one_ph(capsys: pytest.CaptureFixture[str]) -> None:
    assert main(["ionise", "--pka", "4.20", "--at-ph", "7.4", "--name", "benzoic acid"]) == 0
    out = capsys.readouterr().out
    assert "99 % of benzoic acid has lost 1 proton at pH 7.40" in out
    assert "measuring changes nothing" in " ".join(out.split())


def test_ionise_file_with_an_unusable_row(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    source = tmp_path / "acids.csv"
    source.write_text("id,smiles\nfirst,CC(=O)O\nsecond,c1ccccc1\n", encoding="utf-8")
    target = tmp_path / "out.json"
    arguments = ["ionise", str(source), "--pka", "4.76", "--pka", "9", "-o", str(target), "--ph-step", "1"]
    assert main(arguments) == 3
    assert "acids.csv, row 3" in capsys.readouterr().err
    assert {row["id"] for row in json.loads(target.read_text(encoding="utf-8"))} == {"first"}


def test_ionise_temperature_says_its_enthalpy(capsys: pytest.CaptureFixture[str]) -> None:
    assert main(["ionise", "--pka", "4.76", "--temperature", "37", "--at-ph", "7"]) == 0
    assert "kJ/mol assumed" in " ".join(capsys.readouterr().out.split())


def test_workup_of_one_acid(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    table = tmp_path / "bases.csv"
    arguments = [
        "workup",
        "OC(=O)c1ccc([N+](=O)[O-])cc1",
        "--pka",
        "3.44",
        "--log-p",
        "1.89",
        "-o",
        str(table),
    ]
    assert main(arguments) == 0
    out = " ".join(capsys.readouterr().out.split())
    assert "15.74" in out and "6.35" in out
    assert "Caution: Nitro compound" in out and "give off CO2" in out and "safety data sheet" in out
    written = rows(table)
    chosen = [row for row in written if row["chosen"] == "True"]
    assert len(written) == 8 and [row["base"] for row in chosen] == ["sodium hydrogencarbonate"]
    assert f"any pKa below {float(chosen[0]['flips_at']):.2f}" in out


def test_workup_with_ammonia_needs_no_caution(capsys: pytest.CaptureFixture[str]) -> None:
    assert main(["workup", "OC(=O)c1ccccc1", "--pka", "4.2", "--base", "ammonia"]) == 0
    out = capsys.readouterr().out
    assert "Caution" not in out and "safety data sheet" not in out and "CO2" not in out


def test_workup_of_two_acids(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    window, plot = tmp_path / "window.json", tmp_path / "plot.svg"
    arguments = [
        "workup",
        "--pka",
        "4.2",
        "--pka",
        "9.5",
        "--log-p",
        "1.87",
        "--log-p",
        "2.7",
        "--base",
        "carbonate",
    ]
    assert main([*arguments, "--window", str(window), "--plot", str(plot)]) == 0
    found = json.loads(window.read_text(encoding="utf-8"))[0]
    assert found["exists"] and found["in_water"] == "acid 1" and found["from_ph"] < found["to_ph"]
    assert {path.name for path in tmp_path.iterdir()} == {
        "window.json", "plot-1.svg", "plot-2.svg", "plot-window.svg",
    }  # fmt: skip
    assert "exists with probability" in " ".join(capsys.readouterr().out.split())


def test_workup_refuses_a_zwitterion(capsys: pytest.CaptureFixture[str]) -> None:
    assert main(["workup", "NCC(=O)O", "--pka", "2.35"]) == 3
    assert "choose another separation" in capsys.readouterr().err


def test_buffer_finds_the_ratio(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    table = tmp_path / "b.xlsx"
    arguments = [
        "buffer",
        "CC(=O)O",
        "--pka",
        "4.756",
        "--ph",
        "5.0",
        "-o",
        str(table),
        "--plot",
        str(tmp_path / "b.svg"),
    ]
    assert main(arguments) == 0
    out = capsys.readouterr().out
    assert "pH 5.00" in out and "useful range: pH 3.7 to 5.7" in out
    openpyxl = pytest.importorskip("openpyxl")
    sheet = openpyxl.load_workbook(table).active
    header = [cell.value for cell in sheet[1]]
    first = dict(zip(header, (cell.value for cell in sheet[2]), strict=True))
    assert first["ph"] == pytest.approx(5.0, abs=1e-4)
    assert first["acid_m"] + first["salt_m"] == pytest.approx(0.1)
    assert (tmp_path / "b.svg").read_text(encoding="utf-8").lstrip().startswith("<?xml")


def test_workup_says_when_the_error_of_an_estimated_log_p_decides(capsys: pytest.CaptureFixture[str]) -> None:
    """Benzoic acid: log P 1.87 measured (Hansch, Leo & Hoekman 1995, from memory), 1.38 by Crippen's contributions."""
    arguments = ["workup", "OC(=O)c1ccccc1", "--pka", "4.20"]
    assert main(arguments) == 0
    out = " ".join(capsys.readouterr().out.split())
    assert "Gentlest that does: sodium hydrogencarbonate" in out
    assert "sodium hydrogencarbonate no longer does and it takes triethanolamine: give --log-p" in out
    assert main([*arguments, "--log-p", "1.87"]) == 0
    out = " ".join(capsys.readouterr().out.split())
    assert "Gentlest that does: triethanolamine" in out
    assert "standard error above the estimate" not in out


@pytest.mark.parametrize(
    ("arguments", "status", "message"),
    [
        (["ionise"], 2, "give a SMILES string, a file, or --pka"),
        (["ionise", "--pka", "4.2", "--temperature", "60"], 2, "10 to 40 °C"),
        (["ionise", "--pka", "4.2", "--ionic-strength", "0.9"], 2, "0 to 0.5 mol/L"),
        (["ionise", "--pka", "4.2", "--ph-step", "1e-5"], 2, "points"),
        (["ionise", "--pka", "4.2", "-o", "x.doc"], 2, "the extension must be"),
        (["ionise", "CC(=O)O", "--pka", "4.2", "--pka", "5"], 2, "2 times for 1 acid;"),
        (["ionise", "missing.csv", "--pka", "4.2"], 2, "no such file"),
        (["ionise", "--pka", "4.2", "--from-ph", "9", "--to-ph", "2"], 2, "must lie above --from-ph"),
        (["ionise", "--pka", "4.2", "--temperature", "-5"], 2, "-5 °C"),
        (["buffer", "--pka", "4.2", "--step", "2"], 3, "it has 1 step"),
        (["workup", "--pka", "4.2", "--log-p", "2", "--base", "lye"], 2, "is not known"),
        (["workup", "--pka", "4.2", "--log-p", "2", "--base", "amine:99"], 2, "from 0 to 14"),
        (["workup", "--pka", "4.2", "--log-p", "2", "--ionic-strength", "3"], 2, "0 to 0.5 mol/L"),
        (["workup", "--pka", "4.2"], 3, "give --log-p"),
        (["workup", "--pka", "4.2", "--log-p", "2", "--window", "w.csv"], 2, "for two acids"),
        (["buffer", "--pka", "4.2", "--acid", "0", "--salt", "0"], 2, "both zero"),
        (["buffer", "--pka", "4.2", "--ph", "4.5", "--acid", "0.1"], 2, "leave both out"),
        (["buffer", "--pka", "4.2", "--ph", "11"], 3, "another acid"),
        (["buffer", "--pka", "4.2", "--ionic-strength", "2"], 2, "0 to 0.5 mol/L"),
        (["buffer", "--pka", "4.2", "--ionic-strength", "0.001"], 3, "own ions make"),
    ],
)
def test_refusals(
    arguments: list[str], status: int, message: str, capsys: pytest.CaptureFixture[str]
) -> None:
    assert main(arguments) == status
    err = capsys.readouterr().err
    assert message in err and "Traceback" not in err
    assert len(err.strip().splitlines()) == 1


@pytest.mark.parametrize(
    ("arguments", "message"),
    [
        (["ionise", "--pka", "4,76"], "with a point"),  # a decimal comma, not steps of 4 and 76
        (["ionise", "--pka", "4,3"], "with a point"),
        (["ionise", "--pka", "400"], "from -5 to 20"),
        (["ionise", "--pka", "4.2", "--at-ph", "99"], "a pH from"),
        (["ionise", "--pka", "4.2", "--log-p", "1e9"], "too large"),
        (["buffer", "--pka", "4.2", "--acid", "100"], "more than 20 mol/L"),
        (["buffer", "--pka", "4.2", "--ph", "20"], "a pH from"),
    ],
)
def test_numbers_that_no_solution_has(
    arguments: list[str], message: str, capsys: pytest.CaptureFixture[str]
) -> None:
    with pytest.raises(SystemExit) as left:
        main(arguments)
    assert left.value.code == 2
    err = capsys.readouterr().err
    assert message in err and len(err.strip().splitlines()) == 1


def test_a_recipe_that_is_no_buffer_says_so(capsys: pytest.CaptureFixture[str]) -> None:
    """An excess of strong base sets the pH by itself: the solution is no buffer (common practice, no source)."""
    arguments = ["buffer", "--pka", "4.756", "--acid", "0.05", "--salt", "0.05"]
    assert main(arguments) == 0
    assert "outside the useful range" not in capsys.readouterr().out
    assert main([*arguments, "--strong-base", "0.2"]) == 0
    assert "outside the useful range" in " ".join(capsys.readouterr().out.split())


def test_the_columns_of_the_base_table_are_explained(capsys: pytest.CaptureFixture[str]) -> None:
    assert main(["workup", "--pka", "4.2", "--log-p", "1.9", "--base", "ammonia"]) == 0
    out = " ".join(capsys.readouterr().out.split())
    assert "ΔpKa: constant of the base's conjugate acid less that of the acid" in out
