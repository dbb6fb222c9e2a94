"""Figures of a report: the page's own, with zoom, and bound to one station."""

from __future__ import annotations

from collections.abc import Iterable

from bokeh.models import BoxZoomTool, HoverTool, PanTool, ResetTool, WheelZoomTool
from bokeh.plotting import figure

from app.analysis.results import Results
from app.figures.balance_plots import ChordRuler, ElevatorOverSpeed
from app.figures.landing_plots import SpeedsOnOneAxis
from app.figures.loading import Loading
from app.figures.planform import PlanformDrawing
from app.figures.plot import Plot
from app.figures.section_limits import LargestLift
from app.figures.section_plots import (
    LiftOverAngle,
    LiftOverDrag,
    MomentOverAngle,
    OutlineDrawing,
    SectionPlot,
)
from app.figures.span_plots import LocalLift, ReynoldsAlongSpan, RoomAlongSpan
from app.figures.speed_plots import (
    ENDURANCE,
    LIFT_TO_DRAG,
    POWER,
    RANGE,
    CurveOverSpeed,
    DragOverSpeed,
)
from app.figures.station import Station, half_span
from app.figures.wing_lift import WingLift

HEIGHT = 236
"""Of a plot on screen [px]."""

DRAWING_HEIGHT, DRAWING_WIDTH = 400, 640
"""Of the wing from above on screen, its frame alone across [px]."""

DRAWING_ROOM = 1.2
"""How much is seen over what is drawn [-]."""


class Charts:
    """The figures of one report, in the order in which they were made.

    Each is a root of the document and gets a place on the page by its name.
    """

    def __init__(self) -> None:
        self.models: list[figure] = []

    def add(self, model: figure, name: str, *, height: int = HEIGHT) -> str:
        """Take a figure in: it can be zoomed, and its name is unique.

        Parameters
        ----------
        model : figure
            From the page or from the report itself.
        name : str
            Of its place.
        height : int
            On screen. [px]

        Returns
        -------
        str
            The name.
        """
        model.name = name
        model.height = height
        zoomable(model)
        self.models.append(model)
        return name

    def fed(self, plot: Plot, results: Results, name: str, *, height: int = HEIGHT) -> str:
        """Feed one of the page's figures once and take it in."""
        plot.update(results)
        return self.add(plot.model, name, height=height)


def zoomable(model: figure) -> None:
    """Give a figure its tools: drag a box to zoom, double click or the button to reset."""
    box = BoxZoomTool()
    # The wheel alone belongs to the page, which would not scroll otherwise.
    wheel = WheelZoomTool(modifiers={"ctrl": True})
    model.add_tools(box, wheel, PanTool(), ResetTool())
    model.toolbar.active_drag = box
    model.toolbar.active_scroll = wheel
    model.toolbar.logo = None
    model.toolbar.autohide = True
    model.toolbar_location = "right"
    model.toolbar_inner = True
    for tool in model.toolbar.tools:
        if isinstance(tool, HoverTool):
            tool.visible = False


def planform(charts: Charts, station: Station, results: Results) -> str:
    """Draw wing and tail, as high as they need to be seen whole."""
    drawing = PlanformDrawing(station, height=DRAWING_HEIGHT)
    drawing.update(results)
    plan = results.planform
    half = half_span(plan)
    top, bottom = float(plan.wing_x.min()), float(max(plan.tail_x.max(), plan.wing_x.max()))
    height = drawing_height(half, bottom - top)
    room = 0.5 * (bottom - top) * DRAWING_ROOM
    middle = 0.5 * (bottom + top)
    drawing.x_range.update(start=-1.06 * half, end=1.06 * half)
    drawing.y_range.update(start=middle + room, end=middle - room)
    return charts.add(drawing.model, "planform", height=height)


def drawing_height(half: float, depth: float) -> int:
    """Give the height at which a drawing to scale shows wing and tail whole.

    Parameters
    ----------
    half : float
        Half-span. [m]
    depth : float
        From the foremost to the rearmost edge. [m]

    Returns
    -------
    int
        Within what a page bears. [px]
    """
    needed = DRAWING_WIDTH / (2.12 * half) * depth * DRAWING_ROOM + 70.0
    return int(min(max(needed, 220.0), 560.0))


def span_plots(charts: Charts, station: Station, results: Results) -> list[str]:
    """Draw what happens along the half-wing."""
    made: list[tuple[Plot, str]] = [
        (LocalLift(station, "landing"), "local-lift-landing"),
        (LocalLift(station, "cruise"), "local-lift-cruise"),
        (RoomAlongSpan(station), "room"),
        (ReynoldsAlongSpan(station, ("cruise", "landing")), "reynolds"),
        (Loading(station), "loading"),
        (WingLift(), "wing-lift"),
    ]
    return _fed(charts, results, made)


def speed_plots(charts: Charts, results: Results) -> list[str]:
    """Draw drag, power, endurance and range over speed."""
    made: list[tuple[Plot, str]] = [(DragOverSpeed(), "drag")]
    made += [
        (CurveOverSpeed(curve), curve.name.replace("_", "-"))
        for curve in (LIFT_TO_DRAG, POWER, ENDURANCE, RANGE)
    ]
    return _fed(charts, results, made)


def landing_plots(charts: Charts, results: Results) -> list[str]:
    """Draw the speeds on one axis."""
    return _fed(charts, results, [(SpeedsOnOneAxis(), "speeds")])


def balance_plots(charts: Charts, results: Results) -> list[str]:
    """Draw balance and elevator."""
    return _fed(charts, results, [(ChordRuler(), "balance"), (ElevatorOverSpeed(), "elevator")])


def section_plots(charts: Charts, station: Station, results: Results, index: int) -> list[str]:
    """Draw one section of the results."""
    made: list[tuple[SectionPlot, str]] = [
        (OutlineDrawing(), "outline"),
        (LargestLift(station), "largest-lift"),
        (LiftOverAngle(station), "lift"),
        (LiftOverDrag(station), "polar"),
    ]
    if any(curve.moment.size for curve in results.sections[index].curves):
        made.append((MomentOverAngle(), "moment"))
    for plot, _ in made:
        plot.choose(index)
    return _fed(charts, results, [(plot, f"section-{index + 1}-{name}") for plot, name in made])


def _fed(charts: Charts, results: Results, made: Iterable[tuple[Plot, str]]) -> list[str]:
    return [charts.fed(plot, results, name) for plot, name in made]
