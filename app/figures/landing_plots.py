"""Stall, landing, launch and cruise on one axis of speed."""

from __future__ import annotations

import numpy as np
from bokeh.models import ColumnDataSource

from app.analysis.results import Results
from app.figures import look, words
from app.figures.labels import Labels
from app.figures.plot import Plot, new_figure
from app.figures.ranges import fit

_ROWS = ("cruise", "landing", "launch", "stall")


class SpeedsOnOneAxis(Plot):
    """Each speed with its band, and the least speed that its requirement allows."""

    def __init__(self) -> None:
        self.model = plot = new_figure(
            "speeds",
            "Speeds on one axis",
            x_label="true airspeed [m/s]",
            y_label="",
            y_range=(-0.7, 3.8),
            described="Stall, launch, landing and cruise speed on one axis with their bands",
        )
        plot.yaxis.ticker = [0, 1, 2, 3]
        plot.yaxis.major_label_overrides = dict(enumerate(reversed(_ROWS)))
        plot.yaxis.major_tick_line_color = None
        plot.ygrid.visible = False
        plot.min_border_left = 56
        limit = look.colour("limit")
        self.stalled = ColumnDataSource({"x": [], "low": [], "high": [], "far": []})
        plot.vstrip(
            "far",
            "x",
            source=self.stalled,
            fill_color=None,
            line_color=None,
            hatch_pattern="right_diagonal_line",
            hatch_color=limit,
            hatch_alpha=0.35,
            hatch_scale=9,
            hatch_weight=1,
        )
        plot.vstrip(
            "low", "high", source=self.stalled, fill_color=limit, fill_alpha=0.18, line_color=None
        )
        plot.vspan("x", source=self.stalled, line_color=limit, line_width=look.THICK)
        columns = ("x", "y", "low", "high", "colour", "marker")
        self.speeds = ColumnDataSource({name: [] for name in columns})
        plot.segment(
            "low",
            "y",
            "high",
            "y",
            source=self.speeds,
            line_color="colour",
            line_width=7,
            line_alpha=0.3,
        )
        plot.scatter("x", "y", source=self.speeds, marker="marker", size=12, color="colour")
        self.least = ColumnDataSource({"x": [], "top": [], "bottom": []})
        plot.segment("x", "bottom", "x", "top", source=self.least, line_color=limit, line_width=2.5)
        self.labels = Labels(plot)
        self.least_labels = Labels(plot)

    def update(self, results: Results) -> None:
        """Feed the figure."""
        landing = results.landing
        stall = landing.stall_speed_m_s
        ends = sorted((landing.stall_speed_low_m_s, landing.stall_speed_high_m_s))
        known = bool(np.isfinite([stall, *ends]).all())
        self.stalled.data = (
            {"x": [stall], "low": [ends[0]], "high": [ends[1]], "far": [-100.0]}
            if known
            else {"x": [], "low": [], "high": [], "far": []}
        )
        rows = self._rows(results, stall, ends)
        values = [row[0] for row in rows]
        fit(self.x_range, values, [row[2] for row in rows], [0.93 * stall], room=(0.02, 0.3))
        names = ("x", "y", "low", "high", "colour", "marker")
        self.speeds.data = {name: [row[at] for row in rows] for at, name in enumerate(names)}
        self._feed_words(results, rows)

    def _rows(
        self, results: Results, stall: float, ends: list[float]
    ) -> list[tuple[float, float, float, float, str, str]]:
        error = results.inputs.get("airspeed_error_m_s")
        error = float(error) if isinstance(error, (int, float)) else 0.0
        shades = {
            "launch": ("body", "square"),
            "landing": ("today", "circle"),
            "cruise": ("cruise", "diamond"),
        }
        rows = []
        if np.isfinite([stall, *ends]).all():
            rows.append((stall, 0.0, ends[0], ends[1], look.colour("limit"), "inverted_triangle"))
        for place, name in enumerate(reversed(_ROWS)):
            value = results.inputs.get(f"{name}_speed_m_s")
            if name in shades and isinstance(value, (int, float)):
                shade, marker = shades[name]
                speed = float(value)
                rows.append(
                    (speed, float(place), speed - error, speed + error, look.colour(shade), marker)
                )
        return rows

    def _feed_words(
        self, results: Results, rows: list[tuple[float, float, float, float, str, str]]
    ) -> None:
        stall = results.landing.stall_speed_m_s
        across = self.width
        labels, least = [], []
        limits = {margin.key: margin.limit for margin in results.margins}
        for value, place, _, high, shade, _ in rows:
            text, right = words.number(value, "m/s"), max(value, high)
            key = {1.0: "launch_over_stall", 2.0: "landing_over_stall"}.get(place)
            if key in limits and np.isfinite(stall):
                text += f", {words.number(value / stall)} of stall"
                asked = limits[key] * stall
                least.append((asked, place))
                # Where the limit is missed its mark stands where the words would.
                right = max(right, asked)
            labels.append((right + 0.02 * across, place, text, shade))
        self.labels.feed(labels)
        self.least.data = {
            "x": [row[0] for row in least],
            "bottom": [row[1] - 0.36 for row in least],
            "top": [row[1] + 0.36 for row in least],
        }
        self.least_labels.feed(
            [
                (
                    x - 0.012 * across,
                    place + 0.3,
                    f"least {words.number(x, 'm/s')}",
                    look.colour("limit"),
                    "right",
                )
                for x, place in least
            ]
        )
