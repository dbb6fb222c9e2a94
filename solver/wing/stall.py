"""Which station reaches its own limit first, and how far the others are.

The critical-section rule: the wing stalls where the first section reaches its
own largest lift at its own Reynolds number. The angle of the knee (98 % of the
largest lift) says where and when, since on a plateau the maximum itself is
noise; the first peak says how much.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from solver.section.sweeps import KNEE_SHARE
from solver.wing.lifting_line import Flow, Loading, solve

FloatArray = NDArray[np.float64]

NEARLY = 0.01
"""Share of the limit within which a station counts as stalling with the first [-]."""


@dataclass(frozen=True, eq=False)
class Room:
    """What is left to each station; arrays (..., n).

    Fields
    ------
    limit : ndarray
        Largest section lift at the local Reynolds number, streamwise [-].
    lift : ndarray
        What is left of it [-].
    angle : ndarray
        Angle left to the knee [rad].
    """

    limit: FloatArray
    lift: FloatArray
    angle: FloatArray


def room(state: Loading, *, band: ArrayLike | None = None) -> Room:
    """Lift and angle left at every station of a solved loading.

    Parameters
    ----------
    state : Loading
    band : array_like of int, optional
        End of the confidence band for the limit; that of the flow by default.

    Returns
    -------
    Room

    References
    ----------
    .. [1] R. F. Anderson, Determination of the Characteristics of Tapered Wings,
       NACA Report 572, 1936: the critical-section rule.
    """
    flow = state.flow
    limits = flow.polars.limits(flow.reynolds(), band=flow.band if band is None else band)
    limit = limits.largest_lift * np.square(flow.lattice.cos_sweep)
    return Room(
        limit=limit,
        lift=limit - state.lift,
        angle=limits.knee_angle - state.section_angle,
    )


def least_angle_room(state: Loading, *, surface: int = 0) -> FloatArray:
    """Angle left to the first station of a surface that will reach its knee.

    Parameters
    ----------
    state : Loading
    surface : int
        Index of the surface.

    Returns
    -------
    ndarray, shape (...)
        Negative past the onset of stall [rad].
    """
    on_surface = state.flow.lattice.surface == surface
    return np.asarray(np.min(room(state).angle[..., on_surface], axis=-1))


def critical_share(state: Loading, *, surface: int = 0) -> FloatArray:
    """Lift over its largest, at the station with the least angle left to its knee.

    Parameters
    ----------
    state : Loading
    surface : int
        Index of the surface.

    Returns
    -------
    ndarray, shape (...)
        [-]; 0.98 at the onset of stall, by the definition of the knee. Between runs of
        a table whose curves differ, the blended knee can lie lower on the blended
        curve: it is given no more credit than the definition does.
    """
    left = room(state)
    on_surface = state.flow.lattice.surface == surface
    first = np.argmin(np.where(on_surface, left.angle, np.inf), axis=-1)[..., None]
    share = np.broadcast_to(state.lift / left.limit, left.angle.shape)
    found = np.take_along_axis(share, first, axis=-1)[..., 0]
    return np.asarray(np.clip(found, KNEE_SHARE, 1.0))


def stalling_range(state: Loading, *, surface: int = 0) -> tuple[FloatArray, FloatArray]:
    """Part of the half-span that stalls with the first station.

    Parameters
    ----------
    state : Loading
    surface : int
        Index of the surface.

    Returns
    -------
    start, end : ndarray, shape (...)
        Places along the half-span [-]; NaN where no station is within
        :data:`NEARLY` of the share of its limit that the knee stands for, or past it.
    """
    on_surface = state.flow.lattice.surface == surface
    place = state.flow.lattice.fraction[on_surface]
    flow = state.flow
    limits = flow.polars.limits(flow.reynolds(), band=flow.band)
    knee_lift = flow.polars.evaluate(limits.knee_angle, flow.reynolds(), band=flow.band).lift
    close = state.lift >= (1.0 - NEARLY) * knee_lift * np.square(flow.lattice.cos_sweep)
    past = state.section_angle >= limits.knee_angle
    near = (close | past)[..., on_surface]
    start = np.where(near, place, np.inf).min(axis=-1)
    end = np.where(near, place, -np.inf).max(axis=-1)
    none = ~near.any(axis=-1)
    return np.where(none, np.nan, start), np.where(none, np.nan, end)


@dataclass(frozen=True, eq=False)
class Branch:
    """Loadings followed from low angle upwards.

    Fields
    ------
    states : tuple of Loading
        One for each angle, all of them converged.
    angle : ndarray, shape (k,)
        [rad]; fewer than were asked for where the branch was lost.
    """

    states: tuple[Loading, ...]
    angle: FloatArray


def follow(
    flow_at: Callable[[float], Flow], angles: FloatArray, *, start: FloatArray | None = None
) -> Branch:
    """Follow one branch of solutions from the lowest angle upwards.

    Parameters
    ----------
    flow_at : callable
        From an angle of attack [rad] to its single :class:`Flow`.
    angles : ndarray, shape (k,)
        Ascending, the first one unstalled or next to `start` [rad].
    start : ndarray, shape (n,), optional
        Circulations at a neighbouring lower angle [m].

    Returns
    -------
    Branch

    Notes
    -----
    Past stall the equations have several solutions. Each angle starts from the
    circulations of the angle below it, so what is found is what a slow pull would
    meet first. The branch ends before the first angle that fails.
    """
    states: list[Loading] = []
    for angle in angles:
        state = solve(flow_at(float(angle)), float(angle), start=start)
        if not bool(state.converged):
            break
        start = state.circulation
        states.append(state)
    return Branch(
        states=tuple(states),
        angle=np.asarray(angles[: len(states)], dtype=np.float64),
    )
