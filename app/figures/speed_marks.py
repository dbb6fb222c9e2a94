"""Today's landing and cruise speed, marked on every plot over speed."""

from __future__ import annotations

from typing import cast

from bokeh.models import ColumnDataSource, Range1d
from bokeh.plotting import figure

from app.analysis.results import Results
from app.figures import look
from app.figures.labels import Labels
from app.figures.ranges import bounds

_SPEEDS = (
    # The landing speed is never above the cruise speed: words stand outside the two.
    ("landing_speed_m_s", "landing", "today", "right"),
    ("cruise_speed_m_s", "cruise", "cruise", "left"),
)


class SpeedMarks:
    """Two upright lines with their names.

    Parameters
    ----------
    plot : figure
        With speed across.
    """

    def __init__(self, plot: figure) -> None:
        self.plot = plot
        self.source = ColumnDataSource({"x": [], "colour": []})
        plot.vspan("x", source=self.source, line_color="colour", line_width=look.THIN)
        self.labels = Labels(plot, baseline="top")

    def feed(self, results: Results, *, top: float) -> None:
        """Mark the speeds of the inputs.

        Parameters
        ----------
        results : Results
            Whose inputs name the two speeds.
        top : float
            Where the words hang, in the unit of the vertical axis.
        """
        rows = []
        left, right = bounds(cast(Range1d, self.plot.x_range))
        edge = left + 0.2 * (right - left)
        for name, text, shade, align in _SPEEDS:
            value = results.inputs.get(name)
            if isinstance(value, (int, float)):
                # At the left end there is no room before the line.
                side = "left" if value < edge else align
                rows.append((float(value), top, f" {text} ", look.colour(shade), side))
        self.source.data = {"x": [row[0] for row in rows], "colour": [row[3] for row in rows]}
        self.labels.feed(rows)
