"""What happens along the half-wing, root to tip."""

from __future__ import annotations

import numpy as np
from bokeh.models import ColumnDataSource, Range1d
from bokeh.plotting import figure

from app.analysis.results import Results, SpanResult, Trust
from app.figures import look, words
from app.figures.labels import Labels
from app.figures.plot import Plot, TrustLine, add_reading, new_figure
from app.figures.ranges import fit
from app.figures.section_plots import on_wing
from app.figures.station import Station, half_span

ACROSS = "distance from the centre [m]"
CONDITION_WORDS = {"landing": "at landing", "cruise": "in cruise"}


def span_of(results: Results, condition: str) -> SpanResult:
    """Give one flight condition along the span.

    Parameters
    ----------
    results : Results
        Where it comes from.
    condition : str
        ``"landing"`` or ``"cruise"``.

    Returns
    -------
    SpanResult
        Root to tip.
    """
    return results.landing.landing_span if condition == "landing" else results.cruise.span


def condition_colour(condition: str) -> str:
    """Give the colour of landing or cruise.

    Parameters
    ----------
    condition : str
        ``"landing"`` or ``"cruise"``.

    Returns
    -------
    str
        A hexadecimal colour.
    """
    return look.colour("today" if condition == "landing" else "cruise")


def fit_to_span(axis_range: Range1d, results: Results) -> None:
    """Make room for the half-wing, root to tip.

    Parameters
    ----------
    axis_range : Range1d
        Of the distance from the centre [m].
    results : Results
        Whose planform gives the span.
    """
    fit(axis_range, [0.0, half_span(results.planform)], include=(0.0,), room=(0.0, 0.04))


class Limit:
    """A limit: a line hatched on the side that cannot be reached, and its band.

    Parameters
    ----------
    plot : figure
        Where to draw.
    """

    def __init__(self, plot: figure) -> None:
        self.source = ColumnDataSource({"x": [], "low": [], "mid": [], "high": [], "top": []})
        limit = look.colour("limit")
        plot.varea("x", "low", "high", source=self.source, fill_color=limit, fill_alpha=0.18)
        plot.varea(
            "x",
            "mid",
            "top",
            source=self.source,
            fill_color=None,
            hatch_pattern="right_diagonal_line",
            hatch_color=limit,
            hatch_alpha=0.55,
            hatch_scale=6,
            hatch_weight=1,
        )
        self.line = TrustLine(plot, colour=limit)

    def feed(
        self,
        x: np.ndarray,
        band: tuple[np.ndarray, np.ndarray, np.ndarray],
        trust: np.ndarray,
        *,
        depth: float,
    ) -> None:
        """Show a limit.

        Parameters
        ----------
        x : numpy.ndarray, shape (n,)
            Places.
        band : tuple of numpy.ndarray
            Low, nominal and high values.
        trust : numpy.ndarray, shape (n,)
            Codes of :class:`Trust`.
        depth : float
            Height of the hatching, in the unit of the values.
        """
        low, mid, high = band
        found = np.asarray(trust) != Trust.NOT_CONVERGED
        place = np.asarray(x)[found]
        self.source.data = {
            "x": place.tolist(),
            "low": np.asarray(low)[found].tolist(),
            "mid": np.asarray(mid)[found].tolist(),
            "high": np.asarray(high)[found].tolist(),
            "top": (np.asarray(mid)[found] + depth).tolist(),
        }
        self.line.feed(x, mid, trust)


class LocalLift(Plot):
    """Local lift, and the most that each station's section gives there.

    Parameters
    ----------
    station : Station
        The place pointed at.
    condition : str
        ``"landing"`` or ``"cruise"``.
    """

    def __init__(self, station: Station, condition: str) -> None:
        self.condition = condition
        said = CONDITION_WORDS[condition]
        self.model = plot = new_figure(
            f"local_lift_{condition}",
            f"Local lift and its limit {said}",
            x_label=ACROSS,
            y_label="section lift coefficient [-]",
        )
        self.limit = Limit(plot)
        self.lift = TrustLine(plot, colour=condition_colour(condition), width=2.5)
        self.labels = Labels(plot)
        station.mark_across(plot)
        station.mark_point(plot, "y", f"lift_{condition}", condition=condition)
        add_reading(
            plot,
            [*self.lift.renderers, *self.limit.line.renderers],
            [("distance", "@x{0.00} m"), ("lift coefficient", "$y{0.00}")],
        )

    def update(self, results: Results) -> None:
        """Feed the figure."""
        span = span_of(results, self.condition)
        fit_to_span(self.x_range, results)
        fit(self.y_range, span.lift, span.limit_high, include=(0.0,))
        depth = 0.06 * self.height
        band = (span.limit_low, span.limit, span.limit_high)
        self.limit.feed(span.y_m, band, span.trust, depth=depth)
        self.lift.feed(span.y_m, span.lift, span.trust)
        self.labels.feed(
            [
                label_on(span.y_m, span.limit_low, "limit", look.colour("limit"), below=depth),
                label_on(
                    span.y_m,
                    span.lift,
                    "local lift",
                    condition_colour(self.condition),
                    below=1.2 * depth,
                ),
            ]
        )


def label_on(
    x: np.ndarray, y: np.ndarray, text: str, colour: str, *, below: float = 0.0, share: float = 0.12
) -> tuple[float, float, str, str]:
    """Place words near a line.

    Parameters
    ----------
    x, y : numpy.ndarray, shape (n,)
        The line.
    text, colour : str
        The words and their colour.
    below : float
        How far under the line, in the unit of y.
    share : float
        How far along the line, from 0 to 1. [-]

    Returns
    -------
    tuple
        A row for `Labels.feed`.
    """
    if not len(x):
        return (np.nan, np.nan, text, colour)
    at = float(x[0]) + share * (float(x[-1]) - float(x[0]))
    return (at, float(np.interp(at, x, y)) - below, text, colour)


class RoomAlongSpan(Plot):
    """How much lift is left to each station at landing speed.

    Parameters
    ----------
    station : Station
        The place pointed at.
    """

    def __init__(self, station: Station) -> None:
        self.model = plot = new_figure(
            "room",
            "Lift left to each station at landing",
            x_label=ACROSS,
            y_label="limit less local lift [-]",
        )
        self.band = ColumnDataSource({"x": [], "low": [], "high": []})
        today = look.colour("today")
        plot.varea("x", "low", "high", source=self.band, fill_color=today, fill_alpha=0.15)
        plot.hspan(y=[0.0], line_color=look.colour("limit"), line_width=look.THICK)
        self.room = TrustLine(plot, colour=today, width=2.5)
        self.least = Labels(plot, baseline="top")
        self.least_mark = ColumnDataSource({"x": [], "y": []})
        plot.scatter(
            "x",
            "y",
            source=self.least_mark,
            marker="inverted_triangle",
            size=9,
            color=look.colour("limit"),
        )
        station.mark_across(plot)
        station.mark_point(plot, "y", "room_landing", condition="landing")
        add_reading(
            plot,
            self.room.renderers,
            [("distance", "@x{0.00} m"), ("lift left", "$y{0.00}")],
        )

    def update(self, results: Results) -> None:
        """Feed the figure."""
        span = results.landing.landing_span
        low, high = span.limit_low - span.lift, span.limit_high - span.lift
        fit_to_span(self.x_range, results)
        fit(self.y_range, low, high, include=(0.0,))
        found = (np.asarray(span.trust) != Trust.NOT_CONVERGED) & np.isfinite(span.room)
        self.band.data = {
            "x": span.y_m[found].tolist(),
            "low": low[found].tolist(),
            "high": high[found].tolist(),
        }
        self.room.feed(span.y_m, span.room, span.trust)
        if not found.any():
            self.least_mark.data = {"x": [], "y": []}
            self.least.feed([])
            return
        at = int(np.argmin(np.where(found, span.room, np.inf)))
        place, room = float(span.y_m[at]), float(span.room[at])
        self.least_mark.data = {"x": [place], "y": [room]}
        below = 0.07 * self.height
        tip = float(span.y_m[-1])
        inside = min(max(place, 0.21 * tip), 0.79 * tip)
        text = f"least left, {words.number(room)}"
        self.least.feed([(inside, room - below, text, look.colour("limit"), "center")])


class ReynoldsAlongSpan(Plot):
    """Reynolds number along the span, in cruise and at landing.

    Parameters
    ----------
    station : Station
        The place pointed at.
    conditions : tuple of str
        Which lines to draw.
    """

    def __init__(self, station: Station, conditions: tuple[str, ...]) -> None:
        self.conditions = conditions
        alone = f" {CONDITION_WORDS[conditions[0]]}" if len(conditions) == 1 else ""
        self.model = plot = new_figure(
            "reynolds_" + "_".join(conditions),
            f"Reynolds number{alone}" if alone else "Reynolds number along the span",
            x_label=ACROSS,
            y_label="Reynolds number [thousand]",
        )
        self.unknown = ColumnDataSource({"bottom": [], "top": [], "left": [], "right": []})
        plot.quad(
            left="left",
            right="right",
            bottom="bottom",
            top="top",
            source=self.unknown,
            fill_color=None,
            line_color=None,
            hatch_pattern="cross",
            hatch_color=look.colour("limit"),
            hatch_alpha=0.5,
            hatch_scale=8,
            hatch_weight=0.75,
        )
        self.lines = {
            name: TrustLine(plot, colour=condition_colour(name), width=2.5) for name in conditions
        }
        self.labels = Labels(plot)
        station.mark_across(plot)
        for name in conditions:
            station.mark_point(plot, "y", f"re_{name}", condition=name)
        add_reading(
            plot,
            [renderer for line in self.lines.values() for renderer in line.renderers],
            [("distance", "@x{0.00} m"), ("Reynolds number", "$y{0} thousand")],
        )

    def update(self, results: Results) -> None:
        """Feed the figure."""
        spans = {name: span_of(results, name) for name in self.conditions}
        half = half_span(results.planform)
        fit_to_span(self.x_range, results)
        values = [span.reynolds / 1e3 for span in spans.values()]
        fit(self.y_range, *values, include=(0.0,))
        above = 0.06 * self.top
        rows = []
        for name, span in spans.items():
            self.lines[name].feed(span.y_m, span.reynolds / 1e3, span.trust)
            # Reynolds number falls towards the tip: free room lies above a line's
            # inner end and below its outer end.
            outer = name == "landing"
            row = label_on(
                span.y_m,
                span.reynolds / 1e3,
                CONDITION_WORDS[name],
                condition_colour(name),
                below=above if outer else -above,
                share=1.0 if outer else 0.0,
            )
            rows.append((*row, "right" if outer else "left"))
        self.labels.feed(rows)
        self.unknown.data = _unknown(results, 0.0, half, self.top)


def _unknown(results: Results, left: float, right: float, top: float) -> dict[str, list[float]]:
    intervals = {
        interval
        for section in results.sections
        if on_wing(section)
        for interval in section.unknown_reynolds
        if interval[0] / 1e3 < top
    }
    low = [first / 1e3 for first, _ in intervals]
    high = [min(last / 1e3, top) for _, last in intervals]
    return {
        "left": [left] * len(low),
        "right": [right] * len(low),
        "bottom": low,
        "top": high,
    }
