"""What the surface of a built wing does to a polished tunnel model's numbers.

The factors are from memory and common practice, with no source: they say in
which direction and roughly how far, so that a polished model is never the silent
default.
"""

from __future__ import annotations

from dataclasses import dataclass
from types import MappingProxyType
from typing import Final

from solver.errors import InputError


@dataclass(frozen=True)
class Finish:
    """Effect of a surface on profile drag and largest lift.

    Fields
    ------
    drag_factor : float
        Multiplies profile drag [-], >= 1.
    largest_lift_debit : float
        Taken off the largest section lift [-], >= 0.
    """

    drag_factor: float
    largest_lift_debit: float


FINISHES: Final = MappingProxyType(
    {
        "moulded": Finish(1.00, 0.00),
        "filmed": Finish(1.05, 0.02),
        "taped": Finish(1.08, 0.03),
        "bare foam": Finish(1.20, 0.08),
    }
)


def finish(name: str) -> Finish:
    """Look a finish up by name.

    Parameters
    ----------
    name : str
        One of :data:`FINISHES`.

    Returns
    -------
    Finish

    Raises
    ------
    InputError
        If there is no such finish.
    """
    if name not in FINISHES:
        raise InputError("finish", name, f"one of {', '.join(FINISHES)}")
    return FINISHES[name]
