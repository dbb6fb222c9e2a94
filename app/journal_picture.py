"""A small picture of a wing and its tail from above, as SVG text."""

from __future__ import annotations

import re

import numpy as np

from app.analysis.results import FloatArray, PlanformResult

WIDTH, HEIGHT = 160.0, 72.0
"""Size of the picture [px]; both outlines fit in, to one scale."""

ROOM = 4.0

_OPEN = (
    f'<svg xmlns="http://www.w3.org/2000/svg" viewBox="0 0 {WIDTH:g} {HEIGHT:g}" '
    f'width="{WIDTH:g}" height="{HEIGHT:g}" role="img" aria-label="Wing and tail from above">'
)
_PATH = '<path d="{}" fill="currentColor" fill-opacity="0.12" stroke="currentColor"/>'
_CLOSE = "</svg>"

_DRAWN = re.compile(
    re.escape(_OPEN)
    + "(?:"
    + re.escape(_PATH).replace(r"\{\}", r"M-?[0-9. L-]{0,4000}Z")
    + "){0,4}"
    + re.escape(_CLOSE)
)


def planform_svg(planform: PlanformResult) -> str:
    """Draw wing and tail from above, to one scale.

    Parameters
    ----------
    planform : PlanformResult
        Outlines in metres; one that has a value that is not finite is left out.

    Returns
    -------
    str
        One ``svg`` element of two closed paths in the text's colour; no style,
        script or outside address.
    """
    outlines = [
        outline
        for outline in (
            _outline(planform.wing_y, planform.wing_x),
            _outline(planform.tail_y, planform.tail_x),
        )
        if outline.size and np.isfinite(outline).all()
    ]
    if not outlines:
        return _OPEN + _CLOSE
    points = np.concatenate(outlines)
    low, high = points.min(axis=0), points.max(axis=0)
    size = np.array([WIDTH, HEIGHT]) - 2.0 * ROOM
    scale = float(np.min(size / np.maximum(high - low, 1e-6)))
    shift = np.array([WIDTH, HEIGHT]) / 2.0 - scale * (low + high) / 2.0
    paths = "".join(_PATH.format(_path(scale * outline + shift)) for outline in outlines)
    return _OPEN + paths + _CLOSE


def is_planform_svg(text: str) -> bool:
    """Whether a text is a picture that `planform_svg` could have drawn.

    Parameters
    ----------
    text : str
        From a file that anybody may have written.

    Returns
    -------
    bool
        True only for shapes: such a text holds nothing that a browser would run
        or fetch.
    """
    return _DRAWN.fullmatch(text) is not None


def _outline(y: FloatArray, x: FloatArray) -> FloatArray:
    return np.column_stack([np.asarray(y, dtype=np.float64), np.asarray(x, dtype=np.float64)])


def _path(points: FloatArray) -> str:
    said = [f"{x:.1f} {y:.1f}" for x, y in points]
    # A point at the place of the one before adds nothing.
    kept = [one for index, one in enumerate(said) if index == 0 or one != said[index - 1]]
    return "M" + " L".join(kept) + "Z"
