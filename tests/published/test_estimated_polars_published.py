"""Estimated polars against wind-tunnel tables of twelve sections.

Each section is predicted with constants fitted to the others, so that the figures
are those a section without measurements must expect. Run with ``--log-cli-level=INFO`` to see them.
"""

from __future__ import annotations

import logging
from functools import lru_cache

import numpy as np
import pytest
from numpy.typing import NDArray
from scipy.optimize import least_squares

from solver.section.estimate import (
    DRAG_HALF_WIDTH,
    LARGEST_LIFT_HALF_WIDTH,
    estimate_polar,
)
from solver.section.estimated_drag import DRAG_RULE, DragRule, attached_drag
from solver.section.estimated_lift import (
    BURST_SHARE,
    BURST_SPREAD,
    HALF_STALLED,
    ROUNDING,
    STALL_RULE,
    SectionShape,
    StallRule,
    attached_largest_lift,
    camber_share,
    lift_curve,
    lift_slope,
)
from solver.section.stalled_flow import plate_drag
from tests.published.measured_sections import (
    SECTIONS,
    Run,
    outline,
    runs,
    shape,
    shapes,
    stall_of,
)
from tests.published.tables import rows

pytestmark = pytest.mark.published
Array = NDArray[np.float64]

say = logging.getLogger(__name__).info

BANDS = ((0.0, 9e4), (9e4, 1.7e5), (1.7e5, 1e7))


# --- largest lift


@lru_cache(maxsize=1)
def _stalls() -> tuple[Array, SectionShape, Array, Array]:
    """Names, shapes, Reynolds numbers and largest lifts of all runs that did not burst."""
    found = [(run, stall_of(run)) for run in runs("lift") if not run.burst]
    kept = [(run, limit) for run, limit in found if limit is not None]
    names = [run.section for run, _ in kept]
    return (
        np.array(names),
        shapes(names),
        np.array([run.reynolds for run, _ in kept]),
        np.array([limit.largest_lift for _, limit in kept]),
    )


def _part(whole: SectionShape, mask: Array) -> SectionShape:
    return SectionShape(
        *(
            np.asarray(getattr(whole, name))[mask]
            for name in ("thickness", "nose_radius", "zero_lift_angle", "ideal_lift", "moment")
        )
    )


def _fit_stall(mask: Array, *, bubble: bool = True) -> StallRule:
    """Fit the constants of the rule, every section with the same weight."""
    names, shape_, reynolds, measured = _stalls()
    part = _part(shape_, mask)
    weight = 1.0 / np.sqrt([np.count_nonzero(names[mask] == name) for name in names[mask]])

    def error(constants: Array) -> Array:
        rule = StallRule(*constants) if bubble else StallRule(*constants, 0.0)
        return (attached_largest_lift(part, reynolds[mask], rule=rule) - measured[mask]) * weight

    start = (3.0, 0.03, 0.02) if bubble else (6.0, 0.1)
    fitted = tuple(least_squares(error, start).x)
    return StallRule(*fitted) if bubble else StallRule(*fitted, 0.0)


def _left_out(*, bubble: bool = True) -> dict[str, Array]:
    """Errors in largest lift of each section under constants fitted to the others."""
    names, shape_, reynolds, measured = _stalls()
    errors = {}
    for name in SECTIONS:
        own = names == name
        rule = _fit_stall(~own, bubble=bubble)
        predicted = attached_largest_lift(_part(shape_, own), reynolds[own], rule=rule)
        errors[name] = predicted - measured[own]
    return errors


def _rms(values: Array) -> float:
    return float(np.sqrt(np.mean(np.square(values))))


def test_largest_lift_of_a_section_that_was_left_out():
    errors = _left_out()
    for name, values in errors.items():
        say(f"{name:10s} {values.size:2d} runs  mean {values.mean():+.3f}  rms {_rms(values):.3f}")
    by_section = float(np.sqrt(np.mean([_rms(values) ** 2 for values in errors.values()])))
    pooled = np.concatenate(list(errors.values()))
    say(f"by section {by_section:.3f}, by run {_rms(pooled):.3f}")
    # The half-width is defined as twice this rms; it is printed to two decimals.
    assert 2.0 * by_section <= LARGEST_LIFT_HALF_WIDTH + 0.005
    # ... and said to cover 19 runs of 20; of 78 runs one more may be out.
    covered = float(np.mean(np.abs(pooled) <= LARGEST_LIFT_HALF_WIDTH))
    say(f"within the half-width: {covered:.2f} of runs; largest {np.abs(pooled).max():.3f}")
    assert covered >= 0.94


def test_the_shipped_stall_constants_are_those_of_all_sections():
    names, *_ = _stalls()
    fitted = _fit_stall(np.ones(names.size, dtype=bool))
    say(f"fitted to all: {fitted}")
    # Rounded to two figures when written down.
    assert STALL_RULE.pressure_difference == pytest.approx(fitted.pressure_difference, rel=0.02)
    assert STALL_RULE.exponent == pytest.approx(fitted.exponent, abs=0.005)
    assert STALL_RULE.bubble_radius == pytest.approx(fitted.bubble_radius, rel=0.05)


def test_the_rule_needs_the_radius_of_the_bubble():
    # What the notes claim: without it the errors are several times larger.
    with_bubble = np.concatenate(list(_left_out().values()))
    without = np.concatenate(list(_left_out(bubble=False).values()))
    say(f"rms by run: {_rms(with_bubble):.3f} with, {_rms(without):.3f} without")
    assert _rms(without) > 3.0 * _rms(with_bubble)


def test_burst_bubbles_take_the_share_that_is_taken_for_them():
    found = [(run, stall_of(run)) for run in runs("lift") if run.burst]
    shares = [
        limit.largest_lift / float(attached_largest_lift(shape(run.section), run.reynolds))
        for run, limit in found
        if limit is not None
    ]
    assert len(shares) == 4
    # FX 63-137 at 62,000 creeps up to the end of its run: its last reading stands in.
    last = next(run for run in runs("lift") if run.burst and run.section == "fx63-137")
    shares.append(float(last.lift.max() / attached_largest_lift(shape("fx63-137"), last.reynolds)))
    say(f"shares of the rule: {np.round(sorted(shares), 2)}")
    # The spread covers them with the scatter between tunnels: 0.07 in a lift of two.
    assert max(abs(share - BURST_SHARE) for share in shares) <= BURST_SPREAD + 0.03


# --- lift at equal angle


GRID = np.radians(np.linspace(-10.0, 25.0, 351))


def _lift_errors(run: Run) -> tuple[Array, float]:
    """Estimated less measured lift from -3 degrees to the first of the two peaks.

    And estimated less measured angle of the peak [rad], NaN where none was measured.
    """
    limit = stall_of(run)
    curve = lift_curve(GRID, shape(run.section), np.array([run.reynolds])).lift[:, 0]
    peak = float(GRID[np.argmax(curve)])
    top = min(peak, limit.peak_angle if limit else float(run.angle.max()))
    used = (run.angle > np.radians(-3.0)) & (run.angle <= top)
    errors = np.interp(run.angle[used], GRID, curve) - run.lift[used]
    return errors, peak - limit.peak_angle if limit else np.nan


@pytest.mark.parametrize(
    ("band", "allowed"),
    # What was reached, rounded up. Below 90,000 most of it is the loss of lift at small
    # angles, which each section has in its own way; coupled methods that solve
    # for it leave 0.06 to 0.11 on such tables.
    list(zip(BANDS, (0.105, 0.075, 0.055), strict=True)),
)
def test_lift_at_equal_angle(band, allowed):
    # S1223's lower side separates at the small angles where its runs begin: no estimate.
    found = [
        _lift_errors(run)
        for run in runs("lift")
        if band[0] < run.reynolds <= band[1] and not run.burst and run.section != "s1223"
    ]
    errors = np.concatenate([values for values, _ in found])
    peaks = np.degrees([angle for _, angle in found])
    say(
        f"{band}: rms {_rms(errors):.3f}, mean {errors.mean():+.3f}, {errors.size} points; "
        f"angle of the peak: mean {np.nanmean(peaks):+.1f}, rms {np.sqrt(np.nanmean(peaks**2)):.1f}"
    )
    assert _rms(errors) <= allowed
    assert abs(errors.mean()) <= 0.03
    # Flat tops: the angle of the measured peak itself moves by 3 degrees between repeats.
    assert np.sqrt(np.nanmean(peaks**2)) <= 3.5


def test_the_flat_spot_of_a_symmetric_section_is_seen():
    # Slope of NACA 0009 between -1.1 and 1.1 degrees, by Re: 0.055 to 0.10 per degree
    # measured. The estimate must show the same loss, to half of it.
    for run in runs("lift"):
        if run.section != "naca0009":
            continue
        used = np.abs(run.angle) < np.radians(1.15)
        measured = np.polyfit(run.angle[used], run.lift[used], 1)[0]
        near = np.radians(np.linspace(-1.1, 1.1, 23))
        curve = lift_curve(near, shape("naca0009"), np.array([run.reynolds]))
        estimated = np.polyfit(near, curve.lift[:, 0], 1)[0]
        say(f"{run.reynolds:8.0f}: measured {measured:.2f}, estimated {estimated:.2f} per rad")
        assert estimated < 5.6
        assert estimated == pytest.approx(measured, abs=1.6)


# --- drag


@lru_cache(maxsize=1)
def _drags() -> tuple[Array, SectionShape, Array, Array, Array, Array]:
    """Names, shapes, Reynolds numbers, lift, drag and weight of points before the stall."""
    names, reynolds, lift, drag, weight = [], [], [], [], []
    for run in runs("drag"):
        if run.burst or run.drag is None:
            continue
        rising = np.arange(run.lift.size) <= int(np.argmax(run.lift))
        top = float(attached_largest_lift(shape(run.section), run.reynolds))
        used = rising & (run.lift > -0.3) & (run.lift < 0.95 * top)
        count = int(np.count_nonzero(used))
        if not count:
            continue
        names += [run.section] * count
        reynolds += [run.reynolds] * count
        weight += [1.0 / np.sqrt(count)] * count
        lift.append(run.lift[used])
        drag.append(run.drag[used])
    return (
        np.array(names),
        shapes(names),
        np.array(reynolds),
        np.concatenate(lift),
        np.concatenate(drag),
        np.array(weight),
    )


def _drag_error(rule: DragRule, mask: Array) -> Array:
    """Logarithm of estimated over measured drag at equal lift, before the stall."""
    _, shape_, reynolds, lift, drag, _ = _drags()
    part, number, cl = _part(shape_, mask), reynolds[mask], lift[mask]
    top = attached_largest_lift(part, number)
    near = np.clip(cl - (top - ROUNDING), 0.0, 0.9999 * ROUNDING)
    # The rounded peak turned round: how much lift is missing at this lift.
    missing = 2.0 * ROUNDING - np.sqrt(4.0 * ROUNDING * (ROUNDING - near)) - near
    stalled = missing / (missing + HALF_STALLED)
    zero = np.asarray(part.zero_lift_angle) * camber_share(part)
    angle = zero + (cl + missing) / lift_slope(part, number)
    estimated = (1.0 - stalled) * attached_drag(cl, part, number, rule=rule)
    return np.log((estimated + stalled * plate_drag(angle)) / drag[mask])


def _fit_drag(mask: Array) -> DragRule:
    weight = _drags()[5][mask]
    start = np.array([0.79, 0.26, 0.12, 1.7, 0.018])

    def error(constants: Array) -> Array:
        return _drag_error(DragRule(*constants), mask) * weight

    # Against outliers: a few points sit in long bubbles with three times the drag.
    fitted = least_squares(
        error,
        start,
        bounds=([0.2, 0.2, 0.0, 1.0, 0.0], [0.95, 1.5, 0.5, 3.0, 0.1]),
        loss="soft_l1",
        f_scale=0.3,
        x_scale=start,
    )
    return DragRule(*fitted.x)


def test_drag_of_a_section_that_was_left_out():
    names, _, reynolds, *_ = _drags()
    errors = np.zeros(names.size)
    for name in SECTIONS:
        own = names == name
        errors[own] = _drag_error(_fit_drag(~own), own)
        say(
            f"{name:10s} {np.count_nonzero(own):3d} points  mean {errors[own].mean():+.3f}  "
            f"rms {_rms(errors[own]):.3f}"
        )
    for (low, high), (_, width) in zip(BANDS, DRAG_HALF_WIDTH, strict=True):
        inside = errors[(reynolds > low) & (reynolds <= high)]
        say(f"Re {low:g} to {high:g}: mean |e| {np.abs(inside).mean():.3f}, rms {_rms(inside):.3f}")
        # The half-width is this rms, written down to two decimals.
        assert _rms(inside) <= width + 0.005
        assert _rms(inside) >= width - 0.03


def test_the_shipped_drag_constants_do_as_well_as_those_fitted_to_all():
    names, *_ = _drags()
    everything = np.ones(names.size, dtype=bool)
    best = _fit_drag(everything)
    fitted = _rms(_drag_error(best, everything))
    say(f"fitted to all: {best}, rms {fitted:.3f}")
    # They trade against one another, so the outcome is compared: two figures written down.
    assert _rms(_drag_error(DRAG_RULE, everything)) <= 1.02 * fitted


# --- the whole polar


@pytest.mark.parametrize("name", SECTIONS)
def test_the_polar_carries_the_rule_and_a_clear_first_peak(name):
    polar = estimate_polar(outline(name))
    assert polar.bracketed.all()
    safe = polar.largest_lift_uncertainty <= LARGEST_LIFT_HALF_WIDTH + 1e-9
    rule = attached_largest_lift(shape(name), polar.reynolds)
    # The top of a parabola between angles half a degree apart: 5e-4.
    np.testing.assert_allclose(polar.largest_lift[safe], rule[safe], atol=1e-3)
    assert bool(polar.unknown) == (name in ("s1223", "fx63-137", "naca6409"))


def test_the_moment_of_e387_comes_out_as_measured():
    # UIUC vol. 3, model C, 0 to 5 degrees, 200,000 and above, where bubbles are short.
    measured = [
        float(row["cm_c4"])
        for row in rows("sections/e387/uiuc_v3_modelC_lift.csv")
        if float(row["Re"]) > 1.9e5 and 0.0 < float(row["alpha_deg"]) < 5.5 and row["sweep"] == "up"
    ]
    polar = estimate_polar(outline("e387"))
    level = np.abs(polar.angle - np.radians(2.5)) < np.radians(2.6)
    # Readings at these Reynolds numbers spread by 0.007; thin-airfoil theory leaves out
    # thickness, which is worth 0.005 of it.
    assert len(measured) > 10
    np.testing.assert_allclose(polar.moment[level], np.mean(measured), atol=0.01)
