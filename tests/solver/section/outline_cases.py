"""Outlines whose true shape is known, and measures of panels laid on outlines."""

from __future__ import annotations

import numpy as np

from solver.section.naca import naca_section


def naca_points(digits: str, angle: np.ndarray) -> np.ndarray:
    """Points of a closed NACA section; the angle runs 0 to 2 pi, trailing edge over the top."""
    section = naca_section(digits)
    x = 0.5 * (1.0 + np.cos(angle))
    half = np.where(x > 1.0 - 1e-15, 0.0, section.half_thickness(x, closed=True))
    slope = np.arctan(section.camber.slope(x))
    side = np.where(angle <= np.pi, 1.0, -1.0)
    return np.column_stack(
        [
            x - side * half * np.sin(slope),
            section.camber.height(x) + side * half * np.cos(slope),
        ]
    )


def cusp_points(angle: np.ndarray, *, thick: float = 0.08, bent: float = 0.08) -> np.ndarray:
    """Points of a Joukowski section, whose surfaces meet without an angle, chord 1."""

    def mapped(turned: np.ndarray) -> np.ndarray:
        centre = complex(-thick, bent)
        circle = centre + abs(1.0 - centre) * np.exp(1j * (turned + np.angle(1.0 - centre)))
        return circle + 1.0 / circle

    foremost = mapped(np.linspace(0.0, 2.0 * np.pi, 200001)).real.min()
    chord = 2.0 - foremost
    points = mapped(angle)
    return np.column_stack([(points.real - foremost) / chord, points.imag / chord])


def turns(x: np.ndarray, y: np.ndarray) -> np.ndarray:
    """Change of direction [deg] from panel to panel, at every node but first and last."""
    return np.degrees(np.diff(np.unwrap(np.arctan2(np.diff(y), np.diff(x)))))


def distances(points: np.ndarray, line: np.ndarray) -> np.ndarray:
    """Distance of each point from a finely drawn line."""
    start, step = line[:-1], np.diff(line, axis=0)
    found = np.empty(len(points))
    for k, point in enumerate(points):
        share = ((point - start) * step).sum(axis=1) / (step**2).sum(axis=1)
        nearest = start + np.clip(share, 0.0, 1.0)[:, None] * step
        found[k] = np.hypot(*(point - nearest).T).min()
    return found


def crossings(x: np.ndarray, y: np.ndarray) -> list[tuple[int, int]]:
    """Pairs of pieces of a closed line that cross; neighbours do not count."""
    start = np.column_stack([x[:-1], y[:-1]])
    step = np.column_stack([np.diff(x), np.diff(y)])

    def side(points: np.ndarray) -> np.ndarray:
        apart = points[None] - start[:, None]
        return step[:, None, 0] * apart[..., 1] - step[:, None, 1] * apart[..., 0]

    parted = side(start) * side(start + step) < 0.0
    last = len(step) - 1
    return [
        (int(one), int(other))
        for one, other in zip(*np.nonzero(parted & parted.T), strict=True)
        if 1 < other - one < last
    ]
