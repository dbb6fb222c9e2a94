"""Nodes of the panels that stand for a section's outline in the flow solver."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy.optimize import brentq

from solver.errors import InputError
from solver.section.arc_spline import BrokenCurve, broken_curve
from solver.section.fairing import closed_points, fair_outline
from solver.section.geometry import Outline, cosine_spacing
from solver.section.outline_checks import PRINT_ROUNDING

FloatArray = NDArray[np.float64]

FEWEST_NODES, MOST_NODES = 81, 301
LEAST_WEDGE = 0.002
"""Thickness over distance from the trailing edge: 0.1 degrees, within the print of a cusp."""
WEDGE_REACH = 0.05
"""Of that wedge, over chord: ahead of it the thickness may be as small as at its end."""
FACING = 0.9
"""Distance from the trailing edge, over chord, up to which nodes of equal number face one
another across the section."""
FARTHEST_EDGE = 0.1
"""Of the leading edge behind the foremost point, over chord."""
MOST_UNEVEN = 1.5
"""Of the two surfaces' lengths, and so of the panels that meet at the leading edge."""


@dataclass(frozen=True, eq=False)
class PanelNodes:
    """Ends of the panels, once round the section: first and last node are the same point.

    The middle node (index n // 2) is the leading edge: the place of the outline
    farthest from the trailing edge, where the tangent stands square to the line
    between the two.

    Parameters
    ----------
    x, y : numpy.ndarray, shape (n,)
        From the trailing edge over the upper surface to the leading edge and
        back along the lower one. [-]
    arc : numpy.ndarray, shape (n,)
        Length along the surface from the first node. [-]
    """

    x: FloatArray
    y: FloatArray
    arc: FloatArray


def panel_nodes(outline: Outline, *, nodes: int = 141) -> PanelNodes:
    """Lay the ends of panels along an outline, close together at both edges.

    Parameters
    ----------
    outline : Outline
        Chord 1.
    nodes : int, optional
        How many, the trailing edge counted twice. Odd, 81 to 301.

    Returns
    -------
    PanelNodes
        As many on either surface, cosine spaced in length along the surface
        from the leading edge to the trailing edge.

    Raises
    ------
    InputError
        Named ``nodes``, if they are even in number or out of range; named
        ``coordinates``, saying where, if the outline leaves no room between its
        surfaces or one of them is more than half as long again as the other, or the
        leading edge lies more than 10 % of chord behind the foremost point.

    Notes
    -----
    An open trailing edge is closed by moving each surface by half the gap times x.
    The nodes lie on the smooth curve of :func:`solver.section.fairing.fair_outline`,
    or, where the outline has corners, on cubic splines in length along the surface
    through its points from corner to corner. A node is not laid on a corner: the
    spacing stays the same wherever a hinge is, and the lift in potential flow of a
    flap at 20 degrees with it, to 2e-4 at 141 nodes.

    Surfaces closer than a wedge of 0.1 degrees at the trailing edge, or crossed by
    less than the print of a list can tell, are parted to that wedge.
    """
    if nodes % 2 == 0 or not FEWEST_NODES <= nodes <= MOST_NODES:
        raise InputError("nodes", nodes, f"odd and between {FEWEST_NODES} and {MOST_NODES}")
    points = closed_points(outline if outline.corners else fair_outline(outline).outline)
    curve = broken_curve(points, corners=outline.corners)
    nose, whole = _leading_edge(curve), float(curve.starts[-1])
    share = cosine_spacing(nodes // 2 + 1)
    arc = np.concatenate([nose * share, nose + (whole - nose) * share[1:]])
    laid = curve(arc)
    laid[[0, -1]] = points[0]
    _check_leading_edge(laid[nodes // 2], float(points[:, 0].min()), nose / (whole - nose))
    laid = _parted(laid)
    return PanelNodes(laid[:, 0].copy(), laid[:, 1].copy(), arc)


def _leading_edge(curve: BrokenCurve) -> float:
    """Length along the outline to the place farthest from the trailing edge."""
    edge = curve.pieces[0](0.0)
    reach = [float(np.hypot(*(piece(piece.x) - edge).T).max()) for piece in curve.pieces]
    at = int(np.argmax(reach))
    piece = curve.pieces[at]
    near = int(np.argmax(np.hypot(*(piece(piece.x) - edge).T)))

    def turning(along: float) -> float:
        return float((piece(along) - edge) @ piece(along, 1))

    low, high = piece.x[max(near - 1, 0)], piece.x[min(near + 1, len(piece.x) - 1)]
    if turning(low) * turning(high) > 0.0:
        raise InputError(
            "coordinates",
            f"a leading edge at a corner, x = {100 * piece(low)[0]:.1f} % of chord",
            "of a section with a round nose",
        )
    return float(curve.starts[at]) + float(brentq(turning, low, high, xtol=1e-14))


def _check_leading_edge(edge: FloatArray, foremost: float, ratio: float) -> None:
    """Refuse one far from the foremost point, or with surfaces of unlike length."""
    if edge[0] - foremost > FARTHEST_EDGE:
        raise InputError(
            "coordinates",
            f"an outline farthest from its trailing edge at x = {100 * edge[0]:.1f} % of chord",
            "of a section that is farthest from its trailing edge at the nose",
        )
    if not 1.0 / MOST_UNEVEN <= ratio <= MOST_UNEVEN:
        raise InputError(
            "coordinates",
            f"an upper surface {ratio:.2f} times as long as the lower one",
            "of a section neither of whose surfaces is half as long again as the other",
        )


def _parted(laid: FloatArray) -> FloatArray:
    """Part surfaces that lie closer than a wedge at the trailing edge; refuse crossed ones."""
    half = len(laid) // 2
    upper, lower = laid[: half + 1], laid[: half - 1 : -1]
    middle = 0.5 * (upper + lower)
    along = np.gradient(middle, axis=0)  # towards the leading edge
    across = np.column_stack([along[:, 1], -along[:, 0]]) / np.hypot(*along.T)[:, None]
    room = ((upper - lower) * across).sum(axis=1)
    away = np.hypot(*(middle - laid[0]).T)
    least = LEAST_WEDGE * np.minimum(away, WEDGE_REACH)
    lacking = np.where(away < FACING, np.maximum(least - room, 0.0), 0.0)
    lacking[0] = 0.0
    at = int(np.argmax(lacking))
    if lacking[at] > 2.0 * PRINT_ROUNDING:
        raise InputError(
            "coordinates",
            f"a thickness of {100 * room[at]:.3f} % of chord at x = {100 * middle[at, 0]:.1f} %",
            "of a section with room between its surfaces up to the trailing edge",
        )
    shift = 0.5 * lacking[:, None] * across
    parted = laid.copy()
    parted[: half + 1] += shift
    parted[: half - 1 : -1] -= shift
    return parted
