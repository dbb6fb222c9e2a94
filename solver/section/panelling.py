"""Nodes of the panels that stand for a section's outline in the flow solver."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy.interpolate import CubicSpline
from scipy.optimize import brentq

from solver.errors import InputError
from solver.section.geometry import Outline, cosine_spacing

FloatArray = NDArray[np.float64]

FEWEST_NODES, MOST_NODES = 81, 301


@dataclass(frozen=True, eq=False)
class PanelNodes:
    """Ends of the panels, once round the section: first and last node are the same point.

    The middle node (index n // 2) is the leading edge.

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
        Named ``nodes``, if they are even in number or out of range.

    Notes
    -----
    An open trailing edge is closed by moving each surface by half the gap times x.
    The leading edge is the point farthest from the trailing edge.
    """
    if nodes % 2 == 0 or not FEWEST_NODES <= nodes <= MOST_NODES:
        raise InputError("nodes", nodes, f"odd and between {FEWEST_NODES} and {MOST_NODES}")
    points = _closed(outline)
    along = np.concatenate([[0.0], np.cumsum(np.hypot(*np.diff(points, axis=0).T))])
    curve = CubicSpline(along, points)
    fine = np.linspace(0.0, along[-1], 20 * len(along))
    length = CubicSpline(fine, np.hypot(*curve(fine, 1).T)).antiderivative()
    nose = _leading_edge(curve, along, points)
    share = cosine_spacing(nodes // 2 + 1)
    wanted = np.concatenate(
        [
            length(nose) * share,
            length(nose) + (length(along[-1]) - length(nose)) * share[1:],
        ]
    )
    place = np.interp(wanted, length(fine), fine)
    for _ in range(4):
        place -= (length(place) - wanted) / length(place, 1)
    found = curve(np.clip(place, 0.0, along[-1]))
    found[[0, -1]] = points[0]
    return PanelNodes(found[:, 0].copy(), found[:, 1].copy(), wanted)


def _closed(outline: Outline) -> FloatArray:
    """Points of an outline with its trailing edge brought to one point."""
    points = np.column_stack([outline.x, outline.y])
    near = int(np.argmin(points[:, 0]))
    gap = points[0] - points[-1]
    share = (points[:, :1] - points[near, 0]) / (points[[0, -1], 0].mean() - points[near, 0])
    side = np.where(np.arange(len(points)) < near, -0.5, 0.5)[:, None]
    closed = points + side * share * gap
    closed[[0, -1]] = 0.5 * (points[0] + points[-1])
    return np.asarray(closed, dtype=np.float64)


def _leading_edge(curve: CubicSpline, along: FloatArray, points: FloatArray) -> float:
    """Place along the curve farthest from its first point."""
    near = int(np.argmax(np.hypot(*(points - points[0]).T)))

    def turning(place: float) -> float:
        return float((curve(place) - points[0]) @ curve(place, 1))

    return float(brentq(turning, along[near - 1], along[near + 1], xtol=1e-14))
