"""One polar made ready for packing: extended, banded, with nodes in Reynolds number."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from types import MappingProxyType

import numpy as np
from numpy.typing import NDArray

from solver.section.bands import LARGEST_SHARE, negative_knee, shift_weight
from solver.section.hermite import node_slopes, over_reynolds, resample
from solver.section.polar import Polar
from solver.section.stalled_flow import Quantity, beyond

FloatArray = NDArray[np.float64]

ANGLE_LIMIT = np.radians(30.0)
"""Angles to here are evaluated as they are [rad]."""

SOFT_STOP = np.radians(2.0)
"""Larger ones are taken smoothly to this much beyond [rad]."""

LOWEST_REYNOLDS, HIGHEST_REYNOLDS = 20e3, 2e6
"""Confidence half-widths grow from the ends of a table to here, and are then held."""

CHANGE_OVER = 0.01
"""Share of the Reynolds number over which curves change at the end of an interval
in which largest lift is unknown [-]: no smooth curve is drawn through it."""

LARGEST_DRAG_SHARE = 0.5
"""A band of drag reaches at most this share of drag either way [-]."""

SIGNS = np.array([-1.0, 0.0, 1.0])
"""Of the shift of lift, at the low, nominal and high end of the band."""

QUANTITIES: tuple[Quantity, ...] = ("lift", "drag", "moment")


@dataclass(frozen=True, eq=False)
class PackedSection:
    """One section on the angle grid at its own Reynolds numbers.

    Fields
    ------
    log_reynolds : ndarray, shape (k,)
        Its nodes.
    angle : ndarray, shape (na,)
        The grid [rad].
    values : ndarray, shape (k, na, 3 bands, 3 quantities)
        Coefficients [-].
    limits : ndarray, shape (k, 3 bands, 3)
        Largest lift [-], knee angle, peak angle [rad].
    rows : mapping of str to ndarray, shape (k,)
        Whatever else depends on Reynolds number.
    unknown : tuple of (float, float)
        Reynolds numbers between which largest lift jumps.
    """

    log_reynolds: FloatArray
    angle: FloatArray
    values: FloatArray
    limits: FloatArray
    rows: Mapping[str, FloatArray]
    unknown: tuple[tuple[float, float], ...]

    def surfaces_at(
        self, nodes: FloatArray
    ) -> tuple[FloatArray, FloatArray, FloatArray, FloatArray]:
        """Value, slope over angle, over log Reynolds number, and cross slope.

        Parameters
        ----------
        nodes : ndarray, shape (m,)
            Logarithms of Reynolds numbers.

        Returns
        -------
        four ndarrays, shape (na, m, 3 bands, 3 quantities)
        """
        found = over_reynolds(*self._held(self.values), nodes)
        value, over_re = (np.swapaxes(array, 0, 1) for array in found)
        return value, node_slopes(self.angle, value), over_re, node_slopes(self.angle, over_re)

    def limits_at(self, nodes: FloatArray) -> tuple[FloatArray, FloatArray]:
        """Limits and their slopes over log Reynolds number.

        Parameters
        ----------
        nodes : ndarray, shape (m,)

        Returns
        -------
        two ndarrays, shape (m, 3 bands, 3)
        """
        return over_reynolds(*self._held(self.limits), nodes)

    def row_at(self, name: str, nodes: FloatArray) -> FloatArray:
        """One of `rows`, piecewise linear, its ends held.

        Parameters
        ----------
        name : str
        nodes : ndarray, shape (m,)

        Returns
        -------
        ndarray, shape (m,)
        """
        return np.interp(nodes, self.log_reynolds, self.rows[name])

    def _held(self, values: FloatArray) -> tuple[FloatArray, FloatArray]:
        """Nodes and values with the ends repeated far out."""
        x = self.log_reynolds
        far = np.concatenate([[x[0] - 20.0], x, [x[-1] + 20.0]])
        return far, np.concatenate([values[:1], values, values[-1:]])


@dataclass(frozen=True)
class _Node:
    reynolds: float
    column: int
    widening: float


def _nodes(polar: Polar, *, cliffs: bool) -> list[_Node]:
    """Reynolds numbers at which curves are laid down, and whose curves they are."""
    re = [float(value) for value in polar.reynolds]
    jumps = set(polar.unknown) if cliffs else set()
    nodes = [_Node(re[0], 0, 1.0)]
    for j in range(1, len(re)):
        if (re[j - 1], re[j]) in jumps:
            if polar.largest_lift[j - 1] <= polar.largest_lift[j]:
                nodes.append(_Node(re[j] * (1.0 - CHANGE_OVER), j - 1, 1.0))
            else:
                nodes.append(_Node(re[j - 1] * (1.0 + CHANGE_OVER), j, 1.0))
        nodes.append(_Node(re[j], j, 1.0))
    if re[0] > LOWEST_REYNOLDS:
        nodes.insert(0, _Node(LOWEST_REYNOLDS, 0, _widening(LOWEST_REYNOLDS / re[0])))
    if re[-1] < HIGHEST_REYNOLDS:
        nodes.append(_Node(HIGHEST_REYNOLDS, len(re) - 1, _widening(HIGHEST_REYNOLDS / re[-1])))
    return nodes


def _widening(ratio: float) -> float:
    """Half as much again for each halving or doubling past the table; our choice."""
    return float(1.0 + 0.5 * abs(np.log2(ratio)))


def on_grid(polar: Polar, quantity: Quantity, grid: FloatArray) -> FloatArray:
    """Coefficients of a polar on an angle grid, extended as a stalled plate.

    Parameters
    ----------
    polar : Polar
    quantity : {"lift", "drag", "moment"}
    grid : ndarray, shape (m,)
        Ascending [rad].

    Returns
    -------
    ndarray, shape (nr, m)
    """
    a, table = polar.angle, getattr(polar, quantity)
    slopes = node_slopes(a, table)
    below, above = grid < a[0], grid > a[-1]
    inside = ~(below | above)
    result = np.empty((table.shape[1], grid.size))
    result[:, inside] = resample(a, table, grid[inside]).T
    for j in range(table.shape[1]):
        for outside, end in ((below, 0), (above, -1)):
            if outside.any():
                result[j, outside] = beyond(
                    grid[outside],
                    quantity,
                    end=float(a[end]),
                    value=float(table[end, j]),
                    slope=float(slopes[end, j]),
                )
    return result


def pack_section(
    polar: Polar,
    grid: FloatArray,
    *,
    drag_factor: float,
    largest_lift_debit: float,
    hold_at_reynolds: float | None,
) -> PackedSection:
    """Lay one polar's curves down on the grid, with their bands and limits.

    Parameters
    ----------
    polar : Polar
    grid : ndarray, shape (na,)
        Equally spaced [rad].
    drag_factor, largest_lift_debit : float
        See :func:`solver.section.packing.pack_polars` [-].
    hold_at_reynolds : float or None
        The same [-].

    Returns
    -------
    PackedSection
    """
    nodes = _nodes(polar, cliffs=hold_at_reynolds is None)
    log_re = np.log([node.reynolds for node in nodes])
    column = np.array([node.column for node in nodes])
    widening = np.array([node.widening for node in nodes])
    tables = {quantity: on_grid(polar, quantity, grid) for quantity in QUANTITIES}
    lift, limits = _lift_bands(
        polar, grid, tables["lift"], debit=largest_lift_debit, column=column, widening=widening
    )
    if hold_at_reynolds is not None:
        at = np.clip(
            np.log(hold_at_reynolds), np.log(polar.reynolds[0]), np.log(polar.reynolds[-1])
        )
        lift = np.repeat(over_reynolds(log_re, lift, np.array([at]))[0], len(nodes), axis=0)
        limits = np.repeat(over_reynolds(log_re, limits, np.array([at]))[0], len(nodes), axis=0)
    share = np.minimum(polar.drag_uncertainty[column] * widening, LARGEST_DRAG_SHARE)
    drag = tables["drag"][column][:, :, None] * drag_factor
    drag = drag * (1.0 - share[:, None, None] * SIGNS)
    moment = np.repeat(tables["moment"][column][:, :, None], 3, axis=2)
    values = np.stack([lift, drag, moment], axis=-1)
    rows = {name: row[column] for name, row in _rows(polar).items()}
    return PackedSection(
        log_reynolds=log_re,
        values=values,
        angle=grid,
        limits=limits,
        rows=MappingProxyType(rows),
        unknown=polar.unknown if hold_at_reynolds is None else (),
    )


def _lift_bands(
    polar: Polar,
    grid: FloatArray,
    table: FloatArray,
    *,
    debit: float,
    column: NDArray[np.intp],
    widening: FloatArray,
) -> tuple[FloatArray, FloatArray]:
    """Lift (k, na, 3) and limits (k, 3, 3) of every node at each end of the band."""
    lift = np.empty((column.size, grid.size, SIGNS.size))
    limits = np.empty((column.size, SIGNS.size, 3))
    shifts = [_shift(polar, grid, table[j], j) for j in range(polar.reynolds.size)]
    for k, j in enumerate(column):
        top = float(polar.largest_lift[j])
        half_width = float(polar.largest_lift_uncertainty[j]) * widening[k]
        for b, sign in enumerate(SIGNS):
            change = max(sign * half_width - debit, -LARGEST_SHARE * top)
            lift[k, :, b] = table[j] + change * shifts[j]
            # The weight is 1 at the knee, which therefore stays where it is: 2 % of
            # the change is less than the scatter of a reading.
            limits[k, b] = top + change, polar.knee_angle[j], polar.peak_angle[j]
    return lift, limits


def _shift(polar: Polar, grid: FloatArray, lift: FloatArray, j: int) -> FloatArray:
    covered = polar.valid[:, j]
    return shift_weight(
        grid,
        lift,
        zero_lift_angle=float(polar.zero_lift_angle[j]),
        knee_angle=float(polar.knee_angle[j]),
        negative_knee=negative_knee(polar.angle[covered], polar.lift[covered, j]),
    )


def _rows(polar: Polar) -> dict[str, FloatArray]:
    """Ends of the tabled and of the unstalled angles, and the like, a column each."""
    angle, never = polar.angle, 2.0 * np.pi
    covered = [angle[polar.valid[:, j]] for j in range(polar.reynolds.size)]
    stalled = [angle[polar.beyond_stall[:, j]] for j in range(polar.reynolds.size)]
    middle = 0.5 * (polar.zero_lift_angle + polar.peak_angle)
    return {
        "zero_lift_angle": polar.zero_lift_angle,
        "valid_low": np.array([a[0] for a in covered]),
        "valid_high": np.array([a[-1] for a in covered]),
        "stall_low": np.array(
            [np.max(a[a < m], initial=-never) for a, m in zip(stalled, middle, strict=True)]
        ),
        "stall_high": np.array(
            [np.min(a[a > m], initial=never) for a, m in zip(stalled, middle, strict=True)]
        ),
        "recovery": polar.recovery,
    }
