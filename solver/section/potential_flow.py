"""Plane potential flow about a closed outline and its wake, by singularities on panels.

Vorticity varies linearly along each panel and sources are constant on it. The
fluid inside stands still, so that the vorticity is the speed just outside and the
source strength is the outflow that a boundary layer causes. Everything is linear
in the free stream and in the mass defect, and depends on neither angle nor
Reynolds number: one :class:`Influence` serves all points of a polar.
"""

from __future__ import annotations

from dataclasses import dataclass, fields

import numpy as np
from numpy.typing import NDArray

from solver.section.panelling import PanelNodes

FloatArray = NDArray[np.float64]
ComplexArray = NDArray[np.complex128]

WAKE_LENGTH = 1.0
"""Of the modelled wake, over chord."""
WAKE_PANELS = 26


@dataclass(frozen=True, eq=False)
class Wake:
    """The wake's path from the trailing edge downstream.

    Parameters
    ----------
    x, y : numpy.ndarray, shape (w + 1,)
        The first point is the trailing edge. [-]
    distance : numpy.ndarray, shape (w + 1,)
        Along the path from the trailing edge, over chord. [-]
    """

    x: FloatArray
    y: FloatArray
    distance: FloatArray


@dataclass(frozen=True, eq=False)
class Influence:
    """What free stream, mass defect and wake sheet do to the speeds along body and wake.

    Rows are the n body nodes (speed along the order of the nodes) followed by the
    w wake nodes after the trailing edge (speed downstream). Columns are the signed
    mass defects of the same stations (negative on the side that runs against the
    order of the nodes), over chord and free-stream speed.

    Parameters
    ----------
    along, across : numpy.ndarray, shape (n + w,)
        Speed in a unit free stream along x; along y. [-]
    defect : numpy.ndarray, shape (n + w, n + w)
        Speed for each signed mass defect. [-]
    sheet : numpy.ndarray, shape (n + w, w + 1)
        Speed for a unit vortex sheet at each wake node, the trailing edge
        included; positive where it is faster on the upper side. [-]
    normal_along, normal_across : numpy.ndarray, shape (w,)
        Velocity across the wake, up positive, midway along each wake panel. [-]
    normal_defect : numpy.ndarray, shape (w, n + w)
    normal_sheet : numpy.ndarray, shape (w, w + 1)
    wake : Wake
        The path for which this holds.
    """

    along: FloatArray
    across: FloatArray
    defect: FloatArray
    sheet: FloatArray
    normal_along: FloatArray
    normal_across: FloatArray
    normal_defect: FloatArray
    normal_sheet: FloatArray
    wake: Wake


@dataclass(frozen=True, eq=False)
class _Panels:
    """Straight panels between consecutive points of the complex plane."""

    start: ComplexArray
    length: FloatArray
    direction: ComplexArray

    @property
    def middle(self) -> ComplexArray:
        return self.start + 0.5 * self.length * self.direction


def _panels(x: FloatArray, y: FloatArray) -> _Panels:
    point = x + 1j * y
    step: ComplexArray = np.diff(point)
    length: FloatArray = np.abs(step)
    direction: ComplexArray = step / length
    return _Panels(point[:-1], length, direction)


def straight_wake(nodes: PanelNodes, *, angle: float = 0.0) -> Wake:
    """Lay a straight wake from the trailing edge, its panels growing geometrically.

    Parameters
    ----------
    nodes : PanelNodes
        Of the body, which give the length of the first panel.
    angle : float, optional
        Of the wake against the x axis. [rad]

    Returns
    -------
    Wake
        One chord long.
    """
    distance = _wake_distances(nodes)
    return Wake(
        nodes.x[0] + distance * np.cos(angle), nodes.y[0] + distance * np.sin(angle), distance
    )


def _wake_distances(nodes: PanelNodes) -> FloatArray:
    first = 0.5 * (nodes.arc[1] - nodes.arc[0] + nodes.arc[-1] - nodes.arc[-2])
    low, high = 1.0 + 1e-6, 3.0
    for _ in range(60):  # bisection for the growth that makes the panels one chord long
        growth = 0.5 * (low + high)
        if first * (growth**WAKE_PANELS - 1.0) / (growth - 1.0) > WAKE_LENGTH:
            high = growth
        else:
            low = growth
    return np.asarray(
        first * (growth ** np.arange(WAKE_PANELS + 1) - 1.0) / (growth - 1.0), dtype=np.float64
    )


def _integrals(points: ComplexArray, panels: _Panels) -> tuple[ComplexArray, ComplexArray]:
    """Conjugate velocity at points due to unit sources on panels, constant and linear.

    Returns
    -------
    tuple of numpy.ndarray, shape (points, panels)
        For a strength of one, and for one that rises from 0 to 1 along the panel.
    """
    local: ComplexArray = (points[:, None] - panels.start) / panels.direction
    beyond = local - panels.length
    with np.errstate(divide="ignore", invalid="ignore"):
        constant: ComplexArray = np.log(local / beyond)
    linear: ComplexArray = (local * constant - panels.length) / panels.length
    turn = np.conj(panels.direction) / (2.0 * np.pi)
    return constant * turn, linear * turn


def _own_middle(integrals: tuple[ComplexArray, ComplexArray], panels: _Panels, side: float) -> None:
    """Set the panels' influence on their own middles: `side` +1 left, -1 right, 0 mean."""
    turn = np.conj(panels.direction) / (2.0 * np.pi)
    own = np.arange(len(panels.length))
    integrals[0][own, own] = -1j * np.pi * side * turn
    integrals[1][own, own] = (-0.5j * np.pi * side - 1.0) * turn


def _hats(constant: ComplexArray, linear: ComplexArray) -> ComplexArray:
    """From panels to nodes: strengths that vary linearly between nodal values."""
    nodal = np.zeros((constant.shape[0], constant.shape[1] + 1), dtype=np.complex128)
    nodal[:, :-1] = constant - linear
    nodal[:, 1:] += linear
    return nodal


def _outflow(nodes: int, wake_nodes: int, body: FloatArray, wake: FloatArray) -> FloatArray:
    """Panel source strengths (body panels, then wake panels) for signed mass defects."""
    panels = nodes - 1
    outflow = np.zeros((panels + wake_nodes, nodes + wake_nodes))
    at = np.arange(panels)
    outflow[at, at] = -1.0 / body
    outflow[at, at + 1] = 1.0 / body
    at = np.arange(wake_nodes)
    outflow[panels + at, nodes + at] = 1.0 / wake
    outflow[panels + at[1:], nodes + at[:-1]] = -1.0 / wake[1:]
    # The wake begins with what both sides bring; the upper one is counted negative.
    outflow[panels, 0] = 1.0 / wake[0]
    outflow[panels, nodes - 1] = -1.0 / wake[0]
    return outflow


def _at_wake_nodes(wake: Wake) -> FloatArray:
    """Matrix that takes values midway along wake panels to the nodes after the first."""
    middle = 0.5 * (wake.distance[1:] + wake.distance[:-1])
    count = len(middle)
    matrix = np.zeros((count, count))
    for row in range(count):
        left = min(row, count - 2)
        share = (wake.distance[row + 1] - middle[left]) / (middle[left + 1] - middle[left])
        matrix[row, left], matrix[row, left + 1] = 1.0 - share, share
    return matrix


def _component(conjugate: ComplexArray, direction: ComplexArray) -> FloatArray:
    """Velocity along a direction, from the conjugate velocity; rows go with directions."""
    return np.asarray((conjugate * direction[:, None]).real)


def influence(nodes: PanelNodes, wake: Wake) -> Influence:
    """Solve the potential flow about a section for every unit cause.

    Parameters
    ----------
    nodes : PanelNodes
        Closed loop, upper surface first.
    wake : Wake
        From its trailing edge.

    Returns
    -------
    Influence

    Notes
    -----
    No flow crosses the inner side of each panel's middle, save a uniform leakage
    that is an unknown of its own; the speeds at the trailing edge leave it
    smoothly; and the fluid between the middles of the two last panels does not
    move along their bisector. The last two let a cusp converge. [1]_ is the
    method's origin; the two conditions were found by trial.

    References
    ----------
    .. [1] J. L. Hess, A. M. O. Smith, Calculation of potential flow about arbitrary
       bodies, Progress in Aeronautical Sciences 8, 1967.
    """
    count, after = len(nodes.x), len(wake.x) - 1
    body, behind = _panels(nodes.x, nodes.y), _panels(wake.x, wake.y)
    outflow = _outflow(count, after, body.length, behind.length)

    inside = np.append(body.middle, 0.5 * (body.middle[0] + body.middle[-1]))
    inward = np.append(1j * body.direction, _bisector(body))
    body_part = _integrals(inside, body)
    _own_middle((body_part[0][:-1], body_part[1][:-1]), body, 1.0)
    wake_part = _integrals(inside, behind)
    body_sources = body_part[0].copy()
    own = np.arange(count - 1)
    body_sources[own, own] += 0.5j * _turn_along(body) * np.conj(body.direction) / (2.0 * np.pi)

    matrix = np.zeros((count + 1, count + 1))
    matrix[:count, :count] = _component(-1j * _hats(*body_part), inward)
    matrix[: count - 1, count] = -1.0
    matrix[count, 0] = matrix[count, count - 1] = 1.0
    sources = np.hstack([body_sources, wake_part[0]])
    causes = np.zeros((count + 1, 2 + count + after + after + 1))
    causes[:count, 0], causes[:count, 1] = -inward.real, -inward.imag
    causes[:count, 2 : 2 + count + after] = -_component(sources, inward) @ outflow
    causes[:count, 2 + count + after :] = -_component(1j * _hats(*wake_part), inward)
    causes[count, 2 + count + after] = -1.0  # the sheet begins at the trailing edge
    speeds = np.asarray(np.linalg.solve(matrix, causes)[:count], dtype=np.float64)

    conjugate = _wake_velocities(body, behind, speeds, outflow)
    tangential = _at_wake_nodes(wake) @ _component(conjugate, behind.direction)
    normal = _component(conjugate, 1j * behind.direction)
    every = np.vstack([speeds, tangential])
    defects = slice(2, 2 + count + after)
    sheets = slice(2 + count + after, None)
    return Influence(
        along=every[:, 0].copy(),
        across=every[:, 1].copy(),
        defect=every[:, defects].copy(),
        sheet=every[:, sheets].copy(),
        normal_along=normal[:, 0].copy(),
        normal_across=normal[:, 1].copy(),
        normal_defect=normal[:, defects].copy(),
        normal_sheet=normal[:, sheets].copy(),
        wake=wake,
    )


def between(one: Influence, other: Influence, share: float) -> Influence:
    """Potential flow between two that differ by where the wake lies.

    Parameters
    ----------
    one, other : Influence
        Of the same body, with wakes of the same distances.
    share : float
        Of the other, 0 to 1. [-]

    Returns
    -------
    Influence
        Linear in the share, as it is in the wake's place where that moves little.
    """

    def mixed(a: FloatArray, b: FloatArray) -> FloatArray:
        return np.asarray(a + share * (b - a), dtype=np.float64)

    values = {
        field.name: mixed(getattr(one, field.name), getattr(other, field.name))
        for field in fields(Influence)
        if field.name != "wake"
    }
    wake = Wake(mixed(one.wake.x, other.wake.x), mixed(one.wake.y, other.wake.y), one.wake.distance)
    return Influence(wake=wake, **values)


def _turn_along(body: _Panels) -> FloatArray:
    """Find the angle through which the surface turns along each panel, convex positive [rad].

    A curved panel's own sources have a velocity across its middle that a straight one's
    have not: strength times turn over 4 pi, outwards.
    """
    corner = np.angle(body.direction[1:] / body.direction[:-1])
    share = body.length[:-1] / (body.length[:-1] + body.length[1:])
    turn = np.zeros(len(body.length))
    turn[:-1] += share * corner
    turn[1:] += (1.0 - share) * corner
    return turn


def _bisector(body: _Panels) -> ComplexArray:
    """Direction midway between the two panels at the trailing edge, downstream."""
    direction = body.direction[-1] - body.direction[0]
    return np.atleast_1d(direction / np.abs(direction))


def _wake_velocities(
    body: _Panels, behind: _Panels, speeds: FloatArray, outflow: FloatArray
) -> ComplexArray:
    """Conjugate velocity midway along wake panels, a column for each cause in `speeds`."""
    points = behind.middle
    from_body = _integrals(points, body)
    from_wake = _integrals(points, behind)
    _own_middle(from_wake, behind, 0.0)
    total = -1j * _hats(*from_body) @ speeds
    total[:, 0] += 1.0
    total[:, 1] += -1.0j
    defects = outflow.shape[1]
    total[:, 2 : 2 + defects] += np.hstack([from_body[0], from_wake[0]]) @ outflow
    total[:, 2 + defects :] += 1j * _hats(*from_wake)
    return np.asarray(total)
