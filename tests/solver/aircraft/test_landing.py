"""Stall in trim, against a second route: bisection over speed instead of angle."""

from __future__ import annotations

import numpy as np
import pytest
from scipy.optimize import brentq

from solver.aircraft.landing import ratio_band, speed_margins, stall_onset
from solver.aircraft.trim import trim
from solver.wing.stall import least_angle_room, room
from tests.aircraft_cases import AnalyticSections, load, small_aircraft


@pytest.mark.parametrize("growth", [0.0, 0.1])
@pytest.mark.parametrize("balance", [0.2, 0.35])
def test_the_onset_found_over_angle_is_the_one_found_over_speed(growth, balance):
    aircraft = small_aircraft(AnalyticSections(growth=growth))
    carried = load(aircraft, balance=balance)
    onset = stall_onset(aircraft, carried)
    assert onset.found

    def room_at(speed):
        return float(least_angle_room(trim(aircraft, carried, speed=speed).state))

    # The bracket's lower end is still on the branch: 2 % below the onset.
    speed = brentq(room_at, 0.98 * float(onset.trimmed.speed), 1.6 * float(onset.speed), xtol=1e-4)
    # The onset stops at 0.01 degrees of room: 0.1 % of the stall speed.
    assert float(onset.trimmed.speed) == pytest.approx(speed, rel=1e-3)
    # At the knee the first station has 98 % of its largest lift, and the stall speed
    # is where the same loading has all of it.
    assert float(onset.speed) == pytest.approx(speed * np.sqrt(0.98), rel=1e-3)


def test_the_band_orders_the_stall_speeds_and_each_is_its_own_solution():
    aircraft = small_aircraft()
    together = stall_onset(aircraft, load(aircraft), band=np.array([0, 1, 2]))
    assert np.all(together.found)
    assert np.all(np.diff(together.speed) < 0.0)
    for band in (0, 1, 2):
        alone = stall_onset(aircraft, load(aircraft), band=band)
        assert float(alone.speed) == pytest.approx(float(together.speed[band]), rel=1e-3)


def test_at_the_onset_lift_carries_the_load_and_one_station_is_at_its_knee():
    aircraft = small_aircraft()
    onset = stall_onset(aircraft, load(aircraft))
    flight = onset.trimmed
    assert float(flight.lift_area * flight.dynamic_pressure) == pytest.approx(40.0, rel=1e-6)
    left = room(flight.state).angle[aircraft.on_wing]
    assert np.min(left) == pytest.approx(0.0, abs=np.radians(0.011))
    assert 0.0 <= float(onset.start) <= float(onset.end) <= 1.0


def test_reynolds_numbers_belong_to_the_stall_speed_itself():
    aircraft = small_aircraft()
    onset = stall_onset(aircraft, load(aircraft))
    reynolds = onset.trimmed.state.flow.reynolds()
    expected = (
        float(onset.trimmed.speed) * aircraft.lattice.chord / load(aircraft).kinematic_viscosity
    )
    np.testing.assert_allclose(reynolds, expected, rtol=1e-12)


def test_heavier_thinner_and_forward_stall_faster():
    aircraft = small_aircraft()
    base = float(stall_onset(aircraft, load(aircraft)).speed)
    heavy = float(stall_onset(aircraft, load(aircraft, force=48.0)).speed)
    forward = float(stall_onset(aircraft, load(aircraft, balance=0.15)).speed)
    # Closed form without the Reynolds number: square root of the weight; with it the
    # heavier one gains a little largest lift.
    assert base * np.sqrt(1.2) * 0.98 < heavy < base * np.sqrt(1.2)
    assert forward > base


def test_taper_moves_the_onset_outboard():
    """NACA Report 572, 1936: the first critical section moves out as the tip narrows."""
    places = []
    for tip in (0.26, 0.16, 0.11):
        aircraft = small_aircraft(tip_chord=tip, washout=0.0)
        onset = stall_onset(aircraft, load(aircraft))
        places.append(0.5 * float(onset.start + onset.end))
    assert places[0] < places[1] < places[2]


def test_margins_at_a_multiple_of_the_stall_speed():
    aircraft = small_aircraft()
    onset = stall_onset(aircraft, load(aircraft))
    flight = trim(aircraft, load(aircraft), speed=1.3 * float(onset.speed))
    left = speed_margins(flight, onset)
    assert left.ratio == pytest.approx(1.3)
    assert left.lift == pytest.approx(0.69)
    # Level turn at 1.3 Vs: 1/cos(bank) = 1.69, 53.7 degrees.
    assert np.degrees(left.bank) == pytest.approx(53.72, abs=0.01)
    assert left.gust > 0.0
    below = speed_margins(trim(aircraft, load(aircraft), speed=0.99 * float(onset.speed)), onset)
    assert below.bank == 0.0
    assert below.speed_to_lose < 0.0


def test_independent_errors_add_by_their_squares():
    assert ratio_band(1.3, stall_speed_error=0.03, airspeed_error=0.6, speed=15.0) == (
        pytest.approx(1.3 * 0.05)
    )


def test_a_tail_that_cannot_hold_the_wing_leaves_the_onset_unfound():
    aircraft = small_aircraft(tail_area=0.004)
    onset = stall_onset(aircraft, load(aircraft, balance=-0.4))
    assert not onset.found
    assert np.isfinite(float(onset.speed))
