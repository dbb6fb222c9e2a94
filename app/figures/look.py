"""Colours, type and the Bokeh theme, read from the page's own tokens.

``app/static/tokens.css`` decides; nothing here repeats a value. Text, axes and
grids take their colours in the browser from the same tokens, so that they
follow the system's choice of light or dark without the server knowing it.
"""

from __future__ import annotations

import math
import re
from functools import cache
from pathlib import Path

from bokeh.themes import Theme

STATIC = Path(__file__).resolve().parent.parent / "static"
_TOKEN = re.compile(r"--([a-z0-9-]+):\s*([^;]+);")


@cache
def static_text(name: str) -> str:
    """Read one of the page's own files.

    Parameters
    ----------
    name : str
        File name inside ``app/static``.

    Returns
    -------
    str
        Its content.
    """
    return (STATIC / name).read_text(encoding="utf-8")


@cache
def tokens() -> dict[str, str]:
    """Read the tokens of the light paper by name.

    Returns
    -------
    dict of str to str
        Names without their two leading dashes.
    """
    light = static_text("tokens.css").split("@media", 1)[0]
    return {name: value.strip() for name, value in _TOKEN.findall(light)}


def token(name: str) -> str:
    """Give one token.

    Parameters
    ----------
    name : str
        Name without its two leading dashes.

    Returns
    -------
    str
        Its value as written.

    Raises
    ------
    KeyError
        If there is no such token.
    """
    return tokens()[name]


def colour(name: str) -> str:
    """Give the colour of one kind of mark.

    Parameters
    ----------
    name : str
        For example ``"today"``; see the tokens that begin with ``plot-``.

    Returns
    -------
    str
        A hexadecimal colour.
    """
    return token(f"plot-{name}")


THICK = float(token("plot-line"))
THIN = float(token("plot-thin"))
FONT = token("font").replace('"', "'")


@cache
def theme() -> Theme:
    """Make the one Bokeh theme.

    Returns
    -------
    Theme
        Given to each session's document.
    """
    text = {"size": token("plot-text"), "font": FONT}
    return Theme(
        json={
            "attrs": {
                "Plot": {
                    "background_fill_alpha": 0.0,
                    "border_fill_alpha": 0.0,
                    "outline_line_color": None,
                    "min_border_left": 50,
                    "min_border_right": 12,
                    "min_border_top": 22,
                    "min_border_bottom": 36,
                },
                "Axis": {
                    "axis_label_text_font": text["font"],
                    "axis_label_text_font_size": text["size"],
                    "axis_label_text_font_style": "normal",
                    "axis_label_standoff": 2,
                    "major_label_standoff": 3,
                    "major_label_text_font": text["font"],
                    "major_label_text_font_size": text["size"],
                    "minor_tick_line_color": None,
                    "major_tick_in": 0,
                    "major_tick_out": 3,
                    "axis_line_width": 1,
                },
                "Grid": {"grid_line_width": 1},
                "Title": {
                    "text_font": text["font"],
                    "text_font_size": token("plot-title"),
                    "text_font_style": "bold",
                    "standoff": 4,
                },
                "Label": {"text_font": text["font"], "text_font_size": text["size"]},
            }
        }
    )


_SLOW_TO_FAST = ("slow", "slowish", "middle", "fastish", "fast")


_SLOWEST, _FASTEST = 4e4, 6e5


def reynolds_colour(value: float) -> str:
    """Give the colour of a Reynolds number, warm for slow to cool for fast.

    Parameters
    ----------
    value : float
        Reynolds number. [-]

    Returns
    -------
    str
        A hexadecimal colour, mixed between the tokens.
    """
    anchors = [_rgb(colour(name)) for name in _SLOW_TO_FAST]
    if not value > 0.0:
        return colour("outline")
    share = math.log(value / _SLOWEST) / math.log(_FASTEST / _SLOWEST)
    place = min(max(share, 0.0), 1.0) * (len(anchors) - 1)
    first = min(int(place), len(anchors) - 2)
    mixed = [
        round(low + (place - first) * (high - low))
        for low, high in zip(anchors[first], anchors[first + 1], strict=True)
    ]
    return "#{:02x}{:02x}{:02x}".format(*mixed)


def _rgb(code: str) -> tuple[int, int, int]:
    return int(code[1:3], 16), int(code[3:5], 16), int(code[5:7], 16)


MARKERS = ("circle", "square", "triangle", "diamond", "inverted_triangle", "hex", "plus", "x")
"""Second carrier of the Reynolds number, for measured points."""
