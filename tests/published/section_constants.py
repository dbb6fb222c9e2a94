"""How much the section solver's chosen constants depend on any one section.

    python -m tests.published.section_constants [--constants NAME ...] [--sections NAME ...]
        [--threads N]

Four of the constants in :class:`solver.section.boundary_layer.constants.ClosureConstants`
were set by comparison with the same wind-tunnel runs that the accuracy table is pooled
from. Here each of them is moved alone, the others as they are in use, and all sections
are solved again; then each section in turn is left out, the value that suits the others
best is chosen, and the section that had no say is judged by it.

What is best is said by :func:`objective`: all figures of the accuracy table of which
something is asked, over that. All sections at one value take about as long as the
accuracy table, half a minute to a minute on one core.
"""

from __future__ import annotations

import argparse
import sys
from collections.abc import Callable, Iterable, Iterator, Mapping
from concurrent.futures import ThreadPoolExecutor
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from app.kernel_cache import prepare_kernel_cache
from solver.section.boundary_layer.constants import ClosureConstants
from solver.section.geometry import Outline
from solver.section.one_thread import linear_algebra_on_one_thread
from solver.section.panelling import panel_nodes
from tests.published.measured_sections import SECTIONS
from tests.published.section_accuracy import TARGETS, pooled, run
from tests.published.section_comparison import compare
from tests.published.section_records import RANGES, Comparison, FloatArray

GRID: dict[str, tuple[float, ...]] = {
    "separated_growth": (0.68, 0.80, 1.0),
    "dissipation_rise": (0.0, 0.2, 0.4),
    "dissipation_from_h": (1.5, 2.2),
    "dissipation_span": (0.5, 2.0),
    "inner_layer": (0.0, 12.0, 24.0),
}
"""Values tried beside the one in use. Separated growth 1, dissipation rise 0 and inner layer
0 are the published forms."""

SHOWN = ("drag_mean", "drag_bias", "lift_bias", "largest_rms_without", "converged")
"""Figures of the accuracy table that are printed for every value."""

CRITICAL_AMPLIFICATION = 9.0


@dataclass(frozen=True, eq=False)
class PlainFlow:
    """What :func:`tests.published.section_comparison.compare` reads of a flow."""

    angle: FloatArray
    reynolds: FloatArray
    lift: FloatArray
    drag: FloatArray
    status: NDArray[np.uint8]


def solve_with(constants: ClosureConstants) -> Callable[..., PlainFlow]:
    """Return a function that solves sections with constants other than those in use."""
    from solver.section.boundary_layer.point import Conditions
    from solver.section.boundary_layer.sweep import solve_column
    from solver.section.boundary_layer.wake_path import prepared

    conditions = Conditions(CRITICAL_AMPLIFICATION, None, None, constants)

    def solve(
        outline: Outline, *, angle: FloatArray, reynolds: FloatArray, threads: int = 1
    ) -> PlainFlow:
        with linear_algebra_on_one_thread(), ThreadPoolExecutor(threads) as pool:
            panels = prepared(panel_nodes(outline), constants)
            columns = list(
                pool.map(
                    lambda number: solve_column(
                        panels, conditions, angle=angle, reynolds=float(number)
                    ),
                    reynolds,
                )
            )
        return PlainFlow(
            angle,
            reynolds,
            np.column_stack([column.readings[:, 0] for column in columns]),
            np.column_stack([column.readings[:, 1] for column in columns]),
            np.column_stack([column.status for column in columns]),
        )

    return solve


def objective(comparison: Comparison) -> float:
    """Mean of the sizes of figures over what is asked of them, over ranges; 1 is as asked.

    Of points converged, the share that is lost over the share that may be. Figures for
    which a comparison has no points are left out.
    """
    figures = pooled(comparison)
    shares = []
    for key, targets in TARGETS.items():
        for name, target in zip(RANGES, targets, strict=True):
            value = figures[name][key]
            if key == "converged":
                value, target = 1.0 - value, 1.0 - target
            if np.isfinite(value):
                shares.append(abs(value) / target)
    return float(np.mean(shares)) if shares else float("nan")


@dataclass(frozen=True)
class Choice:
    """The value that is best without a section, and how that section fares.

    Fields
    ------
    section : str
    value : float
        Chosen on the others.
    chosen, used : float
        Objective of the section itself with that value, and with the one in use.
    """

    section: str
    value: float
    chosen: float
    used: float


def left_out(trials: Mapping[float, Comparison], *, used: float) -> list[Choice]:
    """Leave each section out, choose on the others, judge by the one left out."""
    choices = []
    for section in dict.fromkeys(trials[used].section.tolist()):
        value = min(trials, key=lambda v: objective(trials[v].part(without=[section])))
        own = [objective(trials[v].part(sections=[section])) for v in (value, used)]
        choices.append(Choice(section, value, *own))
    return choices


def cross_judged(trials: Mapping[float, Comparison], choices: Iterable[Choice]) -> Comparison:
    """Pool the records of all sections, each solved with the value chosen without it."""
    parts = [trials[choice.value].part(sections=[choice.section]) for choice in choices]
    fields = vars(parts[0])
    return Comparison(*(np.concatenate([vars(part)[name] for part in parts]) for name in fields))


def tried(
    constant: str,
    *,
    base: Comparison,
    sections: Iterable[str],
    threads: int,
    done: Callable[[str], None],
) -> dict[float, Comparison]:
    """Solve all sections at each value of a constant, ascending; the one in use is given."""
    in_use = ClosureConstants()
    used = float(getattr(in_use, constant))
    trials = {used: base}
    for value in GRID[constant]:
        solve = solve_with(replace(in_use, **{constant: value}))
        trials[value] = compare(run(solve, sections=sections, threads=threads))
        done(f"{constant} {value:g}")
    return dict(sorted(trials.items()))


def lines(constant: str, trials: Mapping[float, Comparison]) -> Iterator[str]:
    """Yield the table of one constant."""
    used = float(getattr(ClosureConstants(), constant))
    choices = left_out(trials, used=used)
    yield ""
    yield f"{constant}, {used:g} in use"
    yield f"  {'':30}{'objective':>10}" + "".join(f"{name:>38}" for name in RANGES)
    yield f"  {'':30}{'':10}" + 3 * f"{'cd mean  bias  cl bias  top  found':>38}"
    for value, comparison in trials.items():
        yield _row(f"{value:g}{' (in use)' if value == used else ''}", comparison)
    yield _row("each chosen without the section", cross_judged(trials, choices))
    yield (
        f"  {'left out':12}{'best without it':>17}{'its objective so':>19}{'with that in use':>19}"
    )
    for one in choices:
        yield f"  {one.section:12}{one.value:17g}{one.chosen:19.2f}{one.used:19.2f}"


def _row(label: str, comparison: Comparison) -> str:
    cells = ""
    for figures in pooled(comparison).values():
        drag, bias, lift, top, found = (figures[key] for key in SHOWN)
        cells += f"{100 * drag:8.1f} %{100 * bias:+6.1f} %{lift:+8.3f}{top:6.3f}"
        cells += f"{100 * found:6.1f} %"
    return f"  {label:32}{objective(comparison):8.3f}{cells}"


def _say(text: str) -> None:
    sys.stderr.write(f"{text}\n")
    sys.stderr.flush()


def main(arguments: list[str] | None = None) -> int:
    """Print a table for each constant."""
    parser = argparse.ArgumentParser(prog="python -m tests.published.section_constants")
    parser.add_argument("--constants", nargs="+", choices=list(GRID), default=list(GRID))
    parser.add_argument("--sections", nargs="+", choices=SECTIONS, default=list(SECTIONS))
    parser.add_argument("--threads", type=int, default=1)
    given = parser.parse_args(arguments)
    prepare_kernel_cache()
    base = compare(
        run(solve_with(ClosureConstants()), sections=given.sections, threads=given.threads)
    )
    _say("as in use")
    for constant in given.constants:
        trials = tried(
            constant, base=base, sections=given.sections, threads=given.threads, done=_say
        )
        sys.stdout.write("\n".join(lines(constant, trials)) + "\n")
        sys.stdout.flush()
    return 0


if __name__ == "__main__":
    sys.exit(main())
