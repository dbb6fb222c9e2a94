"""Largest lift of one section over Reynolds number, and how surely it is known."""

from __future__ import annotations

import numpy as np
from bokeh.models import ColumnDataSource

from app.analysis.results import Results, SectionResult
from app.figures import look
from app.figures.labels import Labels
from app.figures.plot import DASHES, add_reading, new_figure, split_by_trust
from app.figures.ranges import fit
from app.figures.section_plots import CONDITIONS, SectionPlot, on_wing
from app.figures.station import Station


class LargestLift(SectionPlot):
    """Largest lift over Reynolds number: what the section can give, and how surely."""

    def __init__(self, station: Station) -> None:
        super().__init__()
        self.model = plot = new_figure(
            "largest_lift",
            "Largest lift over Reynolds number",
            x_label="Reynolds number [thousand]",
            y_label="largest lift coefficient [-]",
            x_range=(40.0, 700.0),
            y_range=(0.6, 1.6),
            x_axis_type="log",
        )
        plot.xaxis.ticker = [20, 30, 50, 100, 200, 300, 500, 1000, 2000]
        self.ranges = ColumnDataSource({"left": [], "right": [], "colour": []})
        plot.quad(
            left="left",
            right="right",
            bottom=-5.0,
            top=5.0,
            source=self.ranges,
            fill_color="colour",
            fill_alpha=0.13,
            line_color=None,
        )
        self.unknown = ColumnDataSource({"left": [], "right": []})
        plot.quad(
            left="left",
            right="right",
            bottom=-5.0,
            top=5.0,
            source=self.unknown,
            fill_color=None,
            line_color=None,
            hatch_pattern="cross",
            hatch_color=look.colour("limit"),
            hatch_alpha=0.5,
            hatch_scale=8,
            hatch_weight=0.75,
        )
        limit = look.colour("limit")
        self.band = ColumnDataSource({"x": [], "low": [], "high": []})
        plot.varea("x", "low", "high", source=self.band, fill_color=limit, fill_alpha=0.2)
        self.line = ColumnDataSource({"xs": [], "ys": [], "dash": []})
        self.renderer = plot.multi_line(
            "xs", "ys", source=self.line, line_color=limit, line_width=2.5, line_dash="dash"
        )
        self.labels = Labels(plot, baseline="bottom")
        self.marks = [
            station.mark_point(plot, f"re_{name}", f"lift_{name}", condition=name)
            for name in CONDITIONS
        ]
        reading = [("Reynolds number", "$x{0} thousand"), ("largest lift", "$y{0.00}")]
        add_reading(plot, [self.renderer], reading)

    def update(self, results: Results) -> None:
        """Feed the figure."""
        section = self.chosen(results)
        thousands = np.asarray(section.limit_reynolds) / 1e3
        self.band.data = {
            "x": thousands.tolist(),
            "low": np.asarray(section.largest_lift_low).tolist(),
            "high": np.asarray(section.largest_lift_high).tolist(),
        }
        parts = split_by_trust(section.largest_lift, section.limit_trust)
        shown = [
            (values, dash)
            for values, dash in zip(parts.values(), DASHES.values(), strict=True)
            if np.isfinite(values).any()
        ]
        self.line.data = {
            "xs": [thousands.tolist() for _ in shown],
            "ys": [values for values, _ in shown],
            "dash": [dash for _, dash in shown],
        }
        self.unknown.data = {
            "left": [first / 1e3 for first, _ in section.unknown_reynolds],
            "right": [last / 1e3 for _, last in section.unknown_reynolds],
        }
        seen = [section.largest_lift_low, section.largest_lift_high]
        if on_wing(section):
            # So that the room between a station's lift and its limit is seen.
            spans = (results.landing.landing_span, results.cruise.span)
            seen.append(np.array([np.max(span.lift) for span in spans]))
        fit(self.y_range, *seen, room=(0.14, 0.3))
        self._feed_ranges(section)

    def _feed_ranges(self, section: SectionResult) -> None:
        today, cruise = look.colour("today"), look.colour("cruise")
        ranges = [
            (section.landing_reynolds, today, "landing"),
            (section.cruise_reynolds, cruise, "cruise"),
        ]
        ranges = [row for row in ranges if np.isfinite(row[0]).all()]
        self.ranges.data = {
            "left": [low / 1e3 for (low, _), _, _ in ranges],
            "right": [high / 1e3 for (_, high), _, _ in ranges],
            "colour": [colour for _, colour, _ in ranges],
        }
        # One above the other, since the two ranges often overlap.
        self.labels.feed(
            [
                (
                    float(np.sqrt(low * high)) / 1e3,
                    self.top - (0.11 + 0.09 * index) * self.height,
                    text,
                    colour,
                    "center",
                )
                for index, ((low, high), colour, text) in enumerate(ranges)
            ]
        )
