"""One section: its outline, and its lift, drag and moment."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

import numpy as np
from bokeh.models import ColumnDataSource
from bokeh.models.renderers import GlyphRenderer
from bokeh.plotting import figure

from app.analysis.results import FloatArray, PolarCurve, Results, SectionResult, Trust
from app.figures import look, words
from app.figures.plot import DASHES, Plot, add_reading, new_figure, split_by_trust
from app.figures.ranges import fit, keep_to_scale
from app.figures.station import Station

CONDITIONS = ("cruise", "landing")
ALL = 0.0
"""Every Reynolds number is shown."""

_NEAR = 1.12  # runs within this ratio are shown with a curve brought forward


def on_wing(section: SectionResult) -> bool:
    """Whether a section belongs to the wing, so that a station of it means something."""
    return section.role != "tail"


class SectionPlot(Plot):
    """A plot of the section chosen on the sheet."""

    def __init__(self) -> None:
        self.section = 0
        self.only = ALL
        self.marks: list[GlyphRenderer[Any]] = []

    def choose(self, section: int, only: float = ALL) -> None:
        """Choose what the next update shows.

        Parameters
        ----------
        section : int
            Index into the sections of the results.
        only : float
            The one Reynolds number to bring forward, or `ALL`. [-]
        """
        self.section, self.only = section, only

    def chosen(self, results: Results) -> SectionResult:
        """Give the section chosen, or the first where there are fewer now."""
        index = self.section if self.section < len(results.sections) else 0
        section = results.sections[index]
        for mark in self.marks:
            # The station lies on the wing; a tail's section has no part in it.
            mark.visible = on_wing(section)
        return section


class OutlineDrawing(SectionPlot):
    """Outline, camber line and the quarter point, to scale."""

    def __init__(self) -> None:
        super().__init__()
        self.model = plot = new_figure(
            "outline",
            "Outline and camber line, to scale",
            x_label="along the chord [chord]",
            y_label="[chord]",
            x_range=(-0.03, 1.03),
            y_range=(-0.3, 0.3),
        )
        keep_to_scale(plot)
        grey = look.colour("outline")
        self.outline = ColumnDataSource({"x": [], "y": []})
        plot.patch(
            "x",
            "y",
            source=self.outline,
            fill_color=grey,
            fill_alpha=0.14,
            line_color=grey,
            line_width=look.THICK,
        )
        self.camber = ColumnDataSource({"x": [], "y": []})
        plot.line(
            "x",
            "y",
            source=self.camber,
            line_color=look.colour("today"),
            line_width=look.THIN,
            line_dash=[8, 3, 2, 3],
        )

    def update(self, results: Results) -> None:
        """Feed the figure."""
        section = self.chosen(results)
        self.outline.data = {
            "x": np.asarray(section.outline_x).tolist(),
            "y": np.asarray(section.outline_y).tolist(),
        }
        self.camber.data = {
            "x": np.asarray(section.camber_x).tolist(),
            "y": np.asarray(section.camber_y).tolist(),
        }


class PolarPlot(SectionPlot):
    """Curves of one section, one a Reynolds number, with measured points over them.

    Parameters
    ----------
    plot : figure
        Where to draw.
    across, up : callable
        Give the two columns of a curve or of measured points.
    reading : tuple of (str, str)
        Labels of the two columns for the pointer.
    """

    def __init__(
        self,
        plot: figure,
        *,
        across: Callable[[object], FloatArray],
        up: Callable[[object], FloatArray],
        reading: tuple[tuple[str, str], tuple[str, str]],
    ) -> None:
        super().__init__()
        self.model = plot
        self._across, self._up = across, up
        self.curves = ColumnDataSource(
            {name: [] for name in ("xs", "ys", "colour", "dash", "alpha", "width", "re")}
        )
        lines = plot.multi_line(
            "xs",
            "ys",
            source=self.curves,
            line_color="colour",
            line_dash="dash",
            line_alpha="alpha",
            line_width="width",
        )
        self.points = ColumnDataSource({name: [] for name in ("x", "y", "colour", "marker", "re")})
        dots = plot.scatter(
            "x",
            "y",
            source=self.points,
            marker="marker",
            size=5,
            fill_color=None,
            line_color="colour",
            line_alpha=0.8,
            line_width=1.1,
        )
        rows = [("Reynolds number", "@re"), *reading]
        add_reading(plot, [dots], rows)
        add_reading(plot, [lines], rows)

    def update(self, results: Results) -> None:
        """Feed the figure."""
        section = self.chosen(results)
        self.curves.data = self._curve_columns(section.curves)
        self.points.data = self._point_columns(section)
        shown = [curve for curve in section.curves if self._shown(curve.reynolds)]
        if shown:
            self.fit_ranges(shown)

    def fit_ranges(self, curves: list[PolarCurve]) -> None:
        """Make room for the curves shown.

        Parameters
        ----------
        curves : list of PolarCurve
            Never empty.
        """
        seen = [curve.trust < Trust.INDICATIVE for curve in curves]
        fit(self.y_range, *(self._up(c)[s] for c, s in zip(curves, seen, strict=True)))

    def _shown(self, reynolds: float) -> bool:
        if self.only == ALL:
            return True
        return bool(max(reynolds / self.only, self.only / reynolds) < _NEAR)

    def _curve_columns(self, curves: tuple[PolarCurve, ...]) -> dict[str, list[object]]:
        rows: list[tuple[object, ...]] = []
        for curve in curves:
            parts = split_by_trust(self._up(curve), curve.trust)
            across = np.asarray(self._across(curve)).tolist()
            alpha, width = (1.0, look.THICK) if self._shown(curve.reynolds) else (0.16, look.THIN)
            shade, said = look.reynolds_colour(curve.reynolds), words.reynolds(curve.reynolds)
            for values, dash in zip(parts.values(), DASHES.values(), strict=True):
                if np.isfinite(values).any():
                    rows.append((across, values, shade, dash, alpha, width, said))
        names = ("xs", "ys", "colour", "dash", "alpha", "width", "re")
        return {name: [row[at] for row in rows] for at, name in enumerate(names)}

    def _point_columns(self, section: SectionResult) -> dict[str, list[object]]:
        columns: dict[str, list[object]] = {
            name: [] for name in ("x", "y", "colour", "marker", "re")
        }
        for run in section.points:
            x, y = np.asarray(self._across(run)), np.asarray(self._up(run))
            found = np.isfinite(x) & np.isfinite(y)
            if not found.any() or not self._shown(run.reynolds):
                continue
            count = int(found.sum())
            columns["x"] += x[found].tolist()
            columns["y"] += y[found].tolist()
            columns["colour"] += [look.reynolds_colour(run.reynolds)] * count
            columns["marker"] += [run_marker(section, run.reynolds)] * count
            way = "measured" if run.rising else "measured, angle falling"
            columns["re"] += [f"{words.reynolds(run.reynolds)}, {way}"] * count
        return columns


def run_levels(section: SectionResult) -> list[float]:
    """List the Reynolds numbers of a section's runs, near ones as one.

    Parameters
    ----------
    section : SectionResult
        Whose measured points.

    Returns
    -------
    list of float
        Rising; empty where nothing was measured. [-]
    """
    levels: list[float] = []
    for value in sorted(run.reynolds for run in section.points):
        if not levels or value / levels[-1] >= _NEAR:
            levels.append(value)
    return levels


def run_marker(section: SectionResult, reynolds: float) -> str:
    """Give the mark of a run: the second carrier of its Reynolds number.

    Parameters
    ----------
    section : SectionResult
        Whose run.
    reynolds : float
        Of the run. [-]

    Returns
    -------
    str
        A Bokeh marker.
    """
    levels = run_levels(section)
    at = max((i for i, level in enumerate(levels) if level <= reynolds), default=0)
    return look.MARKERS[at % len(look.MARKERS)]


def _column(name: str) -> Callable[[object], FloatArray]:
    def column(table: object) -> FloatArray:
        return np.asarray(getattr(table, name), dtype=np.float64)

    return column


ANGLE, LIFT, DRAG, MOMENT = (_column(name) for name in ("angle_deg", "lift", "drag", "moment"))


class LiftOverAngle(PolarPlot):
    """Section lift over angle, with the station's points."""

    def __init__(self, station: Station) -> None:
        plot = new_figure(
            "section_lift",
            "Lift over angle of attack",
            x_label="angle of attack [deg]",
            y_label="lift coefficient [-]",
            x_range=(-8.0, 18.0),
        )
        reading = (("angle", "$x{0.0} deg"), ("lift coefficient", "$y{0.00}"))
        super().__init__(plot, across=ANGLE, up=LIFT, reading=reading)
        self.marks = [
            station.mark_point(plot, f"angle_{name}", f"lift_{name}", condition=name)
            for name in CONDITIONS
        ]


class LiftOverDrag(PolarPlot):
    """Section lift over drag, with the station's points."""

    def __init__(self, station: Station) -> None:
        plot = new_figure(
            "section_drag",
            "Lift over drag",
            x_label="drag coefficient, times 1000 [-]",
            y_label="lift coefficient [-]",
            x_range=(0.0, 60.0),
        )
        reading = (("drag coefficient, times 1000", "$x{0.0}"), ("lift coefficient", "$y{0.00}"))
        super().__init__(plot, across=lambda table: 1e3 * DRAG(table), up=LIFT, reading=reading)
        self.marks = [
            station.mark_point(plot, f"drag_{name}", f"lift_{name}", condition=name)
            for name in CONDITIONS
        ]


class MomentOverAngle(PolarPlot):
    """Section moment about the quarter chord over angle."""

    def __init__(self) -> None:
        plot = new_figure(
            "section_moment",
            "Moment about the quarter chord",
            x_label="angle of attack [deg]",
            y_label="moment coefficient [-]",
            x_range=(-8.0, 18.0),
        )
        reading = (("angle", "$x{0.0} deg"), ("moment coefficient", "$y{0.000}"))
        super().__init__(plot, across=ANGLE, up=MOMENT, reading=reading)
