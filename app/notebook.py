"""The page: one session's life, and the server that gives it.

A session owns its own copy of the scenario. What the user does arrives as a
message; the scenario takes it or refuses it; what was taken is solved and shown
on the sheet that is open. Nothing else on the page calls the analysis.
"""

from __future__ import annotations

import logging
import socket
import webbrowser
from collections.abc import Callable, Mapping
from contextlib import AbstractContextManager
from pathlib import Path
from types import TracebackType
from typing import Any, Protocol, cast

import panel as pn
from bokeh.io import curdoc
from bokeh.server.server import Server

from app.analysis.results import Margin, Results
from app.components import FieldColumn, Footer, Message, Strip, Tabs
from app.figures.look import static_text, theme
from app.figures.station import Station
from app.inputs import Inputs
from app.page_state import field_groups, margin_tile, own_copy, refusal, station_words
from app.scenario import Scenario, field_list
from app.sheets.balance import BalanceSheet
from app.sheets.landing import LandingSheet
from app.sheets.section import SectionSheet
from app.sheets.sheet import Sheet
from app.sheets.speed import SpeedSheet
from app.sheets.wing import WingSheet
from solver.errors import InputError

LOG = logging.getLogger(__name__)

ADDRESS = "127.0.0.1"
TITLE = "Halfspan"
SHEETS: tuple[type[Sheet], ...] = (SectionSheet, WingSheet, BalanceSheet, SpeedSheet, LandingSheet)
SHEETS_BY_NAME = {kind.name: kind for kind in SHEETS}
FIRST = WingSheet.name
WRONG = (
    "Something inside went wrong with that change, and it was taken back: "
    "the plots show the last good result. The log file has the details."
)

NOTHING = "Something inside went wrong and nothing could be solved. The log file has the details."


class Solves(Protocol):
    """What the page needs of the analysis."""

    def run(self, inputs: Inputs, *, want: frozenset[str]) -> Results:
        """Solve one scenario."""


class Session:
    """One browser tab: its scenario, its sheets and what they show.

    Parameters
    ----------
    scenario : Scenario
        This session's own.
    analysis : Solves
        Turns inputs into results.
    """

    def __init__(self, scenario: Scenario, analysis: Solves) -> None:
        self.scenario, self.analysis = scenario, analysis
        self.fields = {field.name: field for field in field_list()}
        self.refused: dict[str, tuple[object, str]] = {}
        self.notice = ""
        self.chosen = ""
        self.results: Results | None = None
        self.sheets = {
            kind.name: kind(Station(self._say_station), lambda: _Guard(self)) for kind in SHEETS
        }
        self.open = self.sheets[FIRST]
        self.strip = Strip(self._strip_message, css_classes=["halfspan-strip"], **_WIDE)
        self.tabs = Tabs(
            self._tabs_message, names=list(self.sheets), active=self.open.name, **_WIDE
        )
        self.column = FieldColumn(self._column_message, sizing_mode="stretch_both")
        self.footer = Footer(css_classes=["halfspan-footer"], **_WIDE)
        self._show_groups()
        with _Guard(self):
            self._show(self._solve(self.open))

    def layout(self) -> pn.viewable.Viewable:
        """Give the page.

        Returns
        -------
        Viewable
            Strip over column and sheets, the cautions at the foot.
        """
        sheets = pn.Column(
            *(sheet.view for sheet in self.sheets.values()), **_box("halfspan-sheets")
        )
        main = pn.Column(self.tabs, sheets, **_box("halfspan-main"))
        return pn.Column(self.strip, self.column, main, self.footer, **_box("halfspan-root"))

    # What the user does

    def _column_message(self, message: Message) -> None:
        with _Guard(self):
            self._set(dict(message["values"]))

    def _strip_message(self, message: Message) -> None:
        with _Guard(self):
            self.chosen = str(message["open"])
            margin = self._margin(self.chosen)
            if margin is not None and margin.sheet in self.sheets:
                self._open(margin.sheet)
            self._show_strip()

    def _tabs_message(self, message: Message) -> None:
        with _Guard(self):
            if "sheet" in message:
                self._open(str(message["sheet"]))
            else:
                self.open.station.point_at(float(message["station"]))

    def _set(self, values: Mapping[str, object]) -> None:
        """Take values, or mark the field that cannot be taken and keep the rest.

        A value that was refused for another field's sake is tried again with
        every later change, so that the order of two changes does not matter.
        """
        waiting = {name: value for name, (value, _) in self.refused.items() if name not in values}
        for attempt in ({**waiting, **values}, dict(values)):
            try:
                self._try(attempt)
            except InputError as error:
                refused = error
                continue
            return
        self._refuse(refused, values)

    def _try(self, values: Mapping[str, object]) -> None:
        """Set, solve and show; when any of it fails, all is as it was before."""
        before, results = self.scenario.values(), self.results
        self.scenario.set_values(values)
        try:
            solved = self._solve(self.open)
        except Exception:
            self.scenario.set_values(before)
            raise
        for name in values:
            self.refused.pop(name, None)
        try:
            self._show(solved)
        except Exception:
            self.scenario.set_values(before)
            if results is not None:
                self._show(results)
            raise

    def _refuse(self, error: InputError, values: Mapping[str, object]) -> None:
        name = error.name if error.name in self.fields else next(iter(values))
        text = refusal(error, self.fields[name].label)
        for given in values:
            self.refused.pop(given, None)
        self.refused[name] = (values.get(name, error.value), text)
        self._show_fields()

    def _open(self, name: str) -> None:
        before, after = self.open, self.sheets[name]
        if after is before:
            return
        after.station.point_at(before.station.share, held=before.station.held)
        results = self._solve(after)
        self.open = after
        self._show(results)
        before.view.visible = False
        self.tabs.active = name
        self._show_groups()

    # What the page shows

    def _solve(self, sheet: Sheet) -> Results:
        return self.analysis.run(self.scenario.freeze(), want=sheet.want)

    def _show(self, results: Results) -> None:
        self.results, self.notice = results, ""
        self.open.station.update(results)
        self.open.update(results)
        self.open.view.visible = True
        self.footer.sentences = list(results.cautions)
        self._show_strip()
        self._show_fields()

    def _show_fields(self) -> None:
        self.column.state = {
            "values": self.scenario.values(),
            "refusals": {
                name: {"value": value, "text": text} for name, (value, text) in self.refused.items()
            },
        }

    def _show_strip(self) -> None:
        results, chosen = self.results, self._margin(self.chosen)
        margins = results.margins if results is not None else ()
        reason = results.reason if results is not None else ""
        self.strip.data = {
            "name": self.scenario.name,
            "note": self.scenario.note or self.scenario.author,
            "margins": [margin_tile(margin) for margin in margins],
            "chosen": self.chosen if chosen is not None else "",
            "reason_title": f"{chosen.label}:" if chosen is not None else "",
            "reason": chosen.reason if chosen is not None else reason,
            "notice": self.notice,
        }

    def fail(self) -> None:
        """Say that something went wrong; the plots keep the last good result."""
        self.notice = WRONG if self.results is not None else NOTHING
        self._show_strip()
        self._show_fields()

    def _margin(self, key: str) -> Margin | None:
        margins = self.results.margins if self.results is not None else ()
        return next((margin for margin in margins if margin.key == key), None)

    def _say_station(self) -> None:
        row = self.open.station.row
        if "y" not in row:
            return
        self.tabs.station = {"share": row["share"], "text": station_words(row)}

    def _show_groups(self) -> None:
        self.column.groups = field_groups(
            self.open.field_groups(), self.fields, self.scenario.section_names()
        )


class _Guard(AbstractContextManager[None]):
    """Turn an error in a callback into a sentence on the page."""

    def __init__(self, session: Session) -> None:
        self.session = session

    def __exit__(
        self,
        kind: type[BaseException] | None,
        error: BaseException | None,
        trace: TracebackType | None,
    ) -> bool:
        if not isinstance(error, Exception):
            return False
        LOG.error("a callback failed", exc_info=error)
        self.session.fail()
        return True


_WIDE: dict[str, Any] = {"sizing_mode": "stretch_width"}


def _box(name: str) -> dict[str, object]:
    return {
        "css_classes": [name],
        "stylesheets": [static_text("layout.css")],
        "sizing_mode": "stretch_both",
    }


def page(scenario: Scenario, analysis: Solves) -> pn.viewable.Viewable:
    """Build one session's page.

    Parameters
    ----------
    scenario : Scenario
        This session's own; see `own_copy`.
    analysis : Solves
        Turns inputs into results.

    Returns
    -------
    Viewable
        The whole page.
    """
    return Session(scenario, analysis).layout()


def serve(
    scenario: Scenario | str | Path,
    *,
    port: int | None = None,
    open_browser: bool = True,
    ready: Callable[[str], None] | None = None,
    analysis: Solves | None = None,
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

        opened = read_scenario(scenario)
    if analysis is None:
        from app.analysis.stages import Analysis

        analysis = Analysis()
    server = make_server(opened, port=port or 0, analysis=analysis)
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


def _solve_ahead(scenario: Scenario, analysis: Solves) -> None:
    try:
        analysis.run(scenario.freeze(), want=SHEETS_BY_NAME[FIRST].want)
    except Exception:
        # The page will run into it too, and say it.
        LOG.exception("solving ahead failed")


def make_server(scenario: Scenario, *, port: int, analysis: Solves) -> Server:
    """Make a server that listens but does not yet answer.

    Parameters
    ----------
    scenario : Scenario
        Every session begins with a copy of it.
    port : int
        Port on 127.0.0.1; 0 for a free one.
    analysis : Solves
        Shared by all sessions.

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

    def session() -> pn.viewable.Viewable:
        curdoc().theme = theme()
        return page(own_copy(scenario), analysis)

    port = port or _free_port()
    server = pn.serve(  # type: ignore[no-untyped-call]
        session,
        port=port,
        address=ADDRESS,
        websocket_origin=f"{ADDRESS}:{port}",
        show=False,
        start=False,
        title=TITLE,
        verbose=False,
    )
    server.start()
    return cast(Server, server)


def _free_port() -> int:
    """Find a free port: it has to be known before, to name the one allowed origin."""
    with socket.socket() as probe:
        probe.bind((ADDRESS, 0))
        return int(probe.getsockname()[1])
