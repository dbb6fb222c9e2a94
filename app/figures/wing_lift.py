"""Lift of the whole wing over angle, up to the onset of stall and past it."""

from __future__ import annotations

import numpy as np
from bokeh.models import ColumnDataSource

from app.analysis.results import Results, Trust
from app.figures import look, words
from app.figures.labels import Labels
from app.figures.plot import Plot, TrustLine, add_reading, new_figure
from app.figures.ranges import fit


class WingLift(Plot):
    """Lift curve at landing speed: onset of stall, today's angle, what lies beyond."""

    def __init__(self) -> None:
        self.model = plot = new_figure(
            "wing_lift",
            "Wing lift over angle at landing speed",
            x_label="angle of attack [deg]",
            y_label="lift coefficient [-]",
        )
        today, limit = look.colour("today"), look.colour("limit")
        self.needed = ColumnDataSource({"y": []})
        plot.hspan("y", source=self.needed, line_color=today, line_width=look.THIN)
        self.onset = ColumnDataSource({"x": [], "y": []})
        plot.vspan("x", source=self.onset, line_color=limit, line_width=look.THIN)
        self.line = TrustLine(plot, colour=look.colour("outline"), width=2.5)
        plot.scatter("x", "y", source=self.onset, marker="inverted_triangle", size=11, color=limit)
        self.peak = ColumnDataSource({"x": [], "y": []})
        plot.scatter(
            "x",
            "y",
            source=self.peak,
            marker="triangle",
            size=9,
            fill_color=None,
            line_color=limit,
            line_width=1.5,
        )
        self.labels = Labels(plot)
        add_reading(
            plot,
            self.line.renderers,
            [("angle", "@x{0.0} deg"), ("lift coefficient", "$y{0.00}")],
        )

    def update(self, results: Results) -> None:
        """Feed the figure."""
        curve = results.lift_curve
        if curve is None:
            return
        found = np.isfinite(curve.lift_coefficient) & (curve.trust != Trust.NOT_CONVERGED)
        if not found.any():
            self.line.feed([], [], [])
            return
        fit(self.x_range, curve.angle_deg[found])
        fit(self.y_range, curve.lift_coefficient[found], include=(0.0,))
        self.line.feed(curve.angle_deg, curve.lift_coefficient, curve.trust)
        onset = (curve.onset_angle_deg, curve.onset_lift_coefficient)
        seen = bool(np.isfinite(onset).all())
        self.onset.data = {"x": [onset[0]], "y": [onset[1]]} if seen else {"x": [], "y": []}
        self._feed_labels(results, onset)
        at = int(np.argmin(np.abs(curve.lift_coefficient - curve.largest_lift_coefficient)[found]))
        peak = (float(curve.angle_deg[found][at]), float(curve.largest_lift_coefficient))
        known = bool(np.isfinite(peak).all())
        self.peak.data = {"x": [peak[0]], "y": [peak[1]]} if known else {"x": [], "y": []}

    def _feed_labels(self, results: Results, onset: tuple[float, float]) -> None:
        needed = lift_needed(results)
        self.needed.data = {"y": [needed] if np.isfinite(needed) else []}
        left, across = self.left, self.width
        height = self.height
        text = f"landing needs {words.number(needed)}"
        today, limit = look.colour("today"), look.colour("limit")
        said = f"stall begins at {words.number(onset[0], 'deg')}, {words.number(onset[1])}"
        self.labels.feed(
            [
                (left + 0.02 * across, needed + 0.06 * height, text, today),
                (onset[0] - 0.02 * across, onset[1] + 0.06 * height, said, limit, "right"),
            ]
        )


def lift_needed(results: Results) -> float:
    """Give the lift coefficient that landing asks for.

    Parameters
    ----------
    results : Results
        Whose lift margin at landing speed is the part of it left until onset.

    Returns
    -------
    float
        NaN where either is not known. [-]
    """
    landing = results.landing
    share = 1.0 + landing.lift_margin_percent / 100.0
    return landing.onset_lift_coefficient / share if share > 0.0 else float("nan")
