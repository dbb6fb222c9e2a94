"""How far the computed section polars lie from wind-tunnel runs, as a table.

    python -m tests.published.section_accuracy [--sections NAME ...] [--threads N] [--plot FOLDER]

What is compared and how is said in :mod:`tests.published.section_comparison`. First the
figures pooled over all points, with what is asked of them; then a row a section and range.
"""

from __future__ import annotations

import argparse
import math
import sys
from collections.abc import Callable, Iterable, Iterator
from pathlib import Path
from typing import Protocol

from app.kernel_cache import prepare_kernel_cache
from solver.errors import InputError
from solver.section.geometry import Outline
from tests.published.measured_sections import SECTIONS
from tests.published.section_comparison import Flow, compare, measured
from tests.published.section_pictures import can_draw, draw
from tests.published.section_records import RANGES, Comparison, Figures, FloatArray

CAMBERED = ("s1223", "fx63-137")
"""Very cambered: their largest lift is given apart, since it would outweigh the others."""


class Solve(Protocol):
    """How a section is solved: as ``solver.section.flow.section_flow`` is called."""

    def __call__(
        self, outline: Outline, *, angle: FloatArray, reynolds: FloatArray, threads: int = 1
    ) -> Flow: ...


def run(
    solve: Solve | None = None,
    *,
    sections: Iterable[str] = SECTIONS,
    threads: int = 1,
    done: Callable[[str], None] = lambda _: None,
) -> dict[str, Flow]:
    """Solve the sections at the Reynolds numbers they were measured at.

    Parameters
    ----------
    solve : callable, optional
        Called with an outline, and `angle` [rad], `reynolds` [-] and `threads` by name.
        The section solver by default.
    sections : iterable of str, optional
        All of them by default.
    threads : int, optional
        Handed on.
    done : callable, optional
        Called with the name of every section that is done.

    Raises
    ------
    InputError
        If a section is not among those that were measured.
    """
    if solve is None:
        from solver.section.flow import section_flow

        solve = section_flow
    flows = {}
    for name in sections:
        if name not in SECTIONS:
            raise InputError("sections", name, f"among {', '.join(SECTIONS)}")
        section = measured()[name]
        flows[name] = solve(
            section.outline, angle=section.angle, reynolds=section.reynolds, threads=threads
        )
        done(name)
    return flows


# --- the table

TARGETS = {
    "drag_mean": (0.135, 0.11, 0.075),
    "drag_bias": (0.03, 0.03, 0.025),
    "lift_bias": (0.03, 0.03, 0.03),
    "largest_rms_without": (0.05, 0.035, 0.05),
    "largest_rms": (0.05, 0.08, 0.06),
    "converged": (0.985, 0.99, 0.995),
}
"""What is asked, a figure a range: at most this size, or, of points converged, at least."""

PERCENT, SIGNED_PERCENT, SIZE, SIGNED, COUNT = "percent", "+percent", "size", "signed", "count"

POOLED = (
    ("cd: points compared", "drag_points", COUNT),
    ("    not reached", "drag_missed", COUNT),
    ("    error, mean", "drag_mean", PERCENT),
    ("    error, median", "drag_median", PERCENT),
    ("    bias, median", "drag_bias", SIGNED_PERCENT),
    ("    bias, mean", "drag_bias_mean", SIGNED_PERCENT),
    ("cl at equal angle: points compared", "lift_points", COUNT),
    ("    not reached", "lift_missed", COUNT),
    ("    bias, mean", "lift_bias", SIGNED),
    ("    bias, median", "lift_bias_median", SIGNED),
    ("    rms", "lift_rms", SIZE),
    ("largest lift, without the very cambered: runs", "largest_runs_without", COUNT),
    ("    not bracketed by ours", "largest_missed_without", COUNT),
    ("    rms", "largest_rms_without", SIZE),
    ("    bias", "largest_bias_without", SIGNED),
    ("largest lift, all: runs", "largest_runs", COUNT),
    ("    not bracketed by ours", "largest_missed", COUNT),
    ("    rms", "largest_rms", SIZE),
    ("    bias", "largest_bias", SIGNED),
    ("points to converge", "points", COUNT),
    ("    converged", "converged", PERCENT),
)

BY_SECTION = (
    ("cd n", "drag_points", COUNT),
    ("miss", "drag_missed", COUNT),
    ("mean", "drag_mean", PERCENT),
    ("median", "drag_median", PERCENT),
    ("bias", "drag_bias", SIGNED_PERCENT),
    ("(mean)", "drag_bias_mean", SIGNED_PERCENT),
    ("cl n", "lift_points", COUNT),
    ("miss", "lift_missed", COUNT),
    ("bias", "lift_bias", SIGNED),
    ("(median)", "lift_bias_median", SIGNED),
    ("rms", "lift_rms", SIZE),
    ("top n", "largest_runs", COUNT),
    ("miss", "largest_missed", COUNT),
    ("bias", "largest_bias", SIGNED),
    ("rms", "largest_rms", SIZE),
    ("points", "points", COUNT),
    ("converged", "converged", PERCENT),
)


def pooled(comparison: Comparison) -> dict[str, dict[str, float]]:
    """Figures by range and name; `_without` leaves the very cambered sections out."""
    found = {}
    for name, limits in RANGES.items():
        part = comparison.part(reynolds=limits)
        found[name] = vars(part.figures()) | {
            f"{key}_without": value
            for key, value in vars(part.part(without=CAMBERED).figures()).items()
        }
    return found


def meets(figure: str, value: float, target: float) -> bool:
    """Whether a figure is as good as asked; NaN never is."""
    return value >= target if figure == "converged" else abs(value) <= target


def lines(comparison: Comparison) -> Iterator[str]:
    """Yield the lines of the table."""
    figures = pooled(comparison)
    yield f"{'':46}" + "".join(f"{name:>26}" for name in figures)
    for label, key, kind in POOLED:
        cells = []
        for index, values in enumerate(figures.values()):
            cell = written(values[key], kind)
            if key in TARGETS:
                target = TARGETS[key][index]
                sign, asked = (
                    ("≥" if key == "converged" else "≤"),
                    written(target, kind.lstrip("+")),
                )
                mark = "met   " if meets(key, values[key], target) else "missed"
                cell += f" {sign} {asked.lstrip('+'):>7} {mark}"
            else:
                cell += " " * 17
            cells.append(f"{cell:>26}")
        yield f"{label:46}" + "".join(cells)
    yield ""
    yield "By section. miss: not reached or not bracketed by ours; bias of cd: median (mean)"
    head = "".join(f"{name:>10}" for name, _, _ in BY_SECTION)
    for name, limits in RANGES.items():
        yield ""
        yield f"{name:12}{head}"
        for section in dict.fromkeys(comparison.section.tolist()):
            part = comparison.part(sections=[section], reynolds=limits)
            if part.section.size:
                yield f"{section:12}" + _section_cells(part.figures())


def _section_cells(figures: Figures) -> str:
    return "".join(f"{written(getattr(figures, key), kind):>10}" for _, key, kind in BY_SECTION)


def written(value: float, kind: str) -> str:
    """Write a figure the way its kind is written."""
    if math.isnan(value):
        return "–"
    if kind == COUNT:
        return f"{value:.0f}"
    if kind in (PERCENT, SIGNED_PERCENT):
        return f"{100.0 * value:{'+' if kind == SIGNED_PERCENT else ''}.1f} %"
    return f"{value:{'+' if kind == SIGNED else ''}.3f}"


def _say(name: str) -> None:
    sys.stderr.write(f"{name}\n")
    sys.stderr.flush()


def main(arguments: list[str] | None = None, *, solve: Solve | None = None) -> int:
    """Print the table; the exit status says whether the arguments could be used."""
    parser = argparse.ArgumentParser(prog="python -m tests.published.section_accuracy")
    parser.add_argument("--sections", nargs="+", metavar="NAME", default=list(SECTIONS))
    parser.add_argument("--threads", type=int, default=1)
    parser.add_argument("--plot", type=Path, metavar="FOLDER", help="a picture a section")
    given = parser.parse_args(arguments)
    if given.plot is not None and not can_draw():
        parser.error("--plot needs matplotlib, which is not installed")
    if solve is None:
        prepare_kernel_cache()
    try:
        flows = run(
            solve,
            sections=given.sections,
            threads=given.threads,
            done=_say,
        )
    except InputError as error:
        parser.error(str(error))
    sys.stdout.write("\n".join(lines(compare(flows))) + "\n")
    if given.plot is not None:
        draw(flows, given.plot)
    return 0


if __name__ == "__main__":
    sys.exit(main())
