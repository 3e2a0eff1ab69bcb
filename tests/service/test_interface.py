"""The HTTP interface: what it answers, what it refuses, and that nothing gets past its limits."""

from __future__ import annotations

import csv
import io
import json
import re
import socket
import subprocess
import sys
import time
from concurrent.futures import ThreadPoolExecutor
from pathlib import Path
from typing import Any

import pytest

# The columns that every table of predictions has, whoever reads it.
CONTRACT = (
    "id", "smiles", "structure", "step", "pka", "low", "high", "coverage", "domain", "reasons", "nearest",
    "nearest_pka", "nearest_distance", "measured", "pka_without", "model",
)  # fmt: skip
MOL_BLOCK = """acetic

made by hand
  4  3  0  0  0  0  0  0  0  0999 V2000
    0.0000    0.0000    0.0000 C   0  0
    1.5000    0.0000    0.0000 C   0  0
    2.2000    1.2000    0.0000 O   0  0
    2.2000   -1.2000    0.0000 O   0  0
  1  2  1  0
  2  3  2  0
  2  4  1  0
M  END
"""
HOSTILE = [
    "", " ", "\x00", "C" * 9_000, "C(" * 3_000, "[" * 500, "C1" + "CC1" * 60, "OC(=O)" + "C(F)(F)" * 500, "*C(=O)O",
    "[U]C(=O)O", "CC(=O)O.[Na+].[Cl-]", "/etc/passwd", "../../x.csv", "C:\\x.sdf", "-", "=1+1", "<b>x</b>", "💥",
    "'; DROP TABLE", "C[N+](C)(C)C(C(=O)O)", "OC(=O)C" + "%99" * 30, "{{7*7}}", "\u202eO=C(O)C", "a\nb",
]  # fmt: skip


def rows_of(client: Any, *smiles: str) -> list[dict[str, Any]]:
    answer = client.post("/api/v1/predict", json={"structures": [{"smiles": s} for s in smiles]})
    assert answer.status_code == 200
    return list(answer.json()["rows"])


def events_of(answer: Any) -> list[dict[str, Any]]:
    assert answer.status_code == 200, answer.text
    return [json.loads(line) for line in answer.text.splitlines()]


def acidity(checkout: Path, *arguments: str) -> str:
    done = subprocess.run(
        [sys.executable, "-m", "qsar", *arguments], cwd=checkout, capture_output=True, text=True, timeout=60
    )
    assert done.returncode in (0, 3), done.stderr
    return done.stdout


def test_rows_have_the_fields_of_the_table(client: Any) -> None:
    usable, unusable = rows_of(client, "OC(=O)c1ccccc1", "c1ccccc1")
    assert tuple(usable) == CONTRACT == tuple(unusable)
    assert unusable["domain"] == "unusable" and unusable["pka"] is None and "carboxyl" in unusable["reasons"]


def test_the_page_and_the_command_line_answer_alike(client: Any, checkout: Path, tmp_path: Path) -> None:
    acids = ["OC(=O)c1ccccc1O", "OC(=O)CC(O)(CC(=O)O)C(=O)O", "NCC(=O)O", "OC(=O)/C=C/c1ccccc1Cl"]
    acidity(checkout, "predict", *acids, "--output", str(tmp_path / "a.json"))
    said = json.loads((tmp_path / "a.json").read_text(encoding="utf-8"))
    assert rows_of(client, *acids) == said


# CRC Handbook of Chemistry and Physics, dissociation constants of organic acids, 25 °C (from memory).
@pytest.mark.parametrize(
    ("name", "smiles", "pka"),
    [("acetic acid", "CC(=O)O", 4.756), ("benzoic acid", "OC(=O)c1ccccc1", 4.204), ("formic acid", "O=CO", 3.75)],
)
def test_measured_values_are_those_of_the_handbook(client: Any, name: str, smiles: str, pka: float) -> None:
    answer = client.get("/api/v1/acid", params={"smiles": smiles}).json()
    assert answer["name"] == name
    assert answer["steps"][0]["measured"] == pytest.approx(pka, abs=0.02)
    assert answer["steps"][0]["measured_source"]


def test_an_acid_is_explained_and_its_numbers_add_up(client: Any) -> None:
    answer = client.get("/api/v1/acid", params={"smiles": "OC(=O)CC(=O)O", "step": 2}).json()
    assert answer["shown_step"] == 2
    for step in answer["steps"]:
        total = step["parent_pka"] + sum(line["contribution"] for line in step["contributions"])
        assert total == pytest.approx(step["pka"], abs=1e-9)
        assert len(step["neighbours"]) == 5
        assert step["low"] <= step["pka"] <= step["high"]
    assert any("CO2" in note for note in answer["notes"])


def test_a_phenol_is_noted(client: Any) -> None:
    notes = client.get("/api/v1/acid", params={"smiles": "OC(=O)c1ccccc1O"}).json()["notes"]
    assert any("phenol" in note.lower() for note in notes)


def test_swapping_a_group_gives_the_acid_that_is_meant(client: Any) -> None:
    question = {"smiles": "OC(=O)c1ccc(Cl)cc1", "position": "para", "group": "NO2"}
    answer = client.post("/api/v1/swap", json=question).json()
    meant = client.get("/api/v1/acid", params={"smiles": "OC(=O)c1ccc([N+](=O)[O-])cc1"}).json()
    assert answer["smiles"] == meant["smiles"]
    assert answer["swapped"] == {"place": "para", "old": "chloro", "new": "NO2"}


def test_analogues_are_those_of_the_command_line(client: Any, checkout: Path, tmp_path: Path) -> None:
    question = {"smiles": "OC(=O)Cc1ccccc1", "position": "1", "groups": ["CF3", "C2H5", "*C#N"], "low": 0, "high": 9}
    rows = client.post("/api/v1/analogues", json=question).json()["rows"]
    target = tmp_path / "a.csv"
    acidity(
        checkout, "analogues", "OC(=O)Cc1ccccc1", "--at", "1", "--groups", "CF3 C2H5 *C#N", "--low", "0", "--high", "9",
        "--output", str(target),
    )  # fmt: skip
    with target.open(encoding="utf-8", newline="") as handle:
        said = list(csv.DictReader(handle))
    assert [(row["group"], row["smiles"], row["pka"]) for row in rows] == [
        (row["group"], row["smiles"], float(row["pka"])) for row in said
    ]
    assert [row["pka"] for row in rows] == sorted(row["pka"] for row in rows)


def test_a_wanted_range_keeps_what_lies_in_it(client: Any) -> None:
    question = {"smiles": "OC(=O)c1ccccc1", "position": "meta: H", "low": 3.3, "high": 3.6}
    rows = client.post("/api/v1/analogues", json=question).json()["rows"]
    assert 3 < len(rows) < 150
    assert all(3.3 <= row["pka"] <= 3.6 for row in rows)


def test_the_base_is_that_of_the_command_line(client: Any, checkout: Path, tmp_path: Path) -> None:
    acidity(checkout, "workup", "CCCCCC(=O)O", "--output", str(tmp_path / "w.json"))
    said = {row["base"]: row for row in json.loads((tmp_path / "w.json").read_text(encoding="utf-8"))}
    answer = client.post("/api/v1/decide/base", json={"smiles": "CCCCCC(=O)O"}).json()
    for row in answer["table"]:
        assert row["in_water"] == pytest.approx(said[row["base"]]["in_water"], abs=1e-9)
        assert row["chosen"] == said[row["base"]]["chosen"]
    assert answer["cautions"] and answer["verdicts"][0]["sentence"]


@pytest.mark.parametrize(
    ("kind", "more"),
    [("window", {"other_smiles": "CCCCCCCC(=O)O"}), ("buffer", {"ph": 4.2}), ("risk", {"flips_at": 4.1})],
)
def test_decisions_say_what_to_do(client: Any, kind: str, more: dict[str, Any]) -> None:
    answer = client.post(f"/api/v1/decide/{kind}", json={"smiles": "OC(=O)c1ccccc1", **more}).json()
    assert answer["kind"] == kind and answer["headline"].endswith(".")


def test_a_zwitterion_has_no_base(client: Any) -> None:
    answer = client.post("/api/v1/decide/base", json={"smiles": "NCC(=O)O"})
    assert answer.status_code == 422 and "charge" in answer.json()["detail"]


# --- what is pasted and dropped


@pytest.mark.parametrize(
    ("text", "smiles"),
    [
        ("CC(=O)O", ["CC(=O)O"]),
        ("Benzoic Acid", ["O=C(O)c1ccccc1"]),
        ("CC(=O)O acetic\n\nOC(=O)C", ["CC(=O)O", "OC(=O)C"]),
        (MOL_BLOCK, ["CC(=O)O"]),
        ("id,smiles\na,CC(=O)O\nb,CCC(=O)O", ["CC(=O)O", "CCC(=O)O"]),
        ("smiles\tid\nCC(=O)O\ta", ["CC(=O)O"]),
    ],
)
def test_pasted_text_is_read(client: Any, text: str, smiles: list[str]) -> None:
    answer = client.post("/api/v1/read", json={"text": text}).json()
    assert [row["smiles"] for row in answer["structures"]] == smiles


def test_an_unknown_name_is_said(client: Any) -> None:
    (row,) = client.post("/api/v1/read", json={"text": "unobtainic acid"}).json()["structures"]
    assert "not the name of an acid in the table" in row["error"]


def xlsx(*rows: tuple[str, ...]) -> bytes:
    import openpyxl

    book = openpyxl.Workbook()
    for row in rows:
        book.active.append(row)
    held = io.BytesIO()
    book.save(held)
    return held.getvalue()


@pytest.mark.parametrize(
    ("name", "content"),
    [
        ("a.csv", b"id,smiles\nx,CC(=O)O\ny,c1ccccc1\n"),
        ("../../a.TSV", b"smiles\tid\nCC(=O)O\tx\nc1ccccc1\ty\n"),
        ("C:\\temp\\a.xlsx", xlsx(("id", "smiles"), ("x", "CC(=O)O"), ("y", "c1ccccc1"))),
        ("a.smi", b"CC(=O)O x\nc1ccccc1 y\n"),
        ("a.sdf", (MOL_BLOCK.replace("acetic", "x") + "$$$$\n" + MOL_BLOCK.replace("acetic", "y") + "$$$$\n").encode()),
    ],
)
def test_files_are_answered_as_a_stream(client: Any, name: str, content: bytes) -> None:
    events = events_of(client.post("/api/v1/file", files={"file": (name, content)}))
    assert events[0] == {"event": "start", "total": 2} and events[-1] == {"event": "end", "done": 2}
    rows = [row for event in events for row in event.get("rows", ())]
    assert [row["id"] for row in rows] == ["x", "y"]
    assert rows[0]["measured"] == pytest.approx(4.756, abs=0.01)


@pytest.mark.parametrize(
    ("name", "content", "status", "said"),
    [
        ("a.exe", b"MZ", 415, "not read"),
        ("csv", b"smiles\nC", 415, "not read"),
        ("a.csv", b"", 422, "empty"),
        ("a.csv", b"a,b\n1,2\n", 422, "no column smiles"),
        ("a.xlsx", b"PK\x03\x04 not really", 422, "not an Excel workbook"),
        ("a.csv", b"PK\x03\x04", 422, "zip or Excel"),
    ],
)
def test_files_that_are_not_read_get_a_sentence(client: Any, name: str, content: bytes, status: int, said: str) -> None:
    answer = client.post("/api/v1/file", files={"file": (name, content)})
    assert answer.status_code == status
    assert said in answer.json()["detail"]
    assert "/tmp" not in answer.text


def test_a_long_list_comes_in_parts(client: Any) -> None:
    structures = [{"id": str(i), "smiles": "C" * (i % 9 + 1) + "C(=O)O"} for i in range(250)]
    events = events_of(client.post("/api/v1/stream", json={"structures": structures}))
    done = [event["done"] for event in events if event["event"] == "rows"]
    assert done == [20, 120, 220, 250]
    assert [row["id"] for event in events for row in event.get("rows", ())] == [str(i) for i in range(250)]


def test_the_work_stops_when_the_client_leaves(client: Any) -> None:
    structures = [{"smiles": f"OC(=O)c1ccc({'C' * (i % 12 + 1)})cc1"} for i in range(5_000)]
    before = client.get("/api/v1/about").json()["workers"]["done"]
    with client.stream("POST", "/api/v1/stream", json={"structures": structures}) as answer:
        for line in answer.iter_lines():
            if '"rows"' in line:
                break
    time.sleep(1.0)
    after = client.get("/api/v1/about").json()["workers"]["done"]
    time.sleep(1.5)
    assert client.get("/api/v1/about").json()["workers"]["done"] <= after + 1
    assert after - before < 25, "the list of 51 parts was worked through"


# --- files to take away


def formula_rows(client: Any) -> list[dict[str, Any]]:
    (row,) = rows_of(client, "CC(=O)O")
    return [{**row, "id": name} for name in ("=1+1", "+cmd", "-2+3", "@x", "\ttab", "plain", "-5")]


def test_no_cell_of_a_csv_becomes_a_formula(client: Any) -> None:
    answer = client.post("/api/v1/export", json={"format": "csv", "rows": formula_rows(client)})
    rows = list(csv.DictReader(io.StringIO(answer.content.decode("utf-8"))))
    # OWASP, CSV Injection: cells that begin with = + - @, tab or return are to be prefixed.
    assert [row["id"] for row in rows] == ["'=1+1", "'+cmd", "'-2+3", "'@x", "'\ttab", "plain", "-5"]
    assert float(rows[0]["pka"]) == formula_rows(client)[0]["pka"]


def test_no_cell_of_a_workbook_is_a_formula(client: Any) -> None:
    import openpyxl

    answer = client.post("/api/v1/export", json={"format": "xlsx", "rows": formula_rows(client)})
    sheet = openpyxl.load_workbook(io.BytesIO(answer.content)).active
    cells = [cell for row in sheet.iter_rows() for cell in row]
    assert {cell.data_type for cell in cells} <= {"s", "n"}
    assert sheet["A2"].value == "=1+1"


def test_an_sd_file_can_be_read_back(client: Any, tmp_path: Path) -> None:
    from rdkit import Chem

    answer = client.post("/api/v1/export", json={"format": "sdf", "rows": rows_of(client, "OC(=O)CC(=O)O")})
    (tmp_path / "a.sdf").write_bytes(answer.content)
    entries = list(Chem.SDMolSupplier(str(tmp_path / "a.sdf")))
    assert [Chem.MolToSmiles(mol) for mol in entries] == ["O=C(O)CC(=O)O"] * 2
    assert entries[1].GetProp("step") == "2"


def test_the_report_is_whole_and_names_are_escaped(client: Any) -> None:
    name = '<script>alert(1)</script>"\'><img src=x onerror=alert(2)>'
    question = {
        "structures": [{"id": name, "smiles": "OC(=O)c1ccc(SC)cc1Br"}, {"id": "bad", "smiles": "x<y>"}],
        "decisions": [{"kind": "risk", "smiles": "OC(=O)c1ccccc1", "name": name, "flips_at": 4}],
    }
    answer = client.post("/api/v1/report", json=question)
    assert answer.status_code == 200 and answer.headers["content-disposition"] == 'attachment; filename="acids.html"'
    page = answer.text
    assert "<script" not in page and "<img src=x" not in page and "&lt;script&gt;" in page
    assert not re.findall(r'(?:src|href)="(?!data:)', page), "the report loads something"
    assert "Predicted" in page and "Not usable" in page


# --- limits


@pytest.mark.parametrize("smiles", HOSTILE)
def test_hostile_structures_get_a_sentence(client: Any, smiles: str) -> None:
    (row, after) = rows_of(client, smiles, "CC(=O)O")[0], rows_of(client, "CC(=O)O")[0]
    assert after["domain"] == "inside"
    one = client.get("/api/v1/acid", params={"smiles": smiles})
    assert (one.status_code == 200) == (row["domain"] != "unusable")
    assert one.status_code in (200, 422)
    if one.status_code == 422:
        assert one.json()["detail"] and one.json()["detail"].isprintable()
        assert "Traceback" not in one.text


def test_too_many_atoms_are_refused_with_the_number(client: Any) -> None:
    answer = client.get("/api/v1/acid", params={"smiles": "C" * 250 + "C(=O)O"})
    assert answer.status_code == 422
    assert "at most 200" in answer.json()["detail"]


def test_too_many_rows_are_refused(client: Any) -> None:
    limit = client.get("/api/v1/about").json()["limits"]
    many = [{"smiles": "CC(=O)O"}] * (int(limit["structures"]) + 1)
    assert client.post("/api/v1/predict", json={"structures": many}).status_code == 413
    lines = b"CC(=O)O\n" * (int(limit["rows"]) + 1)
    answer = client.post("/api/v1/file", files={"file": ("a.smi", lines)})
    assert answer.status_code == 413 and "20,000 structures" in answer.json()["detail"]


def raw(server: str, request: bytes) -> bytes:
    host, port = server.removeprefix("http://").split(":")
    with socket.create_connection((host, int(port)), timeout=20) as connection:
        connection.sendall(request)
        received = b""
        while part := connection.recv(65536):
            received += part
            if b"}" in part:
                break
    return received


def test_a_large_body_is_refused_before_it_is_sent(client: Any, server: str) -> None:
    head = b"POST /api/v1/predict HTTP/1.1\r\nHost: 127.0.0.1\r\nContent-Length: 99999999\r\n\r\n"
    answer = raw(server, head)
    assert answer.startswith(b"HTTP/1.1 413") and b"20 MiB" in answer


def test_a_large_body_without_a_length_is_cut_off(client: Any) -> None:
    parts = (b"x" * (1 << 20) for _ in range(40))
    import httpx

    try:
        answer = client.post("/api/v1/predict", content=parts, headers={"content-type": "application/json"})
    except (httpx.WriteError, httpx.ReadError):
        return  # the connection was closed while the rest was on its way
    assert answer.status_code == 413


def test_a_request_without_host_is_refused(client: Any, server: str) -> None:
    assert raw(server, b"GET /api/v1/about HTTP/1.0\r\n\r\n").startswith(b"HTTP/1.1 400")


@pytest.mark.parametrize(
    "host", ["evil.example", "127.0.0.1.evil.example", "evil.example:80", "", "localhost.evil", "10.0.0.1"]
)
def test_a_foreign_host_is_refused(client: Any, host: str) -> None:
    answer = client.get("/api/v1/about", headers={"host": host})
    assert answer.status_code in (400, 403)
    assert "workers" not in answer.text


@pytest.mark.parametrize("host", ["localhost", "LOCALHOST:1", "127.0.0.1"])
def test_this_machine_is_not_foreign(client: Any, host: str) -> None:
    assert client.get("/api/v1/parents", headers={"host": host}).status_code == 200


@pytest.mark.parametrize(
    "headers",
    [
        {"origin": "https://evil.example"}, {"origin": "null"}, {"origin": "http://127.0.0.1:1"},
        {"origin": "file://"}, {"sec-fetch-site": "cross-site", "sec-fetch-mode": "no-cors"},
    ],
)  # fmt: skip
def test_a_foreign_origin_is_refused(client: Any, headers: dict[str, str]) -> None:
    answer = client.post("/api/v1/predict", json={"structures": [{"smiles": "CC(=O)O"}]}, headers=headers)
    assert answer.status_code == 403 and "another page" in answer.json()["detail"]


def test_the_own_origin_is_not_foreign(client: Any, server: str) -> None:
    answer = client.post(
        "/api/v1/predict", json={"structures": [{"smiles": "CC(=O)O"}]}, headers={"origin": server}
    )
    assert answer.status_code == 200


@pytest.mark.parametrize(
    "path",
    ["/static/../app.py", "/static/%2e%2e/app.py", "/static/..%2f..%2fetc%2fpasswd", "/static//etc/passwd"],
)
def test_no_path_leads_to_other_files(client: Any, path: str) -> None:
    assert client.get(path).status_code == 404


def test_everything_is_local(client: Any) -> None:
    page = client.get("/").text
    texts = [page, client.get("/api").text] + [
        client.get(path).text for path in re.findall(r'"(/static/[\w.]+)"', page)
    ]
    for name in ("acid", "axis", "bench", "decide", "many", "util"):
        texts.append(client.get(f"/static/{name}.js").text)
    for text in texts:
        assert not set(re.findall(r"https?://[\w.]+", text)) - {"http://www.w3.org"}
    policy = client.get("/").headers["content-security-policy"]
    assert "default-src 'none'" in policy and "unsafe" not in policy


def test_the_interface_is_documented_on_its_own_page(client: Any) -> None:
    page = client.get("/api").text
    for path in client.get("/openapi.json").json()["paths"]:
        assert path in page
    for name in CONTRACT:
        assert f"<code>{name}</code>" in page


def test_twenty_clients_at_once_get_right_answers(client: Any, server: str) -> None:
    import httpx

    acids = ["C" * n + "C(=O)O" for n in range(1, 11)]
    acids += [f"OC(=O)c1cccc({x})c1" for x in ("F", "Cl", "Br", "I", "O", "N", "C", "CC", "OC", "SC")]
    alone = [rows_of(client, s)[0]["pka"] for s in acids]

    def ask(k: int) -> list[float]:
        with httpx.Client(base_url=server, timeout=60) as own:
            order = [(k + i) % len(acids) for i in range(3)]
            found = [rows_of(own, acids[i])[0]["pka"] for i in order]
            view = own.get("/api/v1/acid", params={"smiles": acids[k]}).json()
            assert found == [alone[i] for i in order]
            return [view["steps"][0]["pka"]]

    with ThreadPoolExecutor(20) as pool:
        assert list(pool.map(ask, range(20))) == [[value] for value in alone]
