"""What every sheet is: its inputs, what it asks of the analysis, and its cards."""

from __future__ import annotations

from abc import ABC, abstractmethod
from collections.abc import Callable, Sequence
from contextlib import AbstractContextManager, nullcontext
from dataclasses import dataclass

import panel as pn

from app.analysis.results import Results
from app.components import Choice, Message, Words
from app.figures.look import static_text
from app.figures.plot import Plot
from app.figures.station import Station

Guard = Callable[[], AbstractContextManager[None]]


@dataclass(frozen=True)
class FieldGroup:
    """A heading in the column of inputs, and the fields under it by name."""

    title: str
    names: tuple[str, ...]
    open: bool = True


MISSION = FieldGroup("Mission", ("mass_kg", "cruise_speed_m_s", "landing_speed_m_s"))
FIELD = FieldGroup(
    "Launch, landing and field",
    (
        "launch_method",
        "launch_speed_m_s",
        "landing_method",
        "field_altitude_m",
        "temperature_offset_K",
        "headwind_m_s",
        "airspeed_error_m_s",
    ),
    open=False,
)
LIMITS = FieldGroup(
    "What is asked for",
    (
        "landing_over_stall_min",
        "launch_over_stall_min",
        "static_margin_min_percent",
        "elevator_left_min_percent",
        "cruise_power_max_w",
        "endurance_min_h",
        "span_max_m",
    ),
    open=False,
)
BRIEF = (MISSION, FIELD, LIMITS)
"""The brief: in the column whatever sheet is open."""


class Sheet(ABC):
    """One sheet: built when it is first opened, then fed while it is open.

    Parameters
    ----------
    station : Station
        The place that all plots point at.
    guard : callable, optional
        Makes what each callback runs under, so that its errors are said.
    """

    name: str
    want: frozenset[str] = frozenset()
    groups: tuple[FieldGroup, ...] = ()

    def __init__(self, station: Station, guard: Guard = nullcontext) -> None:
        self.station, self.guard = station, guard
        self.plots: list[Plot] = []
        self.results: Results | None = None
        self.folded = Words(
            self._fold,
            fold="Numbers behind the plots",
            sizing_mode="stretch_width",
            css_classes=["halfspan-line"],
        )
        self.unfolded = False
        self.choices: list[Choice] = []
        self.grid = pn.Column(
            css_classes=["halfspan-sheet"],
            stylesheets=[static_text("layout.css")],
            sizing_mode="stretch_width",
        )
        # Shown and hidden through a plain box: the grid's own rules would undo it.
        self.view = pn.Column(
            self.grid,
            stylesheets=[static_text("layout.css")],
            sizing_mode="stretch_width",
            visible=False,
            name=self.name,
        )

    @property
    def built(self) -> bool:
        """Whether the sheet has been opened before."""
        return bool(len(self.grid))

    def field_groups(self) -> tuple[FieldGroup, ...]:
        """Give the inputs beside this sheet: mission, its own, the rest of the brief."""
        return (MISSION, *self.groups, FIELD, LIMITS)

    def build(self) -> Sequence[pn.viewable.Viewable]:
        """Make figures and words; they are fed next.

        Returns
        -------
        sequence of Viewable
            The cards in their order on the sheet; none where a sheet lays itself out.
        """
        return ()

    def feed(self, results: Results) -> None:
        """Show results in figures and words.

        Parameters
        ----------
        results : Results
            With what `want` names.
        """
        for plot in self.plots:
            plot.update(results)

    @abstractmethod
    def numbers(self, results: Results) -> list[dict[str, object]]:
        """Give the numbers behind the plots.

        Parameters
        ----------
        results : Results
            With what `want` names.

        Returns
        -------
        list of dict
            Tables for a card of words.
        """

    def _fold(self, message: Message) -> None:
        with self.guard():
            self.unfolded = bool(message["open"])
            self._feed_numbers()

    def _feed_numbers(self) -> None:
        # A long table costs as much as all the plots: only where it is looked at.
        if self.unfolded and self.results is not None:
            self.folded.blocks = self.numbers(self.results)

    def update(self, results: Results) -> None:
        """Feed the sheet, building it first where that has not been done.

        Parameters
        ----------
        results : Results
            With what `want` names.
        """
        cards = None if self.built else self.build()
        self.results = results
        self.feed(results)
        self._feed_numbers()
        if cards is not None:
            # Filled before it is shown: the browser paints it once.
            self.grid.objects = list(cards)
            self.view.objects = [*self.choices, self.grid, self.folded]

    def card(self, plot: Plot, *, shape: str = "one") -> pn.viewable.Viewable:
        """Make a card of a figure and feed it from now on.

        Parameters
        ----------
        plot : Plot
            What it shows.
        shape : str
            ``"one"``, ``"wide"`` (two columns), ``"tall"`` (two rows) or ``"large"``
            (two by two).

        Returns
        -------
        Viewable
            The card.
        """
        self.plots.append(plot)
        # Two sheets may show the same kind of figure.
        plot.model.name = f"{self.name}: {plot.model.name}"
        # On the figure itself: the pane does not hand its own classes on.
        plot.model.css_classes = ["halfspan-card", f"halfspan-{shape}"]
        plot.model.stylesheets = [static_text("layout.css")]
        return pn.pane.Bokeh(plot.model, sizing_mode="stretch_width")  # type: ignore[no-untyped-call]


def words_card(shape: str = "one") -> Words:
    """Make an empty card of words.

    Parameters
    ----------
    shape : str
        As for `Sheet.card`, or ``"full"`` for the whole width.

    Returns
    -------
    Words
        To be fed through its `blocks`.
    """
    return Words(sizing_mode="stretch_width", css_classes=[f"halfspan-{shape}"])


def title(text: str) -> dict[str, object]:
    """Make a heading for a card of words."""
    return {"kind": "title", "text": text}


def sentences(items: Sequence[str]) -> dict[str, object]:
    """Make a list of sentences for a card of words."""
    return {"kind": "sentences", "items": list(items)}


def note(text: str) -> dict[str, object]:
    """Make a small remark for a card of words."""
    return {"kind": "note", "text": text}


def facts(items: Sequence[tuple[str, str]]) -> dict[str, object]:
    """Make a list of names and values for a card of words."""
    return {"kind": "facts", "items": [list(item) for item in items]}


def table(head: Sequence[str], rows: Sequence[Sequence[object]]) -> dict[str, object]:
    """Make a table for a card of words; a cell may be ``{"verdict": ...}``."""
    return {"kind": "table", "head": list(head), "rows": [list(row) for row in rows]}
