"""What every figure shares: how it is made, its ranges, and how trust is drawn.

A figure is made once a session and then fed. Its ranges stay where they are
while a slider moves, unless the data leave them or come to fill little of them:
a moving axis hides what moved, and automatic ranges paint every figure twice.
"""

from __future__ import annotations

import math
from collections.abc import Iterable, Sequence
from typing import Any, Literal, cast

import numpy as np
from bokeh.core.properties import value
from bokeh.models import ColumnDataSource, CustomJS, HoverTool, Range1d
from bokeh.models.renderers import GlyphRenderer
from bokeh.plotting import figure
from numpy.typing import ArrayLike

from app.analysis.results import Results, Trust
from app.figures import look

PLOT_HEIGHT = 186
DASHES = {Trust.VALID: "solid", Trust.EXTRAPOLATED: "8 4", Trust.INDICATIVE: "2 3"}
NAMES = {Trust.VALID: "valid", Trust.EXTRAPOLATED: "extrapolated", Trust.INDICATIVE: "indicative"}
_UNSET = (0.0, 1e-9)
_FILL_LEAST = 0.45  # a range filled less than this is drawn in again


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
    start, end = ends or _UNSET
    return Range1d(start=start, end=end)


class Plot:
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

    def update(self, results: Results) -> None:
        """Feed the figure.

        Parameters
        ----------
        results : Results
            What to show.
        """
        raise NotImplementedError


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


def bounds(axis_range: Range1d) -> tuple[float, float]:
    """Give start and end of a range.

    Parameters
    ----------
    axis_range : Range1d
        Numbers at both ends.

    Returns
    -------
    tuple of float
        Start, which is the larger one where the axis runs downwards, and end.
    """
    return float(str(axis_range.start)), float(str(axis_range.end))


def fit(
    axis_range: Range1d,
    *values: ArrayLike,
    include: Sequence[float] = (),
    room: tuple[float, float] = (0.08, 0.12),
) -> None:
    """Widen or draw in a range, only when the data ask for it.

    Parameters
    ----------
    axis_range : Range1d
        The range to keep or change; may run downwards.
    *values : array_like
        Everything that should be seen; not-finite values are left out.
    include : sequence of float
        Values always inside, for example zero.
    room : tuple of float
        Left free below and above the data, as shares of what they span.
    """
    seen = np.concatenate([np.ravel(np.asarray(part, dtype=np.float64)) for part in values])
    seen = seen[np.isfinite(seen)]
    if not seen.size:
        if bounds(axis_range) == _UNSET:
            axis_range.update(start=0.0, end=1.0)
        return
    low = min(float(seen.min()), *include) if include else float(seen.min())
    high = max(float(seen.max()), *include) if include else float(seen.max())
    start, end = sorted(bounds(axis_range))
    inside = low >= start and high <= end
    if inside and (high - low) >= _FILL_LEAST * (end - start):
        return
    first, last = _round_out(low, high, include, room)
    if (first, last) == (start, end):
        return
    if bounds(axis_range)[0] > bounds(axis_range)[1]:
        first, last = last, first
    axis_range.update(start=first, end=last)


def _round_out(
    low: float, high: float, include: Iterable[float], room: tuple[float, float]
) -> tuple[float, float]:
    width = max(high - low, 1e-3 * max(abs(low), abs(high)), 1e-9)
    first, last = low - room[0] * width, high + room[1] * width
    bounds = set(include)
    # A bound that is itself the end of the data (a zero line) needs no room.
    if low in bounds and low == 0.0:
        first = 0.0
    step = _nice(width / 20.0)
    return math.floor(first / step + 1e-9) * step, math.ceil(last / step - 1e-9) * step


def _nice(step: float) -> float:
    power = 10.0 ** math.floor(math.log10(step))
    return next(size * power for size in (1.0, 2.0, 5.0, 10.0) if size * power >= step * 0.999)


_EQUAL = """
const width = plot.inner_width, height = plot.inner_height
if (!(width > 20 && height > 20)) return
const across = Math.abs(plot.x_range.end - plot.x_range.start)
const middle = (plot.y_range.start + plot.y_range.end) / 2
const down = plot.y_range.start > plot.y_range.end ? -1 : 1
const half = across * height / width / 2
if (Math.abs(Math.abs(plot.y_range.end - plot.y_range.start) - 2 * half) < 1e-6 * half) return
plot.y_range.setv({start: middle - down * half, end: middle + down * half})
"""


def keep_to_scale(plot: figure) -> None:
    """Keep one unit as long upwards as across, whatever the size on screen.

    Parameters
    ----------
    plot : figure
        Its horizontal range decides; the vertical one keeps its middle.
    """
    callback = CustomJS(args={"plot": plot}, code=_EQUAL)
    plot.js_on_change("inner_width", callback)
    plot.js_on_change("inner_height", callback)
    plot.x_range.js_on_change("end", callback)
    plot.y_range.js_on_change("end", callback)


Label = tuple[float, float, str, str] | tuple[float, float, str, str, str]
"""Place x and y, words, colour; and ``"left"``, ``"center"`` or ``"right"``."""


def _legible(shade: str) -> str:
    """Give the blue of today's marks as small words need it: seen on both papers."""
    return look.colour("today-words") if shade == look.colour("today") else shade


class Labels:
    """Words beside lines and points, in the colour of what they name.

    Parameters
    ----------
    plot : figure
        Where to write.
    baseline : str
        How the words sit at the height of their point.
    chips : bool
        Lay a piece of light paper under the words, where they stand on colour.
    """

    def __init__(self, plot: figure, *, baseline: str = "middle", chips: bool = False) -> None:
        self.source = ColumnDataSource({name: [] for name in _LABEL_COLUMNS})
        self.renderer = plot.text(
            "x",
            "y",
            text="text",
            source=self.source,
            text_color="colour",
            text_align="align",
            text_baseline=baseline,
            text_font_size=look.token("plot-text"),
            text_font=value(look.FONT),
            level="annotation",
        )
        if chips:
            self.renderer.glyph.update(
                background_fill_color=look.token("card"),
                background_fill_alpha=0.85,
                padding=2,
                border_radius=2,
            )

    def feed(self, labels: Iterable[Label]) -> None:
        """Write words.

        Parameters
        ----------
        labels : iterable of tuple
            Rows as in `Label`; those at a not-finite place are left out.
        """
        kept = [
            (*row[:3], _legible(row[3]), row[4] if len(row) > 4 else "left")
            for row in labels
            if math.isfinite(row[0]) and math.isfinite(row[1])
        ]
        self.source.data = {
            name: [row[at] for row in kept] for at, name in enumerate(_LABEL_COLUMNS)
        }


_LABEL_COLUMNS = ("x", "y", "text", "colour", "align")


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
