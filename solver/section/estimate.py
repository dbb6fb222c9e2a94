"""A polar for a section without measurements, from its outline alone.

Good enough to size a tail or to try an idea, marked as estimated wherever it goes.
What it cannot know is what low-Reynolds-number sections are made for: how one
laminar bubble differs from another.
"""

from __future__ import annotations

import dataclasses
from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

from solver.errors import InputError
from solver.section.estimated_drag import attached_drag
from solver.section.estimated_lift import (
    BURST_LAST,
    BURST_SPREAD,
    SectionShape,
    attached_largest_lift,
    burst_weight,
    camber_share,
    lift_curve,
)
from solver.section.geometry import Outline, leading_edge_radius, max_thickness
from solver.section.polar import CellOrigin, Polar, polar_from_columns
from solver.section.stalled_flow import plate_drag, plate_moment
from solver.section.thin_airfoil import outline_thin_airfoil

FloatArray = NDArray[np.float64]

REYNOLDS = (4e4, 6e4, 8e4, 1e5, 1.5e5, 2e5, 3e5, 5e5)
"""Where polars are estimated unless asked otherwise [-]: the range of the measurements that
the constants come from."""
LOWEST_REYNOLDS, HIGHEST_REYNOLDS = 1e4, 1e7
ANGLE_LIMIT, ANGLE_STEP = np.radians(25.0), np.radians(0.5)
LARGEST_LIFT_HALF_WIDTH = 0.12
"""Twice the error in largest lift, rms over twelve sections, each predicted with constants
fitted to the others [-]: 19 runs of 20 lie within, the worst 0.14 off."""
DRAG_HALF_WIDTH = ((9e4, 0.34), (1.7e5, 0.29), (np.inf, 0.25))
"""To which Reynolds number, and the error in drag as a share, rms over the points of twelve
sections, each predicted with constants fitted to the others [-]."""
SOURCE = (
    "estimated from the outline: thin-airfoil theory, pressure-difference rule for largest "
    "lift, flat-plate friction with laminar bubbles; constants from twelve measured sections"
)


def shape_of(outline: Outline) -> SectionShape:
    """Measure what the estimate takes of an outline.

    Parameters
    ----------
    outline : Outline
        Chord 1.

    Returns
    -------
    SectionShape
        Numbers.
    """
    thin = outline_thin_airfoil(outline)
    return SectionShape(
        thickness=max_thickness(outline).value,
        nose_radius=leading_edge_radius(outline),
        zero_lift_angle=thin.zero_lift_angle,
        ideal_lift=thin.ideal_lift,
        moment=thin.moment_quarter_chord,
    )


def estimate_polar(outline: Outline, *, reynolds: Sequence[float] = REYNOLDS) -> Polar:
    """Estimate lift, drag and moment of a section from its outline.

    Steady incompressible flow, a smooth surface, little turbulence in the air. Fitted to
    and checked on published sections 8.5 to 14 % thick with ideal lifts from 0 to 1.7 at
    Reynolds numbers from 40,000 to 500,000.

    Parameters
    ----------
    outline : Outline
        Chord 1.
    reynolds : sequence of float, optional
        Ascending, 10,000 to 10,000,000 [-]. Outside 40,000 to 500,000 the constants are
        extrapolated.

    Returns
    -------
    Polar
        From -25 to 25 degrees, every cell marked as estimated. Strongly cambered sections
        carry an interval of Reynolds number in which their largest lift is unknown.

    Raises
    ------
    InputError
        Named ``reynolds``, if it is empty, does not ascend or is out of range.
    """
    numbers = _checked(reynolds)
    shape = shape_of(outline)
    steps = round(float(ANGLE_LIMIT / ANGLE_STEP))
    angle = np.linspace(-ANGLE_LIMIT, ANGLE_LIMIT, 2 * steps + 1)
    curve = lift_curve(angle, shape, numbers)
    drag = attached_drag(curve.attached_lift, shape, numbers)
    moment = float(np.asarray(shape.moment) * camber_share(shape))
    stalled = curve.stalled
    burst = burst_weight(shape, numbers)
    polar = polar_from_columns(
        outline.name,
        source=SOURCE,
        angle=angle,
        reynolds=numbers,
        lift=curve.lift,
        drag=(1.0 - stalled) * drag + stalled * plate_drag(angle)[:, None],
        moment=(1.0 - stalled) * moment + stalled * plate_moment(angle)[:, None],
        origin=CellOrigin.ESTIMATED,
        largest_lift_uncertainty=LARGEST_LIFT_HALF_WIDTH
        + BURST_SPREAD * burst * attached_largest_lift(shape, numbers),
        drag_uncertainty=[
            next(width for end, width in DRAG_HALF_WIDTH if number <= end) for number in numbers
        ],
    )
    none = np.full(numbers.shape, np.nan)
    return dataclasses.replace(
        polar,
        # The flat top is the rule's own rounding, no plateau that anyone measured.
        plateau_from=none,
        plateau_to=none.copy(),
        beyond_stall=curve.stall,
        unknown=_unknown(numbers, burst),
    )


def _checked(reynolds: Sequence[float]) -> FloatArray:
    """Refuse Reynolds numbers that no estimate can be tabled at."""
    numbers = np.array(reynolds, dtype=np.float64)
    if not (
        numbers.ndim == 1
        and numbers.size
        and np.all(np.diff(numbers) > 0.0)
        and np.all((numbers >= LOWEST_REYNOLDS) & (numbers <= HIGHEST_REYNOLDS))
    ):
        raise InputError(
            "reynolds", reynolds, f"ascending, {LOWEST_REYNOLDS:g} to {HIGHEST_REYNOLDS:g}"
        )
    return numbers


def _unknown(reynolds: FloatArray, burst: FloatArray) -> tuple[tuple[float, float], ...]:
    """Neighbouring Reynolds numbers between which a bubble is taken to burst."""
    return tuple(
        (float(low), float(high))
        for low, high, lost in zip(reynolds[:-1], reynolds[1:], burst[:-1], strict=True)
        if lost > 0.0 and low <= BURST_LAST < high
    )
