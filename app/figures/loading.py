"""How the lift is spread along the half-wing."""

from __future__ import annotations

import numpy as np
from bokeh.models import ColumnDataSource

from app.analysis.results import Results, SpanResult, Trust
from app.figures import look
from app.figures.labels import Labels
from app.figures.plot import Plot, TrustLine, new_figure
from app.figures.ranges import fit
from app.figures.span_plots import ACROSS, CONDITION_WORDS, condition_colour, fit_to_span, label_on
from app.figures.station import Station, half_span


class Loading(Plot):
    """How the lift is spread along the span, against an ellipse of the same area.

    Parameters
    ----------
    station : Station
        The place pointed at.
    """

    def __init__(self, station: Station) -> None:
        self.model = plot = new_figure(
            "loading",
            "How the lift is spread",
            x_label=ACROSS,
            y_label="chord × lift / mean chord [-]",
        )
        self.ellipse = ColumnDataSource({"x": [], "low": [], "high": []})
        grey = look.colour("outline")
        plot.varea("x", "low", "high", source=self.ellipse, fill_color=grey, fill_alpha=0.16)
        self.lines = {
            name: TrustLine(plot, colour=condition_colour(name), width=2.5)
            for name in ("landing", "cruise")
        }
        self.labels = Labels(plot)
        station.mark_across(plot)

    def update(self, results: Results) -> None:
        """Feed the figure."""
        landing, cruise = results.landing.landing_span, results.cruise.span
        half = half_span(results.planform)
        ellipse = _ellipse(landing, half)
        fit_to_span(self.x_range, results)
        fit(self.y_range, landing.loading, cruise.loading, ellipse[1], include=(0.0,))
        self.ellipse.data = {"x": ellipse[0], "low": [0.0] * len(ellipse[0]), "high": ellipse[1]}
        below = 0.08 * self.top
        rows = []
        for name, span in (("landing", landing), ("cruise", cruise)):
            self.lines[name].feed(span.y_m, span.loading, span.trust)
            colour = condition_colour(name)
            said = CONDITION_WORDS[name]
            rows.append(label_on(span.y_m, span.loading, said, colour, below=below, share=0.06))
        if ellipse[1]:
            grey = look.colour("outline")
            rows.append((0.06 * half, 1.5 * below, "grey: an ellipse, same lift as landing", grey))
        self.labels.feed(rows)


def _ellipse(span: SpanResult, half: float) -> tuple[list[float], list[float]]:
    """Give the ellipse that carries as much as `span`; empty where that is not known."""
    found = (np.asarray(span.trust) != Trust.NOT_CONVERGED) & np.isfinite(span.loading)
    if not found.all() or half <= 0.0:
        return [], []
    # Stations lie inside the half-wing: the tip carries nothing.
    y = np.concatenate(([0.0], span.y_m, [half]))
    carried = np.concatenate(([span.loading[0]], span.loading, [0.0]))
    area = float(np.trapezoid(carried, y))
    across = half * np.sin(np.linspace(0.0, np.pi / 2.0, 40))
    height = 4.0 * area / (np.pi * half) * np.sqrt(np.maximum(0.0, 1.0 - (across / half) ** 2))
    return across.tolist(), height.tolist()
