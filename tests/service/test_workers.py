"""One structure or file that hangs, or kills its process, costs its own answer only."""

from __future__ import annotations

import json
import threading
import time
from collections.abc import Iterator
from typing import Any

import pytest
from service.conftest import NEEDED, need_module
from service.slow_tasks import ENDS_PROCESS, FAILS, HANGS, HANGS_OVER_CONTRIBUTIONS


@pytest.fixture(scope="module")
def slow() -> Iterator[Any]:
    """A service with a short time limit whose tasks misbehave on request."""
    for name in NEEDED:
        need_module(name)
    from fastapi.testclient import TestClient

    from qsar.service.app import create_app
    from qsar.service.settings import Settings

    settings = Settings(
        hosts=("testserver",), seconds=0.5, file_seconds=1.0, tasks="service.slow_tasks", slow_rows=1, max_waiting=4
    )
    with TestClient(create_app(settings)) as client:
        yield client


def lines(answer: Any) -> list[dict[str, Any]]:
    return [json.loads(line) for line in answer.text.splitlines()]


def test_a_structure_that_hangs_is_stopped_and_others_are_answered_meanwhile(slow: Any) -> None:
    hanging: list[Any] = []
    thread = threading.Thread(target=lambda: hanging.append(slow.get("/api/v1/acid", params={"smiles": HANGS})))
    thread.start()
    answered = 0
    while thread.is_alive():
        answer = slow.get("/api/v1/acid", params={"smiles": "CC(=O)O"})
        assert answer.status_code == 200
        answered += 1
        time.sleep(0.02)
    thread.join()
    assert answered > 3
    assert hanging[0].status_code == 503
    assert "longer than 0.5 seconds" in hanging[0].json()["detail"]


def test_the_stopped_process_is_replaced(slow: Any) -> None:
    workers = slow.app.state.workers
    before = workers.replaced
    slow.get("/api/v1/acid", params={"smiles": HANGS})
    assert workers.replaced == before + 2  # once with contributions, once without
    for _ in range(200):
        if workers.busy == 0:
            break
        time.sleep(0.05)
    assert workers.busy == 0 and len(workers._all) == workers.size


def test_an_acid_whose_contributions_take_too_long_is_answered_without_them(slow: Any) -> None:
    answer = slow.get("/api/v1/acid", params={"smiles": HANGS_OVER_CONTRIBUTIONS})
    assert answer.status_code == 200 and answer.json()["smiles"] == HANGS_OVER_CONTRIBUTIONS


def test_a_process_that_dies_is_said_and_replaced(slow: Any) -> None:
    answer = slow.get("/api/v1/acid", params={"smiles": ENDS_PROCESS})
    assert answer.status_code == 503 and "was ended" in answer.json()["detail"]
    assert slow.get("/api/v1/acid", params={"smiles": "CC(=O)O"}).status_code == 200


def test_an_error_of_the_program_is_said_without_a_traceback(slow: Any) -> None:
    answer = slow.get("/api/v1/acid", params={"smiles": FAILS})
    assert answer.status_code == 500
    assert answer.json() == {"detail": "an error of the program (ArithmeticError: made to fail)"}


def test_a_hanging_row_of_a_list_is_unusable_and_the_other_rows_are_answered(slow: Any) -> None:
    structures = [{"id": str(i), "smiles": HANGS if i == 3 else "CC(=O)O"} for i in range(6)]
    events = lines(slow.post("/api/v1/stream", json={"structures": structures}))
    rows = [row for event in events for row in event.get("rows", ())]
    assert [row["id"] for row in rows] == ["0", "1", "2", "3", "4", "5"]
    assert [row["domain"] for row in rows] == ["inside"] * 3 + ["unusable"] + ["inside"] * 2
    assert "longer than" in rows[3]["reasons"]
    assert events[-1] == {"event": "end", "done": 6}


def test_a_list_of_hanging_rows_is_given_up(slow: Any) -> None:
    events = lines(slow.post("/api/v1/stream", json={"structures": [{"smiles": HANGS}] * 4}))
    assert events[-1]["event"] == "failed"
    assert "took too long" in events[-1]["detail"]


def test_a_file_that_cannot_be_read_in_time_is_refused(slow: Any) -> None:
    answer = slow.post("/api/v1/file", files={"file": ("a.smi", b"hang")})
    assert answer.status_code == 503 and "longer than 1 seconds" in answer.json()["detail"]
    assert slow.get("/api/v1/acid", params={"smiles": "CC(=O)O"}).status_code == 200


def test_long_lists_leave_a_process_for_short_questions(slow: Any) -> None:
    structures = {"structures": [{"smiles": HANGS}] * 2}
    threads = [threading.Thread(target=lambda: slow.post("/api/v1/stream", json=structures)) for _ in range(3)]
    for thread in threads:
        thread.start()
    answers = [slow.get("/api/v1/acid", params={"smiles": "CC(=O)O"}).status_code for _ in range(20)]
    still_at_work = any(thread.is_alive() for thread in threads)
    for thread in threads:
        thread.join()
    assert answers == [200] * 20
    assert still_at_work, "the lists ended before the short questions were asked"


def test_too_many_at_once_are_told_so(slow: Any) -> None:
    codes: list[int] = []
    ask = lambda: codes.append(slow.get("/api/v1/acid", params={"smiles": HANGS}).status_code)  # noqa: E731
    threads = [threading.Thread(target=ask) for _ in range(6)]
    for thread in threads:
        thread.start()
    workers = slow.app.state.workers
    for _ in range(100):
        if workers.waiting == 4:
            break
        time.sleep(0.01)
    refused = slow.get("/api/v1/acid", params={"smiles": "CC(=O)O"})
    for thread in threads:
        thread.join()
    assert refused.status_code == 503
    assert "too many requests" in refused.json()["detail"]
    assert codes == [503] * 6
