"""Where along the half-wing a low Reynolds number may hurt at landing, and why."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from app.analysis.results import SpanResult, StationRisk, Trust, Verdict
from solver.aircraft.configuration import Aircraft
from solver.section.packed import NOMINAL, PackedPolars
from solver.wing.lifting_line import Loading

FloatArray = NDArray[np.float64]

PLACES = (("root", 0.0), ("quarter", 0.25), ("middle", 0.5), ("three quarters", 0.75), ("tip", 1.0))

SLOWER = 0.9
"""Share of the speed at which a section's largest lift is looked at again [-]."""

LOSS_TO_WATCH, LOSS_TOO_MUCH = 0.05, 0.15
"""Share of largest lift lost to 10 % less speed (our choice) [-]."""

DRAG_RISE = 2.0
"""Section drag over that at high Reynolds number from which a go-around is in doubt
(our choice) [-]."""

CRITICAL_REYNOLDS = 70e3
"""Below it a smooth section may not reattach (B. H. Carmichael, NASA CR 165803, 1981,
read second-hand)."""

Concern = tuple[Verdict, str]


@dataclass(frozen=True, eq=False)
class _Behaviour:
    """How each chosen station's own section behaves; arrays (places,).

    Fields
    ------
    section : ndarray of int
    unknown : ndarray of bool
        Largest lift jumps at this Reynolds number or at 10 % less.
    loss : ndarray
        Share of largest lift that 10 % less speed costs [-].
    drag_rise : ndarray
        Drag over that at the highest tabled Reynolds number, same angle [-].
    recovery : ndarray
        Angle below which it reattaches after a stall, NaN where unknown [rad].
    """

    section: NDArray[np.int64]
    unknown: NDArray[np.bool_]
    loss: FloatArray
    drag_rise: FloatArray
    recovery: FloatArray


def station_risks(span: SpanResult, state: Loading, aircraft: Aircraft) -> tuple[StationRisk, ...]:
    """Low-Reynolds-number risk at five places of the half-wing, with the reason.

    Parameters
    ----------
    span : SpanResult
        At landing speed.
    state : Loading
        The flight it was made of, a single one.
    aircraft : Aircraft
    """
    half_span = 0.5 * float(np.asarray(aircraft.wing.span))
    wanted = np.array([share * half_span for _, share in PLACES])
    stations = np.abs(span.y_m[None, :] - wanted[:, None]).argmin(axis=1)
    behaviour = _behaviour(state, stations)
    packed = state.flow.polars.packed
    return tuple(
        _risk(name, place, int(station), span, behaviour, packed)
        for place, ((name, _), station) in enumerate(zip(PLACES, stations, strict=True))
    )


def _behaviour(state: Loading, stations: NDArray[np.intp]) -> _Behaviour:
    polars = state.flow.polars
    packed = polars.packed
    section = np.where(polars.weight < 0.5, polars.first, polars.second)[stations]
    reynolds, angle = state.flow.reynolds()[stations], state.section_angle[stations]
    both = np.stack([SLOWER * reynolds, reynolds])
    largest = packed.limits(both, band=NOMINAL, section=section).largest_lift
    against = np.stack([reynolds, packed.highest_reynolds[section]])
    drag = packed.evaluate(angle, against, band=NOMINAL, section=section).drag
    nearest = np.abs(np.log(packed.reynolds[None, :] / reynolds[:, None])).argmin(axis=1)
    return _Behaviour(
        section=section,
        unknown=np.asarray(packed.in_unknown(both, section=section).any(axis=0)),
        loss=1.0 - largest[0] / largest[1],
        drag_rise=drag[0] / drag[1],
        recovery=packed.recovery[section, nearest],
    )


def _risk(
    name: str,
    place: int,
    station: int,
    span: SpanResult,
    behaviour: _Behaviour,
    packed: PackedPolars,
) -> StationRisk:
    concerns = [
        *_section_concerns(behaviour, place),
        *_room_concerns(span, station),
        *_data_concerns(span, station, estimated=bool(packed.estimated[behaviour.section[place]])),
    ]
    order = {Verdict.PASS: 0, Verdict.WATCH: 1, Verdict.FAIL: 2}
    return StationRisk(
        place=name,
        y_m=float(span.y_m[station]),
        reynolds=float(span.reynolds[station]),
        level=max((level for level, _ in concerns), key=order.__getitem__, default=Verdict.PASS),
        reason="; ".join(text for _, text in concerns) or "none found",
    )


def _section_concerns(behaviour: _Behaviour, place: int) -> Iterator[Concern]:
    """What the section's own polar does near this Reynolds number."""
    loss, rise = float(behaviour.loss[place]), float(behaviour.drag_rise[place])
    if behaviour.unknown[place]:
        yield Verdict.FAIL, "largest lift jumps between two runs here: not known"
    elif loss > LOSS_TO_WATCH:
        level = Verdict.FAIL if loss > LOSS_TOO_MUCH else Verdict.WATCH
        yield level, f"10 % less speed costs {100 * loss:.0f} % of largest lift"
    if np.isfinite(behaviour.recovery[place]):
        recovery = np.degrees(behaviour.recovery[place])
        yield Verdict.WATCH, f"after a stall it reattaches only below {recovery:.0f}°"
    if rise > DRAG_RISE:
        text = f"drag is {rise:.1f} times that at high Reynolds number: the go-around suffers"
        yield Verdict.WATCH, text


def _room_concerns(span: SpanResult, station: int) -> Iterator[Concern]:
    if span.room[station] < 0.0:
        yield Verdict.FAIL, "past its largest lift"
    elif span.knee_room_deg[station] < 0.0:
        yield Verdict.WATCH, "past the knee of its lift curve"


def _data_concerns(span: SpanResult, station: int, *, estimated: bool) -> Iterator[Concern]:
    if estimated:
        yield Verdict.WATCH, "its polar is estimated, not measured"
    elif span.trust[station] == Trust.EXTRAPOLATED:
        yield Verdict.WATCH, "outside the Reynolds numbers or angles measured"
    if span.reynolds[station] < CRITICAL_REYNOLDS:
        text = f"below about {CRITICAL_REYNOLDS:,.0f} a smooth section may not reattach"
        yield Verdict.WATCH, text
