"""The report as a page: what stands where."""

from __future__ import annotations

from bokeh.models import ColumnDataSource

from app.figures.station import Station
from app.report import charts as figures
from app.report import parts
from app.report.charts import Charts
from app.report.compare import compared
from app.report.csv_text import file_name, polar_csv, station_csv
from app.report.embed import whole_file
from app.report.live import Live, plot_place
from app.report.markup import Html, join, tag
from app.report.order import Order, Shown
from app.report.parts import section


def page(order: Order) -> str:
    """Build the file.

    Parameters
    ----------
    order : Order
        What to show.

    Returns
    -------
    str
        HTML, the same for the same order.
    """
    charts = Charts()
    live = Live(order, charts)
    sources: list[ColumnDataSource]
    if order.compares:
        body, sources = compared(order, charts, live), []
    else:
        station = Station()
        station.update(order.shown[0].results)
        body = _single(order.shown[0], charts, station, live)
        sources = [station.table, station.marker]
    content = tag(
        "main",
        parts.header(order),
        body,
        parts.cautions(order),
        parts.computed(order),
    )
    return whole_file(
        join(content, _station_bar(order)),
        title=f"{order.title} · Halfspan report",
        figures=charts.models,
        sources=[*sources, *live.sources],
        data={"live": live.data(), "csv": _csv(order), "stations": _stations(order)},
        cargo=order.cargo,
    )


def _single(one: Shown, charts: Charts, station: Station, live: Live) -> Html:
    results = one.results
    margins = results.margins
    return join(
        section(
            "verdict",
            parts.summary(margins),
            tag("p", results.reason, cls="reason"),
            tag("div", parts.margin_table(margins, above=results.reason), cls="scroll"),
            parts.behind(results),
            cls=f"verdict-section {parts.worst(margins)}",
        ),
        section(
            "wing",
            "The wing",
            tag(
                "div",
                plot_place(figures.planform(charts, station, results), wide=True),
                parts.planform_facts(results),
                cls="drawing",
            ),
        ),
        section("brief", "The brief", parts.group_facts(one, "brief")),
        section("live", "What if", live.markup()),
        section(
            "landing",
            "Launch and landing",
            tag(
                "div",
                [plot_place(name) for name in figures.landing_plots(charts, results)],
                tag("div", parts.risk_table(results), cls="scroll"),
                cls="beside",
            ),
        ),
        section("span", "Along the wing", _grid(figures.span_plots(charts, station, results))),
        section("speed", "Over speed", _grid(figures.speed_plots(charts, results))),
        section("balance", "Balance", _grid(figures.balance_plots(charts, results))),
        section(
            "stations",
            "Stations",
            parts.station_table(results),
            parts.save_button("stations-0", "Save the stations as CSV"),
        ),
        sections(one, charts, station),
        section("inputs", "Every other input", parts.inputs(one)),
    )


def sections(one: Shown, charts: Charts, station: Station) -> Html:
    """Show each section: what is known of it, where from, and its curves."""
    results = one.results
    shown = [
        tag(
            "div",
            tag("h3", f"{each.name}, {each.role}, ", tag("em", each.origin)),
            parts.section_facts(results, index),
            _grid(figures.section_plots(charts, station, results, index)),
            cls="one-section",
        )
        for index, each in enumerate(results.sections)
    ]
    return section(
        "sections", "Sections", shown, parts.save_button("polars-0", "Save the curves as CSV")
    )


def _grid(names: list[str]) -> Html:
    return tag("div", [plot_place(name) for name in names], cls="plots")


def _csv(order: Order) -> dict[str, dict[str, str]]:
    found = {}
    for at, one in enumerate(order.shown):
        found[f"stations-{at}"] = {
            "name": file_name(one.name, "stations"),
            "text": station_csv(one.results),
        }
        found[f"polars-{at}"] = {
            "name": file_name(one.name, "polars"),
            "text": polar_csv(one.results),
        }
    return found


def _stations(order: Order) -> dict[str, object]:
    return {"linked": not order.compares}


def _station_bar(order: Order) -> Html:
    """Make the bar that says what is pointed at, and points by keyboard."""
    said = "Point at the wing or at a plot along it." if not order.compares else ""
    return tag(
        "div",
        tag("label", "Station", for_="station"),
        tag(
            "input",
            type="range",
            id="station",
            min="0",
            max="100",
            step="1",
            value="50",
            aria_label="Station, percent of the half-span",
        ),
        tag("output", said, id="station-said", for_="station"),
        cls="station-bar",
    )
