"""``halfspan section``: the polar of a section from its outline, as CSV."""

from __future__ import annotations

import argparse
import math
import os
import re
import signal
import sys
import threading
from collections.abc import Iterator, Sequence
from contextlib import contextmanager, suppress
from pathlib import Path
from typing import TypeAlias

import numpy as np
from numpy.typing import NDArray

from app.cli_section_options import MOST_THREADS
from app.cli_status import DONE, FAILS, UnusableError
from app.kernel_cache import prepare_kernel_cache
from app.outline_table import OutlineTable, read_outline
from app.safe_write import disk_trouble, replace_file
from app.section_csv import MadeBy, outline_digest, section_csv, trimmed
from app.table_text import TableError
from app.version import version
from solver.errors import InputError
from solver.section import flow as section_solver
from solver.section.flap import (
    FOREMOST_HINGE,
    LARGEST_DEFLECTION,
    REARMOST_HINGE,
    deflect_flap,
)
from solver.section.flow import (
    FlowCancelledError,
    FlowColumn,
    FlowSettings,
    SectionFlow,
    critical_amplification,
    turbulence_level,
)
from solver.section.geometry import Outline, naca_outline, outline_from_coordinates
from solver.section.kernel_version import section_version
from solver.section.naca import naca_digits

FloatArray: TypeAlias = NDArray[np.float64]

MOST_ANGLES = 400
MOST_REYNOLDS = 100

OPTIONS = {
    "angle": "--angles",
    "critical_amplification": "--critical-factor",
    "deflection": "--flap",
    "hinge": "--flap",
    "reynolds": "--reynolds",
    "threads": "--threads",
    "trip_lower": "--trip-lower",
    "trip_upper": "--trip-upper",
    "turbulence": "--turbulence",
}
"""Which option an argument of the solver comes from."""


def compute_polar(arguments: argparse.Namespace) -> int:
    """Compute what ``halfspan section`` was asked for, and write it.

    Parameters
    ----------
    arguments : argparse.Namespace
        See `app.cli_section_options`.

    Returns
    -------
    int
        The exit status: done, or failed where not one point was found.

    Raises
    ------
    UnusableError
        If outline, options or output cannot be used.
    KeyboardInterrupt
        After saying that nothing was written.
    """
    output = None if arguments.output == "-" else _output(arguments.output, arguments.outline)
    angle, reynolds = _angles(*arguments.angles), _reynolds(arguments.reynolds)
    outline, origin = _outline(arguments.outline)
    try:
        with _stoppable() as stopped:
            flow, made_by = _computed(
                arguments, outline, origin, angle=angle, reynolds=reynolds, stopped=stopped
            )
    except InputError as error:
        raise _refusal(error, arguments.outline) from error
    except (KeyboardInterrupt, FlowCancelledError):
        _say("halfspan: stopped; nothing was written")
        raise KeyboardInterrupt from None
    if not np.isfinite(flow.lift).any():
        _say("halfspan: not one point was found; nothing was written")
        return FAILS
    _write(output, section_csv(flow, made_by))
    return DONE


def _say(sentence: str) -> None:
    """Tell the user, beside the data; whoever does not listen stops nothing."""
    with suppress(OSError, ValueError):
        sys.stderr.write(f"{sentence}\n")  # in one piece: several threads speak
        sys.stderr.flush()


def _output(text: str, outline: str) -> Path:
    """Refuse what cannot end well before anything is computed."""
    output = Path(text)
    if not text or "\0" in text:
        raise UnusableError("--output is not a usable file name")
    try:
        if output.is_dir():
            raise UnusableError(f"{output} is a folder; give the name of a file")
        if not output.parent.is_dir():
            raise UnusableError(f"{output} cannot be written: there is no folder {output.parent}")
        if output.exists() and Path(outline).exists() and output.samefile(outline):
            raise UnusableError(f"{output} is the outline itself; give --output another name")
    except OSError as error:
        raise UnusableError(f"{output} cannot be written: {disk_trouble(error)}") from error
    return output


def _angles(first: float, last: float, step: float) -> FloatArray:
    """Angles from the first by steps up to the last [rad]."""
    if not (first <= last and step > 0.0):
        given = " ".join(trimmed(one) for one in (first, last, step))
        raise UnusableError(
            f"--angles must be FIRST LAST STEP, ascending by a step > 0; got {given}"
        )
    count = math.floor((last - first) / step + 1e-6) + 1
    if count > MOST_ANGLES:
        raise UnusableError(f"--angles makes {count} angles; at most {MOST_ANGLES} are allowed")
    return np.asarray(np.radians(first + step * np.arange(count)))


def _reynolds(given: list[float]) -> FloatArray:
    reynolds = np.unique(np.array(given, dtype=np.float64))
    if reynolds.size > MOST_REYNOLDS:
        raise UnusableError(f"--reynolds has {reynolds.size} numbers; at most {MOST_REYNOLDS}")
    return reynolds


def _outline(text: str) -> tuple[Outline, str]:
    """Find the outline, and where it came from."""
    digits = naca_digits(text)
    with suppress(OSError, ValueError):
        if digits is not None and Path(text).exists():
            digits = None  # a file of that name is meant
        elif digits is None and not Path(text).exists():
            raise UnusableError(
                f"{text} does not exist; give a file of coordinates, or NACA digits such as 2412"
            )
    try:
        if digits is not None:
            outline = naca_outline(digits)
            return outline, f"{outline.name}, from its digits"
        table = read_outline(text)
    except (TableError, InputError) as error:
        raise UnusableError(str(error)) from error
    try:
        outline = outline_from_coordinates(table.name, table.coordinates)
    except InputError as error:
        raise UnusableError(f"{text} is no outline: {error}{_where(error, table)}") from error
    return outline, f"{table.name}, {len(outline.x)} points of {Path(text).name}"


def _deflected(outline: Outline, flap: Sequence[float] | None) -> Outline:
    if flap is None:
        return outline
    (hinge, degrees), most = flap, math.degrees(LARGEST_DEFLECTION)
    if not (FOREMOST_HINGE <= hinge <= REARMOST_HINGE and abs(degrees) <= most):
        raise UnusableError(
            f"--flap must be a hinge from {FOREMOST_HINGE:g} to {REARMOST_HINGE:g} of chord and a "
            f"deflection from {-most:g} to {most:g} degrees; got {hinge:g} {degrees:g}"
        )
    return deflect_flap(outline, hinge=hinge, deflection=math.radians(degrees))


def _where(error: InputError, table: OutlineTable) -> str:
    """Say on which lines of the file the points of a refusal stand."""
    numbers = dict.fromkeys(int(one) for one in re.findall(r"\bpoint (\d+)", str(error)))
    lines = [
        f"point {number} is in line {table.lines[number - 1]}"
        for number in numbers
        if number <= len(table.lines)
    ]
    return f" ({', '.join(lines)})" if lines else ""


def _refusal(error: InputError, outline: str) -> UnusableError:
    option = OPTIONS.get(error.name)
    return UnusableError(f"{option}: {error}" if option else f"{outline} cannot be used: {error}")


def _settings(arguments: argparse.Namespace) -> tuple[FlowSettings, float]:
    """Settings of the solver, and the turbulence level that goes with them [-]."""
    factor = arguments.critical_factor
    if arguments.turbulence is not None:
        factor = critical_amplification(arguments.turbulence / 100.0)
    given = {} if factor is None else {"critical_amplification": factor}
    settings = FlowSettings(
        trip_upper=arguments.trip_upper, trip_lower=arguments.trip_lower, **given
    )
    return settings, turbulence_level(settings.critical_amplification)


@contextmanager
def _stoppable() -> Iterator[threading.Event]:
    """Let Ctrl-C stop what runs in other threads, before it stops this one."""
    stopped = threading.Event()
    if threading.current_thread() is not threading.main_thread():
        yield stopped
        return

    def stop(number: int, frame: object) -> None:
        del number, frame
        stopped.set()
        raise KeyboardInterrupt

    before = signal.signal(signal.SIGINT, stop)
    try:
        yield stopped
    finally:
        signal.signal(signal.SIGINT, before)


def _computed(
    arguments: argparse.Namespace,
    outline: Outline,
    origin: str,
    *,
    angle: FloatArray,
    reynolds: FloatArray,
    stopped: threading.Event,
) -> tuple[SectionFlow, MadeBy]:
    shape = _deflected(outline, arguments.flap)
    kernels = prepare_kernel_cache()
    if not kernels.warm:
        _say("Preparing the solver's kernels (once on this machine) ...")
    settings, turbulence = _settings(arguments)
    made_by = MadeBy(
        version=version(),
        solver=section_version(),
        outline=origin,
        digest=outline_digest(outline),
        turbulence=turbulence,
        flap=arguments.flap,
    )
    flow = section_solver.section_flow(
        shape,
        angle=angle,
        reynolds=reynolds,
        settings=settings,
        threads=arguments.threads or min(usable_cores(), MOST_THREADS),
        on_column=lambda column: _say(_progress(column)),
        cancelled=stopped.is_set,
    )
    if np.isfinite(flow.lift).any():
        kernels.mark_warm()
    return flow, made_by


def usable_cores() -> int:
    """How many cores this process may use."""
    if hasattr(os, "sched_getaffinity"):
        return len(os.sched_getaffinity(0))
    return os.cpu_count() or 1


def _progress(column: FlowColumn) -> str:
    """How a Reynolds number went: how many points there are, where none is, the largest lift."""
    found = np.isfinite(column.lift)
    degrees = np.degrees(column.angle)
    sentence = f"Re {column.reynolds:,.0f}: {np.count_nonzero(found)} of {found.size} points"
    if not found.all():
        sentence += f" (none at {_stretches(degrees, ~found)} deg)"
    if not np.isfinite(column.largest_lift):
        return f"{sentence}, largest lift not bracketed"
    at = int(np.nanargmin(np.abs(column.lift - column.largest_lift)))
    return f"{sentence}, largest lift {column.largest_lift:.2f} at {degrees[at]:.1f} deg"


def _stretches(values: FloatArray, chosen: NDArray[np.bool_]) -> str:
    """Write the chosen values, neighbours as from-to."""
    edges = np.diff(np.concatenate([[False], chosen, [False]]).astype(np.int8))
    parts = []
    for first, last in zip(np.flatnonzero(edges > 0), np.flatnonzero(edges < 0) - 1, strict=True):
        ends = (trimmed(values[first]), trimmed(values[last]))
        parts.append(ends[0] if first == last else f"{ends[0]} to {ends[1]}")
    return ", ".join(parts)


def _write(output: Path | None, text: str) -> None:
    if output is None:
        sys.stdout.write(text)
        return
    try:
        replace_file(output.resolve(), text.encode())
    except OSError as error:
        raise UnusableError(f"{output} cannot be written: {disk_trouble(error)}") from error
