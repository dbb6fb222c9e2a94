"""Words inside a figure, in the colour of what they name."""

from __future__ import annotations

import math
from collections.abc import Iterable

from bokeh.core.properties import value
from bokeh.models import ColumnDataSource
from bokeh.plotting import figure

from app.figures import look

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
        self.chips, self.most = chips, 0
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
        if self.chips:
            # Bokeh 3.9 fails in the browser when words on paper become fewer: what is
            # gone stays as a row without words or place.
            self.most = max(self.most, len(kept))
            kept += [(math.nan, math.nan, "", "", "left")] * (self.most - len(kept))
        self.source.data = {
            name: [row[at] for row in kept] for at, name in enumerate(_LABEL_COLUMNS)
        }


_LABEL_COLUMNS = ("x", "y", "text", "colour", "align")
