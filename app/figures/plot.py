"""What every figure shares: how it is made, and how trust is drawn.

A figure is made once a session and then fed.
"""

from __future__ import annotations

from abc import ABC, abstractmethod
from collections.abc import Sequence
from typing import Any, Literal, cast

import numpy as np
from bokeh.models import ColumnDataSource, HoverTool, Range1d
from bokeh.models.renderers import GlyphRenderer
from bokeh.plotting import figure
from numpy.typing import ArrayLike

from app.analysis.results import Results, Trust
from app.figures import look
from app.figures.ranges import UNSET, bounds

PLOT_HEIGHT = 186
DASHES = {Trust.VALID: "solid", Trust.EXTRAPOLATED: "8 4", Trust.INDICATIVE: "2 3"}
NAMES = {Trust.VALID: "valid", Trust.EXTRAPOLATED: "extrapolated", Trust.INDICATIVE: "indicative"}


def new_figure(
    name: str,
    title: str,
    *,
    x_label: str,
    y_label: str,
    x_range: tuple[float, float] | None = None,
    y_range: tuple[float, float] | None = None,
    height: int = PLOT_HEIGHT,
    x_axis_type: Literal["linear", "log"] = "linear",
    described: str = "",
) -> figure:
    """Make an empty figure in the page's look.

    Parameters
    ----------
    name : str
        Model name, by which tests find it.
    title, x_label, y_label : str
        As shown; labels carry their unit in brackets.
    x_range, y_range : tuple of float
        Ranges at the start, in the units of the labels; without one the first
        data decide.
    height : int
        Height on screen. [px]
    x_axis_type : str
        ``"linear"`` or ``"log"``.
    described : str
        What a screen reader says; the title where empty.

    Returns
    -------
    bokeh.plotting.figure
        With explicit ranges, no toolbar and no legend.
    """
    plot = figure(
        name=name,
        title=title,
        height=height,
        sizing_mode="stretch_width",
        x_range=_range(x_range),
        y_range=_range(y_range),
        x_axis_label=x_label,
        y_axis_label=y_label,
        x_axis_type=x_axis_type,
        toolbar_location=None,
        tools="",
        html_attributes={"role": "img", "aria-label": described or title},
    )
    return plot


def _range(ends: tuple[float, float] | None) -> Range1d:
    start, end = ends or UNSET
    return Range1d(start=start, end=end)


class Plot(ABC):
    """One figure and its sources: made once, then fed."""

    model: figure

    @property
    def x_range(self) -> Range1d:
        """Range across."""
        return cast(Range1d, self.model.x_range)

    @property
    def y_range(self) -> Range1d:
        """Range upwards."""
        return cast(Range1d, self.model.y_range)

    @property
    def height(self) -> float:
        """How much is seen upwards, in the unit of the axis."""
        return abs(bounds(self.y_range)[1] - bounds(self.y_range)[0])

    @property
    def width(self) -> float:
        """How much is seen across, in the unit of the axis."""
        return abs(bounds(self.x_range)[1] - bounds(self.x_range)[0])

    @property
    def left(self) -> float:
        """Value at the left end."""
        return bounds(self.x_range)[0]

    @property
    def bottom(self) -> float:
        """Value at the lower end."""
        return bounds(self.y_range)[0]

    @property
    def top(self) -> float:
        """Value at the upper end."""
        return bounds(self.y_range)[1]

    @abstractmethod
    def update(self, results: Results) -> None:
        """Feed the figure.

        Parameters
        ----------
        results : Results
            What to show.
        """


class TrustLine:
    """A line that says how far it can be believed.

    Solid where valid, dashed where extrapolated, dotted where indicative, a gap
    where nothing converged. Colour and width stay the same.

    Parameters
    ----------
    plot : figure
        Where to draw.
    colour : str
        Of the line.
    width : float
        Of the line. [px]
    """

    def __init__(self, plot: figure, *, colour: str, width: float = look.THICK) -> None:
        columns: dict[str, list[float]] = {"x": []}
        columns.update({name: [] for name in NAMES.values()})
        self.source = ColumnDataSource(columns)
        self.renderers: list[GlyphRenderer[Any]] = [
            plot.line(
                "x",
                name,
                source=self.source,
                line_color=colour,
                line_width=width,
                line_dash=DASHES[trust],
            )
            for trust, name in NAMES.items()
        ]

    def feed(self, x: ArrayLike, y: ArrayLike, trust: ArrayLike) -> None:
        """Show a line.

        Parameters
        ----------
        x, y : array_like, shape (n,)
            Points in the units of the axes.
        trust : array_like, shape (n,)
            Codes of :class:`Trust`.
        """
        across = np.asarray(x, dtype=np.float64)
        self.source.data = {"x": across.tolist(), **split_by_trust(y, trust)}


def split_by_trust(y: ArrayLike, trust: ArrayLike) -> dict[str, list[float]]:
    """Split a line into the parts drawn solid, dashed and dotted.

    Neighbouring parts share a point so that no gap shows between them; the
    shared point belongs to the less trusted side's line too. Points that did
    not converge are NaN in all of them.

    Parameters
    ----------
    y : array_like, shape (n,)
        Values.
    trust : array_like, shape (n,)
        Codes of :class:`Trust`.

    Returns
    -------
    dict of str to list of float
        One list of n values a name in `NAMES`, NaN where another part is drawn.
    """
    values = np.asarray(y, dtype=np.float64)
    codes = np.broadcast_to(np.asarray(trust, dtype=np.int64), values.shape)
    found = codes != Trust.NOT_CONVERGED
    parts = {}
    for code, name in NAMES.items():
        here = codes == code
        if code != Trust.VALID:
            # A segment is drawn like its less trusted end.
            better = found & (codes < code)
            here = here | (better & (_beside(codes == code)))
        parts[name] = np.where(here, values, np.nan).tolist()
    return parts


def _beside(mask: np.ndarray) -> np.ndarray:
    near = np.zeros_like(mask)
    near[1:] |= mask[:-1]
    near[:-1] |= mask[1:]
    return near


def add_reading(
    plot: figure, renderers: Sequence[GlyphRenderer[Any]], rows: Sequence[tuple[str, str]]
) -> None:
    """Let the pointer read values off lines.

    Parameters
    ----------
    plot : figure
        Where.
    renderers : sequence of GlyphRenderer
        What can be read.
    rows : sequence of (str, str)
        Label and Bokeh field format of each line of the reading.
    """
    plot.add_tools(
        HoverTool(
            renderers=list(renderers), tooltips=list(rows), line_policy="nearest", visible=False
        )
    )
