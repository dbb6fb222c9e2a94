"""Print what a slider step and a section cost: ``python -m tests.benchmark [--json FILE]``.

Absolute times drift from machine to machine and hour to hour; the counts and the
ratios within one run do not.
"""

from __future__ import annotations

import argparse
import json
import os
import sys
from pathlib import Path

os.environ.setdefault("OPENBLAS_NUM_THREADS", "1")

from app.scenario_file import read_scenario
from scenarios import example_path
from tests.benchmark import page_steps, section_steps, solver_steps

TARGET_STEP_MS, TARGET_PAINT_S = 25.0, 4.0
TARGET_SECTION_S, TARGET_COMPILING_MB = (1.0, 0.6), 500.0


def main() -> int:
    """Measure, print, and write the figures where asked."""
    parser = argparse.ArgumentParser(prog="python -m tests.benchmark", description=__doc__)
    parser.add_argument("--json", type=Path, metavar="FILE", help="write the figures as JSON")
    parser.add_argument("--no-page", action="store_true", help="leave the browser out")
    parser.add_argument("--no-section", action="store_true", help="leave section polars out")
    options = parser.parse_args()
    solver = solver_steps.measure(read_scenario(example_path()))
    print(f"Solver, one slider step (aim: at most {TARGET_STEP_MS:.0f} ms)")
    print(f"  {'sheet / slider':<42} {'median':>9} {'worst':>9} {'systems':>8} {'x bare':>7}")
    for name, row in solver.items():
        print(
            f"  {name:<42} {row['median_ms']:6.1f} ms {row['worst_ms']:6.1f} ms "
            f"{row['systems']:8.0f} {row['ratio']:7.1f}"
        )
    figures: dict[str, object] = {"solver": solver}
    if not options.no_section:
        figures["section"] = print_section()
    if not options.no_page:
        page = page_steps.measure()
        figures["page"] = page
        print(f"Page (aim: warm paint within {TARGET_PAINT_S:.0f} s)")
        for name, value in page.items():
            unit = "s" if name.endswith("_s") else "ms"
            print(f"  {name:<42} {value:8.2f} {unit}")
    if options.json is not None:
        options.json.write_text(json.dumps(figures, indent=2) + "\n", encoding="utf-8")
    return 0


def print_section() -> dict[str, dict[str, float]]:
    """Measure a section's polars and the compilation of what solves them, and print both."""
    found = section_steps.measure()
    one, two = TARGET_SECTION_S
    print(
        f"Section, 30 angles x 8 Reynolds numbers (aim: {one:.1f} s on one core, {two:.1f} on two)"
    )
    for name, row in found.items():
        print(
            f"  {name:<42} {row['median_s']:6.2f} s, first column {row['first_column_s']:4.2f} s, "
            f"processor {row['processor_s']:4.2f} s, "
            f"{row['systems']:.0f} systems, {row['ratio']:.1f} x bare ({row['bare_s']:.2f} s), "
            f"{row['missing']:.0f} missing"
        )
    found["compiling"] = compiling = section_steps.compiling()
    print(
        f"  {'compiling, fresh interpreter':<42} {compiling['first_s']:6.1f} s, "
        f"peak {compiling['peak_mb']:.0f} MB (aim: below {TARGET_COMPILING_MB:.0f})"
    )
    return found


if __name__ == "__main__":
    sys.exit(main())
