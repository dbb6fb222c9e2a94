"""Figures that lay several wings over each other."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any, TypeAlias

import numpy as np
from bokeh.models import HoverTool
from bokeh.models.annotations import Legend, LegendItem
from bokeh.models.renderers import GlyphRenderer
from bokeh.plotting import figure

from app.analysis.results import FloatArray, Results, SweepResult, TrustArray
from app.figures import look
from app.figures.plot import TrustLine, new_figure
from app.figures.ranges import fit, keep_to_scale
from app.figures.station import half_span
from app.report.charts import Charts, drawing_height
from app.report.live import COLOURS, DASHES, LEGEND
from app.report.order import Order

Lines: TypeAlias = "list[GlyphRenderer[Any]]"

MARKERS = ("circle", "square", "triangle", "diamond", "hex", "inverted_triangle")


def overlays(charts: Charts, order: Order) -> list[str]:
    """Draw everything that is compared, planforms first."""
    return [
        _planforms(charts, order),
        _along(
            charts,
            order,
            "used",
            "Local lift over its limit, at landing",
            "local lift over its limit [-]",
            lambda r: r.landing.landing_span.lift / r.landing.landing_span.limit,
        ),
        _along(
            charts,
            order,
            "reynolds",
            "Reynolds number, at landing",
            "Reynolds number [thousand]",
            lambda r: r.landing.landing_span.reynolds / 1e3,
        ),
        _over_speed(charts, order, "drag", "Drag in level flight", "drag [N]", lambda s: s.total),
        _over_speed(
            charts, order, "lift-to-drag", "Lift to drag", "lift to drag [-]",
            lambda s: s.lift_to_drag,
        ),
        _over_speed(
            charts, order, "power", "Electric power", "electric power [W]",
            lambda s: s.electric_power_w,
        ),
        _over_speed(
            charts, order, "endurance", "Endurance", "time in the air [h]", lambda s: s.endurance_h
        ),
    ]  # fmt: skip


def _planforms(charts: Charts, order: Order) -> str:
    half = max(half_span(one.results.planform) for one in order.shown)
    bottom = max(float(np.max(one.results.planform.tail_x)) for one in order.shown)
    plot = new_figure(
        "planforms",
        "Wings and tails from above, to scale, root leading edges together",
        x_label="distance from the centre [m]",
        y_label="behind the root's leading edge [m]",
        x_range=(-1.04 * half, 1.04 * half),
        y_range=(1.1 * bottom, -0.1 * bottom),
    )
    keep_to_scale(plot)
    rows: list[tuple[str, Lines]] = []
    for at, one in enumerate(order.shown):
        plan = one.results.planform
        lines = plot.multi_line(
            [_closed(plan.wing_y), _closed(plan.tail_y)],
            [_closed(plan.wing_x), _closed(plan.tail_x)],
            line_color=look.colour(COLOURS[at]),
            line_dash=DASHES[at],
            line_width=2,
        )
        mark = plot.scatter(
            [0.0],
            [plan.balance_x_m],
            marker=MARKERS[at],
            size=10,
            fill_color=look.colour(COLOURS[at]),
            line_color=None,
        )
        rows.append((one.letter, [lines, mark]))
    _legend(plot, rows)
    plot.legend.location = "bottom_right"
    return charts.add(plot, "planforms", height=drawing_height(half, bottom))


def _closed(values: FloatArray) -> list[float]:
    return [*values.tolist(), float(values[0])]


def _along(
    charts: Charts,
    order: Order,
    name: str,
    title: str,
    label: str,
    values: Callable[[Results], FloatArray],
) -> str:
    plot = new_figure(
        name,
        title,
        x_label="along the half-wing [%]",
        y_label=label,
        x_range=(0.0, 101.0),
        y_range=(0.0, 1.0),
    )
    fit(plot.y_range, *(values(one.results) for one in order.shown), include=(0.0,))  # type: ignore[arg-type]
    rows = []
    for at, one in enumerate(order.shown):
        span = one.results.landing.landing_span
        share = 100.0 * span.y_m / half_span(one.results.planform)
        rows.append((one.letter, _line(plot, at, share, values(one.results), span.trust)))
    return _done(charts, plot, name, rows)


def _over_speed(
    charts: Charts,
    order: Order,
    name: str,
    title: str,
    label: str,
    values: Callable[[SweepResult], FloatArray],
) -> str:
    sweeps = [one.results.sweep for one in order.shown]
    known = [sweep for sweep in sweeps if sweep is not None]
    plot = new_figure(
        name,
        title,
        x_label="true airspeed [m/s]",
        y_label=label,
        x_range=(8.0, 25.0),
        y_range=(0.0, 1.0),
    )
    fit(plot.x_range, *(sweep.speed_m_s for sweep in known))  # type: ignore[arg-type]
    seen = [_useful(values(sweep), name) for sweep in known]
    fit(plot.y_range, *(1.12 * one for one in seen), include=(0.0,))  # type: ignore[arg-type]
    rows = []
    for at, (one, sweep) in enumerate(zip(order.shown, sweeps, strict=True)):
        if sweep is not None:
            lines = _line(plot, at, sweep.speed_m_s, values(sweep), sweep.trust)
            rows.append((one.letter, lines))
    return _done(charts, plot, f"compared-{name}", rows)


def _useful(values: FloatArray, name: str) -> FloatArray:
    found = values[np.isfinite(values)]
    if name in ("drag", "power") and found.size:
        found = found[found <= 2.6 * found.min()]
    return found


def _line(plot: figure, at: int, x: FloatArray, y: FloatArray, trust: TrustArray) -> Lines:
    """Draw one wing's line; its dash says whose it is, thinness that it is less sure."""
    line = TrustLine(plot, colour=look.colour(COLOURS[at]), width=2.5)
    line.feed(x, y, trust)
    for renderer, width in zip(line.renderers, (2.5, 1.5, 0.8), strict=True):
        renderer.glyph.update(line_dash=DASHES[at], line_width=width)
    return line.renderers


def _done(
    charts: Charts,
    plot: figure,
    name: str,
    rows: list[tuple[str, Lines]],
) -> str:
    for letter, lines in rows:
        reading = [(letter, "$y{0.00} at $x{0.0}")]
        plot.add_tools(
            HoverTool(renderers=list(lines), tooltips=reading, line_policy="nearest", visible=False)
        )
    _legend(plot, [(letter, lines[:1]) for letter, lines in rows])
    return charts.add(plot, name)


def _legend(plot: figure, rows: list[tuple[str, Lines]]) -> None:
    items = [LegendItem(label=label, renderers=list(lines)) for label, lines in rows]
    style = LEGEND if len(items) <= 4 else {**LEGEND, "glyph_width": 15, "spacing": 3}
    plot.add_layout(Legend(items=items, **style))
