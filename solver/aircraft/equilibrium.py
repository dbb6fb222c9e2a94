"""Newton on circulations, angle of attack and elevator together.

The lifting-line equations of wing and tail are bordered by two more: the moment
about the balance point vanishes, and a target is met, which sets the angle of
attack. Targets are a speed, an angle, or the knee of the first section to stall.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property
from typing import Protocol

import numpy as np
from numpy.typing import NDArray

from solver.aircraft.configuration import WING, Aircraft, body_moment_slope
from solver.aircraft.load import Load
from solver.wing.forces import StationForces, pitching_moment, station_forces
from solver.wing.influence import Influence, influence
from solver.wing.lifting_line import TOLERANCE, Flow, Linearised, linearise, shortened_step

FloatArray = NDArray[np.float64]
BoolArray = NDArray[np.bool_]

MOST_ITERATIONS = 30

GAP_TOLERANCE = 1e-7
"""Largest miss of target and moment over wing area and chord [-]."""

WAKE_TOLERANCE = np.radians(0.05)
"""Angle by which the wake may lie off the free stream in a solution [rad]. At a tail
arm of one half-span that moves the wake by 0.1 % of the half-span, and the downwash
by less than 0.1 % of itself."""

NEARING, SETTLING = np.radians(1.0), np.radians(0.1)
"""The wake is laid anew once a step turns the aircraft by less than the first, since the
next step will be far smaller; after that only once it has all but settled [rad]."""


@dataclass(frozen=True, eq=False)
class Guess:
    """The unknowns of a batch; circulation (..., n) [m], angles (...) [rad]."""

    circulation: FloatArray
    angle: FloatArray
    elevator: FloatArray


@dataclass(frozen=True, eq=False)
class At:
    """Everything evaluated at one guess."""

    guess: Guess
    flow: Flow
    equations: Linearised
    forces: StationForces
    speed: FloatArray

    @cached_property
    def first_to_stall(self) -> tuple[NDArray[np.intp], FloatArray]:
        """The wing station with the least angle left to its knee, and what is left [rad]."""
        flow = self.flow
        knee = flow.polars.limits(flow.reynolds(), band=flow.band).knee_angle
        left = np.where(flow.lattice.surface == WING, knee - self.equations.angle, np.inf)
        first = np.argmin(left, axis=-1)[..., None]
        return first, np.take_along_axis(left, first, axis=-1)[..., 0]


class Target(Protocol):
    """What sets the angle of attack."""

    def speed(self, problem: Problem, lift_area: FloatArray) -> FloatArray:
        """Speed that belongs to a lift area [m/s]."""
        ...

    def gap(self, problem: Problem, at: At) -> FloatArray:
        """By how much the target is missed, over the wing area [-]."""
        ...

    def row(self, problem: Problem, at: At, lift_row: FloatArray) -> FloatArray:
        """Derivatives of the gap with circulations, angle and elevator, (..., n + 2)."""
        ...


def _lift_speed(problem: Problem, lift_area: FloatArray) -> FloatArray:
    """Speed at which the lift carries the load; a floor keeps a poor guess finite."""
    return problem.load.speed_at(np.maximum(lift_area, 0.05 * problem.aircraft.area))


@dataclass(frozen=True, eq=False)
class AtSpeed:
    """Lift carries the load at a given speed [m/s]."""

    given: FloatArray

    def speed(self, problem: Problem, lift_area: FloatArray) -> FloatArray:
        """The given speed [m/s]."""
        return self.given

    def gap(self, problem: Problem, at: At) -> FloatArray:
        """Lift missing or to spare, over the wing area [-]."""
        lift = np.sum(at.forces.lift, axis=-1)
        return np.asarray((lift - problem.load.area_at(self.given)) / problem.aircraft.area)

    def row(self, problem: Problem, at: At, lift_row: FloatArray) -> FloatArray:
        """Derivatives of the lift."""
        none = np.zeros((*lift_row.shape[:-1], 2))
        return np.concatenate([lift_row / problem.aircraft.area, none], axis=-1)


@dataclass(frozen=True, eq=False)
class AtAngle:
    """A given angle of attack [rad]; the speed follows from the lift."""

    given: FloatArray

    def speed(self, problem: Problem, lift_area: FloatArray) -> FloatArray:
        """Speed at which the lift carries the load [m/s]."""
        return _lift_speed(problem, lift_area)

    def gap(self, problem: Problem, at: At) -> FloatArray:
        """Angle still to turn [rad]."""
        return np.asarray(at.guess.angle - self.given)

    def row(self, problem: Problem, at: At, lift_row: FloatArray) -> FloatArray:
        """Only the angle counts."""
        row = np.zeros((*lift_row.shape[:-1], lift_row.shape[-1] + 2))
        row[..., -2] = 1.0
        return row


@dataclass(frozen=True, eq=False)
class AtKnee:
    """The first wing station to stall is at the knee of its section.

    Up to there every section's lift rises with its angle, so the solution is the
    only one and no path leads past it to another.
    """

    def speed(self, problem: Problem, lift_area: FloatArray) -> FloatArray:
        """Speed at which the lift carries the load [m/s]."""
        return _lift_speed(problem, lift_area)

    def gap(self, problem: Problem, at: At) -> FloatArray:
        """Angle past the knee, negative before it [rad]."""
        return -at.first_to_stall[1]

    def row(self, problem: Problem, at: At, lift_row: FloatArray) -> FloatArray:
        """Derivatives of that station's angle."""
        first, _ = at.first_to_stall
        flow = at.flow
        cosine = np.broadcast_to(flow.lattice.cos_sweep, at.equations.angle.shape)
        turn = np.take_along_axis(1.0 / cosine, first, axis=-1)
        upwash = np.take_along_axis(flow.influence.upwash, first[..., None], axis=-2)[..., 0, :]
        slope = np.take_along_axis(flow.influence.onset_slope, first, axis=-1)
        return np.concatenate([upwash * turn, slope * turn, np.zeros_like(turn)], axis=-1)


@dataclass(frozen=True, eq=False)
class Problem:
    """What stays fixed while Newton moves the guess.

    Fields
    ------
    aircraft : Aircraft
    load : Load
    target : Target
    band : ndarray of int, shape (..., 1)
        End of the polars' confidence band.
    unloaded_tail : bool
        The tail carries nothing, the elevator is neutral and the moment left alone.
    """

    aircraft: Aircraft
    load: Load
    target: Target
    band: NDArray[np.int64]
    unloaded_tail: bool = False

    def at(self, field: Influence, guess: Guess) -> At:
        """Evaluate flow, sections and forces at a guess."""
        aircraft = self.aircraft
        forces = _forces(aircraft, field, guess)
        speed = self.target.speed(self, np.sum(forces.lift, axis=-1))
        flow = Flow(
            lattice=aircraft.lattice,
            polars=aircraft.polars,
            influence=field,
            speed_over_viscosity=speed / self.load.kinematic_viscosity,
            shift=aircraft.angle_per_elevator * guess.elevator[..., None],
            active=aircraft.on_wing if self.unloaded_tail else aircraft.everywhere,
            band=self.band,
        )
        equations = linearise(flow, guess.circulation, guess.angle)
        return At(guess, flow, equations, forces, speed)

    def moment_gap(self, at: At) -> FloatArray:
        """Nose-up moment about the balance point over dynamic pressure, area and chord [-]."""
        aircraft, guess = self.aircraft, at.guess
        lattice = aircraft.lattice
        if self.unloaded_tail:
            return guess.elevator
        drag, section = at.equations.values.drag, at.equations.values.moment
        stations = pitching_moment(
            lattice,
            at.forces,
            drag=drag,
            moment=section * lattice.cos_sweep**4
            + aircraft.moment_per_elevator * guess.elevator[..., None],
            angle_of_attack=guess.angle,
            about_x=self.load.balance_x,
        )
        # Thrust equals drag, along the stream.
        resistance = 2.0 * drag * lattice.strip_area + at.forces.induced_drag
        thrust = np.sum(resistance, axis=-1) + aircraft.body.drag_area
        # Munk's body moment goes with sin(2 a)/2; its slope is per radian near zero.
        body = 0.5 * body_moment_slope(aircraft.body) * np.sin(2.0 * guess.angle)
        total = np.sum(stations, axis=-1) + body - aircraft.thrust_height * thrust
        return np.asarray(total / (aircraft.area * aircraft.chord))

    def matrix(self, at: At) -> FloatArray:
        """Jacobian of lifting line, target and moment.

        The slopes of profile drag and of the speed's part in the Reynolds number are
        left out: they change the path of the iteration by a per cent, not its end.
        """
        aircraft, equations = self.aircraft, at.equations
        count = at.guess.circulation.shape[-1]
        matrix = np.zeros((*at.guess.angle.shape, count + 2, count + 2))
        matrix[..., :count, :count] = equations.jacobian
        matrix[..., :count, count] = equations.by_angle
        matrix[..., :count, count + 1] = equations.by_shift * aircraft.angle_per_elevator
        lift_row, moment_row = self._force_rows(at)
        matrix[..., count, :] = self.target.row(self, at, lift_row)
        if self.unloaded_tail:
            matrix[..., count + 1, count + 1] = 1.0
        else:
            matrix[..., count + 1, :] = self._moment_row(at, moment_row)
        return matrix

    def _moment_row(self, at: At, moment_row: FloatArray) -> FloatArray:
        aircraft, field = self.aircraft, at.flow.influence
        lattice = aircraft.lattice
        own = 2.0 * lattice.chord * lattice.strip_area * lattice.normal[..., 2]
        by_angle = own * lattice.cos_sweep**3 * at.equations.values.moment_slope
        by_circulation = moment_row + _weighted(field.upwash, by_angle)
        by_attack = body_moment_slope(aircraft.body) + np.sum(by_angle * field.onset_slope, -1)
        flap = 2.0 * aircraft.moment_per_elevator * lattice.chord * lattice.strip_area
        turned = by_angle * lattice.cos_sweep * aircraft.angle_per_elevator
        by_elevator = np.sum(flap) + np.sum(turned, axis=-1)
        row = np.concatenate(
            [by_circulation, by_attack[..., None], by_elevator[..., None]], axis=-1
        )
        return row / (aircraft.area * aircraft.chord)

    def _force_rows(self, at: At) -> tuple[FloatArray, FloatArray]:
        """Derivatives of lift and of the vortex forces' moment with the circulations."""
        lattice, field, guess = self.aircraft.lattice, at.flow.influence, at.guess
        cosine, sine = np.cos(guess.angle)[..., None], np.sin(guess.angle)[..., None]
        strength = guess.circulation
        about_x = np.asarray(self.load.balance_x)[..., None]
        arm_x, arm_z = lattice.point[..., 0] - about_x, lattice.point[..., 2]
        # d/dg_j of sum_i w_i g_i (own_i(g)), own_i = base_i + sum_j K_ij g_j, for the
        # weights w of lift and of moment.
        own_x, own_z = _own_force(lattice.segment[..., 1], field, guess)
        lift = own_z * cosine - own_x * sine
        lift = lift + _weighted(field.force_z, strength * cosine)
        lift = lift - _weighted(field.force_x, strength * sine)
        moment = arm_z * own_x - arm_x * own_z
        moment = moment + _weighted(field.force_x, strength * arm_z)
        moment = moment - _weighted(field.force_z, strength * arm_x)
        return 4.0 * lift, 4.0 * moment


def solve(
    problem: Problem,
    guess: Guess,
    *,
    field: Influence | None = None,
    wake_tolerance: float = WAKE_TOLERANCE,
) -> tuple[At, BoolArray]:
    """Newton from a guess, the wake laid along the stream as it settles.

    Parameters
    ----------
    problem : Problem
    guess : Guess
        Batch shape (...).
    field : Influence, optional
        Of a wake close to the guess.
    wake_tolerance : float
        Angle by which the wake may lie off the stream in the end [rad].

    Returns
    -------
    at : At
        The last guess, evaluated.
    converged : ndarray of bool, shape (...)
    """
    mean_chord = float(np.mean(problem.aircraft.lattice.chord))
    field = influence(problem.aircraft.lattice, wake_angle=guess.angle) if field is None else field
    turning, slow = 0.0, NEARING
    for iteration in range(MOST_ITERATIONS):
        off = np.abs(guess.angle - field.wake_angle) > wake_tolerance
        if turning < slow and np.any(off):
            field = influence(problem.aircraft.lattice, wake_angle=guess.angle)
            off, slow = np.zeros_like(off), SETTLING
        at = problem.at(field, guess)
        target_gap, moment_gap = problem.target.gap(problem, at), problem.moment_gap(at)
        converged = (
            (np.max(np.abs(at.equations.residual), axis=-1) < TOLERANCE * mean_chord)
            & (np.abs(target_gap) < GAP_TOLERANCE)
            & (np.abs(moment_gap) < GAP_TOLERANCE)
            & ~off
        )
        if np.all(converged) or iteration == MOST_ITERATIONS - 1:
            break
        right = np.concatenate(
            [at.equations.residual, target_gap[..., None], moment_gap[..., None]], axis=-1
        )
        step = -np.linalg.solve(problem.matrix(at), right[..., None])[..., 0]
        stepped = _stepped(problem, field, guess, step)
        turning = float(np.max(np.abs(stepped.angle - guess.angle)))
        guess = stepped
    return at, converged


def _own_force(
    width_y: FloatArray, field: Influence, guess: Guess
) -> tuple[FloatArray, FloatArray]:
    """Force along x and z on each segment per 4 g: free stream and induced."""
    strength = guess.circulation[..., None]
    own_x = np.matmul(field.force_x, strength)[..., 0] - np.sin(guess.angle)[..., None] * width_y
    own_z = np.matmul(field.force_z, strength)[..., 0] + np.cos(guess.angle)[..., None] * width_y
    return own_x, own_z


def _forces(aircraft: Aircraft, field: Influence, guess: Guess) -> StationForces:
    return station_forces(
        aircraft.lattice, field, circulation=guess.circulation, angle_of_attack=guess.angle
    )


def _weighted(operator: FloatArray, weight: FloatArray) -> FloatArray:
    return np.asarray(np.matmul(weight[..., None, :], operator)[..., 0, :])


def _stepped(problem: Problem, field: Influence, guess: Guess, step: FloatArray) -> Guess:
    """Apply a Newton step, shortened so that no section angle runs away."""
    aircraft = problem.aircraft
    circulation, angle, elevator = step[..., :-2], step[..., -2], step[..., -1]
    turned = np.matmul(field.upwash, circulation[..., None])[..., 0]
    turned = turned + field.onset_slope * angle[..., None]
    turned = turned + aircraft.angle_per_elevator * elevator[..., None]
    share = shortened_step(turned)
    return Guess(
        circulation=guess.circulation + share[..., None] * circulation,
        angle=guess.angle + share * angle,
        elevator=guess.elevator + share * elevator,
    )
