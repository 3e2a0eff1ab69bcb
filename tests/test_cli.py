"""The command line: exit status, one line for each problem, streams, interrupts.

Most tests run with the stand-in model, so that they say something about the command and nothing about
chemistry; the shipped model has its own tests.
"""

from __future__ import annotations

import csv
import json
import os
import re
import signal
import subprocess
import sys
from pathlib import Path

import pytest
import stand_in_model
from rdkit import Chem
from rdkit.Chem import rdDepictor

from qsar import __version__
from qsar.batch import CHUNK
from qsar.cli import COMMANDS, available, main
from qsar.commands import predict

ACIDS = ["CC(=O)O", "OC(=O)CCl", "OC(=O)c1ccccc1", "OC(=O)CC(=O)O"]
STAND_IN = Path(stand_in_model.__file__)


@pytest.fixture
def stand_in(monkeypatch: pytest.MonkeyPatch, tmp_path: Path) -> None:
    monkeypatch.setattr(predict, "open_model", stand_in_model.open_stand_in)
    monkeypatch.chdir(tmp_path)


def table(path: Path | str) -> list[dict[str, str]]:
    with Path(path).open(encoding="utf-8", newline="") as handle:
        return list(csv.DictReader(handle))


def smiles_file(path: Path, number: int) -> Path:
    """Distinct acids: chains with a chlorine somewhere."""
    lines = [f"{'C' * (1 + n % 40)}C(Cl){'C' * (n // 40)}C(=O)O a{n}" for n in range(number)]
    path.write_text("\n".join(lines) + "\n")
    return path


def run(*arguments: object, script: Path = STAND_IN, **variables: str) -> subprocess.CompletedProcess[str]:
    return subprocess.run(
        [sys.executable, str(script), *map(str, arguments)],
        capture_output=True, text=True, timeout=120, check=False, env={**environment(), **variables},
    )  # fmt: skip


def environment() -> dict[str, str]:
    return {**os.environ, "PYTHONPATH": str(STAND_IN.parent.parent), "COLUMNS": "110"}


# Status and messages


@pytest.mark.usefixtures("stand_in")
def test_all_predicted(capsys: pytest.CaptureFixture[str]) -> None:
    assert main(["predict", *ACIDS]) == 0
    captured = capsys.readouterr()
    assert captured.err == ""
    assert "4, step 2" in captured.out


@pytest.mark.usefixtures("stand_in")
def test_rows_keep_order_and_ids(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    (tmp_path / "in.csv").write_text("x,ID,Smiles\n,seven,OC(=O)CC(=O)O\n,,CC(=O)O\n,=bad,CCN\n,e,\n")
    assert main(["predict", "OC=O", "in.csv", "CC", "-o", "out.csv"]) == 3
    rows = table("out.csv")
    assert [(row["id"], row["step"], row["domain"]) for row in rows] == [
        ("1", "1", "inside"),
        ("seven", "1", "inside"),
        ("seven", "2", "inside"),
        ("2", "1", "inside"),
        ("'=bad", "", "unusable"),
        ("e", "", "unusable"),
        ("3", "", "unusable"),
    ]
    errors = capsys.readouterr().err.splitlines()
    assert errors[0] == "acidity: in.csv, row 4, id =bad: no COOH"
    assert errors[1].startswith("acidity: in.csv, row 5, id e: no SMILES")
    assert errors[-1] == "out.csv: 6 inputs in 7 rows; 3 could not be used"
    assert sorted(path.name for path in tmp_path.iterdir()) == ["in.csv", "out.csv"]


@pytest.mark.usefixtures("stand_in")
@pytest.mark.parametrize("extension", ["csv", "xlsx", "json", "sdf"])
def test_missing_source_leaves_the_others_answered(
    extension: str, tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    assert main(["predict", "none.csv", "CC(=O)O", "-o", f"out.{extension}"]) == 2
    errors = capsys.readouterr().err.splitlines()
    assert errors[0].startswith("acidity: none.csv: no such file")
    assert (tmp_path / f"out.{extension}").stat().st_size > 100


@pytest.mark.usefixtures("stand_in")
@pytest.mark.parametrize(
    "arguments", [["none.csv"], ["."], ["none.csv", "-o", "out.csv"], [".", "-o", "o.xlsx"]]
)
def test_nothing_to_read_writes_nothing(
    arguments: list[str], tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    assert main(["predict", *arguments]) == 2
    captured = capsys.readouterr()
    assert captured.out == ""
    assert len(captured.err.splitlines()) == 1
    assert not list(tmp_path.iterdir())


@pytest.mark.usefixtures("stand_in")
@pytest.mark.parametrize(
    ("arguments", "message"),
    [
        (["-o", "none/out.csv"], "does not exist"),
        (["-o", "."], "extension must be one of"),
        (["-o", "out.doc"], "extension must be one of"),
        (["-o", os.devnull], "extension must be one of"),
        (["--resume"], "--output"),
        (["--resume", "-o", "out.xlsx"], ".csv only"),
        (["here.smi", "-o", "here.smi"], "extension must be one of"),
        (["here.csv", "-o", "here.csv"], "also a source"),
    ],
)
def test_wrong_usage_is_one_line(
    arguments: list[str], message: str, tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    (tmp_path / "here.csv").write_text("smiles\nCC(=O)O\n")
    assert main(["predict", "CC(=O)O", *arguments]) == 2
    (line,) = capsys.readouterr().err.splitlines()
    assert message in line
    assert [path.name for path in tmp_path.iterdir()] == ["here.csv"]


@pytest.mark.parametrize(
    ("arguments", "message"),
    [
        (["predict"], "SOURCE"),
        (["predict", "C", "--coverage", "90"], "such as 0.9"),
        (["predict", "C", "--coverage", "1"], "such as 0.9"),
        (["predict", "C", "--coverage", "nan"], "such as 0.9"),
        (["predict", "C", "--jobs", "0"], "number of processes"),
        (["predict", "C", "--jobs", "two"], "number of processes"),
        (["predict", "C", "--colour"], "--colour"),
        (["--colour"], "--colour"),
    ],
)
def test_wrong_arguments_are_one_line(
    arguments: list[str], message: str, capsys: pytest.CaptureFixture[str]
) -> None:
    with pytest.raises(SystemExit) as caught:
        main(arguments)
    (line,) = capsys.readouterr().err.splitlines()
    assert message in line
    assert caught.value.code == 2


def test_unknown_command_names_the_nearest(capsys: pytest.CaptureFixture[str]) -> None:
    assert main(["predikt", "C"]) == 2
    (line,) = capsys.readouterr().err.splitlines()
    assert "did you mean predict?" in line


def test_help_lists_the_commands_that_are_there(capsys: pytest.CaptureFixture[str]) -> None:
    with pytest.raises(SystemExit) as caught:
        main(["--help"])
    assert caught.value.code == 0
    printed = capsys.readouterr().out
    assert [name for name in COMMANDS if re.search(rf"^  {name} +\w", printed, re.MULTILINE)] == available()
    assert main([]) == 2
    assert "predict" in capsys.readouterr().err


@pytest.mark.parametrize("name", available())
def test_each_command_explains_itself(name: str, capsys: pytest.CaptureFixture[str]) -> None:
    with pytest.raises(SystemExit) as caught:
        main([name, "--help"])
    assert caught.value.code == 0
    assert f"acidity {name}" in capsys.readouterr().out


def test_version(capsys: pytest.CaptureFixture[str]) -> None:
    with pytest.raises(SystemExit):
        main(["--version"])
    assert capsys.readouterr().out == f"acidity {__version__}\n"


def test_error_of_the_program_is_one_line_unless_debugged(
    monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    def broken(folder: Path | None) -> None:
        raise ArithmeticError("made to fail")

    monkeypatch.setattr(predict, "open_model", broken)
    assert main(["predict", "CC(=O)O"]) == 1
    (line,) = capsys.readouterr().err.splitlines()
    assert "ArithmeticError: made to fail" in line
    with pytest.raises(ArithmeticError):
        main(["predict", "CC(=O)O", "--debug"])


@pytest.mark.usefixtures("stand_in")
def test_failure_inside_the_model_costs_one_row() -> None:
    assert main(["predict", *ACIDS, stand_in_model.FAILS, "OC=O", "-o", "out.json"]) == 3
    found = json.loads(Path("out.json").read_text())
    assert [item["domain"] for item in found].count("unusable") == 1
    assert "made to fail" in found[-2]["reasons"]
    with pytest.raises(ArithmeticError):
        main(["predict", stand_in_model.FAILS, "--debug"])


def test_reader_that_leaves_ends_the_command_quietly(tmp_path: Path) -> None:
    source = smiles_file(tmp_path / "many.smi", 3000)
    with subprocess.Popen(
        [sys.executable, str(STAND_IN), "predict", str(source)],
        stdout=subprocess.PIPE, stderr=subprocess.PIPE, text=True, env=environment(),
    ) as process:  # fmt: skip
        assert process.stdout is not None
        assert process.stderr is not None
        process.stdout.readline()
        process.stdout.close()
        assert process.stderr.read() == ""
        assert process.wait(60) == 141


# Start


def imported(*arguments: str, status: int = 0) -> set[str]:
    """Modules that a run of the command has imported at its end."""
    code = (
        "import sys\nfrom qsar.cli import main\n"
        f"try:\n    status = main({list(arguments)!r})\n"
        "except SystemExit as end:\n    status = end.code or 0\n"
        "print('\\n'.join(sys.modules), file=sys.stderr)\nsys.exit(status)"
    )
    done = subprocess.run(
        [sys.executable, "-c", code], capture_output=True, text=True, check=False, env=environment()
    )
    found, first = done.returncode, done.stderr.split("\n", 1)[0]
    assert found == status, first
    return set(done.stderr.split())


@pytest.mark.parametrize(
    ("arguments", "status"),
    [(["--help"], 0), (["--version"], 0), (["predict", "--help"], 0), (["predikt"], 2)],
)
def test_help_imports_nothing_heavy(arguments: list[str], status: int) -> None:
    assert not imported(*arguments, status=status) & {
        "rdkit",
        "numpy",
        "sklearn",
        "scipy",
        "pandas",
        "matplotlib",
        "openpyxl",
    }


# Streams, processes, interrupts


def test_progress_is_shown_on_request_only(tmp_path: Path) -> None:
    source = smiles_file(tmp_path / "in.smi", 700)
    quiet = run("predict", source, "-o", tmp_path / "a.csv")
    assert quiet.stderr == f"{tmp_path / 'a.csv'}: 700 inputs in 700 rows\n"
    shown = run("predict", source, "-o", tmp_path / "b.csv", "--progress")
    assert "700/700" in shown.stderr
    assert "acids/s" in shown.stderr


def test_two_processes_write_the_same_file(tmp_path: Path) -> None:
    source = smiles_file(tmp_path / "in.smi", 2300)
    with source.open("a") as handle:
        handle.write("CCN not_an_acid\n")
    one, two = tmp_path / "one.csv", tmp_path / "two.csv"
    assert run("predict", source, "-o", one).returncode == 3
    assert run("predict", source, "-o", two, "--jobs", 2).returncode == 3
    assert two.read_bytes() == one.read_bytes()
    assert [row["id"] for row in table(one)] == [*(f"a{n}" for n in range(2300)), "not_an_acid"]


def test_death_of_a_process_costs_one_row(tmp_path: Path) -> None:
    source = smiles_file(tmp_path / "in.smi", 1100)
    lines = source.read_text().splitlines()
    lines.insert(37, f"{stand_in_model.ENDS_PROCESS} killer")
    source.write_text("\n".join(lines))
    done = run("predict", source, "-o", tmp_path / "out.csv", "--jobs", 2)
    assert done.returncode == 3, done.stderr
    rows = table(tmp_path / "out.csv")
    assert [row["id"] for row in rows if row["domain"] == "unusable"] == ["killer"]
    assert [row["id"] for row in rows] == [line.split()[1] for line in lines]


@pytest.mark.parametrize("number", [1, 2])
def test_model_that_cannot_be_read_is_one_line(tmp_path: Path, number: int) -> None:
    done = run("predict", "CC(=O)O", "--model", "none", "--jobs", number, "-o", tmp_path / "out.csv")
    assert (done.returncode, done.stderr) == (2, "acidity: none: no model there\n")
    assert not list(tmp_path.iterdir())


def interrupted(arguments: list[str], number: int = signal.SIGINT) -> tuple[int, str]:
    """Run until the model hangs, then send a signal to the whole group, as a terminal does."""
    with subprocess.Popen(
        [sys.executable, str(STAND_IN), *arguments],
        stderr=subprocess.PIPE, text=True, start_new_session=True, env=environment(),
    ) as process:  # fmt: skip
        assert process.stderr is not None
        first = process.stderr.readline()
        assert first == "hanging\n", first + process.stderr.read()
        os.killpg(process.pid, number)
        return process.wait(60), process.stderr.read()


@pytest.mark.parametrize("number", [signal.SIGINT, signal.SIGTERM])
def test_interrupted_table_is_valid_and_can_be_resumed(tmp_path: Path, number: int) -> None:
    source, target = smiles_file(tmp_path / "in.smi", 1800), tmp_path / "out.csv"
    whole = tmp_path / "whole.csv"
    text = "OC(=O)CC(=O)O two_steps\nCCN unusable\n" + source.read_text()
    source.write_text(text)
    run("predict", source, "-o", whole)
    lines = text.splitlines()
    source.write_text("\n".join([*lines[:1200], f"{stand_in_model.HANGS} hangs", *lines[1201:]]))
    status, errors = interrupted(["predict", str(source), "-o", str(target)], number)
    assert status == 130
    assert "--resume" in errors
    assert "Traceback" not in errors
    partial = tmp_path / "out.csv.partial"
    assert sorted(path.name for path in tmp_path.iterdir()) == ["in.smi", "out.csv.partial", "whole.csv"]
    assert table(partial) == table(whole)[: len(table(partial))]
    whole_chunks = 1200 // CHUNK * CHUNK  # inputs before the one that hangs; the first of them has two rows
    assert len(table(partial)) == whole_chunks + 1

    source.write_text(text)
    done = run("predict", source, "-o", target, "--resume")
    assert done.returncode == 3
    assert target.read_bytes() == whole.read_bytes()
    assert not partial.exists()


def test_interrupt_with_two_processes(tmp_path: Path) -> None:
    source = smiles_file(tmp_path / "in.smi", 1200)
    lines = source.read_text().splitlines()
    source.write_text("\n".join([f"{stand_in_model.HANGS} hangs", *lines]))
    status, errors = interrupted(
        ["predict", str(source), "-o", str(tmp_path / "out.csv"), "--jobs", "2"], signal.SIGINT
    )
    assert (status, errors) == (130, "acidity: interrupted\n")
    assert [path.name for path in tmp_path.iterdir()] == ["in.smi"]


@pytest.mark.parametrize("extension", ["json", "xlsx", "sdf"])
def test_interrupted_file_of_another_kind_is_not_left(tmp_path: Path, extension: str) -> None:
    status, errors = interrupted(
        ["predict", "CC(=O)O", stand_in_model.HANGS, "-o", str(tmp_path / f"out.{extension}")]
    )
    assert (status, errors) == (130, "acidity: interrupted\n")
    assert not list(tmp_path.iterdir())


@pytest.mark.usefixtures("stand_in")
@pytest.mark.parametrize(
    ("change", "message"),
    [
        (lambda text: text.replace("CC(=O)O,", "CCC(=O)O,", 1), "other input"),
        (lambda text: text.replace(",0.9,", ",0.8,", 1), "--coverage 0.8"),
        (lambda text: text.replace("stand-in", "another"), "made with the model another"),
        (lambda text: text[:-60], "damaged"),
        (lambda text: "x,y\n", "not a table of this command"),
    ],
)
def test_resuming_something_else_is_refused(
    change: object, message: str, tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    assert main(["predict", *ACIDS[:3], "-o", "out.csv"]) == 0
    partial = tmp_path / "out.csv.partial"
    kept = change((tmp_path / "out.csv").read_text())  # type: ignore[operator]
    partial.write_text(kept)
    (tmp_path / "out.csv").unlink()
    capsys.readouterr()
    assert main(["predict", *ACIDS, "-o", "out.csv", "--resume"]) == 2
    assert message in capsys.readouterr().err.splitlines()[-1]
    assert partial.read_text() == kept
    assert [path.name for path in tmp_path.iterdir()] == ["out.csv.partial"]


@pytest.mark.usefixtures("stand_in")
def test_resuming_without_a_partial_file_starts_at_the_beginning(tmp_path: Path) -> None:
    assert main(["predict", *ACIDS, "-o", "out.csv", "--resume"]) == 0
    assert len(table(tmp_path / "out.csv")) == 5


# With the shipped model

UNUSABLE = {
    "unparsable": "CC(=O)O)",
    "empty": "",
    "no COOH": "CCO",
    "ester": "COC(C)=O",
    "COOH on N": "CN(C)C(=O)O",
    "COOH on O": "COC(=O)O",
    "COOH on S": "CSC(=O)O",
    "peroxy acid": "CC(=O)OO",
    "inorganic salt": "[Na+].[Cl-]",
    "organometallic": "C[Sn](C)(C)CC(=O)O",
    "wildcard": "*CC(=O)O",
    "impossible valence": "CC(C)(C)(C)(C)C(=O)O",
    "over 200 heavy atoms": "C" * 300 + "(=O)O",
    "over six COOH": "OC(=O)" + "C(C(=O)O)" * 7,
    "line noise": "$$$\t\0",
}


@pytest.mark.usefixtures("shipped_model")
def test_each_unusable_input_gets_its_reason(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.chdir(tmp_path)
    with (tmp_path / "in.csv").open("w", encoding="utf-8", newline="") as handle:
        rows = csv.writer(handle)
        rows.writerow(["id", "smiles"])
        for name, smiles in UNUSABLE.items():
            rows.writerows([[name, smiles], [f"after {name}", "CC(=O)O"]])
    assert main(["predict", "in.csv", "-o", "out.csv"]) == 3
    found = table("out.csv")
    assert [row["id"] for row in found] == [i for name in UNUSABLE for i in (name, f"after {name}")]
    for row in found:
        assert (row["domain"] == "unusable") == (row["id"] in UNUSABLE), row
        assert not row["reasons"] or len(row["reasons"].splitlines()) == 1
        if row["id"] in UNUSABLE:
            assert row["reasons"]
            assert not row["pka"] + row["low"] + row["high"] + row["coverage"] + row["nearest_pka"]
    answered = [float(row["pka"]) for row in found if row["id"] not in UNUSABLE]
    assert answered == pytest.approx([answered[0]] * len(answered), abs=1e-9)


@pytest.mark.usefixtures("shipped_model")
def test_shipped_model_answers_alike_in_any_number_of_processes(tmp_path: Path) -> None:
    """To the last digit, also where Python orders its sets in another way (PYTHONHASHSEED)."""
    source = tmp_path / "in.smi"
    groups = ["Br", "C#N", "OC", "SC", "C(F)(F)F", "c1ccccc1", "[N+](=O)[O-]", "NC(C)=O"]
    source.write_text("".join(f"OC(=O){'C' * n}C(Cl){g} {n}{g}\n" for n in range(1, 70) for g in groups))
    one, two = tmp_path / "one.csv", tmp_path / "two.csv"
    code = STAND_IN.parent.parent / "qsar" / "__main__.py"
    assert run("predict", source, "-o", one, script=code, PYTHONHASHSEED="1").returncode == 0
    assert run("predict", source, "-o", two, "--jobs", 2, script=code, PYTHONHASHSEED="2").returncode == 0
    assert one.read_bytes() == two.read_bytes()


@pytest.mark.usefixtures("shipped_model")
def test_a_prediction_imports_nothing_that_it_does_not_need() -> None:
    modules = imported("predict", "OC(=O)CCl")
    assert "qsar.model" in modules
    assert not modules & {"sklearn", "pandas", "matplotlib", "joblib", "openpyxl", "tqdm"}


@pytest.mark.usefixtures("shipped_model")
def test_mol_file_and_smiles_agree(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.chdir(tmp_path)
    smiles = ["OC(=O)CCl", "OC(=O)/C=C\\C(=O)O", "[NH3+][C@@H](C)C(=O)[O-]"]
    writer = Chem.SDWriter("in.sdf")
    for text in smiles:
        mol = Chem.MolFromSmiles(text)
        rdDepictor.Compute2DCoords(mol)
        writer.write(mol)
    writer.close()
    assert main(["predict", *smiles, "-o", "a.csv"]) == 0
    assert main(["predict", "in.sdf", "-o", "b.csv"]) == 0
    a, b = table("a.csv"), table("b.csv")
    assert [(row["structure"], row["step"]) for row in a] == [(row["structure"], row["step"]) for row in b]
    assert [float(row["pka"]) for row in a] == pytest.approx([float(row["pka"]) for row in b], abs=1e-9)
