"""The errors that callers are meant to catch, and the checks that raise them.

A caller's mistake raises :class:`InputError`, which names the argument so that
a screen can mark the field. A hard case (no convergence, past stall, outside a
table) is not an error: it is returned as a status and a mask.
"""

from __future__ import annotations

import math


class SolverError(Exception):
    """Base of every error the solver raises on purpose."""


class InputError(SolverError, ValueError):
    """One named argument is unusable.

    Parameters
    ----------
    name : str
        The argument's name.
    value : object
        What was given.
    requirement : str
        What is allowed, worded to follow "must be".
    """

    def __init__(self, name: str, value: object, requirement: str) -> None:
        self.name, self.value, self.requirement = name, value, requirement
        super().__init__(f"{name} must be {requirement}; got {value!r}")

    def __reduce__(self) -> tuple[type, tuple[str, object, str]]:
        # Without this the error does not survive a process boundary.
        return type(self), (self.name, self.value, self.requirement)


def require_positive(**values: float) -> None:
    """Refuse the first of the named values that is not finite and > 0.

    Parameters
    ----------
    **values : float
        Arguments by name.

    Raises
    ------
    InputError
        Naming the first value that is not finite or not positive.
    """
    for name, value in values.items():
        if not (math.isfinite(value) and value > 0.0):
            raise InputError(name, value, "finite and > 0")


def require_within(low: float, high: float, **values: float) -> None:
    """Refuse the first of the named values outside a closed range.

    Parameters
    ----------
    low, high : float
        The range, both ends allowed, in the unit of the values.
    **values : float
        Arguments by name.

    Raises
    ------
    InputError
        Naming the first value that is not finite or lies outside the range.
    """
    for name, value in values.items():
        if not (math.isfinite(value) and low <= value <= high):
            raise InputError(name, value, f"finite and between {low:g} and {high:g}")
