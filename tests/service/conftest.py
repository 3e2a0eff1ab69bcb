"""A running service, a browser, and what decides whether a test of them can run."""

from __future__ import annotations

import os
import re
import shutil
import subprocess
import sys
import tarfile
import threading
from collections.abc import Iterator
from pathlib import Path
from typing import Any

import pytest

NEEDED = ("fastapi", "uvicorn", "jinja2", "python_multipart", "httpx")
CHROMIUM_ARGUMENTS = [
    "--no-sandbox", "--disable-gpu", "--disable-dev-shm-usage", "--disable-background-networking",
    "--disable-component-update", "--disable-sync", "--no-first-run", "--mute-audio",
]  # fmt: skip


def missing(reason: str) -> None:
    """Skip for want of a tool; in CI, which must bring it, fail."""
    if os.environ.get("CI"):
        pytest.fail(f"{reason}; .ci/run must bring it")
    pytest.skip(reason)


def need_module(name: str) -> Any:
    """The module, or a skip that says what to install."""
    try:
        return __import__(name, fromlist=["_"])
    except ImportError:
        missing(f"needs the Python package {name} (pip install 'qsar[page,test]')")


@pytest.fixture(scope="session")
def server(shipped_model: Path, checkout: Path) -> Iterator[str]:
    """Address of `acidity serve` with the shipped model, run as a user runs it."""
    for name in NEEDED:
        need_module(name)
    process = subprocess.Popen(
        [sys.executable, "-m", "qsar", "serve", "--port", "0", "--workers", "2"],
        stderr=subprocess.PIPE, text=True, cwd=checkout, env={**os.environ, "PYTHONPATH": str(checkout)},
    )  # fmt: skip
    assert process.stderr is not None
    line = process.stderr.readline()
    found = re.search(r"http://127\.0\.0\.1:\d+", line)
    if not found:
        process.kill()
        pytest.fail(f"acidity serve does not start: {line}{process.stderr.read()}")
    rest: list[str] = []
    reader = threading.Thread(target=lambda: rest.extend(process.stderr or ()), daemon=True)
    reader.start()
    yield found[0]
    process.terminate()
    assert process.wait(30) in (130, 0), "acidity serve does not end when asked to"
    reader.join(5)
    assert not rest or all("interrupted" in text for text in rest), f"acidity serve complained: {''.join(rest)}"


@pytest.fixture(scope="session")
def client(server: str) -> Iterator[Any]:
    """A client of the running service."""
    import httpx

    with httpx.Client(base_url=server, timeout=60) as session:
        session.get("/api/v1/about").raise_for_status()  # the processes have started
        yield session


@pytest.fixture(scope="session")
def chromium() -> Iterator[Any]:
    """A headless Chromium."""
    sync_api = need_module("playwright.sync_api")
    path = next((p for name in ("chromium", "chromium-browser") if (p := shutil.which(name))), None)
    if path is None:
        missing("needs chromium (Debian: apt-get install chromium)")
    with sync_api.sync_playwright() as playwright:
        browser = playwright.chromium.launch(executable_path=path, args=CHROMIUM_ARGUMENTS)
        yield browser
        browser.close()


class Console:
    """Whatever a page complains about."""

    def __init__(self) -> None:
        self.said: list[str] = []

    def listen(self, page: Any) -> None:
        page.on("console", self._message)
        page.on("pageerror", lambda problem: self.said.append(f"uncaught: {problem}"))
        page.on("requestfailed", self._failed)

    def _message(self, message: Any) -> None:
        if message.type in ("error", "warning"):
            self.said.append(f"{message.type}: {message.text}")

    def _failed(self, request: Any) -> None:
        if "ABORTED" not in str(request.failure):  # the page itself gives up what it no longer needs
            self.said.append(f"failed: {request.url} {request.failure}")


@pytest.fixture
def console() -> Iterator[Console]:
    """Fails the test on any error in the console of its pages."""
    listener = Console()
    yield listener
    assert not listener.said


@pytest.fixture
def open_page(chromium: Any, client: Any, server: str, console: Console) -> Iterator[Any]:
    """Opens pages of the service; their console errors fail the test."""
    contexts = []

    def opened(address: str = "", *, width: int = 1280, height: int = 900, scheme: str = "light") -> Any:
        context = chromium.new_context(
            viewport={"width": width, "height": height}, color_scheme=scheme, reduced_motion="reduce"
        )
        contexts.append(context)
        page = context.new_page()
        page.set_default_timeout(20_000)
        page.server = server
        console.listen(page)
        page.goto(f"{server}/{address}")
        return page

    yield opened
    for context in contexts:
        context.close()


@pytest.fixture(scope="session")
def axe(tmp_path_factory: pytest.TempPathFactory) -> str:
    """Source of axe-core: from AXE_CORE, else from npm in CI or where npm has it at hand."""
    given = os.environ.get("AXE_CORE")
    if given:
        return Path(given).read_text(encoding="utf-8")
    npm = shutil.which("npm")
    if npm is None or not os.environ.get("CI"):
        missing("needs axe-core: name its axe.min.js in AXE_CORE (npm pack axe-core), or set CI")
    folder = tmp_path_factory.mktemp("axe")
    subprocess.run([str(npm), "pack", "--silent", "axe-core"], cwd=folder, check=True, capture_output=True, timeout=120)
    with tarfile.open(next(folder.glob("axe-core-*.tgz"))) as archive:
        member = archive.extractfile("package/axe.min.js")
        assert member is not None
        return member.read().decode("utf-8")
