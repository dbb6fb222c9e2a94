"""Ranges of axes: where they stay, when they move, and drawings to scale.

A range stays where it is while a slider moves, unless the data leave it or come to
fill little of it: a moving axis hides what moved, and automatic ranges paint every
figure twice.
"""

from __future__ import annotations

import math
from collections.abc import Iterable, Sequence

import numpy as np
from bokeh.models import CustomJS, Range1d
from bokeh.plotting import figure
from numpy.typing import ArrayLike

UNSET = (0.0, 1e-9)
"""Ends of a range that no data have set yet."""

_FILL_LEAST = 0.45  # a range filled less than this is drawn in again


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
        if bounds(axis_range) == UNSET:
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
