"""How long the page takes to show itself, and to show a slider step.

A warm start is the second opening of a running notebook: the first one pays for
imports and section tables. A step is a key pressed on a slider, until the plots of
the open sheet hold the new numbers and bokeh has nothing left to paint.
"""

from __future__ import annotations

import os
import shutil
import socket
import statistics
import subprocess
import sys
import time
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path

from playwright.sync_api import Browser, Page, sync_playwright

from tests.browser.conftest import ARGUMENTS, IDLE, SIZE

ROOT = Path(__file__).resolve().parents[2]
STEPS = 15
SHEETS = ("Section", "Wing", "Balance", "Speed and battery", "Launch and landing")
SLIDER = "mass_kg"
SETTLED = "() => !window.halfspanFlying && Bokeh.documents[0].is_idle"
LISTEN = """() => {
  window.answers = 0
  window.addEventListener("halfspan-solving", (event) => {
    if (event.detail === "ready") window.answers += 1
  })
}"""
ANSWERED = """(before) => window.answers > before && !window.halfspanFlying
  && Bokeh.documents[0].is_idle"""


def _free_port() -> int:
    with socket.socket() as probe:
        probe.bind(("127.0.0.1", 0))
        return int(probe.getsockname()[1])


@contextmanager
def notebook() -> Iterator[str]:
    """Run a notebook; gives its address."""
    program = subprocess.Popen(
        [sys.executable, "-m", "app.cli", "--no-browser", "--port", str(_free_port())],
        cwd=ROOT,
        stdout=subprocess.PIPE,
        text=True,
        env={**os.environ, "PYTHONUNBUFFERED": "1"},
    )
    try:
        line = program.stdout.readline() if program.stdout else ""
        yield next(word for word in line.split() if word.startswith("http://"))
    finally:
        program.terminate()
        program.wait(10)


@contextmanager
def chromium() -> Iterator[Browser]:
    """Start a browser with a fresh profile."""
    path = os.environ.get("CHROMIUM") or shutil.which("chromium")
    with sync_playwright() as playwright:
        browser = playwright.chromium.launch(executable_path=path, args=list(ARGUMENTS))
        yield browser
        browser.close()


def _opened(browser: Browser, address: str) -> tuple[Page, float]:
    page = browser.new_context(viewport=SIZE).new_page()
    started = time.perf_counter()
    page.goto(address)
    page.wait_for_function(IDLE)
    page.get_by_role("tab", name="Wing", exact=True).wait_for()
    page.wait_for_function(SETTLED)
    return page, time.perf_counter() - started


def _step_ms(page: Page) -> float:
    slider = page.locator(f"input[type=range][data-name={SLIDER}]")
    slider.focus()
    before = page.evaluate("() => window.answers")
    started = time.perf_counter()
    page.keyboard.press("ArrowRight")
    page.wait_for_function(ANSWERED, arg=before)
    return 1e3 * (time.perf_counter() - started)


def measure() -> dict[str, float]:
    """First and warm paint in seconds, and the median step on each sheet in ms.

    Returns
    -------
    dict
        ``first_paint_s``, ``warm_paint_s`` and ``step_ms / SHEET``.
    """
    found = {}
    with notebook() as address, chromium() as browser:
        page, found["first_paint_s"] = _opened(browser, address)
        page.close()
        page, found["warm_paint_s"] = _opened(browser, address)
        page.evaluate(LISTEN)
        for sheet in SHEETS:
            page.get_by_role("tab", name=sheet, exact=True).click()
            page.wait_for_function(SETTLED)
            _step_ms(page)
            found[f"step_ms / {sheet}"] = statistics.median(_step_ms(page) for _ in range(STEPS))
    return found
