"""Polars packed into cubics on a common grid: what a wing takes, and nothing else.

See :mod:`solver.section.hermite` for the order of the two slopes.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any, Final

import numpy as np
from numpy.typing import ArrayLike, NDArray

from solver.section.pack_columns import ANGLE_LIMIT, SOFT_STOP

FloatArray = NDArray[np.float64]
BoolArray = NDArray[np.bool_]
TrustArray = NDArray[np.uint8]

LOW: Final = 0
NOMINAL: Final = 1
HIGH: Final = 2
"""Ends of the confidence band, the first index of every packed array."""

HELD: Final = 3
"""Behind them, where it was packed: the counterfactual of a high Reynolds number."""

VALID, EXTRAPOLATED, INDICATIVE = 0, 1, 2


@dataclass(frozen=True, eq=False)
class SectionValues:
    """Coefficients and their slopes over angle; all of one broadcast shape.

    Fields
    ------
    lift, drag, moment : ndarray
        [-]
    lift_slope, drag_slope, moment_slope : ndarray
        [1/rad]
    """

    lift: FloatArray
    lift_slope: FloatArray
    drag: FloatArray
    drag_slope: FloatArray
    moment: FloatArray
    moment_slope: FloatArray


@dataclass(frozen=True, eq=False)
class SectionLimits:
    """Where sections stall; all of one broadcast shape.

    Fields
    ------
    largest_lift : ndarray
        First attached peak [-].
    knee_angle, peak_angle : ndarray
        98 % of it, and its own angle [rad].
    """

    largest_lift: FloatArray
    knee_angle: FloatArray
    peak_angle: FloatArray


@dataclass(frozen=True, eq=False)
class PackedPolars:
    """Sections on one grid of angle and Reynolds number, once differentiable.

    Fields
    ------
    names : tuple of str
        Of the sections, in the order of their index.
    angle : ndarray, shape (na,)
        Equally spaced [rad].
    reynolds : ndarray, shape (nr,)
        Every tabled one of every section, so that each is met exactly [-].
    cells : ndarray, shape (3 * sections * (na - 1) * (nr - 1), 48)
        Bicubic coefficients: powers of Reynolds number, of angle, quantity.
    limit_lines : ndarray, shape (3, sections, nr - 1, 3, 4)
        Cubic coefficients of the three limits over Reynolds number.
    largest_lift, knee_angle, peak_angle : ndarray, shape (3, sections, nr)
        The limits at the nodes [-], [rad], [rad].
    zero_lift_angle : ndarray, shape (3, sections, nr)
        The same at every end of the band [rad].
    known : ndarray of bool, shape (sections, nr)
        The Reynolds number lies within the section's table.
    in_cliff : ndarray of bool, shape (sections, nr - 1)
        The interval above this node is one whose lift is unknown.
    valid_low, valid_high, stall_low, stall_high : ndarray, shape (sections, nr)
        Ends of the tabled angles; angles past which the section has stalled [rad].
    lowest_reynolds, highest_reynolds : ndarray, shape (sections,)
        Ends of the section's table [-].
    estimated : ndarray of bool, shape (sections,)
    unknown : tuple, one entry a section, of tuples of (float, float)
        Reynolds numbers between which largest lift jumps.
    recovery : ndarray, shape (sections, nr)
        After a stall come below this angle, NaN where none was measured [rad].
    """

    names: tuple[str, ...]
    angle: FloatArray
    reynolds: FloatArray
    cells: FloatArray
    limit_lines: FloatArray
    largest_lift: FloatArray
    knee_angle: FloatArray
    peak_angle: FloatArray
    zero_lift_angle: FloatArray
    known: BoolArray
    in_cliff: BoolArray
    valid_low: FloatArray
    valid_high: FloatArray
    stall_low: FloatArray
    stall_high: FloatArray
    lowest_reynolds: FloatArray
    highest_reynolds: FloatArray
    estimated: BoolArray
    unknown: tuple[tuple[tuple[float, float], ...], ...]
    recovery: FloatArray

    def evaluate(
        self,
        angle: ArrayLike,
        reynolds: ArrayLike,
        *,
        band: ArrayLike = NOMINAL,
        section: ArrayLike = 0,
    ) -> SectionValues:
        """Coefficients and their slopes over angle.

        Parameters
        ----------
        angle : array_like
            [rad]; past 30 degrees it is taken smoothly to at most 32.
        reynolds : array_like
            [-]; past the ends of the grid the end is held.
        band : array_like of int
            :data:`LOW`, :data:`NOMINAL` or :data:`HIGH`.
        section : array_like of int
            Index into `names`.

        Returns
        -------
        SectionValues
            Of the broadcast shape of all four. Finite for every finite angle; NaN
            passes through. The slopes are the derivatives of the values.
        """
        a, stretch = _soft_stop(np.asarray(angle, dtype=np.float64))
        place = (a - self.angle[0]) * ((self.angle.size - 1) / (self.angle[-1] - self.angle[0]))
        row = np.fmin(np.fmax(place, 0.0), self.angle.size - 2.0).astype(np.intp)
        column, v = self._along_reynolds(np.asarray(reynolds, dtype=np.float64))
        first = np.asarray(band, dtype=np.intp) * len(self.names) + np.asarray(section)
        cell = (first * (self.angle.size - 1) + row) * (self.reynolds.size - 1) + column
        shape = np.broadcast_shapes(cell.shape, place.shape)
        flat = _spread(cell, shape).reshape(-1)
        u = _spread(place - row, shape).reshape(-1, 1)
        v = _spread(v, shape).reshape(-1, 1)
        c = self.cells.take(flat, axis=0)
        t = ((c[:, 36:] * v + c[:, 24:36]) * v + c[:, 12:24]) * v + c[:, :12]
        c0, c1, c2, c3 = t[:, :3], t[:, 3:6], t[:, 6:9], t[:, 9:]
        value = ((c3 * u + c2) * u + c1) * u + c0
        slope = (3.0 * c3 * u + 2.0 * c2) * u + c1
        per_radian = (self.angle.size - 1) / (self.angle[-1] - self.angle[0])
        value, slope = value.reshape(*shape, 3), slope.reshape(*shape, 3) * per_radian
        if stretch is not None:
            slope = slope * stretch[..., None]
        return SectionValues(
            lift=value[..., 0],
            lift_slope=slope[..., 0],
            drag=value[..., 1],
            drag_slope=slope[..., 1],
            moment=value[..., 2],
            moment_slope=slope[..., 2],
        )

    def limits(
        self, reynolds: ArrayLike, *, band: ArrayLike = NOMINAL, section: ArrayLike = 0
    ) -> SectionLimits:
        """Largest lift and its angles.

        Parameters
        ----------
        reynolds : array_like
            [-]
        band, section : array_like of int
            As in :meth:`evaluate`.

        Returns
        -------
        SectionLimits
            Of the broadcast shape of all three.
        """
        column, v = self._along_reynolds(np.asarray(reynolds, dtype=np.float64))
        bands, sections = np.asarray(band, dtype=np.intp), np.asarray(section, dtype=np.intp)
        c = self.limit_lines[bands, sections, column]
        w = np.asarray(v)[..., None]
        found = ((c[..., 3] * w + c[..., 2]) * w + c[..., 1]) * w + c[..., 0]
        return SectionLimits(
            largest_lift=found[..., 0], knee_angle=found[..., 1], peak_angle=found[..., 2]
        )

    def trust(self, angle: ArrayLike, reynolds: ArrayLike, *, section: ArrayLike = 0) -> TrustArray:
        """How far the values at an angle and a Reynolds number can be believed.

        Parameters
        ----------
        angle, reynolds : array_like
            [rad], [-]
        section : array_like of int

        Returns
        -------
        ndarray of uint8
            0 within the data, 1 outside the tabled angles or Reynolds numbers or in
            an interval that is unknown, 2 beyond stall on either side.
        """
        a, re = np.asarray(angle, dtype=np.float64), np.asarray(reynolds, dtype=np.float64)
        column, v = self._along_reynolds(re)
        a, re, section, column, v = np.broadcast_arrays(a, re, section, column, v)

        def at(values: FloatArray) -> FloatArray:
            low, high = values[section, column], values[section, column + 1]
            return np.asarray(np.where(v == 0.0, low, low + v * (high - low)))

        outside = (a < at(self.valid_low)) | (a > at(self.valid_high))
        outside |= (re < self.lowest_reynolds[section]) | (re > self.highest_reynolds[section])
        outside |= self.in_cliff[section, column]
        stalled = (a < at(self.stall_low)) | (a > at(self.stall_high))
        return np.where(stalled, INDICATIVE, np.where(outside, EXTRAPOLATED, VALID)).astype(
            np.uint8
        )

    def in_unknown(self, reynolds: ArrayLike, *, section: ArrayLike = 0) -> BoolArray:
        """Tell whether largest lift is unknown because it jumps between two runs.

        Parameters
        ----------
        reynolds : array_like
            [-]
        section : array_like of int

        Returns
        -------
        ndarray of bool
        """
        column, _ = self._along_reynolds(np.asarray(reynolds, dtype=np.float64))
        return np.asarray(self.in_cliff[np.asarray(section), column])

    def _along_reynolds(self, reynolds: FloatArray) -> tuple[NDArray[np.intp], FloatArray]:
        held = np.minimum(np.maximum(reynolds, self.reynolds[0]), self.reynolds[-1])
        column = np.minimum(
            np.searchsorted(self.reynolds, held, side="right") - 1, self.reynolds.size - 2
        )
        low, high = self.reynolds[column], self.reynolds[column + 1]
        return column, np.log(held / low) / np.log(high / low)


def _spread(values: NDArray[Any], shape: tuple[int, ...]) -> NDArray[Any]:
    """Broadcast only where it is needed, which in a kernel it seldom is."""
    return values if values.shape == shape else np.broadcast_to(values, shape)


def _soft_stop(angle: FloatArray) -> tuple[FloatArray, FloatArray | None]:
    """Take angles beyond the limit smoothly to the end of the grid."""
    over = np.abs(angle) - ANGLE_LIMIT
    if not np.any(over > 0.0):
        return angle, None
    bend = np.tanh(np.maximum(over, 0.0) / SOFT_STOP)
    held = np.where(over > 0.0, np.sign(angle) * (ANGLE_LIMIT + SOFT_STOP * bend), angle)
    return held, 1.0 - np.square(bend)
