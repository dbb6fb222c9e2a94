"""Numbers as the screen writes them: three significant figures and their unit.

A value that is not finite is never written as a number.
"""

from __future__ import annotations

import math

MINUS = "\N{MINUS SIGN}"
THIN_SPACE = "\N{NARROW NO-BREAK SPACE}"
UNIT_SPACE = "\N{NO-BREAK SPACE}"
NOT_FOUND = "not found"
_RAISED = str.maketrans("-0123456789", "⁻⁰¹²³⁴⁵⁶⁷⁸⁹")


def number(value: float, unit: str = "", *, figures: int = 3, sign: bool = False) -> str:
    """Write a value with its unit.

    Parameters
    ----------
    value : float
        What to write, in `unit`.
    unit : str
        Written after the value; empty for a ratio.
    figures : int
        Significant figures; whole digits are never cut.
    sign : bool
        Write a plus before positive values.

    Returns
    -------
    str
        For example ``"14.5 m/s"``; `NOT_FOUND` where the value is not finite.
    """
    if not math.isfinite(value):
        return NOT_FOUND
    digits = _digits(abs(value), figures)
    mark = "" if value == 0.0 else MINUS if value < 0 else "+" if sign else ""
    return f"{mark}{digits}{UNIT_SPACE}{unit}" if unit else f"{mark}{digits}"


def _digits(size: float, figures: int) -> str:
    if size == 0.0:
        return "0"
    decimals = max(0, figures - 1 - math.floor(math.log10(size)))
    rounded = round(size, figures - 1 - math.floor(math.log10(size)))
    # 9.996 becomes 10.0 and not 10.00.
    if rounded > 0.0:
        decimals = max(0, figures - 1 - math.floor(math.log10(rounded)))
    if decimals > 5:
        short, _, power = f"{size:.{figures - 1}e}".partition("e")
        return f"{short}×10{str(int(power)).translate(_RAISED)}"
    text = f"{rounded:.{decimals}f}"
    whole, _, rest = text.partition(".")
    if len(whole) > 4:
        whole = f"{int(whole):,}".replace(",", THIN_SPACE)
    return f"{whole}.{rest}" if rest else whole


def given(value: float, unit: str = "") -> str:
    """Write a value that the user set, as it was set.

    Parameters
    ----------
    value : float
        What was set, in `unit`.
    unit : str
        Written after the value; empty for a ratio.

    Returns
    -------
    str
        Without zeros that say nothing: ``"5 %"`` and not ``"5.00 %"``.
    """
    if not math.isfinite(value):
        return NOT_FOUND
    text = f"{value:.6g}".replace("-", MINUS)
    return f"{text}{UNIT_SPACE}{unit}" if unit else text


def part(value: float, of: float, unit: str = "", *, sign: bool = False) -> str:
    """Write a part of a whole, or a difference, to the digits that the whole shows.

    Parameters
    ----------
    value : float
        The part, in `unit`.
    of : float
        The value whose digits decide, in `unit`.
    unit : str
        Written after the value; empty for a ratio.
    sign : bool
        Write a plus before positive values.

    Returns
    -------
    str
        `NOT_FOUND` where either is not finite.
    """
    if not (math.isfinite(value) and math.isfinite(of)):
        return NOT_FOUND
    _, _, rest = _digits(abs(of), 3).partition(".")
    text = f"{abs(value):.{len(rest)}f}"
    zero = float(text) == 0.0
    mark = "" if zero and not sign else MINUS if value < 0 and not zero else "+" if sign else ""
    return f"{mark}{text}{UNIT_SPACE}{unit}" if unit else f"{mark}{text}"


def span_of(low: float, high: float, unit: str = "") -> str:
    """Write a range as ``low to high unit``.

    Parameters
    ----------
    low, high : float
        Ends of the range, in `unit`.
    unit : str
        Written once, at the end.

    Returns
    -------
    str
        One number where both ends are written alike.
    """
    first, last = number(low), number(high)
    if first == last:
        return number(low, unit)
    return f"{first} to {number(high, unit)}"


def reynolds(value: float) -> str:
    """Write a Reynolds number to three figures.

    Parameters
    ----------
    value : float
        Reynolds number. [-]

    Returns
    -------
    str
        For example ``"148 000"``, or `NOT_FOUND`.
    """
    return number(value)
