"""Drag, power, endurance and range over speed."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from bokeh.models import ColumnDataSource

from app.analysis.results import FloatArray, Margin, Results, SweepResult, Trust
from app.figures import look, words
from app.figures.labels import Label, Labels
from app.figures.plot import Plot, TrustLine, add_reading, new_figure
from app.figures.ranges import fit
from app.figures.speed_marks import SpeedMarks

SPEED = "true airspeed [m/s]"
_PARTS = (
    ("body", "body", "dot"),
    ("profile", "wing and tail sections", "left_diagonal_line"),
    ("induced", "induced", "horizontal_line"),
    ("trim", "trim", "cross"),
)


class DragOverSpeed(Plot):
    """Drag of level flight, its parts stacked, over speed."""

    def __init__(self) -> None:
        self.model = plot = new_figure(
            "drag",
            "Drag in level flight, by its parts",
            x_label=SPEED,
            y_label="drag [N]",
        )
        names = [f"{part}_{end}" for part, _, _ in _PARTS for end in ("low", "high")]
        self.stack = ColumnDataSource({name: [] for name in ("x", *names)})
        for part, _, pattern in _PARTS:
            plot.varea(
                "x",
                f"{part}_low",
                f"{part}_high",
                source=self.stack,
                fill_color=look.colour(part),
                fill_alpha=0.35,
                hatch_pattern=pattern,
                hatch_color=look.colour(part),
                hatch_alpha=0.45,
                hatch_scale=9,
                hatch_weight=0.75,
            )
        self.total = TrustLine(plot, colour=look.colour("outline"), width=2.5)
        self.speeds = SpeedMarks(plot)
        self.labels = Labels(plot, chips=True)
        add_reading(
            plot, self.total.renderers, [("speed", "@x{0.0} m/s"), ("drag in all", "$y{0.00} N")]
        )

    def update(self, results: Results) -> None:
        """Feed the figure."""
        sweep = results.sweep
        if sweep is None:
            return
        found = (sweep.trust != Trust.NOT_CONVERGED) & np.isfinite(sweep.total)
        speed = np.asarray(sweep.speed_m_s)[found]
        fit(self.x_range, sweep.speed_m_s)
        # Room at the top for the names of the speeds.
        fit(self.y_range, 1.15 * _useful(sweep.total[found]), include=(0.0,))
        columns: dict[str, list[float]] = {"x": speed.tolist()}
        below = np.zeros(speed.shape)
        edges = {}
        for part, _, _ in _PARTS:
            above = below + np.asarray(getattr(sweep, part))[found]
            columns[f"{part}_low"], columns[f"{part}_high"] = below.tolist(), above.tolist()
            edges[part] = (below, above)
            below = above
        self.stack.data = columns
        self.total.feed(sweep.speed_m_s, sweep.total, sweep.trust)
        self.labels.feed(_part_labels(speed, edges, self.top))
        self.speeds.feed(results, top=self.top)


def _useful(values: FloatArray) -> FloatArray:
    """Leave out what lies far above the least, where stall sets in."""
    return values[values <= 2.6 * np.min(values)] if values.size else values


def _part_labels(
    speed: FloatArray, edges: dict[str, tuple[FloatArray, FloatArray]], top: float
) -> list[Label]:
    """Write each part's name where its layer is thick enough to carry it."""
    rows: list[Label] = []
    for part, text, _ in _PARTS:
        low, high = edges[part]
        thick = np.where(high <= 1.15 * top, high - low, 0.0)
        if thick.size and float(thick.max()) > 0.09 * top:
            right = part in ("body", "profile")
            at = thick.size - 1 if right else int(np.argmax(thick))
            at = min(max(at, thick.size // 3), thick.size - 1)
            middle = 0.5 * float(low[at] + high[at])
            rows.append((float(speed[at]), middle, text, look.token("ink"), "right"))
    return rows


@dataclass(frozen=True)
class Curve:
    """What one plot over speed shows.

    Parameters
    ----------
    name, title, label, unit : str
        Model name, title, label of the vertical axis and unit.
    values : callable
        Gives the curve.
    best : callable or None
        Gives the best speed to mark.
    best_words : str
        What that speed is.
    margin : str
        Key of the margin whose limit is drawn, or empty.
    """

    name: str
    title: str
    label: str
    unit: str
    values: Callable[[SweepResult], FloatArray]
    best: Callable[[SweepResult], float] | None = None
    best_words: str = ""
    margin: str = ""


POWER = Curve(
    "power",
    "Electric power in level flight",
    "electric power [W]",
    "W",
    lambda sweep: sweep.electric_power_w,
    lambda sweep: sweep.best_endurance_speed_m_s,
    "least power",
    "cruise_power",
)
LIFT_TO_DRAG = Curve(
    "lift_to_drag", "Lift to drag", "lift to drag [-]", "", lambda sweep: sweep.lift_to_drag
)
ENDURANCE = Curve(
    "endurance",
    "Endurance",
    "time in the air [h]",
    "h",
    lambda sweep: sweep.endurance_h,
    lambda sweep: sweep.best_endurance_speed_m_s,
    "longest",
    "endurance",
)
RANGE = Curve(
    "range",
    "Range over the ground",
    "range [km]",
    "km",
    lambda sweep: sweep.range_km,
    lambda sweep: sweep.best_range_speed_m_s,
    "furthest",
)


class CurveOverSpeed(Plot):
    """One quantity over speed, with its limit, its best speed and today's speeds.

    Parameters
    ----------
    curve : Curve
        What to show.
    """

    def __init__(self, curve: Curve) -> None:
        self.curve = curve
        self.model = plot = new_figure(
            curve.name,
            curve.title,
            x_label=SPEED,
            y_label=curve.label,
        )
        limit = look.colour("limit")
        self.limit = ColumnDataSource({"edge": [], "far": []})
        plot.hstrip(
            "edge",
            "far",
            source=self.limit,
            fill_color=None,
            line_color=None,
            hatch_pattern="right_diagonal_line",
            hatch_color=limit,
            hatch_alpha=0.45,
            hatch_scale=7,
            hatch_weight=1,
        )
        plot.hspan("edge", source=self.limit, line_color=limit, line_width=look.THICK)
        self.speeds = SpeedMarks(plot)
        self.line = TrustLine(plot, colour=look.colour("outline"), width=2.5)
        self.here = ColumnDataSource({"x": [], "y": []})
        plot.scatter(
            "x",
            "y",
            source=self.here,
            marker="diamond",
            size=12,
            fill_color=look.colour("cruise"),
            line_color=None,
        )
        self.best = ColumnDataSource({"x": [], "y": []})
        plot.scatter(
            "x",
            "y",
            source=self.best,
            marker="star",
            size=12,
            fill_color=look.colour("body"),
            line_color=None,
        )
        self.labels = Labels(plot, baseline="bottom")
        self.best_label = Labels(plot)
        unit = f" {curve.unit}" if curve.unit else ""
        add_reading(
            plot,
            self.line.renderers,
            [("speed", "@x{0.0} m/s"), (curve.title.lower(), f"$y{{0.0}}{unit}")],
        )

    def update(self, results: Results) -> None:
        """Feed the figure."""
        sweep = results.sweep
        if sweep is None:
            return
        values, speed = np.asarray(self.curve.values(sweep)), np.asarray(sweep.speed_m_s)
        found = (sweep.trust != Trust.NOT_CONVERGED) & np.isfinite(values)
        asked = self._asked(results)
        fit(self.x_range, speed)
        if found.any():
            seen = values[found]
            seen = _useful(seen) if self.curve.margin == "cruise_power" else seen
            # Room at the top for the names of the speeds.
            fit(self.y_range, seen, 1.18 * seen, [asked.limit if asked else np.nan], include=(0.0,))
        self._feed_limit(results)
        self.line.feed(speed, values, sweep.trust)
        self._feed_points(results, sweep, speed[found], values[found])
        self.speeds.feed(results, top=self.top)

    def _asked(self, results: Results) -> Margin | None:
        return next((m for m in results.margins if m.key == self.curve.margin), None)

    def _feed_limit(self, results: Results) -> None:
        asked = self._asked(results)
        if asked is None:
            self.limit.data = {"edge": [], "far": []}
            return
        # The side that must not be reached is hatched.
        depth = 0.07 * self.height * (1.0 if asked.sense == "at most" else -1.0)
        self.limit.data = {"edge": [asked.limit], "far": [asked.limit + depth]}

    def _feed_points(
        self, results: Results, sweep: SweepResult, speed: FloatArray, values: FloatArray
    ) -> None:
        cruise = results.inputs.get("cruise_speed_m_s")
        height = self.height
        rows = []
        self.here.data = {"x": [], "y": []}
        if isinstance(cruise, (int, float)) and speed.size and speed[0] <= cruise <= speed[-1]:
            value = float(np.interp(cruise, speed, values))
            self.here.data = {"x": [float(cruise)], "y": [value]}
            text = f"  {words.number(value, self.curve.unit)}"
            # On the side of the curve where a limit's hatching does not lie.
            beside = -0.1 if self.curve.margin == "cruise_power" else 0.02
            rows.append((float(cruise), value + beside * height, text, look.colour("cruise")))
        self.labels.feed(rows)
        best = self.curve.best(sweep) if self.curve.best is not None else float("nan")
        if np.isfinite(best) and speed.size and speed[0] <= best <= speed[-1]:
            value = float(np.interp(best, speed, values))
            self.best.data = {"x": [best], "y": [value]}
            text = f" {self.curve.best_words} at {words.number(best, 'm/s')}"
            # Under a hollow, over a hill: always off the curve.
            above = self.curve.margin != "cruise_power"
            place = value + (0.13 if above else -0.11) * height
            shade = look.colour("body")
            right = best > self.left + 0.6 * self.width
            self.best_label.feed([(best, place, text, shade, "right" if right else "left")])
        else:
            self.best.data = {"x": [], "y": []}
            self.best_label.feed([])
