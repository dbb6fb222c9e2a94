"""Options of ``halfspan section``."""

from __future__ import annotations

import argparse
import math
from collections.abc import Callable

REYNOLDS = (1e4, 1e7)
TURBULENCE = (0.02, 1.96)
"""Where Mack's relation is used [%]: amplification factors of 12 down to 1."""
CRITICAL_FACTOR = (1.0, 20.0)
MOST_THREADS = 64


def add_section_options(parser: argparse.ArgumentParser) -> None:
    """Add what ``halfspan section`` takes.

    Parameters
    ----------
    parser : argparse.ArgumentParser
        Of that command.
    """
    parser.add_argument(
        "outline",
        metavar="OUTLINE",
        help="a file of coordinates x, y in any unit of length, or NACA digits such as 2412",
    )
    parser.add_argument(
        "--reynolds",
        metavar="RE",
        nargs="+",
        required=True,
        type=_number(*REYNOLDS),
        help="one or more Reynolds numbers, 10e3 to 10e6",
    )
    parser.add_argument(
        "--angles",
        metavar=("FIRST", "LAST", "STEP"),
        nargs=3,
        required=True,
        type=_number(-30.0, 30.0),
        help="angles of the x axis of the outline to the air, in degrees, -30 to 30",
    )
    parser.add_argument(
        "--output", metavar="OUT.csv", default="-", help="where to; - is standard output, as it is"
    )
    _add_transition_options(parser)
    parser.add_argument(
        "--flap",
        metavar=("HINGE", "DEGREES"),
        nargs=2,
        type=_number(-90.0, 90.0),
        help="plain flap: its hinge at 0.5 to 0.95 of chord, its deflection, down positive",
    )
    parser.add_argument(
        "--threads",
        metavar="N",
        type=_threads,
        help="Reynolds numbers computed at a time; as many as there are cores unless given",
    )


def _add_transition_options(parser: argparse.ArgumentParser) -> None:
    quiet = parser.add_mutually_exclusive_group()
    quiet.add_argument(
        "--turbulence",
        metavar="PERCENT",
        type=_number(*TURBULENCE),
        help="turbulence level of the air, 0.02 to 1.96 percent; 0.07 unless given",
    )
    quiet.add_argument(
        "--critical-factor",
        metavar="N",
        type=_number(*CRITICAL_FACTOR),
        help="instead: amplification factor where the flow turns, 1 to 20; 9 unless given",
    )
    for side in ("upper", "lower"):
        parser.add_argument(
            f"--trip-{side}",
            metavar="X",
            type=_number(0.0, 1.0),
            help=f"transition forced on the {side} surface at this share of chord",
        )


def _number(low: float, high: float) -> Callable[[str], float]:
    def read(text: str) -> float:
        try:
            value = float(text)
        except ValueError:
            value = math.nan
        if not low <= value <= high:
            raise argparse.ArgumentTypeError(
                f"must be a number from {low:.8g} to {high:.8g}; got {text[:40]!r}"
            )
        return value

    return read


def _threads(text: str) -> int:
    if not (text.isdecimal() and len(text) <= 3 and 1 <= int(text) <= MOST_THREADS):
        raise argparse.ArgumentTypeError(
            f"must be a number from 1 to {MOST_THREADS}; got {text[:40]!r}"
        )
    return int(text)
