"""The requests of a day, the n-th always the same: what many chemists, and some clumsy programs, ask of the page."""

from __future__ import annotations

import json
from collections.abc import Callable
from dataclasses import dataclass, field
from random import Random
from typing import Any
from urllib.parse import quote, urlencode

from benchmarks.many_acids import LIMIT, acid

V1 = "/api/v1"
_JSON = {"content-type": "application/json"}
_POPULAR = ("CC(=O)O", "OC(=O)c1ccccc1", "OC(=O)CCl", "OC(=O)C(F)(F)F", "OC(=O)CCC(=O)O", "NCC(=O)O")
_NAMES = ("acetic acid", "benzoic acid", "succinic acid")


@dataclass(frozen=True)
class Request:
    """One request, and what may be answered."""

    kind: str
    path: str
    method: str = "GET"
    body: bytes | None = None
    headers: dict[str, str] = field(default_factory=dict)
    expected: tuple[int, ...] = (200,)
    complete: bool = False
    leaves: str = ""


def posted(kind: str, path: str, question: Any, **more: Any) -> Request:
    """A question as JSON."""
    return Request(kind, V1 + path, "POST", json.dumps(question).encode(), _JSON, **more)


class Load:
    """The requests of a day.

    Parameters
    ----------
    seed : int
        Of all choices.
    """

    PROBES = (
        f"{V1}/acid?smiles={quote('OC(=O)CC(O)(CC(=O)O)C(=O)O')}",
        f"{V1}/drawing?smiles={quote('OC(=O)c1ccccc1Br')}",
    )
    """Questions whose answers stay the same all day."""

    def __init__(self, seed: int) -> None:
        self.seed = seed

    def request(self, number: int) -> Request:
        """The request of a number."""
        rng = Random(f"{self.seed}/{number}")
        (kind,) = rng.choices(list(_KINDS), [weight for _, weight in _KINDS.values()])
        return _KINDS[kind][0](rng)


def _smiles(rng: Random) -> str:
    return rng.choice(_POPULAR) if rng.random() < 0.2 else acid(rng.randrange(LIMIT))


def _list(rng: Random, count: int) -> list[dict[str, str]]:
    return [{"id": f"n{k}", "smiles": _smiles(rng)} for k in range(count)]


def _single(rng: Random) -> Request:
    return posted("single", "/predict", {"structures": _list(rng, 1), "coverage": rng.choice((0.5, 0.9, 0.95))})


def _small(rng: Random) -> Request:
    return posted("list", "/predict", {"structures": _list(rng, rng.randint(2, 20))})


def _acid(rng: Random) -> Request:
    asked = {"smiles": _smiles(rng), "coverage": rng.choice((0.8, 0.9)), "step": rng.randint(1, 2)}
    return Request("acid", f"{V1}/acid?{urlencode(asked)}")


def _drawing(rng: Random) -> Request:
    asked = {"smiles": _smiles(rng), "width": rng.randint(100, 400), "dark": rng.choice(("true", "false"))}
    return Request("drawing", f"{V1}/drawing?{urlencode(asked)}")


def _decision(rng: Random) -> Request:
    kind = rng.choice(("base", "window", "buffer", "risk"))
    question: dict[str, Any] = {"smiles": _smiles(rng), "temperature_c": rng.choice((20, 25))}
    question |= {
        "base": {"into": rng.choice(("water", "organic"))},
        "window": {"other_smiles": _smiles(rng)},
        "buffer": {"ph": round(rng.uniform(3, 6), 1)},
        "risk": {"flips_at": round(rng.uniform(2, 6), 1)},
    }[kind]
    return posted("decision", f"/decide/{kind}", question, expected=(200, 422))


def _swap(rng: Random) -> Request:
    return posted(
        "swap", "/swap",
        {"smiles": "OC(=O)c1ccccc1", "position": "para", "group": rng.choice(("Cl", "F", "CF3", "NO2", "CN"))},
    )  # fmt: skip


def _analogues(rng: Random) -> Request:
    groups = rng.choice((["Cl", "F", "Br"], ["CN", "NO2", "CF3", "Cl"], None))
    return posted("analogues", "/analogues", {"smiles": "OC(=O)c1ccccc1", "position": "meta", "groups": groups})


def _text(rng: Random) -> Request:
    lines = [rng.choice((_smiles(rng), rng.choice(_NAMES))) for _ in range(rng.randint(1, 30))]
    return posted("text", "/read", {"text": "\n".join(lines)})


def _page(rng: Random) -> Request:
    return Request("page", rng.choice(("/", "/api", "/openapi.json", f"{V1}/about", f"{V1}/groups", "/static/axis.js")))


def _wrong(rng: Random) -> Request:
    wrong = ("c1ccccc1", "nonsense", "CC(=O)O" * 2000, "", "OC(=O)C" + "(" * 50, "C" * 300 + "C(=O)O", "OC(=O)[Xe]")
    foreign = {**_JSON, "origin": "http://elsewhere.example"}
    return rng.choice(
        (
            Request("wrong", f"{V1}/acid?{urlencode({'smiles': rng.choice(wrong)})}", expected=(413, 422)),
            Request("wrong", f"{V1}/predict", "POST", b'{"structures": [', _JSON, (400, 422)),
            Request("wrong", f"{V1}/predict", "POST", b"{}", foreign, (403,)),
            Request("wrong", f"{V1}/nothing", expected=(404,)),
            Request("wrong", f"{V1}/predict", expected=(405,)),
            posted("wrong", "/predict", {"structures": [{"smiles": x} for x in wrong[:2]]}),
            posted("wrong", "/predict", {"structures": [{"smiles": "C"}] * 501}, expected=(413,)),
            _uploaded("wrong", "a.xlsx", b"PK\x03\x04 not a workbook", (400, 415, 422)),
        )
    )


def _uploaded(kind: str, name: str, content: bytes, expected: tuple[int, ...] = (200,)) -> Request:
    edge = "edge-of-a-long-day"
    head = f'--{edge}\r\ncontent-disposition: form-data; name="file"; filename="{name}"\r\n\r\n'
    body = head.encode() + content + f"\r\n--{edge}--\r\n".encode()
    headers = {"content-type": f"multipart/form-data; boundary={edge}"}
    return Request(kind, f"{V1}/file", "POST", body, headers, expected, complete=expected == (200,))


def _file(rng: Random) -> Request:
    rows = "".join(f"{s['id']},{s['smiles']}\n" for s in _list(rng, rng.randint(5, 100)))
    # now and then a column that makes the file too large to be held in memory while it arrives
    padding = "x" * 1_200_000 if rng.random() < 0.05 else "remark"
    return _uploaded("file", "acids.csv", f"id,smiles,remark\n{rows.splitlines()[0]},{padding}\n{rows}".encode())


def _stream(rng: Random) -> Request:
    return posted("stream", "/stream", {"structures": _list(rng, rng.choice((50, 200, 1000)))}, complete=True)


def _export(rng: Random) -> Request:
    rows = [{"id": s["id"], "smiles": s["smiles"], "structure": s["smiles"]} for s in _list(rng, rng.randint(1, 200))]
    return posted("export", "/export", {"format": rng.choice(("csv", "xlsx", "json", "sdf")), "rows": rows})


def _report(rng: Random) -> Request:
    decisions = [{"kind": "risk", "smiles": "CC(=O)O", "flips_at": 4.5}]
    return posted("report", "/report", {"structures": _list(rng, rng.randint(1, 5)), "decisions": decisions})


def _leaving(rng: Random) -> Request:
    leaves = rng.choice(("body", "question", "answer"))
    if leaves == "answer" or rng.random() < 0.5:
        return posted("leaving", "/stream", {"structures": _list(rng, 150)}, leaves=leaves)
    return posted("leaving", "/predict", {"structures": _list(rng, 20)}, leaves=leaves)


_KINDS: dict[str, tuple[Callable[[Random], Request], float]] = {
    "single": (_single, 320),
    "acid": (_acid, 120),
    "drawing": (_drawing, 285),
    "decision": (_decision, 20),
    "list": (_small, 50),
    "text": (_text, 30),
    "page": (_page, 50),
    "wrong": (_wrong, 80),
    "swap": (_swap, 20),
    "leaving": (_leaving, 10),
    "file": (_file, 4),
    "export": (_export, 6),
    "report": (_report, 2),
    "analogues": (_analogues, 2),
    "stream": (_stream, 1),
}
"""Each kind with its share of a thousand requests."""
