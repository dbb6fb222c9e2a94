"""Stands in for the section solver: flows made up by rule, at once."""

from __future__ import annotations

import math
from types import SimpleNamespace

import numpy as np

from solver.section.flow import FlowColumn, FlowSettings, PointStatus, SectionFlow

STALL = math.radians(12.0)
"""Angle of the made-up largest lift."""
SLOPE, FALL = 5.8, 8.2
"""Of lift up to there and behind it, per radian."""


class SampleSolver:
    """Answers in place of the solver and remembers what it was asked.

    `missing` says, of a Reynolds number and an angle in degrees, whether a point is
    missing; `meanwhile` is called with what the solver would poll.
    """

    def __init__(self) -> None:
        self.asked: list[SimpleNamespace] = []
        self.missing = lambda reynolds, degrees: False
        self.meanwhile = lambda cancelled: None

    def section_flow(
        self,
        outline,
        *,
        angle,
        reynolds,
        settings=FlowSettings(),  # noqa: B008 - as the solver has it
        threads=1,
        on_column=None,
        cancelled=None,
    ) -> SectionFlow:
        self.asked.append(
            SimpleNamespace(
                outline=outline, angle=angle, reynolds=reynolds, settings=settings, threads=threads
            )
        )
        self.meanwhile(cancelled)
        columns = [self.column(angle, one) for one in reynolds]
        for column in columns:
            on_column(column)
        names = vars(columns[0]).keys() - {"angle", "reynolds", "largest_lift", "iterations"}
        tables = {name: np.column_stack([vars(one)[name] for one in columns]) for name in names}
        largest = np.array([one.largest_lift for one in columns])
        return SectionFlow(
            name=outline.name,
            settings=settings,
            angle=angle,
            reynolds=reynolds,
            largest_lift=largest,
            iterations=0,
            **tables,
        )

    def column(self, angle, reynolds) -> FlowColumn:
        past = angle > STALL + 1e-9
        gone = np.array([self.missing(reynolds, one) for one in np.degrees(angle)])
        status = np.where(past, PointStatus.BEYOND_STALL, PointStatus.CONVERGED)
        nowhere = np.full_like(angle, np.nan)

        def known(values):
            return np.where(gone, np.nan, values)

        return FlowColumn(
            reynolds=float(reynolds),
            angle=angle,
            lift=known(np.where(past, SLOPE * STALL - FALL * (angle - STALL), SLOPE * angle)),
            drag=known(0.01 + 0.02 * angle**2),
            moment=known(-1e-6),
            transition_upper=known(0.6 - angle),
            transition_lower=known(np.where(angle < 0.0, np.nan, 0.9)),
            separation_upper=nowhere,
            separation_lower=nowhere,
            reattachment_upper=nowhere,
            reattachment_lower=nowhere,
            status=np.where(gone, PointStatus.MISSING, status).astype(np.uint8),
            largest_lift=SLOPE * STALL if (past & ~gone).any() else np.nan,
            iterations=0,
        )
