"""Journal: what was kept, found again, brought back, and laid side by side."""

from __future__ import annotations

import base64
import binascii
import re
from collections.abc import Callable, Mapping, Sequence
from typing import Any, Protocol

import panel as pn

from app.analysis.results import Results
from app.components import ComparisonTable, JournalList, Message
from app.figures import words
from app.figures.look import static_text
from app.figures.overlay_plots import COLOURS, DASHES, LETTERS, Overlay, overlays
from app.figures.station import Station
from app.journal import Journal, JournalError, Snapshot, search
from app.journal_compare import MOST, Column, Comparison, column_now, column_of, compare
from app.journal_exchange import LARGEST_UPLOAD, Imported, export_all, export_one, import_into
from app.journal_snapshot import KeyFigure
from app.page_words import clock, download
from app.scenario import Scenario
from app.sheets.sheet import Guard, Sheet

Answer = dict[str, object] | None

MOST_SHOWN = 100
"""Snapshots listed at once; a search finds the others."""

NOW = "now"
"""Stands for what is on the page where snapshots are named."""

_PATH = re.compile(r'd="(M-?[0-9. L-]{0,4000}Z)"')


class Desk(Protocol):
    """What the sheet needs of its session."""

    scenario: Scenario

    @property
    def journal(self) -> Journal:
        """The journal of all sessions."""

    @property
    def journal_messages(self) -> list[str]:
        """What was said about its files; a damaged one is set aside only once."""

    def solve_kept(self, scenario: Scenario, want: frozenset[str]) -> Results:
        """Solve a scenario; a `JournalError` says why it cannot be."""

    def restore(self, scenario: Scenario, said: str) -> None:
        """Take a scenario over as one step, and say so; else a `JournalError`."""

    def report(self, pairs: Sequence[tuple[Scenario, Results]]) -> Answer:
        """Write a report that compares."""


class JournalSheet(Sheet):
    """The list of snapshots; or two to six of them side by side.

    Parameters
    ----------
    station : Station
        As every sheet has one.
    guard : callable
        Makes what each callback runs under.
    desk : Desk
        The session.
    """

    name = "Journal"

    def __init__(self, station: Station, guard: Guard, desk: Desk) -> None:
        super().__init__(station, guard)
        self.desk = desk
        self.words = ""
        self.compared: list[tuple[Scenario, Results]] = []
        self.deleted: tuple[str, str] | None = None
        self.listed: dict[str, Snapshot] = {}
        self.list = JournalList(self._take, sizing_mode="stretch_width")
        self.table = ComparisonTable(self._beside, sizing_mode="stretch_width")
        self.overlays: tuple[Overlay, ...] = ()
        box: dict[str, Any] = {
            "stylesheets": [static_text("layout.css")],
            "sizing_mode": "stretch_width",
        }
        self.listing = pn.Column(self.list, **box)
        self.comparing = pn.Column(self.table, self.grid, visible=False, **box)
        self._actions: dict[str, Callable[[Any], Answer]] = {
            "search": self._search,
            "restore": self._restore,
            "rename": self._rename,
            "remove": self._remove,
            "undelete": self._undelete,
            "export": self._export,
            "export_all": self._export_all,
            "import": self._import,
            "compare": self._compare,
        }

    def update(self, results: Results) -> None:
        """Show the list as it is now."""
        self.results = results
        if self.listing not in self.view.objects:
            self.view.objects = [self.listing, self.comparing]
        self.refresh()

    def numbers(self, results: Results) -> list[dict[str, object]]:
        """Give none: a comparison is its own table."""
        return []

    def refresh(self) -> None:
        """Read the journal again: another window may have changed it."""
        journal = self.desk.journal
        try:
            listing = journal.list()
        except JournalError as error:
            self._show((), 0, str(error))
            return
        # A damaged file is set aside once; what was said about it stays.
        said = self.desk.journal_messages
        said += [one for one in listing.messages if one not in said]
        self.listed = {one.id: one for one in listing.snapshots}
        self._show(search(listing.snapshots, self.words), len(listing.snapshots), "")

    def _show(self, found: tuple[Snapshot, ...], count: int, trouble: str) -> None:
        state = {
            "folder": str(self.desk.journal.folder.absolute()),
            "largest": LARGEST_UPLOAD,
            "most": MOST,
            "count": count,
            "found": len(found),
            "words": self.words,
            "snapshots": [_row(one) for one in found[:MOST_SHOWN]],
            "messages": [*([trouble] if trouble else []), *self.desk.journal_messages[-5:]],
            "deleted": {"id": self.deleted[0], "name": self.deleted[1]} if self.deleted else None,
        }
        if state != self.list.state:
            self.list.state = state

    # What the user does

    def _take(self, message: Message) -> Answer:
        with self.guard():
            action = next(name for name in self._actions if name in message)
            try:
                answer = self._actions[action](message[action])
            except JournalError as error:
                answer = {"problem": str(error)}
            if action != "compare":
                self.refresh()
            return answer
        return {"problem": "Something inside went wrong. The log file has the details."}

    def _search(self, words_given: object) -> Answer:
        self.words = str(words_given)[:200]
        return None

    def _find(self, snapshot_id: object) -> Snapshot:
        return self.desk.journal.get(str(snapshot_id))

    def _restore(self, snapshot_id: object) -> Answer:
        snapshot = self._find(snapshot_id)
        self.desk.restore(
            self.desk.journal.restore(snapshot),
            f"Restored “{snapshot.name}”; Undo brings back what was here.",
        )
        return {}

    def _rename(self, given: Mapping[str, object]) -> Answer:
        listed = self.listed.get(str(given["id"])) or self._find(given["id"])
        note = str(given["note"]).replace("\r\n", "\n").strip()
        self.desk.journal.rename(listed, name=str(given["name"]), note=note)
        return {}

    def _remove(self, snapshot_id: object) -> Answer:
        snapshot = self._find(snapshot_id)
        self.deleted = (self.desk.journal.delete(snapshot), snapshot.name)
        return {}

    def _undelete(self, deleted_id: object) -> Answer:
        self.desk.journal.bring_back(str(deleted_id))
        self.deleted = None
        return {}

    def _export(self, snapshot_id: object) -> Answer:
        return download(*export_one(self._find(snapshot_id)))

    def _export_all(self, _given: object) -> Answer:
        found = self.desk.journal.list().snapshots
        return download("Halfspan-journal.zip", export_all(found))

    def _import(self, given: Mapping[str, object]) -> Answer:
        letters = str(given["data"])
        if len(letters) > LARGEST_UPLOAD * 4 // 3 + 4:
            raise JournalError(f"At most {LARGEST_UPLOAD / 1e6:g} MB can be taken in at once.")
        try:
            data = base64.b64decode(letters, validate=True)
        except binascii.Error as error:
            raise JournalError("The file did not arrive whole; try again.") from error
        came = import_into(self.desk.journal, data, file=str(given["name"])[:200])
        self.desk.journal_messages.extend(came.messages)
        return {"said": _came(came)}

    def _compare(self, ids: object) -> Answer:
        wanted = [str(one) for one in ids] if isinstance(ids, list) else []
        columns: list[Column] = []
        pairs: list[tuple[Scenario, Results]] = []
        times: list[str] = []
        for one in wanted[: MOST + 1]:
            scenario, name, when, figures = self._chosen(one)
            solved = self.desk.solve_kept(scenario, frozenset({"sweep"}))
            pairs.append((scenario.copy(), solved))
            times.append(when)
            columns.append(figures or column_now(scenario, solved, name=name))
        found = compare(columns)
        self._lay_over([solved for _, solved in pairs])
        self.compared = pairs
        self.table.data = comparison_table(found, times)
        self.listing.visible, self.comparing.visible = False, True
        return {}

    def _chosen(self, one: str) -> tuple[Scenario, str, str, Column | None]:
        if one == NOW:
            scenario = self.desk.scenario
            return scenario, scenario.name, "on the page now", None
        snapshot = self._find(one)
        scenario = self.desk.journal.restore(snapshot)
        return scenario, snapshot.name, clock(snapshot.taken), column_of(snapshot)

    def _lay_over(self, results: list[Results]) -> None:
        first = not self.overlays
        if first:
            self.overlays = overlays()
        for plot in self.overlays:
            plot.update(results)
        if first:
            self.grid.objects = [_card(plot) for plot in self.overlays]

    def _beside(self, message: Message) -> Answer:
        with self.guard():
            if "report" in message:
                return self.desk.report(self.compared)
            self.listing.visible, self.comparing.visible = True, False
            self.refresh()
        return None


def _card(plot: Overlay) -> pn.viewable.Viewable:
    model = plot.model
    model.name = f"{JournalSheet.name}: {model.name}"
    model.css_classes = ["halfspan-card", f"halfspan-{plot.shape}"]
    model.stylesheets = [static_text("layout.css")]
    return pn.pane.Bokeh(model, sizing_mode="stretch_width")  # type: ignore[no-untyped-call]


def _row(snapshot: Snapshot) -> dict[str, object]:
    return {
        "id": snapshot.id,
        "name": snapshot.name,
        "note": snapshot.note,
        "when": clock(snapshot.taken),
        "sections": " · ".join(snapshot.sections),
        "figures": [_figure(figure) for figure in snapshot.figures[:12]],
        # Only the shapes, to be drawn anew: a file's own SVG never enters the page.
        "paths": _PATH.findall(snapshot.picture)[:4],
    }


def _figure(figure: KeyFigure) -> dict[str, str]:
    value = words.number(figure.value, figure.unit)
    limit = words.given(figure.limit, figure.unit)
    return {
        "label": figure.label,
        "value": value,
        "verdict": figure.verdict,
        "said": f"{figure.label} {value}, {figure.sense} {limit}, {figure.verdict}",
    }


def _came(came: Imported) -> str:
    count = len(came.snapshots)
    taken = "1 snapshot was" if count == 1 else f"{count} snapshots were"
    there = f" {came.present} there already." if came.present else ""
    return f"{taken} taken in.{there}"


def comparison_table(comparison: Comparison, times: list[str]) -> dict[str, object]:
    """Word a comparison for the page.

    Parameters
    ----------
    comparison : Comparison
        From `app.journal_compare.compare`.
    times : list of str
        When each column was taken.

    Returns
    -------
    dict
        Columns with letter, colour and dash; rows of words.
    """
    columns = [
        {
            "letter": LETTERS[at],
            "name": name,
            "when": when,
            "colour": f"var(--plot-{COLOURS[at]})",
            "dash": "" if DASHES[at] == "solid" else " ".join(map(str, DASHES[at])),
        }
        for at, (name, when) in enumerate(zip(comparison.names, times, strict=True))
    ]
    inputs = [
        {
            "label": row.label,
            "unit": row.unit,
            "cells": [
                words.given(value) if isinstance(value, float) else str(value)
                for value in row.values
            ],
        }
        for row in comparison.inputs
    ]
    margins = [
        {
            "label": row.label,
            "unit": row.unit,
            "cells": [None if one is None else _margin(one) for one in row.cells],
        }
        for row in comparison.margins
    ]
    return {"columns": columns, "inputs": inputs, "margins": margins}


def _margin(figure: KeyFigure) -> dict[str, str]:
    sign = "≥" if figure.sense == "at least" else "≤"
    return {
        "value": words.number(figure.value),
        "limit": f"{sign} {words.given(figure.limit)}",
        "verdict": figure.verdict,
        "reason": figure.reason,
    }
