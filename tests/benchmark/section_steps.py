"""What a section's polars cost: time beside the bare linear systems, memory while compiling."""

from __future__ import annotations

import json
import os
import statistics
import subprocess
import sys
import tempfile
import time
from dataclasses import replace
from pathlib import Path

import numpy as np

from app.kernel_cache import prepare_kernel_cache
from solver.section.geometry import naca_outline

ROOT = Path(__file__).resolve().parents[2]
SECTION = "4412"
ANGLE = np.radians(np.arange(-6.0, 17.5, 0.8))
REYNOLDS = np.geomspace(5e4, 5e5, 8)
RUNS = 5

FIRST_FLOW = """
import json, resource, sys, time
from app.kernel_cache import prepare_kernel_cache
prepare_kernel_cache()
from solver.section.flow import section_flow
from solver.section.geometry import naca_outline
unit = 1e6 if sys.platform == "darwin" else 1e3
started = time.perf_counter()
section_flow(naca_outline("4412"), angle=[0.0, 0.02], reynolds=[2e5])
print(json.dumps({
    "peak_mb": resource.getrusage(resource.RUSAGE_SELF).ru_maxrss / unit,
    "first_s": time.perf_counter() - started,
}))
"""


def measure() -> dict[str, dict[str, float]]:
    """Time all polars of one section, 30 angles by 8 Reynolds numbers.

    Returns
    -------
    dict
        For one thread and for two: ``median_s``, ``processor_s`` (of all threads: what
        else runs on the machine does not count), ``first_column_s`` (until the first
        Reynolds number is told), ``systems`` (dense systems solved), ``bare_s``
        (processor time of the same number of systems of the same size solved by numpy
        alone), ``ratio`` of the processor times, and ``missing`` points.
    """
    prepare_kernel_cache()
    from solver.section.flow import PointStatus, section_flow

    outline = naca_outline(SECTION)
    section_flow(outline, angle=ANGLE[:2], reynolds=REYNOLDS[:2])
    found = {}
    for threads in (1, 2):
        times, firsts, processor = [], [], []
        for _ in range(RUNS):
            told: list[float] = []
            started, used = time.perf_counter(), time.process_time()
            flow = section_flow(
                replace(outline),  # what is remembered of an outline is found anew
                angle=ANGLE,
                reynolds=REYNOLDS,
                threads=threads,
                on_column=lambda _column, told=told: told.append(time.perf_counter()),
            )
            times.append(time.perf_counter() - started)
            processor.append(time.process_time() - used)
            firsts.append(told[0] - started)
        bare = _bare(flow.iterations, _unknowns(flow.settings.nodes))
        found[f"{threads} thread{'s' if threads > 1 else ''}"] = {
            "median_s": statistics.median(times),
            "processor_s": statistics.median(processor),
            "first_column_s": statistics.median(firsts),
            "systems": float(flow.iterations),
            "bare_s": bare,
            "ratio": statistics.median(processor) / bare,
            "missing": float(np.count_nonzero(flow.status == PointStatus.MISSING)),
        }
    return found


def _unknowns(nodes: int) -> int:
    """Mass defects of body and wake, and the place of the stagnation point."""
    from solver.section.potential_flow import WAKE_PANELS

    return nodes + WAKE_PANELS + 1


def _bare(count: int, size: int) -> float:
    """Time to solve as many dense systems one after the other and nothing else."""
    random = np.random.default_rng(1)
    matrix = random.normal(size=(size, size)) + size * np.eye(size)
    right = random.normal(size=size)
    started = time.process_time()
    for _ in range(count):
        np.linalg.solve(matrix, right)
    return time.process_time() - started


def compiling() -> dict[str, float]:
    """Peak memory and time of a first flow in a fresh interpreter without kernels.

    Returns
    -------
    dict
        ``peak_mb`` of the whole process, ``first_s``.
    """
    with tempfile.TemporaryDirectory() as folder:
        run = subprocess.run(
            [sys.executable, "-c", FIRST_FLOW],
            cwd=ROOT,
            env={**os.environ, "NUMBA_CACHE_DIR": folder},
            capture_output=True,
            text=True,
            check=True,
        )
    found: dict[str, float] = json.loads(run.stdout)
    return found
