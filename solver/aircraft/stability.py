"""Neutral point and static margin of a trimmed aircraft, elevator held."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from solver.aircraft.configuration import Aircraft, body_moment_slope
from solver.aircraft.trim import Trimmed
from solver.wing.forces import pitching_moment, station_forces
from solver.wing.influence import influence
from solver.wing.lifting_line import Flow, solve

HALF_STEP = np.radians(0.25)
"""Half the change of angle over which slopes are taken [rad]: small against the
curvature of a polar, large against the tolerance of the solve."""


@dataclass(frozen=True)
class Stability:
    """Slopes about a trimmed state.

    Fields
    ------
    static_margin : float
        Distance of the neutral point behind the balance point over the mean
        aerodynamic chord, body included [-].
    body_share : float
        How far forward the body alone moves the neutral point, over the mean
        aerodynamic chord [-].
    lift_slope : float
        Change of lift coefficient with angle, elevator held [1/rad].
    converged : bool
    """

    static_margin: float
    body_share: float
    lift_slope: float
    converged: bool


def stability(aircraft: Aircraft, trimmed: Trimmed) -> Stability:
    """Neutral point by dM/dL at one trimmed state.

    Parameters
    ----------
    aircraft : Aircraft
    trimmed : Trimmed
        A single state, batch shape ().

    Returns
    -------
    Stability

    Notes
    -----
    Speed and elevator are held while the angle of attack is moved a quarter of a
    degree either way and the loading solved again, wake turned with the stream:
    the neutral point lies -dM/dL behind the balance point.
    """
    angles = trimmed.angle + HALF_STEP * np.array([-1.0, 1.0])
    field = influence(aircraft.lattice, wake_angle=angles)
    flow = Flow(
        lattice=aircraft.lattice,
        polars=aircraft.polars,
        influence=field,
        speed_over_viscosity=np.full(2, trimmed.speed / trimmed.load.kinematic_viscosity),
        shift=aircraft.angle_per_elevator * trimmed.elevator,
        active=np.ones_like(aircraft.on_wing),
        band=trimmed.state.flow.band,
    )
    state = solve(flow, angles, start=trimmed.state.circulation)
    forces = station_forces(
        aircraft.lattice, field, circulation=state.circulation, angle_of_attack=angles
    )
    moments = pitching_moment(
        aircraft.lattice,
        forces,
        drag=state.drag,
        moment=state.moment,
        angle_of_attack=angles,
        about_x=trimmed.load.balance_x,
    )
    lift_slope = float(np.diff(np.sum(forces.lift, axis=-1))[0] / (2.0 * HALF_STEP))
    moment_slope = float(np.diff(np.sum(moments, axis=-1))[0] / (2.0 * HALF_STEP))
    body = body_moment_slope(aircraft.body)
    chord = aircraft.chord
    return Stability(
        static_margin=-(moment_slope + body) / (lift_slope * chord),
        body_share=body / (lift_slope * chord),
        lift_slope=lift_slope / aircraft.area,
        converged=bool(np.all(state.converged) and np.all(trimmed.converged)),
    )
