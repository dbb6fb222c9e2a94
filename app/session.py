"""One browser tab: its scenario, its sheets and what they show.

What the user does arrives as a message; the scenario takes it or refuses it;
what was taken is solved, shown on the sheet that is open, noted for undo and
kept. Nothing else on the page calls the analysis.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator, Mapping, Sequence
from contextlib import AbstractContextManager, contextmanager
from typing import Any

import panel as pn

from app.analysis.results import Margin, Results
from app.components import FieldColumn, Footer, Message, Strip, Tabs
from app.figures.look import static_text
from app.figures.station import Station
from app.header import Header
from app.history import History, State, apply, state_of
from app.journal import Journal, JournalError
from app.keeper import Keeper, Later
from app.page_guard import PageGuard
from app.page_state import field_groups, margin_tile, refusal, station_words
from app.scenario import Scenario, field_list
from app.sheets.balance import BalanceSheet
from app.sheets.journal import JournalSheet
from app.sheets.landing import LandingSheet
from app.sheets.section import SectionSheet
from app.sheets.sheet import Sheet
from app.sheets.speed import SpeedSheet
from app.sheets.wing import WingSheet
from app.workspace import Workspace
from solver.errors import InputError

SHEETS: tuple[type[Sheet], ...] = (SectionSheet, WingSheet, BalanceSheet, SpeedSheet, LandingSheet)
SHEETS_BY_NAME = {kind.name: kind for kind in SHEETS}
FIRST = WingSheet.name
WRONG = (
    "Something inside went wrong with that change, and it was taken back: "
    "the plots show the last good result. The log file has the details."
)

NOTHING = "Something inside went wrong and nothing could be solved. The log file has the details."


Apart = Callable[[Callable[[], object], Callable[[Any], None]], object]


def _at_once(work: Callable[[], object], done: Callable[[Any], None]) -> None:
    done(work())


class Session:
    """One browser tab.

    Parameters
    ----------
    scenario : Scenario
        This session's own.
    workspace : Workspace
        What it shares with the others.
    later : callable, optional
        Calls something after so many milliseconds, in this session.
    apart : callable
        Does what takes long beside the session, then hands it what came of it.
    notice : str
        What to say at the start.
    """

    def __init__(
        self,
        scenario: Scenario,
        workspace: Workspace,
        *,
        later: Later | None = None,
        apart: Apart = _at_once,
        notice: str = "",
    ) -> None:
        self.scenario, self.workspace = scenario, workspace
        self.analysis, self.apart = workspace.analysis, apart
        self.fields = {field.name: field for field in field_list()}
        self.refused: dict[str, tuple[object, str]] = {}
        self.notice = ""
        self.chosen = ""
        self.results: Results | None = None
        self.history = History(state_of(scenario))
        self.sheets: dict[str, Sheet] = {
            kind.name: kind(Station(self._say_station), self.guard) for kind in SHEETS
        }
        self.kept = JournalSheet(Station(self._say_station), self.guard, self)
        self.sheets[self.kept.name] = self.kept
        self.open = self.sheets[FIRST]
        self.strip = Strip(self._strip_message, css_classes=["halfspan-strip"], **_WIDE)
        self.keeper = Keeper(workspace, scenario, later=later, told=self._told)
        self.header = Header(self)
        self.tabs = Tabs(
            self._tabs_message, names=list(self.sheets), active=self.open.name, **_WIDE
        )
        self.column = FieldColumn(self._column_message, sizing_mode="stretch_both")
        self.footer = Footer(css_classes=["halfspan-footer"], **_WIDE)
        self._show_groups()
        with self.guard():
            self._show(self.solve(self.scenario, self.open.want))
        if notice:
            self.say(notice)
        self.keeper.touch()

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

    def guard(self) -> AbstractContextManager[None]:
        """Make what every callback runs under."""
        return PageGuard(self)

    def end(self) -> None:
        """Take note that the tab was closed."""
        self.workspace.leave(self.keeper)

    # What the user does

    def _column_message(self, message: Message) -> None:
        with self.guard():
            self._set(dict(message["values"]))

    def _strip_message(self, message: Message) -> object:
        with self.guard():
            if "open" not in message:
                return self.header.take(message)
            self.chosen = str(message["open"])
            margin = self._margin(self.chosen)
            if margin is not None and margin.sheet in self.sheets:
                self._open(margin.sheet)
            self._show_strip()
        return None

    def _tabs_message(self, message: Message) -> None:
        with self.guard():
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
        def taken() -> None:
            for name in values:
                self.refused.pop(name, None)

        self.change(lambda: self.scenario.set_values(values), solved=taken)

    def change(
        self, make: Callable[[], object], *, solved: Callable[[], object] = lambda: None
    ) -> None:
        """Change the scenario, solve and show; when any of it fails, all is as it was.

        Parameters
        ----------
        make : callable
            Changes the scenario.
        solved : callable
            Called when that is solved, before it is shown.

        Raises
        ------
        InputError
            If a value cannot be taken.
        """
        self._change(make, solved)
        self.history.record(state_of(self.scenario))
        self._changed()

    def step(self, by: int) -> None:
        """Undo or do again.

        Parameters
        ----------
        by : int
            Steps forward; negative to go back.
        """
        for _ in range(abs(by)):
            state = self.history.redo() if by > 0 else self.history.undo()
            if state is None:
                break
            try:
                self.become(state)
            except Exception:
                _ = self.history.undo() if by > 0 else self.history.redo()
                raise
        self._changed()

    def become(self, state: State) -> None:
        """Bring the scenario into a state and show it; it is not noted for undo."""
        names = self.scenario.section_names()
        self._change(lambda: apply(state, self.scenario), self.refused.clear)
        if names != self.scenario.section_names():
            self._show_groups()

    def replace(self, scenario: Scenario) -> None:
        """Take over everything another scenario holds, as one step that can be undone."""
        state = state_of(scenario)
        self.history.break_step()
        self.become(state)
        if self.workspace.file is None:
            # The comments of an opened file stay with it.
            self.scenario.source_text = scenario.source_text
        self.history.record(state_of(self.scenario))
        self.history.break_step()
        self._changed()

    @property
    def journal(self) -> Journal:
        """The journal of all sessions."""
        return self.workspace.journal

    @property
    def journal_messages(self) -> list[str]:
        """What was said about the files of the journal."""
        return self.workspace.journal_messages

    def restore(self, scenario: Scenario, said: str) -> None:
        """Take over a scenario from the journal, and say so."""
        with _said_of(scenario):
            self.replace(scenario)
        self.keeper.saved_to_journal()
        self.header.say(said)

    def solve_kept(self, scenario: Scenario, want: frozenset[str]) -> Results:
        """Solve a scenario from the journal."""
        with _said_of(scenario):
            return self.solve(scenario, want)

    def report(self, pairs: Sequence[tuple[Scenario, Results]]) -> dict[str, object] | None:
        """Write a report that compares."""
        return self.header.report(pairs)

    def refresh(self) -> None:
        """Look whether another window changed what is on the open sheet."""
        if self.open is self.kept:
            with self.guard():
                self.kept.refresh()

    def _change(self, make: Callable[[], object], solved: Callable[[], object]) -> None:
        before, results = state_of(self.scenario), self.results
        try:
            make()
            found = self.solve(self.scenario, self.open.want)
        except Exception:
            apply(before, self.scenario)
            raise
        solved()
        try:
            self._show(found)
        except Exception:
            apply(before, self.scenario)
            if results is not None:
                self._show(results)
            raise

    def _changed(self) -> None:
        self.keeper.touch()
        self.header.say("")

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
        results = self.solve(self.scenario, after.want)
        self.open = after
        self._show(results)
        before.view.visible = False
        self.tabs.active = name
        self._show_groups()

    # What the page shows

    def solve(self, scenario: Scenario, want: frozenset[str]) -> Results:
        """Solve a scenario, this session's or another."""
        return self.analysis.run(scenario.freeze(), want=want)

    def _show(self, results: Results) -> None:
        self.results, self.notice = results, ""
        self.open.station.update(results)
        self.open.update(results)
        self.open.view.visible = True
        oddities = [one.sentence for one in self.scenario.oddities()]
        self.footer.sentences = [*oddities, *results.cautions]
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
            "margins": [margin_tile(margin) for margin in margins],
            "chosen": self.chosen if chosen is not None else "",
            "reason_title": f"{chosen.label}:" if chosen is not None else "",
            "reason": chosen.reason if chosen is not None else reason,
            "notice": self.notice,
        }

    def say(self, notice: str) -> None:
        """Say a sentence of trouble in the strip until something changes."""
        self.notice = notice
        self._show_strip()

    def fail(self) -> None:
        """Say that something went wrong; the plots keep the last good result."""
        self.say(WRONG if self.results is not None else NOTHING)
        self._show_fields()

    def _told(self, digest: str, trouble: str) -> None:
        self.strip.digest = digest
        if trouble:
            self.say(trouble)
        self.header.show()

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


@contextmanager
def _said_of(scenario: Scenario) -> Iterator[None]:
    """Say what the analysis refuses as a trouble of the journal."""
    try:
        yield
    except InputError as error:
        raise JournalError(f"“{scenario.name}” cannot be solved: {error}.") from error


_WIDE: dict[str, Any] = {"sizing_mode": "stretch_width"}


def _box(name: str) -> dict[str, object]:
    return {
        "css_classes": [name],
        "stylesheets": [static_text("layout.css")],
        "sizing_mode": "stretch_both",
    }
