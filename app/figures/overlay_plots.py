"""Figures that lay up to six wings over each other, each with its letter, colour and dash."""

from __future__ import annotations

from abc import ABC, abstractmethod
from collections.abc import Callable, Sequence
from typing import Any

import numpy as np
from bokeh.models import ColumnDataSource, HoverTool
from bokeh.plotting import figure

from app.analysis.results import FloatArray, Results, SweepResult, TrustArray
from app.figures import look
from app.figures.labels import Label, Labels
from app.figures.plot import TrustLine, new_figure
from app.figures.ranges import bounds, fit, keep_to_scale
from app.figures.station import half_span

LETTERS = "ABCDEF"
COLOURS = ("today", "limit", "body", "cruise", "induced", "profile")
DASHES: tuple[Any, ...] = (
    "solid",
    [8, 3],
    [2, 3],
    [8, 3, 2, 3],
    [14, 4],
    [4, 2, 1, 2],
)
"""Second carrier of which wing a line belongs to; the letter is the third."""

WIDTHS = (2.5, 1.5, 0.8)
"""Valid, extrapolated, indicative: the thinner, the less sure. [px]"""

Useful = Callable[[FloatArray], FloatArray]


class Overlay(ABC):
    """One figure over which up to six wings are laid."""

    model: figure
    shape = "one"

    @abstractmethod
    def update(self, results: Sequence[Results]) -> None:
        """Feed the figure.

        Parameters
        ----------
        results : sequence of Results
            One a letter; what the figure shows must have been asked for.
        """


class OverlayPlanforms(Overlay):
    """Wings and tails from above, root leading edges together."""

    shape = "large"

    def __init__(self) -> None:
        self.model = plot = new_figure(
            "compared_planforms",
            "Wings and tails from above, to scale",
            x_label="distance from the centre [m]",
            y_label="behind the root's leading edge [m]",
            x_range=(-1.0, 1.0),
            y_range=(1.0, -0.2),
            height=388,
        )
        keep_to_scale(plot)
        self.sources = []
        for colour, dash in zip(COLOURS, DASHES, strict=True):
            source = ColumnDataSource({"x": [], "y": []})
            plot.multi_line(
                "x",
                "y",
                source=source,
                line_color=look.colour(colour),
                line_dash=dash,
                line_width=2,
            )
            self.sources.append(source)
        self.labels = Labels(plot, chips=True)

    def update(self, results: Sequence[Results]) -> None:
        """Feed the figure."""
        plans = [one.planform for one in results]
        half = max(half_span(plan) for plan in plans)
        least = min(half_span(plan) for plan in plans)
        fit(self.model.x_range, [-half, half], room=(0.03, 0.03))  # type: ignore[arg-type]
        far = max(float(np.max(plan.tail_x)) for plan in plans)
        near = min(float(np.min(plan.wing_x)) for plan in plans)
        fit(self.model.y_range, [near, far], room=(0.1, 0.1))  # type: ignore[arg-type]
        rows: list[Label] = []
        for at, source in enumerate(self.sources):
            if at >= len(plans):
                source.data = {"x": [], "y": []}
                continue
            plan = plans[at]
            source.data = {
                "x": [_closed(plan.wing_y), _closed(plan.tail_y)],
                "y": [_closed(plan.wing_x), _closed(plan.tail_x)],
            }
            tip = int(np.argmax(plan.wing_y))
            # On the leading edge, each at a place of its own.
            place = (0.25 + 0.12 * at) * least
            height = place / float(plan.wing_y[tip]) * float(plan.wing_x[tip])
            rows.append((place, height, *_named(at), "center"))
        self.labels.feed(_all_six(rows, (-9.0 * half, far)))


class OverlayLines(Overlay):
    """One line a wing.

    Parameters
    ----------
    name, title, x_label, y_label : str
        Model name, title and labels with their units.
    x, y : callable
        Give the line.
    trust : callable
        How far each point can be believed.
    limit : float, optional
        A line that must not be passed, hatched above.
    ends : tuple of float, optional
        Always seen across.
    useful : callable
        Leaves out of the values what need not be seen.
    """

    def __init__(
        self,
        name: str,
        title: str,
        *,
        x_label: str,
        y_label: str,
        x: Callable[[Results], FloatArray],
        y: Callable[[Results], FloatArray],
        trust: Callable[[Results], TrustArray],
        limit: float | None = None,
        ends: tuple[float, float] | None = None,
        useful: Useful = lambda values: values,
    ) -> None:
        self.x, self.y, self.trust, self.useful = x, y, trust, useful
        self.limit, self.ends = limit, ends
        self.model = plot = new_figure(name, title, x_label=x_label, y_label=y_label)
        if limit is not None:
            _forbidden(plot, limit)
        self.lines = []
        for at, (colour, dash) in enumerate(zip(COLOURS, DASHES, strict=True)):
            line = TrustLine(plot, colour=look.colour(colour))
            for renderer, width in zip(line.renderers, WIDTHS, strict=True):
                renderer.glyph.update(line_dash=dash, line_width=width)
            plot.add_tools(
                HoverTool(
                    renderers=list(line.renderers),
                    tooltips=[(LETTERS[at], "$y{0.00} at $x{0.0}")],
                    line_policy="nearest",
                    visible=False,
                )
            )
            self.lines.append(line)
        self.labels = Labels(plot, chips=True)

    def update(self, results: Sequence[Results]) -> None:
        """Feed the figure."""
        across, up = self.model.x_range, self.model.y_range
        lines = [(self.x(one), self.y(one), self.trust(one)) for one in results]
        ends = {} if self.ends is None else {"include": self.ends, "room": (0.0, 0.02)}
        fit(across, *(x for x, _, _ in lines), **ends)  # type: ignore[arg-type]
        seen = [self.useful(y[np.isfinite(y)]) for _, y, _ in lines]
        least = (0.0,) if self.limit is None else (0.0, 1.12 * self.limit)
        fit(up, *seen, include=least)  # type: ignore[arg-type]
        for at, line in enumerate(self.lines):
            if at < len(lines):
                line.feed(*lines[at])
            else:
                line.feed([], [], np.array([], dtype=np.uint8))
        self._feed_letters(lines)

    def _feed_letters(self, lines: Sequence[tuple[FloatArray, FloatArray, TrustArray]]) -> None:
        left, right = bounds(self.model.x_range)  # type: ignore[arg-type]
        bottom, top = bounds(self.model.y_range)  # type: ignore[arg-type]
        rows: list[Label] = []
        for at, (x, y, _) in enumerate(lines):
            found = np.isfinite(y) & (y >= bottom) & (y <= top)
            if not found.any():
                continue
            # Each letter at a place of its own, so that close lines keep theirs apart.
            wanted = left + (0.12 + 0.15 * at) * (right - left)
            place = min(max(wanted, float(x[found][0])), float(x[found][-1]))
            rows.append((place, float(np.interp(place, x[found], y[found])), *_named(at), "center"))
        self.labels.feed(_all_six(rows, (2.0 * left - right, bottom)))


def overlays() -> tuple[Overlay, ...]:
    """Make the figures of a comparison.

    Returns
    -------
    tuple of Overlay
        They need the sweep over speed in the results.
    """

    def over_speed(
        name: str,
        title: str,
        label: str,
        values: Callable[[SweepResult], FloatArray],
        useful: Useful = lambda found: found,
    ) -> Overlay:
        return OverlayLines(
            name,
            title,
            x_label="true airspeed [m/s]",
            y_label=label,
            x=lambda one: _sweep(one).speed_m_s,
            y=lambda one: values(_sweep(one)),
            trust=lambda one: _sweep(one).trust,
            useful=useful,
        )

    return (
        OverlayPlanforms(),
        OverlayLines(
            "compared_lift",
            "Local lift over its limit, at landing",
            x_label="along the half-wing [%]",
            y_label="local lift over its limit [-]",
            x=lambda one: 100.0 * one.landing.landing_span.y_m / half_span(one.planform),
            y=lambda one: one.landing.landing_span.lift / one.landing.landing_span.limit,
            trust=lambda one: one.landing.landing_span.trust,
            limit=1.0,
            ends=(0.0, 100.0),
        ),
        over_speed(
            "compared_drag", "Drag in level flight", "drag [N]", lambda s: s.total, _near_the_least
        ),
        over_speed(
            "compared_power",
            "Electric power in level flight",
            "electric power [W]",
            lambda s: s.electric_power_w,
            _near_the_least,
        ),
        over_speed(
            "compared_endurance", "Endurance", "time in the air [h]", lambda s: s.endurance_h
        ),
        over_speed(
            "compared_lift_to_drag", "Lift to drag", "lift to drag [-]", lambda s: s.lift_to_drag
        ),
    )


def _sweep(results: Results) -> SweepResult:
    if results.sweep is None:
        raise ValueError("the results have no sweep over speed")
    return results.sweep


def _near_the_least(values: FloatArray) -> FloatArray:
    """Leave out what lies far above the least, where stall sets in."""
    return values[values <= 2.6 * np.min(values)] if values.size else values


def _forbidden(plot: figure, limit: float) -> None:
    shade = look.colour("limit")
    plot.hstrip(
        [limit],
        [1.07 * limit],
        fill_color=None,
        line_color=None,
        hatch_pattern="right_diagonal_line",
        hatch_color=shade,
        hatch_alpha=0.55,
        hatch_scale=6,
        hatch_weight=1,
    )
    plot.hspan(y=[limit], line_color=shade, line_width=look.THICK)


def _all_six(rows: list[Label], aside: tuple[float, float]) -> list[Label]:
    """Fill up with nothing out of sight: words that become fewer upset their drawing."""
    return [*rows, *[(*aside, "", look.token("ink"))] * (len(LETTERS) - len(rows))]


def _named(at: int) -> tuple[str, str]:
    return LETTERS[at], look.colour(COLOURS[at])


def _closed(values: FloatArray) -> list[float]:
    return [*np.asarray(values).tolist(), float(values[0])]
