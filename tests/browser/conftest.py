"""One server and one Chromium a test session; any console error fails the test."""

from __future__ import annotations

import os
import shutil
import subprocess
import sys
from collections.abc import Iterator
from dataclasses import dataclass, field
from pathlib import Path
from urllib.parse import urlsplit

import pytest
from playwright.sync_api import Browser, Page, expect, sync_playwright

ROOT = Path(__file__).resolve().parents[2]
SIZE = {"width": 1366, "height": 768}
ARGUMENTS = (
    "--headless",
    "--no-sandbox",
    "--disable-gpu",
    "--disable-quic",
    "--no-first-run",
    "--disable-background-networking",
    "--disable-component-update",
    "--disable-sync",
)
# Long, for a busy machine; nothing waits for it where all is well.
expect.set_options(timeout=20_000)
IDLE = "() => window.Bokeh && Bokeh.documents.length > 0 && Bokeh.documents[0].is_idle"


@dataclass
class Watch:
    """What a page did that it must not do."""

    address: str
    complaints: list[str] = field(default_factory=list)

    def attach(self, page: Page) -> None:
        """Listen to a page from its first request on."""
        page.on("console", self._console)
        page.on("pageerror", lambda error: self.complaints.append(f"script error: {error}"))
        page.on("request", self._request)
        page.on("websocket", lambda socket: self._host(socket.url))

    def _console(self, message: object) -> None:
        # Chromium's advice on how fast a canvas is read back is about the tests themselves.
        if message.type == "error" or ("[bokeh" in message.text and message.type == "warning"):
            self.complaints.append(f"console {message.type}: {message.text}")

    def _request(self, request: object) -> None:
        self._host(request.url)

    def _host(self, url: str) -> None:
        parts = urlsplit(url)
        if parts.scheme in ("blob", "data"):
            return
        if parts.netloc != urlsplit(self.address).netloc:
            self.complaints.append(f"request to another host: {url}")


def open_page(browser: Browser, address: str, watch: Watch, **context: object) -> Page:
    """Open the notebook and wait until its first sheet is painted."""
    page = browser.new_context(viewport=SIZE, **context).new_page()
    page.set_default_timeout(20_000)
    watch.attach(page)
    page.goto(address)
    page.wait_for_function(IDLE)
    page.get_by_role("tab", name="Wing", exact=True).wait_for()
    return page


@pytest.fixture(scope="session")
def chromium() -> str:
    """Path of a Chromium; the tests fail where there is none."""
    wanted = os.environ.get("CHROMIUM")
    names = ("chromium", "chromium-browser", "google-chrome")
    found = (wanted, "/usr/bin/chromium", *map(shutil.which, names))
    for path in found:
        if path and Path(path).is_file():
            return path
    pytest.fail(
        "No Chromium was found for the browser's tests: install Debian's chromium, "
        "or name another with the environment variable CHROMIUM.",
        pytrace=False,
    )


class Program:
    """The notebook as a program of its own, which can be killed and started again.

    Parameters
    ----------
    arguments : str
        Folder and port, or nothing.
    """

    def __init__(self, *arguments: str) -> None:
        self.process = subprocess.Popen(
            [sys.executable, "-m", "tests.browser.served_page", *arguments],
            cwd=ROOT,
            stdout=subprocess.PIPE,
            text=True,
            env={**os.environ, "OPENBLAS_NUM_THREADS": "1"},
        )
        self.address = self.process.stdout.readline().strip()
        assert self.address.startswith("http://127.0.0.1:"), "the notebook did not start; see above"

    def end(self, *, kill: bool = False) -> None:
        """End it, or kill it without a word of warning."""
        if kill:
            self.process.kill()
        else:
            self.process.terminate()
        self.process.wait(10)
        self.process.stdout.close()


@pytest.fixture(scope="session")
def address() -> Iterator[str]:
    """Address of a running notebook."""
    program = Program()
    try:
        yield program.address
    finally:
        program.end()


@pytest.fixture(scope="session")
def browser(chromium: str) -> Iterator[Browser]:
    """One browser for all tests, with a fresh profile."""
    with sync_playwright() as playwright:
        launched = playwright.chromium.launch(executable_path=chromium, args=list(ARGUMENTS))
        yield launched
        launched.close()


class Shared:
    """One open page that the tests hand on to each other."""

    def __init__(self, browser: Browser, address: str) -> None:
        self.browser, self.watch = browser, Watch(address)
        self.address, self.page = address, None

    def get(self) -> Page:
        """Give the page as it is, or a new one."""
        if self.page is None:
            self.page = open_page(self.browser, self.address, self.watch)
        return self.page

    def drop(self) -> None:
        """Close the page: the next test opens its own."""
        if self.page is not None:
            self.page.context.close()
        self.page = None
        self.watch.complaints.clear()


@pytest.fixture(scope="session")
def shared(browser: Browser, address: str) -> Iterator[Shared]:
    """Keep one page open between tests: opening costs seconds."""
    kept = Shared(browser, address)
    yield kept
    kept.drop()


@pytest.fixture
def page(shared: Shared, request: pytest.FixtureRequest) -> Iterator[Page]:
    """Give an open page; afterwards fail on errors and on foreign requests.

    A test leaves inputs as it found them; after a failure the page is closed.
    """
    failed = request.session.testsfailed
    yield shared.get()
    complaints = list(shared.watch.complaints)
    if complaints or request.session.testsfailed != failed:
        shared.drop()
    assert complaints == []
