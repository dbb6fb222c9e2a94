"""Potential flows in closed form, by mapping a circle: written without the panel method.

Lengths are over chord, speeds over the free stream. A place on a section is given
by the angle `turn` about the circle's centre, from the trailing edge over the upper
surface; speeds along the surface are positive in that sense.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy.optimize import minimize_scalar

FloatArray = NDArray[np.float64]
ComplexArray = NDArray[np.complex128]


@dataclass(frozen=True)
class MappedCircle:
    """Section that (z - k)/(z + k) = ((zeta - 1)/(zeta + 1))^k makes of a circle through 1.

    With k = 2 that is z = zeta + 1/zeta, Joukowski's section with a cusp; with less,
    that of Karman and Trefftz (1918), whose surfaces meet at (2 - k) pi. Map and
    condition at the edge: L. M. Milne-Thomson, Theoretical Aerodynamics, 4th ed.,
    1958, ch. VI and VII, and every other textbook.

    Parameters
    ----------
    centre : complex
        Of the circle.
    power : float
        k, more than 1 and at most 2.
    """

    centre: complex
    power: float = 2.0

    @property
    def radius(self) -> float:
        return abs(1.0 - self.centre)

    @property
    def tail(self) -> float:
        """Direction from the centre to the point that becomes the trailing edge [rad]."""
        return float(np.angle(1.0 - self.centre))

    @property
    def foremost(self) -> float:
        found = minimize_scalar(
            lambda turn: float(self._map(turn).real),
            bounds=(np.pi - 0.5, np.pi + 0.5),
            method="bounded",
            options={"xatol": 1e-10},
        )
        return float(found.fun)

    @property
    def chord(self) -> float:
        return self.power - self.foremost

    def circle(self, turn: FloatArray | float) -> ComplexArray:
        return np.asarray(self.centre + self.radius * np.exp(1j * (np.asarray(turn) + self.tail)))

    def _map(self, turn: FloatArray | float) -> ComplexArray:
        zeta, k = self.circle(turn), self.power
        ratio = ((zeta - 1.0) / (zeta + 1.0)) ** k
        return np.asarray(k * (1.0 + ratio) / (1.0 - ratio))

    def points(self, turn: FloatArray) -> tuple[FloatArray, FloatArray]:
        z = (self._map(turn) - self.foremost) / self.chord
        return z.real, z.imag

    def image(self, z: ComplexArray) -> ComplexArray:
        """Point of the circle's plane that a point outside the section comes from."""
        plane, k = np.asarray(z, dtype=complex) * self.chord + self.foremost, self.power
        ratio = ((plane - k) / (plane + k)) ** (1.0 / k)
        return np.asarray((1.0 + ratio) / (1.0 - ratio))

    def stretch(self, zeta: ComplexArray) -> ComplexArray:
        """Find dz/dzeta."""
        k = self.power
        ratio = ((zeta - 1.0) / (zeta + 1.0)) ** k
        return np.asarray(4.0 * k**2 * ratio / ((zeta**2 - 1.0) * (1.0 - ratio) ** 2))

    def lift(self, angle: float) -> float:
        return 8.0 * np.pi * self.radius * np.sin(angle - self.tail) / self.chord

    def velocity(self, zeta: ComplexArray, angle: float) -> ComplexArray:
        """Conjugate velocity in the section's plane."""
        out = zeta - self.centre
        swirl = 2.0 * self.radius * np.sin(angle - self.tail)
        flow = np.exp(-1j * angle) - np.exp(1j * angle) * self.radius**2 / out**2 + 1j * swirl / out
        return flow / self.stretch(zeta)

    def speed(self, turn: FloatArray, angle: float) -> FloatArray:
        """Along the surface; not at the trailing edge itself."""
        zeta = self.circle(turn)
        return self._along(self.velocity(zeta, angle), turn)

    def speed_by_defect(
        self, turn: FloatArray, defect: Callable[[FloatArray], FloatArray]
    ) -> FloatArray:
        """Along the surface, by an outflow from it: the change of `defect` along it.

        On the circle an outflow a cos(n t) + b sin(n t) goes with a speed
        a sin(n t) - b cos(n t) along it; a swirl makes the edge the place without speed.
        """
        even = np.linspace(0.0, 2.0 * np.pi, 1024, endpoint=False)
        waves = np.fft.rfft(defect(even)) * 2.0 / len(even)
        order = np.arange(1, 200)
        outflow = 1j * order * waves[order] / self.radius
        around = (1j * np.exp(1j * np.outer(turn, order)) @ -outflow).real
        around -= float((-1j * outflow).sum().real)
        return self.chord * around / np.abs(self.stretch(self.circle(turn)))

    def speed_by_points(
        self, turn: FloatArray, *, places: ComplexArray, sources: FloatArray, vortices: FloatArray
    ) -> FloatArray:
        """Along the surface, by point sources and vortices outside it.

        Each has its image at the inverse point (Milne-Thomson's circle theorem); sources
        give back at the centre what their images add, and a swirl about the centre
        makes the edge the place without speed. Vortices are positive anticlockwise.
        """
        flow = self._points_on_circle(self.circle(turn), places, sources, vortices)
        tail = self._points_on_circle(self.circle(np.zeros(1)), places, sources, vortices)
        ahead = 1j * np.exp(1j * (turn + self.tail))
        around = (flow * ahead).real - (tail * 1j * np.exp(1j * self.tail)).real
        return self.chord * around / np.abs(self.stretch(self.circle(turn)))

    def velocity_by_points(
        self, z: ComplexArray, *, places: ComplexArray, sources: FloatArray, vortices: FloatArray
    ) -> ComplexArray:
        """Conjugate velocity outside the section, by the same."""
        zeta = self.image(z)
        flow = self._points_on_circle(zeta, places, sources, vortices)
        tail = self._points_on_circle(self.circle(np.zeros(1)), places, sources, vortices)
        swirl = -(tail * 1j * np.exp(1j * self.tail)).real * self.radius
        return self.chord * (flow - 1j * swirl / (zeta - self.centre)) / self.stretch(zeta)

    def _points_on_circle(
        self, zeta: ComplexArray, places: ComplexArray, sources: FloatArray, vortices: FloatArray
    ) -> ComplexArray:
        away = self.image(places)
        mirrored = self.centre + self.radius**2 / np.conj(away - self.centre)
        at = np.asarray(zeta)[:, None]
        direct, mirror, middle = 1 / (at - away), 1 / (at - mirrored), 1 / (at - self.centre)
        by_sources = (direct + mirror - middle) @ sources
        by_vortices = -1j * (direct - mirror) @ vortices
        return np.asarray((by_sources + by_vortices) / (2.0 * np.pi))

    def _along(self, conjugate: ComplexArray, turn: FloatArray) -> FloatArray:
        zeta = self.circle(turn)
        ahead = 1j * np.exp(1j * (turn + self.tail)) * self.stretch(zeta)
        return np.asarray((conjugate * ahead / np.abs(ahead)).real)


@dataclass(frozen=True)
class Ellipse:
    """Ellipse of chord 1 whose flow leaves at its rear vertex.

    Milne-Thomson, as above, sec. 6.3: speed on an ellipse in a stream.

    Parameters
    ----------
    thickness : float
        Over chord.
    """

    thickness: float

    def points(self, turn: FloatArray) -> tuple[FloatArray, FloatArray]:
        return 0.5 + 0.5 * np.cos(turn), 0.5 * self.thickness * np.sin(turn)

    def lift(self, angle: float) -> float:
        return 2.0 * np.pi * (1.0 + self.thickness) * np.sin(angle)

    def speed(self, turn: FloatArray, angle: float) -> FloatArray:
        """Along the surface."""
        stretch = np.sqrt(np.sin(turn) ** 2 + (self.thickness * np.cos(turn)) ** 2)
        return -(1.0 + self.thickness) * (np.sin(turn - angle) + np.sin(angle)) / stretch
