"""From a section's source to its polar, and to what the Section sheet shows."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from functools import cached_property, partial

import numpy as np
from numpy.typing import NDArray

from app.analysis.results import MeasuredPoints, PolarCurve, SectionResult, Trust
from app.inputs import SectionSource
from solver.aircraft.trim import Trimmed
from solver.errors import InputError
from solver.section.estimate import estimate_polar
from solver.section.geometry import (
    CamberLine,
    Outline,
    camber_line,
    leading_edge_radius,
    max_camber,
    max_thickness,
    naca_outline,
    outline_from_coordinates,
)
from solver.section.packed import HIGH, LOW, NOMINAL, PackedPolars
from solver.section.polar import Polar, polar_from_sweeps
from solver.section.sweeps import Sweep
from solver.section.thin_airfoil import ThinAirfoil, naca_thin_airfoil, outline_thin_airfoil

FloatArray = NDArray[np.float64]

ROLES = ("root", "tip", "tail")
SHOWN_FROM, SHOWN_TO, SHOWN_STEP = -10.0, 18.0, 0.5
LIMIT_POINTS = 80

Remembered = Callable[[tuple[int, float], Callable[[], PolarCurve]], PolarCurve]


@dataclass(frozen=True, eq=False)
class SectionData:
    """One section worked out: its outline, thin-airfoil values and polar."""

    source: SectionSource
    outline: Outline
    thin: ThinAirfoil
    polar: Polar

    @cached_property
    def thickness(self) -> float:
        """Largest thickness over chord [-]."""
        return float(max_thickness(self.outline).value)

    @cached_property
    def camber(self) -> float:
        """Largest camber over chord [-]."""
        return float(max_camber(self.outline).value)

    @cached_property
    def camber_line(self) -> CamberLine:
        """Line midway between the surfaces."""
        return camber_line(self.outline)

    @cached_property
    def nose_radius(self) -> float:
        """Radius of the leading edge over chord [-]."""
        return leading_edge_radius(self.outline)


def section_data(source: SectionSource) -> SectionData:
    """Work a section out from its digits or its tables.

    Parameters
    ----------
    source : SectionSource

    Returns
    -------
    SectionData

    Raises
    ------
    InputError
        If digits, outline or tables are unusable.
    """
    if source.kind == "naca":
        outline, thin = naca_outline(source.digits), naca_thin_airfoil(source.digits)
        return SectionData(source, outline, thin, estimate_polar(outline))
    tables = source.tables
    if tables is None:
        raise InputError("section", source.name, "NACA digits or a section with tables")
    outline = outline_from_coordinates(source.name, tables.outline)
    thin = outline_thin_airfoil(outline)
    if not tables.lift:
        return SectionData(source, outline, thin, estimate_polar(outline))
    polar = polar_from_sweeps(
        source.name,
        tables.lift,
        tables.drag,
        thin=thin,
        source=tables.source or "wind-tunnel tables that do not say where they come from",
    )
    return SectionData(source, outline, thin, polar)


def section_results(
    sections: tuple[SectionData, SectionData, SectionData],
    cruise: Trimmed,
    landing: Trimmed,
    *,
    remembered: Remembered,
) -> tuple[SectionResult, ...]:
    """What the Section sheet shows of each different section.

    Parameters
    ----------
    sections : tuple of SectionData
        Of wing root, wing tip and tail.
    cruise, landing : Trimmed
        Single flights, for the Reynolds numbers met.
    remembered : callable
        From a key and a function to what the function gave for that key: curves are
        drawn at rounded Reynolds numbers, so most steps of a slider draw none.
    """
    polars = landing.state.flow.polars
    shown = []
    for index, (role, data) in enumerate(zip(ROLES, sections, strict=True)):
        used = (polars.first == index) | ((polars.second == index) & (polars.weight > 0.0))
        if not used.any():
            continue
        ranges = []
        for flight in (landing, cruise):
            reynolds = flight.state.flow.reynolds()[used]
            ranges.append((float(reynolds.min()), float(reynolds.max())))
        shown.append(
            section_result(
                role,
                data,
                polars.packed,
                index=index,
                landing_reynolds=ranges[0],
                cruise_reynolds=ranges[1],
                remembered=remembered,
            )
        )
    return tuple(shown)


def section_result(
    role: str,
    data: SectionData,
    packed: PackedPolars,
    *,
    index: int,
    landing_reynolds: tuple[float, float],
    cruise_reynolds: tuple[float, float],
    remembered: Remembered,
) -> SectionResult:
    """What the Section sheet shows of one section.

    Parameters
    ----------
    role : str
        Where it is used.
    data : SectionData
    packed : PackedPolars
    index : int
        Its place among the packed sections.
    landing_reynolds, cruise_reynolds : tuple of float
        Smallest and largest Reynolds number that it meets [-].
    remembered : callable
        As for :func:`section_results`.
    """
    outline, line = data.outline, data.camber_line
    limits = _limits_over_reynolds(packed, index, landing_reynolds, cruise_reynolds)
    tables = data.source.tables
    return SectionResult(
        role=role,
        name=data.source.name,
        origin="estimated" if data.polar.estimated else "measured",
        source=data.polar.source,
        outline_x=outline.x,
        outline_y=outline.y,
        camber_x=line.x,
        camber_y=line.y,
        thickness_percent=100.0 * data.thickness,
        camber_percent=100.0 * data.camber,
        leading_edge_radius_percent=100.0 * data.nose_radius,
        zero_lift_angle_deg=float(np.degrees(data.thin.zero_lift_angle)),
        moment_coefficient=data.thin.moment_quarter_chord,
        curves=_curves(data, packed, index, (*landing_reynolds, *cruise_reynolds), remembered),
        points=_points(tables.lift + tables.drag) if tables is not None else (),
        unknown_reynolds=data.polar.unknown,
        landing_reynolds=landing_reynolds,
        cruise_reynolds=cruise_reynolds,
        findings=_findings(data.polar, landing_reynolds),
        **limits,  # type: ignore[arg-type]
    )


def _limits_over_reynolds(
    packed: PackedPolars,
    index: int,
    landing: tuple[float, float],
    cruise: tuple[float, float],
) -> dict[str, NDArray[np.generic]]:
    low = 0.8 * min(landing[0], cruise[0], packed.lowest_reynolds[index])
    high = 1.2 * max(landing[1], cruise[1], min(packed.highest_reynolds[index], 1e6))
    reynolds = np.geomspace(low, high, LIMIT_POINTS)
    ends = {
        band: packed.limits(reynolds, band=band, section=index) for band in (LOW, NOMINAL, HIGH)
    }
    knee = ends[NOMINAL].knee_angle
    outside = (reynolds < packed.lowest_reynolds[index]) | (
        reynolds > packed.highest_reynolds[index]
    )
    return {
        "limit_reynolds": reynolds,
        "largest_lift_low": ends[LOW].largest_lift,
        "largest_lift": ends[NOMINAL].largest_lift,
        "largest_lift_high": ends[HIGH].largest_lift,
        "knee_angle_deg": np.degrees(knee),
        "limit_trust": np.where(outside, Trust.EXTRAPOLATED, Trust.VALID).astype(np.uint8),
    }


def _curves(
    data: SectionData,
    packed: PackedPolars,
    index: int,
    met: tuple[float, ...],
    remembered: Remembered,
) -> tuple[PolarCurve, ...]:
    """Curves at the Reynolds numbers that this wing meets, to two figures."""
    chosen = sorted({float(f"{reynolds:.1e}") for reynolds in met})
    return tuple(
        remembered((index, reynolds), partial(_curve, data, packed, index, reynolds))
        for reynolds in chosen
    )


def _curve(data: SectionData, packed: PackedPolars, index: int, reynolds: float) -> PolarCurve:
    angle_deg = np.arange(SHOWN_FROM, SHOWN_TO + 0.5 * SHOWN_STEP, SHOWN_STEP)
    angle = np.radians(angle_deg)
    at = np.full_like(angle, reynolds)
    values = packed.evaluate(angle, at, band=NOMINAL, section=index)
    return PolarCurve(
        reynolds=reynolds,
        angle_deg=angle_deg,
        lift=values.lift,
        drag=values.drag,
        moment=values.moment,
        trust=packed.trust(angle, at, section=index),
        origin=_origins(data.polar, angle, reynolds),
    )


def _origins(polar: Polar, angle: FloatArray, reynolds: float) -> NDArray[np.uint8]:
    """Where the lift nearest to each angle and Reynolds number comes from."""
    rows = np.abs(polar.angle[None, :] - angle[:, None]).argmin(axis=1)
    column = int(np.abs(np.log(polar.reynolds / reynolds)).argmin())
    return np.asarray(polar.origin_lift[rows, column], dtype=np.uint8)


def _points(runs: tuple[Sweep, ...]) -> tuple[MeasuredPoints, ...]:
    return tuple(
        MeasuredPoints(
            reynolds=run.reynolds,
            angle_deg=np.degrees(run.angle),
            lift=run.lift,
            drag=run.drag if run.drag is not None else np.full_like(run.lift, np.nan),
            moment=run.moment if run.moment is not None else np.full_like(run.lift, np.nan),
            rising=run.rising,
        )
        for run in runs
    )


def _findings(polar: Polar, landing: tuple[float, float]) -> tuple[str, ...]:
    """What the table says that a smooth curve would hide, in sentences."""
    found = []
    if polar.estimated:
        found.append(
            "Estimated from the outline, not measured: a landing on it can be watched, never "
            "passed."
        )
    for low, high in polar.unknown:
        found.append(
            f"Between Re {round(low, -3):,.0f} and {round(high, -3):,.0f} the largest lift jumps "
            "by more than measurements scatter: it is not known there, and the lower value is "
            "taken."
        )
    inside = (polar.reynolds >= 0.8 * landing[0]) & (polar.reynolds <= 1.25 * landing[1])
    for index in np.flatnonzero(inside):
        at = f"At Re {round(polar.reynolds[index], -3):,.0f}"
        start, end = np.degrees([polar.plateau_from[index], polar.plateau_to[index]])
        if np.isfinite(start) and end - start > 2.0:
            found.append(
                f"{at} the lift is flat from {start:.0f}° to {end:.0f}°: the angle of the "
                "maximum means little, and the knee is used."
            )
        recovery = np.degrees(polar.recovery[index])
        if np.isfinite(recovery):
            found.append(f"{at}, after a stall come below {recovery:.0f}° to recover.")
    return tuple(found)
