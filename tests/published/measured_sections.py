"""Published wind-tunnel runs of twelve sections, as arrays for tests.

E387 model A is left out: it was warped, as its authors say. Runs with a flap
deflected are left out of everything but the flap tests.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import lru_cache

import numpy as np

from solver.errors import InputError
from solver.section.estimate import shape_of
from solver.section.estimated_lift import SectionShape
from solver.section.geometry import Outline, outline_from_coordinates
from solver.section.sweeps import LiftLimit, first_attached_peak
from tests.published.tables import DATA, rows

LOWEST_REYNOLDS = 35_000.0
"""Below it nothing was used: E387 model A and NACA 0009 only."""

BURST = {"s1223": 145_000.0, "fx63-137": 70_000.0, "naca6409": 70_000.0}
"""Runs below these Reynolds numbers stalled early: largest lift at the next run is 0.3 to
0.6 higher."""


@dataclass(frozen=True, eq=False)
class Run:
    """One run: angle [rad], lift [-] and, for drag runs, drag [-]."""

    section: str
    table: str
    reynolds: float
    angle: np.ndarray
    lift: np.ndarray
    drag: np.ndarray | None

    @property
    def burst(self) -> bool:
        return self.reynolds < BURST.get(self.section, 0.0)


SECTIONS = tuple(sorted(path.name for path in (DATA / "sections").iterdir()))


@lru_cache(maxsize=16)
def outline(section: str) -> Outline:
    table = rows(f"sections/{section}/coordinates.csv")
    points = np.array([[float(row["x"]), float(row["y"])] for row in table])
    return outline_from_coordinates(section, points)


@lru_cache(maxsize=16)
def shape(section: str) -> SectionShape:
    return shape_of(outline(section))


def shapes(names: list[str]) -> SectionShape:
    """One shape of arrays, an entry for each name."""
    columns = ("thickness", "nose_radius", "zero_lift_angle", "ideal_lift", "moment")
    return SectionShape(
        *(np.array([float(getattr(shape(name), column)) for name in names]) for column in columns)
    )


@lru_cache(maxsize=2)
def runs(kind: str) -> tuple[Run, ...]:
    """All rising runs of a kind, ``lift`` or ``drag``, without flap."""
    found = []
    for path in sorted((DATA / "sections").glob(f"*/*_{kind}.csv")):
        if "flap" in path.stem:
            continue
        groups: dict[float, list[dict[str, str]]] = {}
        for row in rows(f"sections/{path.parent.name}/{path.name}"):
            if row.get("sweep", "up") == "up":
                groups.setdefault(float(row["Re"]), []).append(row)
        for reynolds, group in groups.items():
            if reynolds < LOWEST_REYNOLDS:
                continue
            group.sort(key=lambda row: float(row["alpha_deg"]))
            found.append(
                Run(
                    path.parent.name,
                    path.stem,
                    reynolds,
                    np.radians([float(row["alpha_deg"]) for row in group]),
                    np.array([float(row["cl"]) for row in group]),
                    np.array([float(row["cd"]) for row in group]) if kind == "drag" else None,
                )
            )
    return tuple(found)


def stall_of(run: Run) -> LiftLimit | None:
    """The first attached peak, or None where the run does not reach beyond it."""
    angle, place = np.unique(run.angle, return_inverse=True)
    lift = np.bincount(place, weights=run.lift) / np.bincount(place)
    try:
        limit = first_attached_peak(angle, lift)
    except InputError:
        return None
    return limit if limit.bracketed or limit.plateau else None
