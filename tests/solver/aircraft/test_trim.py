"""Trim: identities that any balanced flight obeys, and the facts of the trade."""

from __future__ import annotations

import dataclasses

import numpy as np
import pytest

from solver.aircraft.configuration import TAIL, body_moment_slope
from solver.aircraft.speed import level_flight
from solver.aircraft.trim import trim
from solver.wing.forces import trefftz_drag
from tests.aircraft_cases import DENSITY, MASS_FORCE, AnalyticSections, load, small_aircraft


def _moments_by_hand(aircraft, flight):
    """Nose-up moment about the balance point, summed from the reported loads [N m]."""
    lattice, state = aircraft.lattice, flight.state
    pressure = float(flight.dynamic_pressure)
    alpha = float(flight.angle)
    lift = pressure * flight.forces.lift
    drag = pressure * (flight.forces.induced_drag + 2.0 * state.drag * lattice.strip_area)
    up = lift * np.cos(alpha) + drag * np.sin(alpha)
    aft = drag * np.cos(alpha) - lift * np.sin(alpha)
    x, z = lattice.point[:, 0] - flight.load.balance_x, lattice.point[:, 2]
    section = state.moment + aircraft.moment_per_elevator * float(flight.elevator)
    own = 2.0 * pressure * section * lattice.chord * lattice.strip_area * lattice.normal[:, 2]
    body = 0.5 * pressure * body_moment_slope(aircraft.body) * np.sin(2.0 * alpha)
    return np.sum(z * aft - x * up + own) + body


@pytest.mark.parametrize("speed", [12.0, 16.0, 24.0])
def test_lift_carries_the_weight_and_the_moment_vanishes(speed):
    aircraft = small_aircraft()
    flight = trim(aircraft, load(aircraft), speed=speed)
    assert flight.converged
    lift = float(flight.lift_area * flight.dynamic_pressure)
    # Newton stops at 1e-7 of the wing area.
    assert lift == pytest.approx(MASS_FORCE, rel=1e-6)
    scale = MASS_FORCE * aircraft.chord
    assert _moments_by_hand(aircraft, flight) / scale == pytest.approx(0.0, abs=1e-6)


def test_lift_from_circulation_is_lift_from_the_sections():
    aircraft = small_aircraft()
    flight = trim(aircraft, load(aircraft), speed=14.0)
    state = flight.state
    values = aircraft.polars.evaluate(state.section_angle, state.flow.reynolds(), band=1)
    # The same numbers by the other route; Newton's tolerance is 1e-10 of the chord.
    np.testing.assert_allclose(values.lift, state.lift, atol=1e-8)


def test_forces_agree_with_the_trefftz_plane_with_a_tail_behind():
    aircraft = small_aircraft()
    flight = trim(aircraft, load(aircraft), speed=13.0)
    far = trefftz_drag(
        aircraft.lattice, circulation=flight.state.circulation, angle_of_attack=flight.angle
    )
    # The legs' core where they pass the tail, and the second-order force of the
    # downwash on lift, leave 0.5 %.
    assert float(flight.induced_area) == pytest.approx(float(far), rel=5e-3)


def test_given_the_angle_that_a_speed_needs_the_speed_comes_back():
    aircraft = small_aircraft()
    by_speed = trim(aircraft, load(aircraft), speed=15.0)
    by_angle = trim(aircraft, load(aircraft), angle=by_speed.angle)
    # The wake may lie 0.05 degrees off the stream in either.
    assert float(by_angle.speed) == pytest.approx(15.0, rel=1e-4)
    assert float(by_angle.elevator) == pytest.approx(float(by_speed.elevator), abs=2e-4)


def test_a_batch_is_its_single_flights():
    aircraft = small_aircraft()
    speeds = np.array([[12.0, 14.0], [17.0, 22.0]])
    together = trim(aircraft, load(aircraft), speed=speeds)
    for index in np.ndindex(speeds.shape):
        alone = trim(aircraft, load(aircraft), speed=speeds[index])
        # Each may stop with its wake up to 0.05 degrees off the stream.
        assert float(together.angle[index]) == pytest.approx(float(alone.angle), abs=1e-5)
        assert float(together.elevator[index]) == pytest.approx(float(alone.elevator), abs=1e-4)


def test_each_case_of_a_batch_may_balance_by_itself():
    aircraft = small_aircraft()
    points = np.array([aircraft.position(share) for share in (0.2, 0.3, 0.4)])
    together = trim(
        aircraft, dataclasses.replace(load(aircraft), balance_x=points), speed=np.full(3, 15.0)
    )
    for index, share in enumerate((0.2, 0.3, 0.4)):
        alone = trim(aircraft, load(aircraft, balance=share), speed=15.0)
        assert float(together.elevator[index]) == pytest.approx(float(alone.elevator), abs=1e-4)
        assert float(together.case(index).load.balance_x) == points[index]


def test_the_core_of_the_wake_does_not_decide_the_trim():
    from solver.wing import influence as module

    aircraft = small_aircraft(tail_height=0.0)
    found = []
    for share in (0.5, 1.0, 2.0):
        original = module.CORE_FRACTION
        keywords = module.influence.__kwdefaults__
        keywords["core_fraction"] = share * original
        try:
            found.append(trim(aircraft, load(aircraft), speed=14.0))
        finally:
            keywords["core_fraction"] = original
    elevators = np.degrees([float(flight.elevator) for flight in found])
    # A tenth of a degree of elevator is what a builder can set (common practice, no source).
    assert np.ptp(elevators) < 0.1


def test_lift_goes_with_speed_squared_at_a_given_angle():
    aircraft = small_aircraft(AnalyticSections(growth=0.0))
    single = trim(aircraft, load(aircraft), angle=0.05)
    heavy = trim(aircraft, load(aircraft, force=4.0 * MASS_FORCE), angle=0.05)
    # With sections that ignore the Reynolds number nothing else changes but their drag.
    assert float(heavy.speed / single.speed) == pytest.approx(2.0, rel=1e-4)


def test_more_camber_costs_trim_drag_while_the_tail_pushes_down():
    """Common practice, no source: a cambered section pitches down; the tail's download pays."""
    costs, tails = [], []
    for moment in (-0.02, -0.06, -0.12):
        aircraft = small_aircraft(AnalyticSections(moment=moment))
        flight = level_flight(aircraft, load(aircraft, balance=0.2), speed=20.0)
        costs.append(float(flight.trim_induced + flight.trim_profile))
        tails.append(float(flight.trimmed.tail_lift))
    assert all(lift < 0.0 for lift in tails)
    assert tails[0] > tails[1] > tails[2]
    assert costs[0] < costs[1] < costs[2]


def test_far_aft_the_tail_lifts_and_more_camber_costs_less():
    """Common practice, no source: with the balance point far aft the sign turns."""
    costs, tails = [], []
    for moment in (0.0, -0.02, -0.04):
        aircraft = small_aircraft(AnalyticSections(moment=moment), tail_area=0.16)
        flight = level_flight(aircraft, load(aircraft, balance=0.55), speed=12.0)
        costs.append(float(flight.trim_induced + flight.trim_profile))
        tails.append(float(flight.trimmed.tail_lift))
    assert all(lift > 0.0 for lift in tails)
    assert costs[0] > costs[1] > costs[2]


def test_a_download_adds_to_the_lift_the_wing_must_give():
    aircraft = small_aircraft()
    flight = trim(aircraft, load(aircraft, balance=0.15), speed=20.0)
    on_tail = aircraft.lattice.surface == TAIL
    wing_lift = float(np.sum(flight.forces.lift[~on_tail]) * flight.dynamic_pressure)
    assert float(flight.tail_lift) < 0.0
    assert wing_lift > MASS_FORCE


def test_an_unloaded_tail_carries_nothing_and_leaves_the_lift():
    aircraft = small_aircraft()
    flight = trim(aircraft, load(aircraft), speed=15.0, unloaded_tail=True)
    assert float(flight.tail_lift) == 0.0
    assert float(flight.elevator) == 0.0
    lift = float(flight.lift_area) * 0.5 * DENSITY * 15.0**2
    assert lift == pytest.approx(MASS_FORCE, rel=1e-6)


def test_thrust_above_the_balance_point_asks_for_up_elevator():
    plain = small_aircraft()
    high = dataclasses.replace(plain, thrust_height=0.1)
    base = trim(plain, load(plain), speed=16.0)
    raised = trim(high, load(high), speed=16.0)
    assert float(raised.elevator) < float(base.elevator)


def test_what_cannot_fly_is_masked_not_raised():
    aircraft = small_aircraft()
    flight = trim(aircraft, load(aircraft), speed=np.array([4.0, 15.0]))
    assert not flight.converged[0]
    assert flight.converged[1]
    assert np.all(np.isfinite(flight.angle))


def test_speed_or_angle_but_not_both():
    aircraft = small_aircraft()
    with pytest.raises(ValueError, match="exactly one"):
        trim(aircraft, load(aircraft), speed=15.0, angle=0.1)
