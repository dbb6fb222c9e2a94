"""Stands in for the section solver: flows made up by rule, at once."""

from __future__ import annotations

import math
import types
from dataclasses import dataclass
from enum import IntEnum

import numpy as np

STALL = math.radians(12.0)
"""Angle of the made-up largest lift."""


@dataclass(frozen=True)
class FlowSettings:
    critical_amplification: float = 9.0
    trip_upper: float | None = None
    trip_lower: float | None = None
    nodes: int = 141


class PointStatus(IntEnum):
    CONVERGED = 0
    APPROXIMATE = 1
    MISSING = 2
    BEYOND_STALL = 3


class SampleSolver(types.ModuleType):
    """A module to put in place of the solver's; it remembers what it was asked."""

    FlowSettings, PointStatus = FlowSettings, PointStatus

    def __init__(self, missing=lambda reynolds, degrees: False) -> None:
        super().__init__("solver.section.flow")
        self.asked: list[types.SimpleNamespace] = []
        self.missing = missing
        self.meanwhile = lambda cancelled: None

    def critical_amplification(self, turbulence):
        return -8.43 - 2.4 * math.log(turbulence)

    def section_flow(
        self, outline, *, angle, reynolds, settings, threads=1, on_column=None, cancelled=None
    ):
        self.asked.append(
            types.SimpleNamespace(
                outline=outline, angle=angle, reynolds=reynolds, settings=settings, threads=threads
            )
        )
        self.meanwhile(cancelled)
        a, re = np.meshgrid(angle, reynolds, indexing="ij")
        lift = 5.8 * a - 14.0 * np.maximum(a - STALL, 0.0)
        gone = np.vectorize(self.missing)(re, np.degrees(a))
        status = np.where(a > STALL + 1e-9, PointStatus.BEYOND_STALL, PointStatus.CONVERGED)
        status[gone] = PointStatus.MISSING

        def known(values):
            return np.where(gone, np.nan, values)

        flow = types.SimpleNamespace(
            name=outline.name,
            settings=settings,
            angle=angle,
            reynolds=reynolds,
            lift=known(lift),
            drag=known(0.01 + 0.02 * a**2),
            moment=known(np.full_like(a, -1e-6)),
            transition_upper=known(0.6 - a),
            transition_lower=np.where(a < 0.0, np.nan, known(0.9)),
            status=status.astype(np.uint8),
        )
        top = angle[-1] - math.radians(1.0) >= STALL
        flow.largest_lift = np.array([5.8 * STALL if top else np.nan for _ in reynolds])
        if on_column is not None:
            for j, one in enumerate(reynolds):
                on_column(
                    types.SimpleNamespace(
                        reynolds=one, lift=flow.lift[:, j], status=flow.status[:, j]
                    )
                )
        return flow
