"""Steady level flight: lift carries the load and the moment vanishes.

Circulations, angle of attack and elevator are solved together, so that the
tail's downwash is the wing's own and not a formula. Either the speed is given,
or the angle of attack, or the flight is the one in which the wing begins to
stall; in the last two cases the speed follows from the lift, and the Reynolds
numbers with it.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from solver.aircraft.configuration import TAIL, Aircraft
from solver.aircraft.equilibrium import (
    WAKE_TOLERANCE,
    At,
    AtAngle,
    AtKnee,
    AtSpeed,
    Guess,
    Problem,
    Target,
    solve,
)
from solver.aircraft.load import Load
from solver.section.packed import NOMINAL
from solver.wing.forces import StationForces
from solver.wing.influence import Influence
from solver.wing.lifting_line import Loading

FloatArray = NDArray[np.float64]
BoolArray = NDArray[np.bool_]


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
            load=self.load.case(index),
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


IDLE_WAKE = np.radians(2.0)
"""How far the wake may lie off the stream where no tail feels it [rad]: dihedral and
sweep alone see the angle, to second order."""


def trim(
    aircraft: Aircraft,
    load: Load,
    *,
    speed: ArrayLike | None = None,
    angle: ArrayLike | None = None,
    band: ArrayLike = NOMINAL,
    unloaded_tail: bool = False,
    start: Trimmed | None = None,
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
    batch = np.broadcast_shapes(given.shape, np.shape(band), load.forces.shape)
    given = np.array(np.broadcast_to(given, batch))
    target: Target = AtSpeed(given) if angle is None else AtAngle(given)
    problem = Problem(
        aircraft=aircraft,
        load=load,
        target=target,
        band=np.broadcast_to(np.asarray(band), batch)[..., None],
        unloaded_tail=unloaded_tail,
    )
    if start is not None:
        guess = Guess(start.state.circulation, start.angle, start.elevator)
    elif angle is None:
        guess = _elliptic_guess(problem, load.area_at(given))
    else:
        guess = _elliptic_guess(problem, np.full(batch, 0.5 * aircraft.area))
    if angle is not None:
        guess = Guess(guess.circulation, given, guess.elevator)
    # A tail that carries nothing does not ask where the wake passes it.
    tolerance = IDLE_WAKE if unloaded_tail else WAKE_TOLERANCE
    return _solved(
        problem, guess, field=_reusable(start, guess, tolerance), wake_tolerance=tolerance
    )


def trim_at_knee(aircraft: Aircraft, load: Load, *, band: ArrayLike = NOMINAL) -> Trimmed:
    """Find level flight in which the first wing station is at the knee of its section.

    Parameters
    ----------
    aircraft : Aircraft
    load : Load
    band : array_like of int, shape (...)
        End of the polars' confidence band for each case.

    Returns
    -------
    Trimmed
        With a mask of the cases that converged.
    """
    batch = np.broadcast_shapes(np.shape(band), load.forces.shape)
    bands = np.broadcast_to(np.asarray(band), batch)
    problem = Problem(aircraft=aircraft, load=load, target=AtKnee(), band=bands[..., None])
    area = np.array(np.broadcast_to(SAFE_SHARE * _largest_area(problem), batch))
    guess = _elliptic_guess(problem, area)
    return _solved(problem, guess, field=None)


SAFE_SHARE = 0.85
"""Share of the sections' largest lift from which the search for the onset starts [-]:
close to the knee, and still below it for the loadings that tapered wings have."""


def _largest_area(problem: Problem) -> FloatArray:
    """Least of the wing sections' largest lift at a first guess of speed, as areas [m2]."""
    aircraft, load = problem.aircraft, problem.load
    speed = load.speed_at(np.asarray(aircraft.area))
    reynolds = speed[..., None] / load.kinematic_viscosity * aircraft.lattice.chord
    limits = aircraft.polars.limits(reynolds, band=NOMINAL)
    least = np.min(limits.largest_lift[..., aircraft.on_wing], axis=-1)
    return np.asarray(least * aircraft.area)


def _elliptic_guess(problem: Problem, lift_area: FloatArray) -> Guess:
    """Elliptic loading of the wing that carries a lift area, tail idle."""
    aircraft = problem.aircraft
    lift_coefficient = lift_area / aircraft.area
    aspect_ratio = float(aircraft.wing.aspect_ratio)
    slope = 2.0 * np.pi * aspect_ratio / (aspect_ratio + 2.0)
    first = aircraft.polars.first[aircraft.on_wing]
    zero_lift = float(np.mean(aircraft.polars.packed.zero_lift_angle[NOMINAL, first]))
    angle = np.clip(lift_coefficient / slope + zero_lift, -0.2, 0.2)
    # Elliptic: 2 g = (4/pi) CL (S/b) (1 - f^2)^(1/2).
    shape = aircraft.on_wing * np.sqrt(1.0 - np.square(aircraft.lattice.fraction))
    lift = np.clip(lift_coefficient, -1.0, 1.0)[..., None]
    circulation = 2.0 / np.pi * float(aircraft.wing.mean_chord) * lift * shape
    return Guess(circulation, np.asarray(angle), np.zeros(lift_area.shape))


def _reusable(start: Trimmed | None, guess: Guess, tolerance: float) -> Influence | None:
    """The neighbour's influence, where its wake lies along the guess's stream."""
    if start is None:
        return None
    field = start.state.flow.influence
    if field.wake_angle.shape != guess.angle.shape:
        return None
    close = np.all(np.abs(guess.angle - field.wake_angle) <= tolerance)
    return field if close else None


def _solved(
    problem: Problem,
    guess: Guess,
    *,
    field: Influence | None,
    wake_tolerance: float = WAKE_TOLERANCE,
) -> Trimmed:
    at, converged = solve(problem, guess, field=field, wake_tolerance=wake_tolerance)
    return Trimmed(
        state=_loading(at, converged),
        forces=at.forces,
        speed=np.asarray(at.speed),
        angle=at.guess.angle,
        elevator=at.guess.elevator,
        load=problem.load,
    )


def _loading(at: At, converged: BoolArray) -> Loading:
    values, lattice = at.equations.values, at.flow.lattice
    return Loading(
        flow=at.flow,
        angle_of_attack=at.guess.angle,
        circulation=at.guess.circulation,
        section_angle=at.equations.angle,
        lift=2.0 * at.guess.circulation / lattice.chord,
        drag=values.drag,
        moment=values.moment * lattice.cos_sweep**4,
        converged=converged,
    )
