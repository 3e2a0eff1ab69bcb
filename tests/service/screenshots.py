"""Draws the main states of the page anew: ``python tests/service/screenshots.py [FOLDER]`` (default: reports)."""

from __future__ import annotations

import io
import os
import re
import shutil
import subprocess
import sys
from collections.abc import Callable
from pathlib import Path
from typing import Any

CHECKOUT = Path(__file__).resolve().parents[2]


def steps(page: Any) -> None:
    for place, group in (("para: H", "NO2"), ("meta: H", "Cl"), ("meta: chloro", "OCH3")):
        page.wait_for_selector(".flag")
        page.get_by_label("Place", exact=True).select_option(label=place)
        before = page.locator(".trail li").count()
        page.locator(".group", has_text=re.compile(f"^{group}$")).click()
        page.locator(f".trail li:nth-child({max(before, 1) + 1})").wait_for()
        page.wait_for_timeout(700)
    page.get_by_label("Place", exact=True).select_option(label="ortho: H")


def try_all(page: Any) -> None:
    page.get_by_label("Place", exact=True).select_option(label="meta: H")
    page.get_by_label("pKa from").fill("2")
    page.get_by_label("to", exact=True).fill("2.4")
    page.get_by_role("button", name="Try all here").click()
    page.wait_for_selector(".all li")


def paste(page: Any) -> None:
    lines = ["OC(=O)c1ccccc1O", "OC(=O)CC(=O)O", "OC(=O)C(F)(F)F", "OC(=O)c1ccc(SC)cc1Br", "nonsense", "NCC(=O)O"]
    page.get_by_label("Acids: SMILES").fill("\n".join(f"{s} invented {i}" for i, s in enumerate(lines, start=1)))
    page.get_by_role("button", name="Predict").click()
    page.wait_for_selector("tbody tr a")


def neighbour(page: Any) -> None:
    page.locator(".tick:not(.own)").first.focus()


SHOTS: list[tuple[str, str, int, int, str, Callable[[Any], None] | None]] = [
    ("start", "", 1280, 800, "light", None),
    ("acid", "#/acid?s=OC(%3DO)c1ccccc1O", 1280, 1250, "light", neighbour),
    ("acid_narrow_dark", "#/acid?s=OC(%3DO)CC(O)(CC(%3DO)O)C(%3DO)O&k=2", 390, 1500, "dark", None),
    ("trail", "#/acid?s=OC(%3DO)c1ccccc1", 1280, 1500, "light", steps),
    ("try_all", "#/acid?s=OC(%3DO)c1ccccc1O", 1280, 1300, "dark", try_all),
    ("many", "#/many", 1280, 1150, "light", paste),
    ("many_narrow", "#/many", 390, 1200, "light", paste),
    ("base", "#/decide?kind=base&s=OC(%3DO)c1ccc(Br)c(SC)c1&go=1", 1280, 1400, "light", None),
    ("window_narrow_dark", "#/decide?kind=window&s=OC(%3DO)c1ccccc1&other_smiles=CCCCCCCC(%3DO)O&go=1",
     390, 1800, "dark", None),
    ("buffer", "#/decide?kind=buffer&s=OC(%3DO)c1cccc(Br)c1F&ph=3&go=1", 1280, 1000, "dark", None),
    ("risk", "#/decide?kind=risk&s=OC(%3DO)c1cccc(Br)c1F&flips_at=3&go=1", 1280, 800, "light", None),
    ("failed", "#/acid?s=CCO", 1280, 500, "light", None),
]  # fmt: skip


def small(png: bytes) -> bytes:
    """The same picture with 128 colours, which a page of flat colours does not miss."""
    from PIL import Image

    held = io.BytesIO()
    Image.open(io.BytesIO(png)).convert("RGB").quantize(128, dither=Image.Dither.NONE).save(held, "PNG", optimize=True)
    return held.getvalue()


def main(folder: Path) -> None:
    from playwright.sync_api import sync_playwright

    server = subprocess.Popen(
        [sys.executable, "-m", "qsar", "serve", "--port", "0"],
        stderr=subprocess.PIPE, text=True, cwd=CHECKOUT, env={**os.environ, "PYTHONPATH": str(CHECKOUT)},
    )  # fmt: skip
    try:
        assert server.stderr is not None
        line = server.stderr.readline()
        address = re.search(r"http://[\d.:]+", line)
        if address is None:
            raise SystemExit(line)
        with sync_playwright() as playwright:
            path = shutil.which("chromium") or shutil.which("chromium-browser")
            browser = playwright.chromium.launch(executable_path=path, args=["--no-sandbox", "--disable-gpu"])
            for name, fragment, width, height, scheme, act in SHOTS:
                page = browser.new_page(
                    viewport={"width": width, "height": height}, color_scheme=scheme, reduced_motion="reduce"
                )
                page.goto(f"{address[0]}/{fragment}")
                page.wait_for_selector("h1, h2, [role=alert]")
                page.wait_for_timeout(2500)
                if act is not None:
                    act(page)
                    page.wait_for_timeout(800)
                (folder / f"page_{name}.png").write_bytes(small(page.screenshot()))
                page.close()
            browser.close()
    finally:
        server.terminate()
        server.wait(20)


if __name__ == "__main__":
    main(Path(sys.argv[1]) if len(sys.argv) > 1 else CHECKOUT / "reports")
