"""Pictures of computed section polars with the measured points over them."""

from __future__ import annotations

from collections.abc import Mapping
from pathlib import Path
from typing import Any

import numpy as np

from tests.published.section_comparison import (
    CONVERGED_STATES,
    Flow,
    Measured,
    column_of,
    measured,
)

LIFT_LIMITS = (-0.7, 2.4)
DRAG_LIMITS = (0.0, 0.08)
SIDE_INCHES = 3.6


def can_draw() -> bool:
    """Whether matplotlib, which nothing else needs, is installed."""
    try:
        import matplotlib  # noqa: F401
    except ImportError:
        return False
    return True


def draw(flows: Mapping[str, Flow], folder: Path) -> list[Path]:
    """Write one picture a section: lift over angle, lift over drag, by Reynolds number.

    Raises
    ------
    ImportError
        If matplotlib is not installed.
    """
    from matplotlib.figure import Figure

    folder.mkdir(parents=True, exist_ok=True)
    written = []
    for name, flow in flows.items():
        figure = Figure(
            figsize=(SIDE_INCHES * flow.reynolds.size, 2.0 * SIDE_INCHES), layout="constrained"
        )
        axes = figure.subplots(2, flow.reynolds.size, sharex="row", sharey="row", squeeze=False)
        for index in range(flow.reynolds.size):
            _computed(axes[:, index], flow, index)
            _measured(axes[:, index], measured()[name], flow, index)
            axes[0, index].set_title(f"{name}, Re {flow.reynolds[index]:,.0f}")
        axes[0, 0].set_ylabel("cl")
        axes[1, 0].set_ylabel("cl")
        axes[1, 0].set_xlim(*DRAG_LIMITS)
        path = folder / f"{name}.png"
        figure.savefig(path)
        written.append(path)
    return written


def _computed(axes: Any, flow: Flow, index: int) -> None:
    """Lines through converged points, broken where one is missing; crosses where approximate."""
    status = flow.status[:, index]
    good = np.isin(status, CONVERGED_STATES)
    degrees = np.degrees(flow.angle)
    lift, drag = flow.lift[:, index], flow.drag[:, index]
    other = ~good & np.isfinite(lift)
    for axis, x in ((axes[0], degrees), (axes[1], drag)):
        axis.plot(np.where(good, x, np.nan), np.where(good, lift, np.nan), "-", color="black", lw=1)
        axis.plot(x[other], lift[other], "x", color="red", ms=5)
        axis.grid(alpha=0.3)
        axis.set_ylim(*LIFT_LIMITS)
    axes[0].set_xlabel("angle of attack [degrees]")
    axes[1].set_xlabel("cd")


def _measured(axes: Any, section: Measured, flow: Flow, index: int) -> None:
    """Points of every run that is compared with this column: circles lift, squares drag."""
    for run in (*section.lift_runs, *section.drag_runs):
        if column_of(flow, run.reynolds) != index:
            continue
        label = f"{run.table}, {run.reynolds:,.0f}"
        style = {"ms": 4, "mfc": "none", "label": label}
        if run.drag is None:
            axes[0].plot(np.degrees(run.angle), run.lift, "o", **style)
        else:
            axes[0].plot(np.degrees(run.angle), run.lift, "s", ms=2, color="grey")
            axes[1].plot(run.drag, run.lift, "s", **style)
    for axis in axes:
        if axis.get_legend_handles_labels()[0]:
            axis.legend(fontsize=6)
