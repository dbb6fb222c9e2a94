"""A batch of loads, and the wing's own variables: the same flights by another route."""

from __future__ import annotations

import numpy as np
import pytest

from solver.aircraft.landing import stall_onset
from solver.aircraft.load import Load
from solver.aircraft.speed import level_flight
from solver.aircraft.trim import trim
from tests.aircraft_cases import DENSITY, VISCOSITY, load, small_aircraft

FORCES = np.array([25.0, 40.0, 60.0])


def test_a_batch_of_loads_is_each_load_by_itself():
    aircraft = small_aircraft()
    speed = np.array([14.0, 15.0, 17.0])
    together = trim(aircraft, load(aircraft, force=FORCES), speed=speed)
    assert together.converged.all()
    for index, force in enumerate(FORCES):
        alone = trim(aircraft, load(aircraft, force=float(force)), speed=speed[index])
        case = together.case(index)
        # The wake may lie 0.05 degrees off the stream in either.
        assert float(case.angle) == pytest.approx(float(alone.angle), abs=1e-4)
        assert float(case.elevator) == pytest.approx(float(alone.elevator), abs=1e-3)
        assert float(case.load.force) == force


def test_stall_of_a_batch_of_loads_is_each_stall_by_itself():
    aircraft = small_aircraft()
    together = stall_onset(aircraft, load(aircraft, force=FORCES), band=1)
    assert together.found.all()
    for index, force in enumerate(FORCES):
        alone = stall_onset(aircraft, load(aircraft, force=float(force)), band=1)
        # The onset stops at 0.01 degrees of room: 0.1 % of the stall speed.
        assert float(together.case(index).speed) == pytest.approx(float(alone.speed), rel=1e-3)


def test_lift_coefficient_and_speed_over_viscosity_decide_all_else():
    aircraft = small_aircraft()
    real = load(aircraft)
    speed = np.array([14.0, 18.0])
    flown = level_flight(aircraft, real, speed=speed)
    own = Load(
        force=np.full(2, real.force / (DENSITY * VISCOSITY**2)),
        density=1.0,
        kinematic_viscosity=1.0,
        balance_x=real.balance_x,
    )
    scaled = level_flight(aircraft, own, speed=speed / VISCOSITY)
    assert scaled.converged.all()
    # The same equations with other units: iteration alone is between them.
    assert scaled.drag * DENSITY * VISCOSITY**2 == pytest.approx(flown.drag, rel=1e-6)
    assert scaled.trimmed.elevator == pytest.approx(flown.trimmed.elevator, abs=1e-6)
