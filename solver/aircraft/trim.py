"""Steady level flight: lift carries the load and the moment vanishes.

Circulations, angle of attack and elevator are solved together, so that the
tail's downwash is the wing's own and not a formula. Either the speed is given
or the angle of attack; in the second case the speed follows from the lift, and
the Reynolds numbers with it.
"""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import ArrayLike, NDArray

from solver.aircraft.configuration import TAIL, Aircraft, body_moment_slope
from solver.section.packed import NOMINAL
from solver.wing.forces import StationForces, pitching_moment, station_forces
from solver.wing.influence import Influence, influence
from solver.wing.lifting_line import (
    MOST_ITERATIONS,
    TOLERANCE,
    Flow,
    Linearised,
    Loading,
    linearise,
    loading,
    shortened_step,
)

FloatArray = NDArray[np.float64]
BoolArray = NDArray[np.bool_]

WAKE_TOLERANCE = np.radians(0.05)
"""Angle by which the wake may lie off the free stream before it is laid anew [rad].

At a tail arm of one half-span it moves the wake at the tail by 0.1 % of the
half-span and the downwash by less than 0.1 % (downwash falls 9 % in 10 % of the
half-span, E. Reid, NACA Report 148's range; the figure is from the closed form).
"""

MOST_WAKES = 6


@dataclass(frozen=True)
class Load:
    """What the aircraft carries, in what air, balanced where.

    Fields
    ------
    force : float
        Load factor times weight [N].
    density : float
        [kg/m3]
    kinematic_viscosity : float
        [m2/s]
    balance_x : float
        Balance point behind the wing root's leading edge [m].
    """

    force: float
    density: float
    kinematic_viscosity: float
    balance_x: float


@dataclass(frozen=True, eq=False)
class Trimmed:
    """A trimmed state, or a batch of them; arrays of shape (...).

    Fields
    ------
    state : Loading
        Converged where both the loading and the balance were found.
    forces : StationForces
    speed : ndarray
        [m/s]
    angle, elevator : ndarray
        Angle of attack and elevator, trailing edge down positive [rad].
    load : Load
    """

    state: Loading
    forces: StationForces
    speed: FloatArray
    angle: FloatArray
    elevator: FloatArray
    load: Load

    def case(self, index: int) -> Trimmed:
        """One case of a batch along its first axis.

        Parameters
        ----------
        index : int

        Returns
        -------
        Trimmed
        """
        forces = self.forces
        return Trimmed(
            state=self.state.case(index),
            forces=StationForces(
                *(getattr(forces, name)[index] for name in forces.__dataclass_fields__)
            ),
            speed=self.speed[index],
            angle=self.angle[index],
            elevator=self.elevator[index],
            load=self.load,
        )

    @property
    def converged(self) -> BoolArray:
        """Where a solution was found."""
        return self.state.converged

    @property
    def dynamic_pressure(self) -> FloatArray:
        """[Pa]."""
        return np.asarray(0.5 * self.load.density * np.square(self.speed))

    @property
    def lift_area(self) -> FloatArray:
        """Total lift over dynamic pressure [m2]."""
        return np.asarray(np.sum(self.forces.lift, axis=-1))

    @property
    def induced_area(self) -> FloatArray:
        """Induced drag over dynamic pressure [m2]."""
        return np.asarray(np.sum(self.forces.induced_drag, axis=-1))

    @property
    def profile_area(self) -> FloatArray:
        """Profile drag of wing and tail over dynamic pressure [m2]."""
        lattice = self.state.flow.lattice
        return np.asarray(2.0 * np.sum(self.state.drag * lattice.strip_area, axis=-1))

    @property
    def tail_lift(self) -> FloatArray:
        """Lift of the tail, upward positive [N]."""
        on_tail = self.state.flow.lattice.surface == TAIL
        return np.asarray(np.sum(self.forces.lift * on_tail, axis=-1) * self.dynamic_pressure)


@dataclass(frozen=True, eq=False)
class _Guess:
    """The unknowns of a batch: circulations, angle of attack and elevator."""

    circulation: FloatArray
    angle: FloatArray
    elevator: FloatArray


def trim(
    aircraft: Aircraft,
    load: Load,
    *,
    speed: ArrayLike | None = None,
    angle: ArrayLike | None = None,
    band: ArrayLike = NOMINAL,
    unloaded_tail: bool = False,
    start: Trimmed | None = None,
    wake_tolerance: float = WAKE_TOLERANCE,
) -> Trimmed:
    """Find level flight at given speeds, or at given angles of attack.

    Parameters
    ----------
    aircraft : Aircraft
    load : Load
    speed, angle : array_like, shape (...)
        Exactly one of them. [m/s] > 0, [rad]
    band : array_like of int, shape (...)
        End of the polars' confidence band for each case.
    unloaded_tail : bool
        The tail carries no load and no deflection, and the moment is left alone:
        what the drag of trim is measured against.
    start : Trimmed, optional
        A neighbouring solution of the same batch shape.
    wake_tolerance : float
        Angle by which the wake may lie off the free stream [rad].

    Returns
    -------
    Trimmed
        With a mask of the cases that converged.

    Raises
    ------
    ValueError
        If not exactly one of `speed` and `angle` is given.
    """
    if (speed is None) == (angle is None):
        raise ValueError("give exactly one of speed and angle")
    given = np.asarray(speed if angle is None else angle, dtype=np.float64)
    batch = np.broadcast_shapes(given.shape, np.shape(band))
    given = np.array(np.broadcast_to(given, batch))
    problem = _Problem(
        aircraft=aircraft,
        load=load,
        speed=given if angle is None else None,
        angle=None if angle is None else given,
        band=np.broadcast_to(np.asarray(band), batch)[..., None],
        unloaded_tail=unloaded_tail,
        body_slope=body_moment_slope(aircraft.body),
    )
    guess = problem.first_guess(batch, start)
    field = _reusable(start, guess, wake_tolerance)
    for _ in range(MOST_WAKES):
        if field is None:
            field = influence(aircraft.lattice, wake_angle=guess.angle)
        guess, converged = _newton(problem, field, guess)
        if not np.any((np.abs(guess.angle - field.wake_angle) > wake_tolerance) & converged):
            break
        last, field = field, None
    if field is None:
        field = last
    return problem.finished(field, guess, converged)


def _reusable(start: Trimmed | None, guess: _Guess, wake_tolerance: float) -> Influence | None:
    """The neighbour's influence, where its wake lies close enough."""
    if start is None:
        return None
    field = start.state.flow.influence
    if field.wake_angle.shape != guess.angle.shape:
        return None
    close = np.all(np.abs(guess.angle - field.wake_angle) <= wake_tolerance)
    return field if close else None


@dataclass(frozen=True, eq=False)
class _Problem:
    """What stays fixed while Newton moves the guess."""

    aircraft: Aircraft
    load: Load
    speed: FloatArray | None
    angle: FloatArray | None
    band: NDArray[np.int64]
    unloaded_tail: bool
    body_slope: float

    def first_guess(self, batch: tuple[int, ...], start: Trimmed | None) -> _Guess:
        """Take the neighbour's solution, or an elliptic guess of the angle."""
        count = self.aircraft.lattice.surface.size
        if start is not None:
            angle = start.angle if self.angle is None else self.angle
            return _Guess(
                np.array(np.broadcast_to(start.state.circulation, (*batch, count))),
                np.array(np.broadcast_to(angle, batch)),
                np.array(np.broadcast_to(start.elevator, batch)),
            )
        zero = np.zeros(batch)
        if self.speed is None:
            return _Guess(np.zeros((*batch, count)), np.array(self.angle), zero)
        lift_coefficient = self.required_area() / self.aircraft.area
        aspect_ratio = float(self.aircraft.wing.aspect_ratio)
        slope = 2.0 * np.pi * aspect_ratio / (aspect_ratio + 2.0)
        first, on_wing = self.aircraft.polars, self.aircraft.on_wing
        zero_lift = float(np.mean(first.packed.zero_lift_angle[NOMINAL, first.first[on_wing]]))
        angle = np.clip(lift_coefficient / slope + zero_lift, -0.2, 0.2)
        lift = np.broadcast_to(np.clip(lift_coefficient, -1.0, 1.0), batch)[..., None]
        # Elliptic: 2 g = (4/pi) CL (S/b) (1 - f^2)^(1/2).
        shape = on_wing * np.sqrt(1.0 - np.square(self.aircraft.lattice.fraction))
        mean_chord = float(self.aircraft.wing.mean_chord)
        circulation = 2.0 / np.pi * mean_chord * lift * shape
        return _Guess(circulation, np.broadcast_to(angle, batch) + zero, zero)

    def required_area(self) -> FloatArray:
        """Lift over dynamic pressure that the given speed asks for [m2]."""
        speed = np.asarray(self.speed)
        return np.asarray(self.load.force / (0.5 * self.load.density * np.square(speed)))

    def speed_for(self, lift_area: FloatArray) -> FloatArray:
        """Speed at which a lift area carries the load [m/s]."""
        floor = 0.05 * self.aircraft.area
        return np.asarray(
            np.sqrt(2.0 * self.load.force / (self.load.density * np.maximum(lift_area, floor)))
        )

    def flow(self, field: Influence, guess: _Guess, lift_area: FloatArray) -> Flow:
        """Flow at the guess: Reynolds numbers and elevator."""
        aircraft = self.aircraft
        speed = self.speed_for(lift_area) if self.speed is None else self.speed
        active = aircraft.on_wing if self.unloaded_tail else np.ones_like(aircraft.on_wing)
        return Flow(
            lattice=aircraft.lattice,
            polars=aircraft.polars,
            influence=field,
            speed_over_viscosity=speed / self.load.kinematic_viscosity,
            shift=aircraft.angle_per_elevator * guess.elevator[..., None],
            active=active,
            band=self.band,
        )

    def forces(self, field: Influence, guess: _Guess) -> StationForces:
        """Forces on the bound segments at the guess."""
        return station_forces(
            self.aircraft.lattice,
            field,
            circulation=guess.circulation,
            angle_of_attack=guess.angle,
        )

    def moment(
        self, forces: StationForces, guess: _Guess, *, drag: FloatArray, moment: FloatArray
    ) -> FloatArray:
        """Nose-up moment about the balance point over dynamic pressure [m3]."""
        aircraft, lattice = self.aircraft, self.aircraft.lattice
        stations = pitching_moment(
            lattice,
            forces,
            drag=drag,
            moment=moment + aircraft.moment_per_elevator * guess.elevator[..., None],
            angle_of_attack=guess.angle,
            about_x=self.load.balance_x,
        )
        profile = 2.0 * np.sum(drag * lattice.strip_area, axis=-1)
        thrust = profile + np.sum(forces.induced_drag, axis=-1) + aircraft.body.drag_area
        # Munk's body moment goes with sin(2 a)/2; its slope is per radian near zero.
        body = 0.5 * self.body_slope * np.sin(2.0 * guess.angle)
        return np.asarray(np.sum(stations, axis=-1) + body - aircraft.thrust_height * thrust)

    def finished(self, field: Influence, guess: _Guess, converged: BoolArray) -> Trimmed:
        """Gather what a trimmed state reports."""
        forces = self.forces(field, guess)
        lift_area = np.sum(forces.lift, axis=-1)
        flow = self.flow(field, guess, lift_area)
        state = loading(flow, guess.circulation, guess.angle, converged=converged)
        speed = self.speed_for(lift_area) if self.speed is None else self.speed
        return Trimmed(
            state=state,
            forces=forces,
            speed=np.asarray(speed),
            angle=guess.angle,
            elevator=guess.elevator,
            load=self.load,
        )


def _newton(problem: _Problem, field: Influence, guess: _Guess) -> tuple[_Guess, BoolArray]:
    """Newton on circulations, angle and elevator with the wake held."""
    mean_chord = float(np.mean(problem.aircraft.lattice.chord))
    area = problem.aircraft.area
    converged = np.zeros(guess.angle.shape, dtype=np.bool_)
    for _ in range(MOST_ITERATIONS):
        forces = problem.forces(field, guess)
        flow = problem.flow(field, guess, np.sum(forces.lift, axis=-1))
        equations = linearise(flow, guess.circulation, guess.angle)
        lift_gap, moment_gap = _gaps(problem, equations, forces, guess)
        converged = (
            (np.max(np.abs(equations.residual), axis=-1) < TOLERANCE * mean_chord)
            & (np.abs(lift_gap) < 1e-7 * area)
            & (np.abs(moment_gap) < 1e-7 * area * mean_chord)
        )
        if np.all(converged):
            break
        matrix = _bordered(problem, field, equations, guess)
        right = np.concatenate(
            [equations.residual, lift_gap[..., None], moment_gap[..., None]], axis=-1
        )
        step = -np.linalg.solve(matrix, right[..., None])[..., 0]
        guess = _stepped(problem, field, guess, step)
    return guess, converged


def _gaps(
    problem: _Problem, equations: Linearised, forces: StationForces, guess: _Guess
) -> tuple[FloatArray, FloatArray]:
    """By how much lift and moment miss, or angle and elevator where those are set."""
    if problem.angle is not None:
        lift_gap = (guess.angle - problem.angle) * problem.aircraft.area
    else:
        lift_gap = np.sum(forces.lift, axis=-1) - problem.required_area()
    if problem.unloaded_tail:
        return lift_gap, guess.elevator * problem.aircraft.area * problem.aircraft.chord
    moment_gap = problem.moment(
        forces,
        guess,
        drag=equations.values.drag,
        moment=equations.values.moment * problem.aircraft.lattice.cos_sweep**4,
    )
    return lift_gap, moment_gap


def _bordered(
    problem: _Problem, field: Influence, equations: Linearised, guess: _Guess
) -> FloatArray:
    """Jacobian of lifting line, lift and moment with circulations, angle, elevator.

    The slopes of profile drag and of the speed's part in the Reynolds number are
    left out: they change the path of the iteration by a per cent, not its end.
    """
    aircraft, lattice = problem.aircraft, problem.aircraft.lattice
    count = guess.circulation.shape[-1]
    matrix = np.zeros((*guess.angle.shape, count + 2, count + 2))
    matrix[..., :count, :count] = equations.jacobian
    matrix[..., :count, count] = equations.by_angle
    matrix[..., :count, count + 1] = equations.by_shift * aircraft.angle_per_elevator
    lift_row, moment_row = _force_rows(problem, field, guess)
    section = 2.0 * lattice.chord * lattice.strip_area * lattice.normal[..., 2]
    by_angle = section * lattice.cos_sweep**3 * equations.values.moment_slope
    moment_row = moment_row + np.matmul(by_angle[..., None, :], field.upwash)[..., 0, :]
    if problem.angle is None:
        matrix[..., count, :count] = lift_row
    else:
        matrix[..., count, count] = aircraft.area
    if problem.unloaded_tail:
        matrix[..., count + 1, count + 1] = aircraft.area * aircraft.chord
        return matrix
    matrix[..., count + 1, :count] = moment_row
    matrix[..., count + 1, count] = problem.body_slope + np.sum(
        by_angle * field.onset_slope, axis=-1
    )
    flap = 2.0 * aircraft.moment_per_elevator * lattice.chord * lattice.strip_area
    matrix[..., count + 1, count + 1] = np.sum(flap) + np.sum(
        by_angle * lattice.cos_sweep * aircraft.angle_per_elevator, axis=-1
    )
    return matrix


def _force_rows(
    problem: _Problem, field: Influence, guess: _Guess
) -> tuple[FloatArray, FloatArray]:
    """Derivatives of lift and of the moment of the vortex forces with circulations."""
    lattice = problem.aircraft.lattice
    cosine, sine = np.cos(guess.angle)[..., None], np.sin(guess.angle)[..., None]
    strength = guess.circulation
    induced_x = np.matmul(field.force_x, strength[..., None])[..., 0]
    induced_z = np.matmul(field.force_z, strength[..., None])[..., 0]
    width_y = lattice.segment[..., 1]
    arm_x = lattice.point[..., 0] - problem.load.balance_x
    arm_z = lattice.point[..., 2]
    # d/dg_j of sum_i w_i g_i (base_i + sum_j K_ij g_j), for two sets of weights w.
    own_x = -sine * width_y + induced_x
    own_z = cosine * width_y + induced_z
    lift = own_z * cosine - own_x * sine
    lift = lift + _weighted(field.force_z, strength * cosine)
    lift = lift - _weighted(field.force_x, strength * sine)
    moment = arm_z * own_x - arm_x * own_z
    moment = moment + _weighted(field.force_x, strength * arm_z)
    moment = moment - _weighted(field.force_z, strength * arm_x)
    return 4.0 * lift, 4.0 * moment


def _weighted(operator: FloatArray, weight: FloatArray) -> FloatArray:
    return np.asarray(np.matmul(weight[..., None, :], operator)[..., 0, :])


def _stepped(problem: _Problem, field: Influence, guess: _Guess, step: FloatArray) -> _Guess:
    """Apply a Newton step, shortened so that no section angle runs away."""
    aircraft = problem.aircraft
    circulation, angle, elevator = step[..., :-2], step[..., -2], step[..., -1]
    turned = np.matmul(field.upwash, circulation[..., None])[..., 0]
    turned = turned + field.onset_slope * angle[..., None]
    turned = turned + aircraft.angle_per_elevator * elevator[..., None]
    share = shortened_step(turned)
    return replace(
        guess,
        circulation=guess.circulation + share[..., None] * circulation,
        angle=guess.angle + share * angle,
        elevator=guess.elevator + share * elevator,
    )
