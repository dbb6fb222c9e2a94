"""Longitudinal balance: where the points lie, and the elevator that trim asks for."""

from __future__ import annotations

import numpy as np
from bokeh.models import ColumnDataSource

from app.analysis.results import BalanceResult, Results
from app.figures import look, words
from app.figures.labels import Label, Labels
from app.figures.plot import Plot, TrustLine, add_reading, new_figure
from app.figures.ranges import fit
from app.figures.speed_marks import SpeedMarks


class ChordRuler(Plot):
    """The mean aerodynamic chord as a ruler, with the points on it."""

    def __init__(self) -> None:
        self.model = plot = new_figure(
            "chord_ruler",
            "Points on the mean aerodynamic chord",
            x_label="behind its leading edge [% of that chord]",
            y_label="",
            x_range=(-5.0, 105.0),
            y_range=(-1.6, 2.6),
        )
        plot.yaxis.visible = False
        plot.ygrid.visible = False
        plot.min_border_left = 20
        grey, today, limit = (look.colour(name) for name in ("outline", "today", "limit"))
        plot.segment([0.0], [0.0], [100.0], [0.0], line_color=grey, line_width=6, line_alpha=0.45)
        self.bar = ColumnDataSource({"left": [], "right": [], "colour": []})
        plot.segment("left", 0.0, "right", 0.0, source=self.bar, line_color="colour", line_width=6)
        self.needed = ColumnDataSource({"x": []})
        plot.scatter(
            "x",
            0.0,
            source=self.needed,
            marker="dash",
            angle=np.pi / 2,
            size=26,
            line_color=limit,
            line_width=2,
        )
        columns = ("x", "marker", "fill", "line")
        self.points = ColumnDataSource({name: [] for name in columns})
        plot.scatter(
            "x",
            0.0,
            source=self.points,
            marker="marker",
            size=13,
            fill_color="fill",
            line_color="line",
            line_width=2,
        )
        self.above = Labels(plot, baseline="bottom")
        self.today = today

    def update(self, results: Results) -> None:
        """Feed the figure."""
        balance = results.balance
        today, limit = look.colour("today"), look.colour("limit")
        marks = [
            (balance.forward_balance_percent, "circle", None, today, "forward", 1.65),
            (balance.balance_percent, "circle", today, today, "balance point", 1.05),
            (balance.neutral_point_percent, "triangle", limit, limit, "neutral point", 0.45),
        ]
        marks = [mark for mark in marks if np.isfinite(mark[0])]
        fit(self.x_range, [mark[0] for mark in marks], include=(-5.0, 105.0))
        self.points.data = {
            "x": [mark[0] for mark in marks],
            "marker": [mark[1] for mark in marks],
            "fill": [mark[2] for mark in marks],
            "line": [mark[3] for mark in marks],
        }
        self._feed_margin(results, balance)
        labels = [
            (x, y, f"{text} {words.number(x, '%')}", line, "center")
            for x, _, _, line, text, y in marks
        ]
        if np.isfinite(balance.static_margin_percent):
            middle = 0.5 * (balance.balance_percent + balance.neutral_point_percent)
            said = f"static margin {words.number(balance.static_margin_percent, '%')}"
            labels.append((middle, -1.15, said, look.colour("outline"), "center"))
        self.above.feed(labels)

    def _feed_margin(self, results: Results, balance: BalanceResult) -> None:
        first, last = balance.balance_percent, balance.neutral_point_percent
        if not np.isfinite([first, last]).all():
            self.bar.data = {"left": [], "right": [], "colour": []}
            self.needed.data = {"x": []}
            return
        stable = last >= first
        shade = look.colour("body" if stable else "limit")
        self.bar.data = {"left": [first], "right": [last], "colour": [shade]}
        least = next((m.limit for m in results.margins if m.key == "static_margin"), np.nan)
        self.needed.data = {"x": [last - least] if np.isfinite(least) else []}


class ElevatorOverSpeed(Plot):
    """Elevator for trim over speed, at both balance points, between its stops."""

    def __init__(self) -> None:
        self.model = plot = new_figure(
            "elevator",
            "Elevator for level flight over speed",
            x_label="true airspeed [m/s]",
            y_label="elevator, down [deg]",
        )
        limit, today = look.colour("limit"), look.colour("today")
        self.stops = ColumnDataSource({"inner": [], "outer": []})
        plot.hstrip(
            "inner",
            "outer",
            source=self.stops,
            fill_color=None,
            line_color=None,
            hatch_pattern="right_diagonal_line",
            hatch_color=limit,
            hatch_alpha=0.55,
            hatch_scale=7,
            hatch_weight=1,
        )
        plot.hspan("inner", source=self.stops, line_color=limit, line_width=look.THICK)
        plot.hspan(y=[0.0], line_color=look.colour("outline"), line_width=0.75)
        self.speeds = SpeedMarks(plot)
        self.nominal = TrustLine(plot, colour=today, width=2.5)
        self.forward = TrustLine(plot, colour=look.colour("trim"), width=2.5)
        self.labels = Labels(plot)
        add_reading(
            plot,
            [*self.nominal.renderers, *self.forward.renderers],
            [("speed", "@x{0.0} m/s"), ("elevator", "$y{0.0} deg")],
        )

    def update(self, results: Results) -> None:
        """Feed the figure."""
        balance = results.balance
        travel = balance.elevator_travel_deg
        speed = np.asarray(balance.speed_m_s)
        fit(self.x_range, speed)
        reach = 1.25 * travel
        fit(self.y_range, [-reach, reach], room=(0.0, 0.0))
        far = travel + 0.07 * self.height
        self.stops.data = {"inner": [travel, -travel], "outer": [far, -far]}
        self.nominal.feed(speed, balance.elevator_nominal_deg, balance.trust)
        self.forward.feed(speed, balance.elevator_forward_deg, balance.trust)
        self._feed_labels(results)

    def _feed_labels(self, results: Results) -> None:
        balance = results.balance
        speed = np.asarray(balance.speed_m_s)
        height = self.height
        rows: list[Label] = []
        for values, text, colour, offset in (
            (balance.elevator_nominal_deg, "balance point", "today", 0.09),
            (balance.elevator_forward_deg, "forward balance point", "trim", -0.09),
        ):
            found = np.isfinite(values)
            if found.any():
                at = float(speed[0]) + 0.45 * float(speed[-1] - speed[0])
                place = float(np.interp(at, speed[found], np.asarray(values)[found]))
                rows.append((at, place + offset * height, text, look.colour(colour)))
        left = self.left
        across = self.width
        for sign in (1.0, -1.0):
            edge = sign * balance.elevator_travel_deg
            rows.append(
                (
                    left + 0.98 * across,
                    edge - sign * 0.05 * height,
                    f"stop, {words.number(edge, 'deg')}",
                    look.colour("limit"),
                    "right",
                )
            )
        self.labels.feed(rows)
        # Under the words at the stop, wherever the speeds lie.
        self.speeds.feed(results, top=0.72 * balance.elevator_travel_deg)
