"""What a slider step costs in the solver, in time and in linear systems."""

from __future__ import annotations

import statistics
import time
from collections.abc import Callable, Iterator
from contextlib import contextmanager
from dataclasses import dataclass, field

import numpy as np

from app.analysis.stages import Analysis
from app.inputs import Inputs
from app.scenario import Scenario

STEPS = 12
SHEETS = {
    "Section": frozenset[str](),
    "Wing": frozenset({"lift_curve"}),
    "Balance": frozenset({"trim_curve"}),
    "Speed and battery": frozenset({"sweep"}),
    "Launch and landing": frozenset[str](),
}
SLIDERS = {
    "span_m": 0.01,
    "root_chord_mm": 1.0,
    "mass_kg": 0.02,
    "landing_speed_m_s": 0.05,
    "cruise_speed_m_s": 0.05,
}


@dataclass
class Systems:
    """Linear systems met by ``numpy.linalg.solve``: matrices and right sides."""

    calls: list[tuple[np.ndarray, np.ndarray]] = field(default_factory=list)

    @property
    def count(self) -> int:
        """Single systems in all batches."""
        return sum(int(np.prod(matrix.shape[:-2])) for matrix, _ in self.calls)

    def bare_ms(self, solve: Callable[..., np.ndarray]) -> float:
        """Time to solve them again and nothing else."""
        started = time.perf_counter()
        for matrix, right in self.calls:
            solve(matrix, right)
        return 1e3 * (time.perf_counter() - started)


@contextmanager
def recorded() -> Iterator[Systems]:
    """Note every system that is solved inside."""
    systems, original = Systems(), np.linalg.solve

    def noting(matrix: np.ndarray, right: np.ndarray) -> np.ndarray:
        systems.calls.append((matrix.copy(), right.copy()))
        return original(matrix, right)

    np.linalg.solve = noting  # type: ignore[assignment]
    try:
        yield systems
    finally:
        np.linalg.solve = original


def stepped(scenario: Scenario, name: str, step: float) -> Iterator[Inputs]:
    """Inputs as one slider moves away step by step."""
    base = float(scenario.freeze().values()[name])
    for index in range(STEPS):
        scenario.set_values({name: base + (index + 1) * step})
        yield scenario.freeze()
    scenario.set_values({name: base})


def measure(scenario: Scenario) -> dict[str, dict[str, float]]:
    """Median solver time of a step of each slider on each sheet, with its systems.

    Parameters
    ----------
    scenario : Scenario

    Returns
    -------
    dict
        By ``sheet / slider``: ``median_ms``, ``worst_ms``, ``systems`` and ``ratio``,
        the median over the time of the same linear systems alone.
    """
    found = {}
    for sheet, want in SHEETS.items():
        for slider, step in SLIDERS.items():
            analysis = Analysis()
            analysis.run(scenario.freeze(), want=want)
            times = [
                analysis.run(inputs, want=want).solver_ms
                for inputs in stepped(scenario, slider, step)
            ]
            with recorded() as systems:
                analysis.run(_one_more(scenario, slider, step), want=want)
            bare = min(systems.bare_ms(np.linalg.solve) for _ in range(5))
            median = statistics.median(times)
            found[f"{sheet} / {slider}"] = {
                "median_ms": median,
                "worst_ms": max(times),
                "systems": float(systems.count),
                "ratio": median / bare if bare > 0.0 else float("nan"),
            }
    return found


def _one_more(scenario: Scenario, slider: str, step: float) -> Inputs:
    base = float(scenario.freeze().values()[slider])
    scenario.set_values({slider: base + (STEPS + 1) * step})
    inputs = scenario.freeze()
    scenario.set_values({slider: base})
    return inputs
