"""The section solver beside measurements that the accuracy table does not pool.

    python -m tests.published.section_checks [high] [bubble] [five] [flap]

- *high*: NACA 0012 at 6e6, smooth (Abbott and von Doenhoff) and with transition fixed
  (Ladson): no section that the solver's constants were set with, and ten times its
  usual Reynolds numbers.
- *bubble*: where E387's laminar bubble begins, turns turbulent and ends.
- *five*: lift, drag and moment of E387 near 5 degrees.
- *flap*: SD7037 with a plain flap at 5 and 10 degrees.

Errors are computed minus measured, of drag as a share of the measured. A computed value
lies on the line between neighbouring converged points, see
:mod:`tests.published.section_comparison`.
"""

from __future__ import annotations

import sys
from collections.abc import Callable, Iterable, Iterator
from dataclasses import dataclass
from functools import lru_cache

import numpy as np

from app.kernel_cache import prepare_kernel_cache
from solver.section.flap import deflect_flap
from solver.section.flow import FlowSettings, SectionFlow, section_flow
from solver.section.geometry import naca_outline
from tests.published.measured_sections import outline
from tests.published.section_comparison import Column, converged_points, peak_of, rising
from tests.published.section_records import FloatArray
from tests.published.tables import numbers, rows


@dataclass(frozen=True, eq=False)
class Errors:
    """Computed minus measured, a value a point; NaN where ours has none."""

    error: FloatArray

    @property
    def known(self) -> FloatArray:
        return self.error[np.isfinite(self.error)]

    @property
    def missed(self) -> int:
        return int(self.error.size - self.known.size)

    @property
    def bias(self) -> float:
        return float(np.mean(self.known)) if self.known.size else float("nan")

    @property
    def mean(self) -> float:
        return float(np.mean(np.abs(self.known))) if self.known.size else float("nan")

    @property
    def largest(self) -> float:
        return float(np.max(np.abs(self.known))) if self.known.size else float("nan")


def _degrees(first: float, last: float, step: float) -> FloatArray:
    return np.radians(np.arange(first, last + 0.5 * step, step))


# --- NACA 0012 at a high Reynolds number

FOLDER = "potential_and_high_re"
HIGH_REYNOLDS = 6e6
GRIT = 0.05
"""Place of the grit on both sides, over chord."""
SMOOTH_ATTACHED, TRIPPED_ATTACHED = 16.5, 17.5
"""Angles up to which all runs of a source are attached [deg]."""


@lru_cache(maxsize=1)
def high_flows() -> tuple[SectionFlow, SectionFlow]:
    """NACA 0012, smooth and tripped."""
    # From -18.25 in half degrees: the least lift is passed on both ends.
    angle = _degrees(-18.25, 22.75, 0.5)
    section = naca_outline("0012")
    smooth, tripped = FlowSettings(), FlowSettings(trip_upper=GRIT, trip_lower=GRIT)
    return (
        section_flow(section, angle=angle, reynolds=[HIGH_REYNOLDS], settings=smooth),
        section_flow(section, angle=angle, reynolds=[HIGH_REYNOLDS], settings=tripped),
    )


def high_reynolds() -> dict[str, Errors]:
    """Lift at equal angle and drag at equal lift where flow is attached, and largest lift."""
    smooth, tripped = (converged_points(flow, 0) for flow in high_flows())
    lift = numbers(f"{FOLDER}/naca0012_abbott_re6e6_smooth_cl.csv")
    drag = numbers(f"{FOLDER}/naca0012_abbott_re6e6_smooth_cd.csv")
    fixed = numbers(f"{FOLDER}/naca0012_ladson_tm4074_re6e6_tripped.csv")
    attached = [row for row in fixed if abs(row["alpha_deg"]) < TRIPPED_ATTACHED]
    up = [row for row in lift if -15.9 < row["alpha_deg"] < SMOOTH_ATTACHED]
    tops = [
        max(row["cl"] for row in fixed if row["trip_grit"] == grit) for grit in (80.0, 120.0, 180.0)
    ]
    return {
        "smooth, lift": _lift_errors(smooth, up),
        "smooth, drag": _drag_errors(smooth, drag),
        "smooth, largest lift": _top_errors(smooth, [max(row["cl"] for row in lift)]),
        "tripped, lift": _lift_errors(tripped, attached),
        "tripped, drag": _drag_errors(tripped, attached),
        "tripped, largest lift": _top_errors(tripped, tops),
    }


def _lift_errors(column: Column, points: list[dict[str, float]]) -> Errors:
    return Errors(
        np.array([column.lift_at(np.radians(row["alpha_deg"])) - row["cl"] for row in points])
    )


def _drag_errors(column: Column, points: list[dict[str, float]]) -> Errors:
    """At equal lift; a branch passes a lift once, so that no angle need be given."""
    branch = column.branch()
    return Errors(
        np.array(
            [
                branch.drag_at(row["cl"], near=np.radians(row.get("alpha_deg", 10.0 * row["cl"])))
                / row["cd"]
                - 1.0
                for row in points
            ]
        )
    )


def _top_errors(column: Column, measured: Iterable[float]) -> Errors:
    own = peak_of(column.angle, column.lift)
    top = own.largest_lift if own is not None and own.bracketed else float("nan")
    return Errors(np.array([top - value for value in measured]))


# --- E387: the bubble, and forces at 5 degrees

BUBBLE_TABLES = {"pressure": "cole_mueller1990_bubble", "oil flow": "nasa_tm4062_oil_flow"}
PLACES = {
    "separation": ("x_sep", "separation_upper"),
    "transition": ("x_tr", "transition_upper"),
    "reattachment": ("x_reattach", "reattachment_upper"),
}
LAST_MID_CHORD = 6.0
"""Up to here the bubble lies at mid-chord in every run [deg]; beyond it leaps to the nose."""


@lru_cache(maxsize=1)
def bubble_flow() -> SectionFlow:
    """E387 at the Reynolds numbers of the bubble tables, and at 5 degrees' others."""
    return section_flow(
        outline("e387"), angle=_degrees(-4.0, 10.0, 0.5), reynolds=[6e4, 1e5, 2e5, 3e5, 4.6e5]
    )


def bubble() -> dict[str, Errors]:
    """Places over chord by source, Reynolds number and kind, to `LAST_MID_CHORD`."""
    flow = bubble_flow()
    found: dict[str, list[float]] = {}
    for source, table in BUBBLE_TABLES.items():
        for row in rows(f"sections/e387/{table}.csv"):
            if float(row["alpha_deg"]) > LAST_MID_CHORD:
                continue
            column = int(np.argmin(np.abs(flow.reynolds - float(row["Re"]))))
            for kind, (name, field) in PLACES.items():
                if row.get(name):
                    place = np.interp(
                        np.radians(float(row["alpha_deg"])),
                        flow.angle,
                        getattr(flow, field)[:, column],
                    )
                    key = f"{source}, {float(row['Re']) / 1e3:.0f}k, {kind}"
                    found.setdefault(key, []).append(float(place) - float(row[name]))
    return {key: Errors(np.array(values)) for key, values in found.items()}


def five_degrees() -> dict[str, Errors]:
    """Lift, drag and moment by Reynolds number, the runs near 5 degrees."""
    flow = bubble_flow()
    found: dict[str, list[float]] = {}
    for row in numbers("sections/e387/nasa_tm4062_alpha5.csv"):
        column = int(np.argmin(np.abs(flow.reynolds - row["Re"])))
        angle = np.radians(row["alpha_deg"])
        lift, drag, moment = (
            float(np.interp(angle, flow.angle, values[:, column]))
            for values in (flow.lift, flow.drag, flow.moment)
        )
        key = f"{row['Re'] / 1e3:.0f}k"
        found.setdefault(f"{key}, lift", []).append(lift - row["cl"])
        found.setdefault(f"{key}, drag", []).append(drag / row["cd"] - 1.0)
        found.setdefault(f"{key}, moment", []).append(moment - row["cm_c4"])
    return {key: Errors(np.array(values)) for key, values in found.items()}


# --- SD7037 with a flap

HINGES = (0.76, 0.80)
"""The tables do not say where the hinge was; these enclose what is usual, over chord."""
DEFLECTIONS = (5, 10)
FLAP_REYNOLDS = (60_000, 100_000, 200_000, 300_000)
SHIFT_ANGLES = np.radians(np.arange(-4.0, 6.1, 0.5))
"""Where the flap's lift is averaged: attached with and without it."""


@dataclass(frozen=True, eq=False)
class FlapCase:
    """What a flap does at one Reynolds number.

    Fields
    ------
    deflection : int
        [deg]
    reynolds : int
    hinge : float
        Of the computed section.
    measured, computed : float
        Gain of lift at equal angle, a mean. [-]
    lift, drag : Errors
        With the flap: lift at equal angle, drag at equal lift.
    largest : Errors
        Largest lift with the flap.
    """

    deflection: int
    reynolds: int
    hinge: float
    measured: float
    computed: float
    lift: Errors
    drag: Errors
    largest: Errors


@lru_cache(maxsize=1)
def flap_cases() -> tuple[FlapCase, ...]:
    """Every hinge, deflection and Reynolds number."""
    angle = _degrees(-6.0, 16.0, 0.5)
    section = outline("sd7037")
    plain = section_flow(section, angle=angle, reynolds=FLAP_REYNOLDS)
    cases = []
    for hinge in HINGES:
        for deflection in DEFLECTIONS:
            bent = deflect_flap(section, hinge=hinge, deflection=np.radians(deflection))
            flow = section_flow(bent, angle=angle, reynolds=FLAP_REYNOLDS)
            for index, reynolds in enumerate(FLAP_REYNOLDS):
                columns = (converged_points(one, index) for one in (plain, flow))
                cases.append(_flap_case(hinge, deflection, reynolds, *columns))
    return tuple(cases)


def _flap_case(
    hinge: float, deflection: int, reynolds: int, plain: Column, bent: Column
) -> FlapCase:
    table = f"uiuc_v2_modelB_flap{deflection}"
    before, after = (_run(name, reynolds) for name in ("uiuc_v2_modelB_lift", f"{table}_lift"))
    measured = [np.interp(SHIFT_ANGLES, run[:, 0], run[:, 1]) for run in (before, after)]
    computed = [np.array([one.lift_at(a) for a in SHIFT_ANGLES]) for one in (plain, bent)]
    drag = _run(f"{table}_drag", reynolds)
    up = rising(drag[:, 0], drag[:, 1])
    branch = bent.branch()
    shares = [branch.drag_at(cl, near=a) / cd - 1.0 for a, cl, cd in drag[up]]
    limit = peak_of(after[:, 0], after[:, 1])
    assert limit is not None
    return FlapCase(
        deflection,
        reynolds,
        hinge,
        float(np.mean(measured[1] - measured[0])),
        float(np.nanmean(computed[1] - computed[0])),
        Errors(computed[1] - measured[1]),
        Errors(np.array(shares)),
        _top_errors(bent, [limit.largest_lift]),
    )


def _run(table: str, reynolds: int) -> FloatArray:
    """Angle [rad], lift and, in drag runs, drag of the rising run nearest a Reynolds number."""
    points = [
        [np.radians(float(row["alpha_deg"])), float(row["cl"]), float(row.get("cd", "nan"))]
        for row in rows(f"sections/sd7037/{table}.csv")
        if row.get("sweep", "up") == "up" and abs(float(row["Re"]) / reynolds - 1.0) < 0.05
    ]
    return np.array(sorted(points))


# --- printing


def _table(title: str, errors: dict[str, Errors]) -> Iterator[str]:
    yield f"{title:40}{'points':>8}{'missed':>8}{'bias':>9}{'mean':>9}{'largest':>9}"
    for name, one in errors.items():
        yield (
            f"  {name:38}{one.error.size:8d}{one.missed:8d}"
            f"{one.bias:+9.4f}{one.mean:9.4f}{one.largest:9.4f}"
        )


def _flap_table() -> Iterator[str]:
    yield "SD7037 with a flap: gain of lift at equal angle; errors with the flap"
    yield (
        f"  {'flap':>5}{'hinge':>7}{'Re':>8}{'measured':>10}{'computed':>10}"
        f"{'cl bias':>9}{'cd bias':>9}{'cd mean':>9}{'cd missed':>10}{'largest':>9}"
    )
    for one in flap_cases():
        yield (
            f"  {one.deflection:5d}{one.hinge:7.2f}{one.reynolds:8d}{one.measured:10.3f}"
            f"{one.computed:10.3f}{one.lift.bias:+9.3f}{one.drag.bias:+9.3f}"
            f"{one.drag.mean:9.3f}{one.drag.missed:10d}{one.largest.bias:+9.3f}"
        )


TABLES: dict[str, Callable[[], Iterable[str]]] = {
    "high": lambda: _table("NACA 0012 at 6e6", high_reynolds()),
    "bubble": lambda: _table("E387, the bubble, over chord", bubble()),
    "five": lambda: _table("E387 near 5 degrees", five_degrees()),
    "flap": _flap_table,
}


def main(arguments: list[str]) -> int:
    """Print the tables asked for, or all."""
    unknown = set(arguments) - set(TABLES)
    if unknown:
        sys.stderr.write(f"not among {', '.join(TABLES)}: {', '.join(sorted(unknown))}\n")
        return 2
    prepare_kernel_cache()
    for name in arguments or TABLES:
        sys.stdout.write("\n".join(TABLES[name]()) + "\n\n")
    return 0


if __name__ == "__main__":
    sys.exit(main(sys.argv[1:]))
