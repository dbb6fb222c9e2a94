"""What moves in a report: sliders, their readings, and two figures fed in the browser."""

from __future__ import annotations

import math
from typing import Any

from bokeh.models import ColumnDataSource, HoverTool
from bokeh.plotting import figure

from app.figures import look, words
from app.figures.plot import new_figure
from app.report.charts import Charts
from app.report.markup import Html, join, table, tag
from app.report.order import LETTERS, Order, Shown
from app.report.parts import trusted

READINGS = (
    ("speed_ratio", "This speed over stall speed", ""),
    ("stall", "Stall speed", "m/s"),
    ("landing_ratio", "Landing speed over stall speed", ""),
    ("lift_to_drag", "Lift to drag", ""),
    ("drag", "Drag", "N"),
    ("power", "Electric power", "W"),
    ("endurance", "Endurance at this power", "h"),
    ("elevator", "Elevator, down positive", "deg"),
    ("local_lift", "Local lift at the station", ""),
    ("local_limit", "Most that its section gives there", ""),
    ("trust", "How sure", ""),
)
"""Rows of readings: key, label, unit."""

SPLIT = (("induced", "induced"), ("profile", "sections"), ("body", "body"), ("trim", "trim"))
PATTERNS = {
    "body": "dot",
    "profile": "left_diagonal_line",
    "induced": "horizontal_line",
    "trim": "cross",
}
COLOURS = ("today", "limit", "body", "cruise", "induced", "profile")
DASHES = ("solid", [8, 3], [2, 3], [8, 3, 2, 3], [14, 4], [4, 2, 1, 2])
"""Second carrier of which scenario a line belongs to."""

LEGEND: dict[str, Any] = {
    "location": "top_right",
    "orientation": "horizontal",
    # A piece of light paper under dark words, which holds on a dark page too.
    "background_fill_color": look.token("card"),
    "background_fill_alpha": 0.85,
    "border_line_color": None,
    "label_text_color": look.token("ink"),
    "label_text_font": look.FONT,
    "label_text_font_size": look.token("plot-text"),
    "padding": 2,
    "margin": 4,
    "spacing": 6,
    "glyph_width": 22,
}


class Live:
    """The live part of a report.

    Parameters
    ----------
    order : Order
        What is shown.
    charts : Charts
        Takes its figures in.
    """

    def __init__(self, order: Order, charts: Charts) -> None:
        self.order, self.charts = order, charts
        self.able = [one for one in order.shown if one.table is not None]
        self.sources: list[ColumnDataSource] = []

    def data(self) -> dict[str, Any] | None:
        """Give the report's script what it scales; None where there is nothing."""
        if not self.able:
            return None
        return {
            "compares": self.order.compares,
            "gravity": 9.80665,
            "scenarios": [_scenario(one) for one in self.able],
        }

    def markup(self) -> Html:
        """Make the sliders, the readings and the places of the figures."""
        if not self.able:
            return tag(
                "p",
                "No sliders here: no onset of stall was found for this wing over the whole range "
                "of masses and altitudes, so nobody could say which flights there are.",
            )
        plots = self._compare_plots() if self.order.compares else self._single_plots()
        return join(
            tag("p", _introduction(self.order, self.able), cls="lead"),
            tag("p", "Printed at ", tag("output", id="live-settings"), cls="print-only"),
            tag(
                "div",
                tag("div", self._sliders(), self._readings(), cls="live-side"),
                tag("div", [plot_place(name) for name in plots], cls="live-plots"),
                cls="live many" if len(self.able) > 2 else "live",
            ),
            tag("p", _error_words(self.able), cls="note"),
        )

    def _sliders(self) -> Html:
        low = min(one.table["reach"]["speed"][0] for one in self.able if one.table)
        high = max(one.table["reach"]["speed"][1] for one in self.able if one.table)
        first = self.able[0]
        speed = _slider(
            "speed", "True airspeed", "m/s", low, high, 0.1, first.value("cruise_speed_m_s")
        )
        if self.order.compares:
            mass = _slider("mass", "Mass, change for each", "%", -25.0, 30.0, 1.0, 0.0)
        else:
            ends = _reach(first, "mass")
            mass = _slider("mass", "Mass", "kg", *ends, 0.01, first.value("mass_kg"))
        if self.order.compares:
            altitude = _slider(
                "altitude", "Altitude, over each field", "m", *self._rise(), 10.0, 0.0
            )
        else:
            ends, at = _reach(first, "altitude"), first.value("field_altitude_m")
            altitude = _slider("altitude", "Altitude", "m", *ends, 10.0, at)
        again = tag("button", "Back to the design", type="button", id="live-reset")
        return tag("div", speed, mass, altitude, again, cls="sliders")

    def _rise(self) -> tuple[float, float]:
        """Give how far every scenario can go down and up from its own field."""
        fields = [one.value("field_altitude_m") for one in self.able]
        reaches = [_reach(one, "altitude") for one in self.able]
        pairs = list(zip(fields, reaches, strict=True))
        low = max(reach[0] - at for at, reach in pairs)
        high = min(reach[1] - at for at, reach in pairs)
        return min(math.ceil(low / 10.0) * 10.0, 0.0), max(math.floor(high / 10.0) * 10.0, 0.0)

    def _readings(self) -> Html:
        if self.order.compares:
            head = ["", *[f"{one.letter} {one.name}" for one in self.able]]
        else:
            head = ["", "Now", "As designed"]
        rows = []
        for key, label, unit in READINGS:
            cells: list[Html] = []
            for at, one in enumerate(self.able):
                cells.append(tag("output", id=f"live-{at}-{key}", data_unit=unit))
                if not self.order.compares:
                    cells.append(tag("span", _designed(one, key, unit)))
            rows.append([label, *cells])
        readings = table(head, rows, cls="readings")
        split = [
            tag(
                "div",
                tag("span", one.letter if self.order.compares else "Drag split", cls="split-name"),
                tag("div", id=f"live-{at}-split", cls="split"),
                cls="split-row",
            )
            for at, one in enumerate(self.able)
        ]
        return join(tag("div", readings, cls="scroll"), split)

    def _source(self, name: str, columns: tuple[str, ...]) -> ColumnDataSource:
        source = ColumnDataSource({column: [] for column in columns}, name=name)
        self.sources.append(source)
        return source

    def _single_plots(self) -> list[str]:
        one = self.able[0]
        return [self._drag_plot(one), self._lift_plot(one)]

    def _drag_plot(self, one: Shown) -> str:
        plot = _over_speed("Drag over speed, at this mass and altitude", "drag [N]", one)
        edges = tuple(f"{part}_{end}" for part, _ in SPLIT for end in ("low", "high"))
        source = self._source("live-drag-data", ("x", "total", *edges))
        for part in ("body", "profile", "induced", "trim"):
            plot.varea(
                "x",
                f"{part}_low",
                f"{part}_high",
                source=source,
                fill_color=look.colour(part),
                fill_alpha=0.35,
                hatch_pattern=PATTERNS[part],
                hatch_color=look.colour(part),
                hatch_alpha=0.45,
                hatch_scale=9,
                hatch_weight=0.75,
                legend_label=dict(SPLIT)[part],
            )
        line = plot.line(
            "x", "total", source=source, line_color=look.colour("outline"), line_width=2.5
        )
        self._speed_mark(plot)
        _legend(plot)
        _reading(plot, [line], [("speed", "@x{0.0} m/s"), ("drag in all", "@total{0.00} N")])
        return self.charts.add(plot, "live-drag", height=270)

    def _speed_mark(self, plot: figure) -> None:
        source = next((one for one in self.sources if one.name == "live-speed-data"), None)
        source = source or self._source("live-speed-data", ("x",))
        plot.vspan("x", source=source, line_color=look.colour("station"), line_width=2)

    def _lift_plot(self, one: Shown) -> str:
        results = one.results
        plot = new_figure(
            "live-lift",
            "Local lift and its limit, at this speed, mass and altitude",
            x_label="distance from the centre [m]",
            y_label="section lift coefficient [-]",
            x_range=(0.0, float(results.planform.wing_y.max()) * 1.02),
            y_range=(0.0, 1.15 * float(results.landing.landing_span.limit_high.max())),
        )
        source = self._source("live-lift-data", ("x", "lift", "low", "limit", "high"))
        limit, today = look.colour("limit"), look.colour("today")
        plot.varea("x", "low", "high", source=source, fill_color=limit, fill_alpha=0.18)
        lines = [
            plot.line(
                "x", "limit", source=source, line_color=limit, line_width=2, legend_label="limit"
            ),
            plot.line(
                "x",
                "lift",
                source=source,
                line_color=today,
                line_width=2.5,
                line_dash=[10, 3],
                legend_label="local lift",
            ),
        ]
        self._station_mark(plot)
        _legend(plot)
        _reading(plot, lines, [("distance", "@x{0.00} m"), ("lift coefficient", "$y{0.00}")])
        return self.charts.add(plot, "live-lift", height=270)

    def _station_mark(self, plot: figure) -> None:
        source = self._source("live-station-data", ("x",))
        plot.vspan("x", source=source, line_color=look.colour("station"), line_width=1.5)

    def _compare_plots(self) -> list[str]:
        first = self.able[0]
        ratio = _over_speed("Lift to drag over speed", "lift to drag [-]", first)
        reaches = [_reach(one, "speed") for one in self.able]
        ends = min(low for low, _ in reaches), max(high for _, high in reaches)
        ratio.x_range.update(start=ends[0], end=ends[1])
        room = new_figure(
            "live-room",
            "Local lift over its limit, at this speed",
            x_label="along the half-wing [%]",
            y_label="local lift over its limit [-]",
            x_range=(0.0, 101.0),
            y_range=(0.0, 1.15),
        )
        room.hspan(y=[1.0], line_color=look.colour("limit"), line_width=look.THICK)
        for at, one in enumerate(self.able):
            # Its own colour and dash, the same as in the other plots.
            place = LETTERS.index(one.letter)
            colour, dash = look.colour(COLOURS[place]), DASHES[place]
            source = self._source(f"live-{at}-data", ("x", "lift_to_drag", "share", "used"))
            style: dict[str, Any] = {"line_color": colour, "line_dash": dash, "line_width": 2.5}
            line = ratio.line("x", "lift_to_drag", source=source, legend_label=one.letter, **style)
            _reading(ratio, [line], [(one.letter, "@lift_to_drag{0.0} at @x{0.0} m/s")])
            along = self._source(f"live-{at}-along", ("share", "used"))
            line = room.line("share", "used", source=along, legend_label=one.letter, **style)
            _reading(room, [line], [(one.letter, "@used{0.00} at @share{0} %")])
        self._speed_mark(ratio)
        self._station_mark(room)
        for plot in (ratio, room):
            _legend(plot)
        room.legend.location = "bottom_left"
        return [
            self.charts.add(ratio, "live-ratio", height=270),
            self.charts.add(room, "live-room", height=270),
        ]


def plot_place(name: str, *, wide: bool = False) -> Html:
    """Make the place of a figure on the page."""
    return tag("div", tag("div", id=f"plot-{name}"), cls="plot wide" if wide else "plot")


def _over_speed(title: str, label: str, one: Shown) -> figure:
    low, high = _reach(one, "speed")
    return new_figure(
        "live",
        title,
        x_label="true airspeed [m/s]",
        y_label=label,
        x_range=(low, high),
        y_range=(0.0, 2.2 * one.results.cruise.drag.total),
    )


def _legend(plot: figure) -> None:
    plot.legend.update(**LEGEND)


def _reading(plot: figure, lines: list[Any], rows: list[tuple[str, str]]) -> None:
    plot.add_tools(HoverTool(renderers=lines, tooltips=rows, line_policy="nearest", visible=False))


def _reach(one: Shown, name: str) -> tuple[float, float]:
    if one.table is None:
        raise ValueError("no table")
    low, high = one.table["reach"][name]
    return float(low), float(high)


def _slider(
    name: str, label: str, unit: str, low: float, high: float, step: float, at: float
) -> Html:
    return tag(
        "div",
        tag("label", label, for_=f"live-{name}"),
        tag("output", id=f"live-{name}-said", for_=f"live-{name}", data_unit=unit),
        tag(
            "input",
            type="range",
            id=f"live-{name}",
            min=f"{low:g}",
            max=f"{high:g}",
            step=f"{step:g}",
            value=f"{at:g}",
            data_design=f"{at:g}",
        ),
        cls="slider",
    )


def _designed(one: Shown, key: str, unit: str) -> str:
    results = one.results
    cruise, landing = results.cruise, results.landing
    found = {
        "speed_ratio": cruise.speed_m_s / landing.stall_speed_m_s,
        "stall": landing.stall_speed_m_s,
        "landing_ratio": landing.landing_ratio,
        "lift_to_drag": cruise.lift_to_drag,
        "drag": cruise.drag.total,
        "power": cruise.electric_power_w,
        "elevator": cruise.elevator_deg,
        "endurance": next((m.value for m in results.margins if m.key == "endurance"), math.nan),
    }
    if key not in found:
        return ""
    trust = landing.trust if key in ("stall", "landing_ratio") else cruise.trust
    if key == "speed_ratio":
        trust = max(landing.trust, cruise.trust)
    return trusted(words.number(found[key], unit), trust)


def _introduction(order: Order, able: list[Shown]) -> str:
    offsets = [one.value("temperature_offset_K") for one in able]
    warm = f"{offsets[0]:+g} K" if len(set(offsets)) == 1 else "each scenario's own offset"
    lost = len(order.shown) - len(able)
    left = (
        f" {lost} of the scenarios had no onset of stall to find and is left out." if lost else ""
    )
    return (
        "Move a slider, or use the arrow keys on it: level flight at the balance point, in the "
        f"standard atmosphere {'with ' + warm if warm != '+0 K' else 'as it is'}; stall speed "
        "and landing ratio belong to the forward balance point and the landing speed of the "
        f"brief. Values in between are interpolated.{left}"
    )


def _error_words(able: list[Shown]) -> str:
    errors = [one.error for one in able if one.error]
    worst = max(
        float(error[key])
        for error in errors
        for key in ("drag", "lift_to_drag", "parts", "elevator", "lift", "stall_speed")
    )
    flights = sum(int(error["flights"]) for error in errors)
    if not flights:
        return "No flight in between was found by which the table could be checked."
    return (
        "The sliders read a table solved beforehand over lift coefficient and speed over "
        f"viscosity. Against {flights} full solves at random places in between, the largest "
        f"difference was {worst:.2g} %."
    )


def _scenario(one: Shown) -> dict[str, Any]:
    return {
        "letter": one.letter,
        "table": one.table,
        "drive": dict(one.drive),
        "mass": one.value("mass_kg"),
        "field": one.value("field_altitude_m"),
        "cruise": one.value("cruise_speed_m_s"),
        "landing": one.value("landing_speed_m_s"),
        "travel": one.value("elevator_travel_deg"),
    }
