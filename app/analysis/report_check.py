"""How far a report's table lies from full solves, at places between its points."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from app.analysis.aircraft_stage import GRAVITY
from app.analysis.report_reading import FlightTable
from app.analysis.report_table import own_load, solved_flights
from app.inputs import Inputs
from solver.aircraft.configuration import Aircraft
from solver.aircraft.landing import stall_onset
from solver.atmosphere import standard_atmosphere
from solver.section.packed import NOMINAL

FloatArray = NDArray[np.float64]

SEED = 20_24
"""Fixed, so that the same scenario gives the same report."""


@dataclass(frozen=True)
class TableError:
    """Largest differences between table and full solves, in percent.

    Fields
    ------
    flights : int
        How many random flights were compared: those that both found.
    drag, lift_to_drag : float
        Of the value itself.
    parts : float
        The largest of the four parts of drag, of the whole drag.
    elevator : float
        Of the elevator's travel.
    lift : float
        Local lift at any station, of its limit.
    stall_speed : float
        Of the value itself; the landing ratio errs by as much.
    """

    flights: int
    drag: float
    lift_to_drag: float
    parts: float
    elevator: float
    lift: float
    stall_speed: float

    @property
    def largest(self) -> float:
        """The worst of them [%]."""
        return max(
            self.drag, self.lift_to_drag, self.parts, self.elevator, self.lift, self.stall_speed
        )


def table_error(
    table: FlightTable, inputs: Inputs, aircraft: Aircraft, *, flights: int = 200, seed: int = SEED
) -> TableError:
    """Compare a table with full solves of random flights inside its reach.

    Parameters
    ----------
    table : FlightTable
    inputs : Inputs
    aircraft : Aircraft
    flights : int
        How many are drawn; those beyond stall are left out.
    seed : int
        Of the random numbers.

    Returns
    -------
    TableError
        Over the flights that both the table and the full solve found.
    """
    random = np.random.default_rng(seed)
    speed, mass, altitude = (
        random.uniform(*ends, flights)
        for ends in (table.reach.speed, table.reach.mass, table.reach.altitude)
    )
    offset = inputs.brief.temperature_offset_K
    airs = [standard_atmosphere(float(h), temperature_offset=offset) for h in altitude]
    density = np.array([air.density for air in airs])
    viscosity = np.array([air.kinematic_viscosity for air in airs])
    read = table.at(speed=speed, mass=mass, altitude=altitude)
    weight = mass * GRAVITY
    pressure_area = 0.5 * density * np.square(speed) * aircraft.area
    flown = read.share < 1.0
    solved = solved_flights(
        inputs,
        aircraft,
        lift_coefficient=(weight / pressure_area)[flown],
        speed=(speed / viscosity)[flown],
    )
    parts = solved.columns[:4] * pressure_area[flown]
    drag = parts.sum(axis=0) + aircraft.body.drag_area * (0.5 * density * speed**2)[flown]
    stall = stall_onset(
        aircraft,
        own_load(
            aircraft,
            weight / (density * viscosity**2),
            percent=inputs.balance.balance_forward_percent,
        ),
        band=NOMINAL,
    )
    limit = read.limit[:, flown]
    return TableError(
        flights=int(np.sum(np.isfinite(read.drag[flown] / drag))),
        drag=_worst(read.drag[flown] / drag - 1.0),
        lift_to_drag=_worst(read.lift_to_drag[flown] * drag / weight[flown] - 1.0),
        parts=_worst((read.parts[:, flown] - parts) / drag),
        elevator=_worst(
            (read.elevator_deg[flown] - solved.columns[4]) / inputs.tail.elevator_travel_deg
        ),
        lift=_worst((read.lift[:, flown] - solved.lift) / limit),
        stall_speed=_worst(read.stall_speed[NOMINAL] / (stall.speed * viscosity) - 1.0),
    )


def _worst(errors: FloatArray) -> float:
    found = errors[np.isfinite(errors)]
    return 100.0 * float(np.max(np.abs(found), initial=0.0))
