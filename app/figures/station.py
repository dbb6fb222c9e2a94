"""The one place on the wing that every plot points at.

All figures of a sheet share two sources: a table of what is known at each
station, and a marker that holds the one row pointed at. Pointing happens in the
browser, so the marker follows the pointer without a round trip. Each sheet has
sources of its own, so that figures out of sight are not painted; the session
carries the place from one sheet to the next.
"""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

import numpy as np
from bokeh.events import MouseMove, Tap
from bokeh.models import ColumnDataSource, CustomJS
from bokeh.models.renderers import GlyphRenderer
from bokeh.plotting import figure

from app.analysis.results import FloatArray, PlanformResult, Results, SpanResult
from app.figures import look

_START_SHARE = 0.5

_POINT = """
const now = performance.now()
if (cb_obj.event_name == "mousemove") {
  if (marker.data.held[0] || now - (window.halfspan_pointed ?? 0) < 40) return
}
window.halfspan_pointed = now
const y = Math.abs(cb_obj.x)
const places = table.data.y
let near = 0
for (let i = 1; i < places.length; i++) {
  if (Math.abs(places[i] - y) < Math.abs(places[near] - y)) near = i
}
let held = marker.data.held[0]
if (cb_obj.event_name == "tap") held = held ? 0 : 1
else if (table.data.share[near] == marker.data.share[0]) return
const row = {held: [held]}
for (const name of Object.keys(table.data)) row[name] = [table.data[name][near]]
marker.data = row
"""


class Station:
    """What is known along the span, and the place pointed at.

    Parameters
    ----------
    on_point : callable, optional
        Called after the place changed, from either side.
    """

    def __init__(self, on_point: Callable[[], None] | None = None) -> None:
        self.table = ColumnDataSource(name="stations")
        self.marker = ColumnDataSource({"held": [0], "share": [_START_SHARE]}, name="station")
        self._on_point = on_point
        self._callback = CustomJS(args={"table": self.table, "marker": self.marker}, code=_POINT)
        self.marker.on_change("data", self._pointed)

    @property
    def share(self) -> float:
        """Place pointed at, as a share of the half-span [-]."""
        return float(self.marker.data["share"][0])

    @property
    def held(self) -> bool:
        """Whether the place stays when the pointer moves on."""
        return bool(self.marker.data["held"][0])

    @property
    def row(self) -> dict[str, Any]:
        """What is known at the place pointed at."""
        return {name: column[0] for name, column in self.marker.data.items()}

    def update(self, results: Results) -> None:
        """Take over new results; the place stays the same share of the half-span."""
        self.table.data = station_columns(results)
        self._point(self.share, held=self.held)

    def point_at(self, share: float, *, held: bool = True) -> None:
        """Point at a place, as the keyboard does.

        Parameters
        ----------
        share : float
            Share of the half-span. [-]
        held : bool
            Whether the place stays when the pointer moves on.
        """
        self._point(share, held=held)

    def _point(self, share: float, *, held: bool) -> None:
        if "share" not in self.table.data:
            self.marker.data = {"held": [int(held)], "share": [share]}
            return
        shares = np.asarray(self.table.data["share"])
        near = int(np.argmin(np.abs(shares - share)))
        row: dict[str, list[Any]] = {
            name: [column[near]] for name, column in self.table.data.items()
        }
        self.marker.data = {"held": [int(held)], **row}
        # While changes are held back for one message, Bokeh calls nobody.
        self._pointed("data", None, None)

    def _pointed(self, attr: str, old: object, new: object) -> None:
        if self._on_point is not None:
            self._on_point()

    def follow(self, plot: figure) -> None:
        """Let the pointer choose the place on a figure whose x is the span [m].

        Parameters
        ----------
        plot : figure
            Any figure with the distance from the centre across.
        """
        plot.js_on_event(MouseMove, self._callback)
        plot.js_on_event(Tap, self._callback)

    def mark_across(self, plot: figure) -> None:
        """Draw the place as an upright line, on a figure that `follow` serves.

        Parameters
        ----------
        plot : figure
            Any figure with the distance from the centre across.
        """
        self.follow(plot)
        plot.vspan("y", source=self.marker, line_color=look.colour("station"), line_width=1.5)

    def mark_point(
        self, plot: figure, x: str, y: str, *, condition: str, size: int = 9
    ) -> GlyphRenderer[Any]:
        """Draw the place as a point: a disc at landing, a diamond in cruise.

        Parameters
        ----------
        plot : figure
            Where.
        x, y : str
            Columns of the station table.
        condition : str
            ``"landing"`` or ``"cruise"``.
        size : int
            Of the mark. [px]

        Returns
        -------
        GlyphRenderer
            The mark, so that it can be hidden where it means nothing.
        """
        return plot.scatter(
            x,
            y,
            source=self.marker,
            marker="circle" if condition == "landing" else "diamond",
            size=size if condition == "landing" else size + 3,
            fill_color=look.colour("station"),
            line_color=look.colour("today" if condition == "landing" else "cruise"),
            line_width=2,
        )


def station_columns(results: Results) -> dict[str, list[float]]:
    """Gather what is known at each station of the half-wing.

    Parameters
    ----------
    results : Results
        Where it comes from.

    Returns
    -------
    dict of str to list
        Columns of one length: place, chord, and for landing and cruise the
        Reynolds number in thousands, angle, lift, limit and a
        thousand times the drag.
    """
    landing, cruise = results.landing.landing_span, results.cruise.span
    places = np.asarray(landing.y_m, dtype=np.float64)
    half = half_span(results.planform)
    lead, trail = chord_ends(results.planform, places)
    columns: dict[str, FloatArray] = {
        "y": places,
        "minus_y": -places,
        "share": places / half,
        "lead": lead,
        "trail": trail,
        "chord": landing.chord_m,
        **_of(landing, "landing", places),
        **_of(cruise, "cruise", places),
    }
    return {name: np.asarray(values).tolist() for name, values in columns.items()}


def _of(span: SpanResult, condition: str, places: FloatArray) -> dict[str, FloatArray]:
    columns = {
        "re": span.reynolds / 1e3,
        "angle": span.angle_deg,
        "lift": span.lift,
        "limit": span.limit,
        "room": span.room,
        "drag": 1e3 * span.drag,
        "knee_room": span.knee_room_deg,
    }
    return {
        f"{name}_{condition}": np.interp(places, span.y_m, values)
        for name, values in columns.items()
    }


def half_span(planform: PlanformResult) -> float:
    """Distance from the centre to the tip [m]."""
    return float(np.max(planform.wing_y))


def chord_ends(planform: PlanformResult, places: FloatArray) -> tuple[FloatArray, FloatArray]:
    """Find leading and trailing edge of the wing at some places.

    Parameters
    ----------
    planform : PlanformResult
        Its wing outline is a closed polygon.
    places : numpy.ndarray, shape (n,)
        Distances from the centre [m].

    Returns
    -------
    lead, trail : numpy.ndarray, shape (n,)
        Positions behind the root's leading edge [m].
    """
    y, x = np.asarray(planform.wing_y), np.asarray(planform.wing_x)
    y_next, x_next = np.roll(y, -1), np.roll(x, -1)
    lead, trail = np.full(places.shape, np.inf), np.full(places.shape, -np.inf)
    inside = np.clip(places, 0.0, float(y.max()))
    for y1, x1, y2, x2 in zip(y, x, y_next, x_next, strict=True):
        crossed = (np.minimum(y1, y2) <= inside) & (inside <= np.maximum(y1, y2))
        for end in [(x1 + (x2 - x1) * (inside - y1) / (y2 - y1))] if y1 != y2 else [x1, x2]:
            lead = np.where(crossed, np.minimum(lead, end), lead)
            trail = np.where(crossed, np.maximum(trail, end), trail)
    return lead, trail
