"""The server: who may ask, and a session for each tab that does.

It listens on this computer only and answers its own page only.
"""

from __future__ import annotations

import logging
import socket
import threading
import webbrowser
from collections.abc import Callable
from functools import partial
from pathlib import Path
from typing import TYPE_CHECKING, cast

import panel as pn
from bokeh.document import Document
from bokeh.io import curdoc
from bokeh.server.server import Server
from tornado.httputil import HTTPServerRequest
from tornado.web import RequestHandler

from app.autosave import Autosave
from app.figures.look import static_text, theme
from app.journal import Journal
from app.scenario import Scenario
from app.session import FIRST, SHEETS_BY_NAME, Session
from app.workspace import Solves, Workspace

if TYPE_CHECKING:
    from bokeh.server.contexts import BokehSessionContext

LOG = logging.getLogger(__name__)

ADDRESS = "127.0.0.1"
TITLE = "Halfspan"
LARGEST_MESSAGE = 22_000_000
"""Largest message from the browser [bytes]: an upload of 15 MB, in letters."""

REFRESH_MS = 3000
"""Between two looks at what other windows changed [ms]."""


def page(workspace: Workspace, document: Document) -> pn.viewable.Viewable:
    """Build one session's page.

    Parameters
    ----------
    workspace : Workspace
        What the sessions share.
    document : Document
        The session's; its address may name a working state.

    Returns
    -------
    Viewable
        The whole page.
    """
    start = workspace.start(_named_state(document))
    session = Session(
        start.scenario,
        workspace,
        later=document.add_timeout_callback,
        apart=partial(_apart, document),
        notice=start.trouble,
    )
    document.add_periodic_callback(session.refresh, REFRESH_MS)
    document.on_session_destroyed(lambda _context: session.end())
    return session.layout()


def _apart(document: Document, work: Callable[[], object], done: Callable[[object], None]) -> None:
    """Do what takes long in a thread of its own, then tell the session in its own time."""

    def run() -> None:
        found = work()
        document.add_next_tick_callback(lambda: done(found))

    threading.Thread(target=run, name="halfspan-apart", daemon=True).start()


def _named_state(document: Document) -> str:
    context = cast("BokehSessionContext | None", document.session_context)
    request = context.request if context is not None else None
    arguments = request.arguments if request is not None else {}
    values = arguments.get("state", [])
    return values[0].decode("ascii", "replace")[:100] if values else ""


def serve(
    scenario: Scenario | str | Path,
    *,
    port: int | None = None,
    open_browser: bool = True,
    ready: Callable[[str], None] | None = None,
    analysis: Solves | None = None,
    journal: str | Path | None = None,
    states: str | Path | None = None,
    file: str | Path | None = None,
) -> None:
    """Serve the notebook on this computer until it is stopped.

    Parameters
    ----------
    scenario : Scenario or str or pathlib.Path
        What to open, or its file.
    port : int, optional
        Port on 127.0.0.1; a free one unless given.
    open_browser : bool
        Open the system's browser on it.
    ready : callable, optional
        Called with the address once the server listens.
    analysis : Solves, optional
        Shared by all sessions, since it remembers; the real one unless given.
    journal : str or pathlib.Path, optional
        Folder of the snapshots; the user's own unless given.
    states : str or pathlib.Path, optional
        Folder of the working states; the user's own unless given.
    file : str or pathlib.Path, optional
        The scenario's file, which the page may save to; where `scenario` is a
        path, that file.

    Raises
    ------
    OSError
        If the port is in use or not allowed.
    ScenarioError
        If the file cannot be used.
    """
    if isinstance(scenario, Scenario):
        opened = scenario
    else:
        from app.scenario_file import read_scenario

        opened, file = read_scenario(scenario), scenario
    if analysis is None:
        from app.analysis.stages import Analysis

        analysis = Analysis()
    from app.version import version

    workspace = Workspace(
        opened,
        analysis,
        journal=Journal(journal, version=version()),
        autosave=Autosave(Path(states) if states is not None else None),
        file=Path(file) if file is not None else None,
    )
    server = make_server(workspace, port=port or 0)
    address = f"http://{ADDRESS}:{server.port}/"
    if ready is not None:
        ready(address)
    if open_browser:
        server.io_loop.add_callback(webbrowser.open, address)
    # While the browser starts: its first page then finds polars and wing solved.
    server.io_loop.add_callback(_solve_ahead, opened, analysis)
    try:
        server.io_loop.start()
    except KeyboardInterrupt:
        pass
    finally:
        server.stop()
        workspace.close()


def _solve_ahead(scenario: Scenario, analysis: Solves) -> None:
    try:
        analysis.run(scenario.freeze(), want=SHEETS_BY_NAME[FIRST].want)
    except Exception:
        # The page will run into it too, and say it.
        LOG.exception("solving ahead failed")


def make_server(workspace: Workspace, *, port: int) -> Server:
    """Make a server that listens but does not yet answer.

    Parameters
    ----------
    workspace : Workspace
        What the sessions share.
    port : int
        Port on 127.0.0.1; 0 for a free one.

    Returns
    -------
    Server
        Start its loop to serve.

    Raises
    ------
    OSError
        If the port is in use or not allowed.
    """
    pn.config.raw_css = [static_text("tokens.css")]
    # The page says it itself, in its own place.
    pn.config.disconnect_notification = ""

    def session() -> pn.viewable.Viewable:
        document = curdoc()
        document.theme = theme()
        document.config.notify_connection_status = False
        # A program started anew knows nothing of this page: a reload is the way back.
        document.config.reconnect_session = False
        return page(workspace, document)

    port = port or _free_port()
    server = pn.serve(  # type: ignore[no-untyped-call]
        session,
        port=port,
        address=ADDRESS,
        websocket_origin=f"{ADDRESS}:{port}",
        websocket_max_message_size=LARGEST_MESSAGE,
        show=False,
        start=False,
        title=TITLE,
        verbose=False,
    )
    _answer_only_to(server, f"{ADDRESS}:{port}")
    server.start()
    return cast(Server, server)


class _Elsewhere(RequestHandler):
    """The answer to a request that names another host: a foreign page may be behind it."""

    def prepare(self) -> None:
        self.set_status(403)
        self.finish(f"Halfspan answers at http://{self.settings['halfspan_host']}/ only.")


def _answer_only_to(server: Server, host: str) -> None:
    application = server._tornado
    find = application.find_handler
    application.settings["halfspan_host"] = host

    def find_own(request: HTTPServerRequest, **more: object) -> object:
        if request.headers.get("Host", "") != host:
            return application.get_handler_delegate(request, _Elsewhere)
        return find(request, **more)

    setattr(application, "find_handler", find_own)  # noqa: B010 - its one door


def _free_port() -> int:
    """Find a free port: it has to be known before, to name the one allowed origin."""
    with socket.socket() as probe:
        probe.bind((ADDRESS, 0))
        return int(probe.getsockname()[1])
