"""The wing from above, to scale, with the points that balance it."""

from __future__ import annotations

import numpy as np
from bokeh.models import ColumnDataSource

from app.analysis.results import PlanformResult, Results
from app.figures import look, words
from app.figures.labels import Label, Labels
from app.figures.plot import Plot, new_figure
from app.figures.ranges import fit, keep_to_scale
from app.figures.station import Station, chord_ends, half_span


class PlanformDrawing(Plot):
    """Wing and tail from above; where stall begins is hatched.

    Parameters
    ----------
    station : Station
        The place pointed at.
    height : int
        Height on screen. [px]
    """

    def __init__(self, station: Station, *, height: int) -> None:
        self.model = plot = new_figure(
            "planform",
            "Wing and tail from above, to scale",
            x_label="distance from the centre [m]",
            y_label="behind the root's leading edge [m]",
            y_range=(1.2, -0.2),
            height=height,
            described="Wing and tail from above, drawn to scale, with mean aerodynamic chord, "
            "neutral point and balance points",
        )
        keep_to_scale(plot)
        grey = look.colour("outline")
        self.outlines = ColumnDataSource({"xs": [], "ys": []})
        plot.patches(
            "xs",
            "ys",
            source=self.outlines,
            fill_color=grey,
            fill_alpha=0.12,
            line_color=grey,
            line_width=look.THICK,
        )
        self.onset = ColumnDataSource({"xs": [], "ys": []})
        plot.patches(
            "xs",
            "ys",
            source=self.onset,
            fill_color=None,
            line_color=None,
            hatch_pattern="right_diagonal_line",
            hatch_color=look.colour("limit"),
            hatch_alpha=0.45,
            hatch_scale=7,
            hatch_weight=1.2,
        )
        self.chord = ColumnDataSource({"x": [], "y": []})
        plot.line("x", "y", source=self.chord, line_color=look.colour("today"), line_width=3)
        self.points = balance_marks(plot)
        self.key = balance_marks(plot)
        plot.segment(
            "y",
            "lead",
            "y",
            "trail",
            source=station.marker,
            line_color=look.colour("station"),
            line_width=3,
        )
        plot.segment(
            "minus_y",
            "lead",
            "minus_y",
            "trail",
            source=station.marker,
            line_color=look.colour("station"),
            line_width=3,
        )
        station.follow(plot)
        self.labels = Labels(plot)

    def update(self, results: Results) -> None:
        """Feed the figure."""
        plan, landing = results.planform, results.landing
        half = half_span(plan)
        fit(self.x_range, [-half, half], room=(0.04, 0.04))
        bottom, top = float(np.max(plan.tail_x)), float(np.min(plan.wing_x))
        middle = (bottom + top) / 2.0
        reach = self.height / 2.0
        self.y_range.update(start=middle + reach, end=middle - reach)
        self.outlines.data = {
            "xs": [np.asarray(plan.wing_y).tolist(), np.asarray(plan.tail_y).tolist()],
            "ys": [np.asarray(plan.wing_x).tolist(), np.asarray(plan.tail_x).tolist()],
        }
        self.onset.data = _onset_patches(plan, landing.onset_from, landing.onset_to)
        self.chord.data = {
            "x": [plan.mean_chord_y_m, plan.mean_chord_y_m],
            "y": [plan.mean_chord_x_m, plan.mean_chord_x_m + plan.mean_chord_m],
        }
        self.points.data = balance_columns(plan)
        self.key.data, words_of_key = _key(plan)
        self.labels.feed([*_labels(results), *words_of_key])


def balance_marks(plot: object) -> ColumnDataSource:
    """Draw balance point, forward balance point and neutral point: three marks.

    Parameters
    ----------
    plot : figure
        Where.

    Returns
    -------
    ColumnDataSource
        To be fed with `balance_columns`.
    """
    source = ColumnDataSource({"x": [], "y": [], "marker": [], "fill": [], "line": []})
    plot.scatter(  # type: ignore[attr-defined]
        "x",
        "y",
        marker="marker",
        source=source,
        size=11,
        fill_color="fill",
        line_color="line",
        line_width=2,
    )
    return source


def balance_columns(plan: PlanformResult) -> dict[str, list[object]]:
    """Give place and look of the three points on the centre line.

    Parameters
    ----------
    plan : PlanformResult
        Where they lie.

    Returns
    -------
    dict of str to list
        One row a point; a point that was not found is left out.
    """
    today, limit = look.colour("today"), look.colour("limit")
    rows = [
        (plan.balance_x_m, "circle", today, today),
        (plan.forward_balance_x_m, "circle", None, today),
        (plan.neutral_point_x_m, "triangle", limit, limit),
    ]
    rows = [row for row in rows if np.isfinite(row[0])]
    return {
        "x": [0.0 for _ in rows],
        "y": [float(row[0]) for row in rows],
        "marker": [row[1] for row in rows],
        "fill": [row[2] for row in rows],
        "line": [row[3] for row in rows],
    }


def _key(
    plan: PlanformResult,
) -> tuple[dict[str, list[object]], list[tuple[float, float, str, str]]]:
    """Say what the three marks mean, in the empty space between wing and tail."""
    columns = balance_columns(plan)
    half = half_span(plan)
    _, trail = chord_ends(plan, np.array([0.0]))
    top, room = float(trail[0]), float(np.min(plan.tail_x)) - float(trail[0])
    names = {
        ("circle", True): "balance point",
        ("circle", False): "forward balance point",
        ("triangle", True): "neutral point",
    }
    rows: list[tuple[float, float, str, str]] = []
    for index, place in enumerate(columns["y"]):
        mark = (str(columns["marker"][index]), columns["fill"][index] is not None)
        text = f"{names[mark]}, {words.number(1e3 * float(str(place)), 'mm')}"
        height = top + room * (0.3 + 0.2 * index)
        rows.append((0.07 * half, height, text, str(columns["line"][index])))
    columns["x"] = [0.04 * half for _ in rows]
    columns["y"] = [row[1] for row in rows]
    return columns, rows


def _onset_patches(plan: PlanformResult, first: float, last: float) -> dict[str, list[list[float]]]:
    if not (np.isfinite(first) and np.isfinite(last)):
        return {"xs": [], "ys": []}
    half = half_span(plan)
    # A single station would have no width on screen.
    ends = np.array([max(0.0, min(first, last - 0.02)), max(last, first + 0.02)]) * half
    lead, trail = chord_ends(plan, ends)
    x = [ends[0], ends[1], ends[1], ends[0]]
    y = [float(lead[0]), float(lead[1]), float(trail[1]), float(trail[0])]
    return {"xs": [[float(v) for v in x], [float(-v) for v in x]], "ys": [y, y]}


def _labels(results: Results) -> list[Label]:
    plan, landing = results.planform, results.landing
    today, limit = look.colour("today"), look.colour("limit")
    aside = 0.02 * half_span(plan)
    chord_end = plan.mean_chord_x_m + plan.mean_chord_m
    rows: list[Label] = [
        (
            plan.mean_chord_y_m,
            chord_end + 2.2 * aside,
            f"mean aerodynamic chord {words.number(1e3 * plan.mean_chord_m, 'mm')}",
            today,
            "center",
        ),
    ]
    if np.isfinite(landing.onset_from) and np.isfinite(landing.onset_to):
        place = 0.5 * (landing.onset_from + landing.onset_to) * half_span(plan)
        lead, _ = chord_ends(plan, np.array([place]))
        rows.append((-place, float(lead[0]) - 2.2 * aside, "stall begins here", limit, "center"))
    return rows
