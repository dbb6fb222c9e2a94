"""The lifting line against itself: batches, symmetry, second routes, packed sections."""

from __future__ import annotations

import dataclasses

import numpy as np
import pytest

from solver.errors import InputError
from solver.section.packing import pack_polars
from solver.section.polar import polar_from_functions
from solver.wing.forces import trefftz_drag
from solver.wing.influence import influence
from solver.wing.lattice import lattice
from solver.wing.lifting_line import linearise, solve
from solver.wing.planform import TaperedSurface
from solver.wing.stall import follow, room, stalling_range
from solver.wing.station_polars import StationPolars
from tests.wing_cases import EllipticSurface, ExactSections, coefficients, flow_over

STALL = np.radians(16.0)


def _curve(angle):
    share = (np.asarray(angle) / STALL) ** 6
    fade = np.exp(-share / 6.0)
    return 2.0 * np.pi * angle * fade, 2.0 * np.pi * fade * (1.0 - share)


def _one_horseshoe_by_pieces(inner, outer, point, stream, length=2e3, pieces=200_000):
    """Biot-Savart sum along the three legs of one horseshoe, cut into short pieces."""

    def line(start, end, grading):
        share = grading[:, None]
        ends = start * (1.0 - share) + end * share
        middle, step = 0.5 * (ends[1:] + ends[:-1]), np.diff(ends, axis=0)
        arm = point - middle
        distance = np.linalg.norm(arm, axis=1)[:, None]
        return np.sum(np.cross(step, arm) / distance**3, axis=0) / (4.0 * np.pi)

    even = np.linspace(0.0, 1.0, 2001)
    far = np.geomspace(1e-9, 1.0, pieces)
    far[0] = 0.0
    return (
        -line(inner, inner + length * stream, far)
        + line(inner, outer, even)
        + line(outer, outer + length * stream, far)
    )


def test_induced_velocity_is_the_biot_savart_sum():
    wing = TaperedSurface(span=2.0, root_chord=0.3, tip_chord=0.2, dihedral=0.1)
    tail = TaperedSurface(span=0.6, root_chord=0.2, tip_chord=0.15, root_x=1.0, root_z=0.2)
    grid = lattice(wing, tail, stations=(4, 4))
    angle = 0.1
    field = influence(grid, wake_angle=angle, core_fraction=0.0)
    stream = np.array([np.cos(angle), 0.0, np.sin(angle)])
    point, normal = grid.point[2], grid.normal[2]
    expected = []
    for j in (0, 1):
        right = _one_horseshoe_by_pieces(grid.inner[j], grid.outer[j], point, stream)
        mirror = np.array([1.0, -1.0, 1.0])
        left = mirror * _one_horseshoe_by_pieces(
            grid.inner[j], grid.outer[j], mirror * point, stream
        )
        across = normal - (normal @ stream) * stream
        expected.append((right + left) @ across / np.linalg.norm(across))
    # The sum ends 2000 m downstream and its pieces are short against the distance: 1e-6.
    np.testing.assert_allclose(field.upwash[2, :2], expected, rtol=1e-5)


def test_a_batch_of_wings_is_its_single_wings():
    spans, sweeps = np.array([1.6, 2.0, 2.4]), np.array([0.0, 0.2, 0.4])
    together = TaperedSurface(span=spans, root_chord=0.3, tip_chord=0.2, sweep=sweeps)
    flow = flow_over(together, stations=(20,), angle=0.08)
    batch = coefficients(flow, np.full(3, 0.08), area=together.area)
    for index in range(3):
        alone = TaperedSurface(
            span=spans[index], root_chord=0.3, tip_chord=0.2, sweep=sweeps[index]
        )
        found = coefficients(
            flow_over(alone, stations=(20,), angle=0.08), 0.08, area=float(alone.area)
        )
        assert batch.lift[index] == pytest.approx(float(found.lift), rel=1e-9)
        assert batch.drag[index] == pytest.approx(float(found.drag), rel=1e-9)


def test_the_jacobian_is_the_derivative_of_the_residual():
    wing = TaperedSurface(span=2.0, root_chord=0.3, tip_chord=0.15, sweep=0.3, dihedral=0.1)
    flow = flow_over(wing, stations=(12,), angle=0.1, sections=ExactSections(_curve))
    angle = np.asarray(0.12)
    g = 0.05 * np.sqrt(1.0 - flow.lattice.fraction**2)
    at = linearise(flow, g, angle)
    step = 1e-6
    for j in range(g.size):
        nudge = step * (np.arange(g.size) == j)
        up = linearise(flow, g + nudge, angle).residual
        down = linearise(flow, g - nudge, angle).residual
        np.testing.assert_allclose((up - down) / (2 * step), at.jacobian[:, j], atol=1e-6)
    up, down = (linearise(flow, g, angle + s).residual for s in (step, -step))
    np.testing.assert_allclose((up - down) / (2 * step), at.by_angle, atol=1e-6)


def test_symmetric_sections_are_odd_in_angle():
    wing = TaperedSurface(span=2.0, root_chord=0.3, tip_chord=0.2)
    up, down = (
        coefficients(
            flow_over(wing, stations=(40,), angle=angle, sections=ExactSections(_curve)),
            angle,
            area=0.5,
        )
        for angle in (0.15, -0.15)
    )
    assert float(up.lift) == pytest.approx(-float(down.lift), rel=1e-12)
    assert float(up.drag) == pytest.approx(float(down.drag), rel=1e-12)


def test_a_long_wing_approaches_its_section():
    slopes = []
    for aspect_ratio in (10.0, 100.0, 1000.0):
        wing = EllipticSurface(span=aspect_ratio, aspect_ratio=aspect_ratio)
        found = coefficients(flow_over(wing, stations=(160,), angle=0.1), 0.1, area=aspect_ratio)
        slopes.append(float(found.lift) / 0.1)
    # Closed form 2 pi / (1 + 2/A).
    exact = [2 * np.pi / (1 + 2 / a) for a in (10.0, 100.0, 1000.0)]
    np.testing.assert_allclose(slopes, exact, rtol=1e-4)


def test_packed_sections_serve_as_well_as_the_formula():
    polar = polar_from_functions(
        "formula",
        lift=lambda a: _curve(a)[0],
        drag=lambda a: 0.01 + 0.0 * a,
        moment=lambda a: 0.0 * a,
        reynolds=(1e5, 1e6),
    )
    wing = EllipticSurface(span=2.0, aspect_ratio=8.0)
    angle = np.radians(14.0)
    exact = flow_over(wing, stations=(80,), angle=angle, sections=ExactSections(_curve))
    count = exact.lattice.surface.size
    index = np.zeros(count, dtype=np.int64)
    packed = dataclasses.replace(
        exact, polars=StationPolars(pack_polars([polar]), index, index, np.zeros(count))
    )
    by_formula = coefficients(exact, angle, area=0.5)
    by_table = coefficients(packed, angle, area=0.5)
    # The packing is accurate to about 1e-6 in lift.
    assert float(by_table.lift) == pytest.approx(float(by_formula.lift), abs=5e-6)


def test_followed_from_below_the_branch_is_the_slow_pull():
    wing = TaperedSurface(span=2.0, root_chord=0.3, tip_chord=0.15)

    def flow_at(angle):
        return flow_over(wing, stations=(20,), angle=angle, sections=ExactSections(_curve))

    angles = np.radians(np.arange(0.0, 19.0))
    branch = follow(flow_at, angles)
    np.testing.assert_array_equal(branch.angle, angles)
    assert all(state.converged for state in branch.states)
    first = np.array([state.circulation for state in branch.states])
    # Continuous: no station jumps by more than the flow could in one degree.
    assert np.max(np.abs(np.diff(first, axis=0))) < 0.02


def test_room_is_measured_to_each_stations_own_limit():
    wing = TaperedSurface(span=2.0, root_chord=0.3, tip_chord=0.15)
    knee, largest = np.radians(12.0), 1.3
    sections = ExactSections(_curve, knee=knee, largest=largest)
    flow = flow_over(wing, stations=(40,), angle=0.15, sections=sections)
    state = solve(flow, 0.15)
    left = room(state)
    np.testing.assert_allclose(left.lift, largest - state.lift)
    np.testing.assert_allclose(left.angle, knee - state.section_angle)


def test_the_stalling_range_is_empty_far_below_and_holds_the_worst_station_above():
    wing = TaperedSurface(span=2.0, root_chord=0.3, tip_chord=0.15)
    sections = ExactSections(_curve, knee=np.radians(10.0))
    calm = solve(flow_over(wing, stations=(40,), angle=0.05, sections=sections), 0.05)
    assert np.isnan(stalling_range(calm)[0])
    angle = np.radians(13.0)
    hard = solve(flow_over(wing, stations=(40,), angle=angle, sections=sections), angle)
    start, end = stalling_range(hard)
    worst = hard.flow.lattice.fraction[np.argmax(hard.section_angle)]
    assert start <= worst <= end


def test_near_and_far_induced_drag_agree_with_sweep_and_dihedral():
    wing = TaperedSurface(
        span=2.0, root_chord=0.3, tip_chord=0.15, sweep=np.radians(30), dihedral=np.radians(6)
    )
    found = coefficients(flow_over(wing, stations=(40,), angle=0.1), 0.1, area=0.45)
    # The first-order angle of the downwash and the dihedral's tilt leave 0.5 %.
    assert float(found.drag) == pytest.approx(float(found.far_drag), rel=5e-3)


def test_elliptic_circulation_has_the_least_drag():
    wing = EllipticSurface(span=2.0, aspect_ratio=8.0)
    grid = lattice(wing, stations=(80,))
    zero = np.asarray(0.0)
    base = np.sqrt(1.0 - grid.fraction**2)
    bumped = base * (1.0 + 0.1 * np.cos(3.0 * np.pi * grid.fraction))
    bumped *= np.sum(base * grid.width) / np.sum(bumped * grid.width)
    least = trefftz_drag(grid, circulation=base, angle_of_attack=zero)
    assert float(trefftz_drag(grid, circulation=bumped, angle_of_attack=zero)) > float(least)


@pytest.mark.parametrize("name", ["span", "root_chord", "tip_chord"])
@pytest.mark.parametrize("bad", [0.0, -1.0, np.nan, np.inf])
def test_an_unusable_length_is_named(name, bad):
    values = {"span": 2.0, "root_chord": 0.3, "tip_chord": 0.2, name: bad}
    with pytest.raises(InputError, match=f"{name} must be finite and > 0") as caught:
        TaperedSurface(**values)
    assert caught.value.name == name


@pytest.mark.parametrize("bad", [3, 0, 2, 21])
def test_an_unusable_number_of_stations_is_named(bad):
    wing = TaperedSurface(span=2.0, root_chord=0.3, tip_chord=0.2)
    with pytest.raises(InputError, match="stations must be even and at least 4"):
        lattice(wing, stations=(bad,))
