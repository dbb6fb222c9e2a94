"""NACA four- and five-digit sections in closed form: thickness and camber line."""

from __future__ import annotations

import re
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from solver.errors import InputError

FloatArray = NDArray[np.float64]

THICKNESS_COEFFICIENTS = (0.2969, -0.1260, -0.3516, 0.2843, -0.1015)
"""Of sqrt(x), x, x^2, x^3, x^4 for a thickness of 20 % chord (NACA Report 460, eq. (1))."""
CLOSED_LAST_COEFFICIENT = -0.1036
"""Replaces the last one where the trailing edge is to close (common practice, no source)."""

# NACA Report 537 (1935), table I, and NACA Report 610 (1937): where the curvature of the
# camber line ends, and its constants, for a design lift coefficient of 0.3 (first digit 2).
_FIVE_DIGIT: dict[str, tuple[float, ...]] = {
    "1": (0.0580, 361.400),
    "2": (0.1260, 51.640),
    "3": (0.2025, 15.957),
    "4": (0.2900, 6.643),
    "5": (0.3910, 3.230),
}
_FIVE_DIGIT_REFLEX: dict[str, tuple[float, ...]] = {
    "2": (0.1300, 51.990, 0.000764),
    "3": (0.2170, 15.793, 0.00677),
    "4": (0.3180, 6.520, 0.0303),
    "5": (0.4410, 3.191, 0.1355),
}
_PATTERN = re.compile(r"(?:NACA)?[\s-]*(\d{4,5})", re.IGNORECASE)
_ALLOWED = (
    "the digits of a NACA section: four (mpTT; 00TT where there is no camber) or five "
    "(LP0TT with P 1 to 5, or LP1TT reflexed with P 2 to 5, L 1 to 6), thickness TT 01 to 40"
)


@dataclass(frozen=True)
class CamberPolynomial:
    """A camber line of two cubics that meet at one place; chord 1.

    Parameters
    ----------
    joint : float
        Where the two pieces meet. [-] 0 < joint < 1.
    front, rear : tuple of float
        Coefficients of 1, x, x^2, x^3 ahead of and behind the joint. [-]
    """

    joint: float
    front: tuple[float, float, float, float]
    rear: tuple[float, float, float, float]

    def _pick(self, x: ArrayLike, front: tuple[float, ...], rear: tuple[float, ...]) -> FloatArray:
        place = np.asarray(x, dtype=np.float64)
        ahead = np.polynomial.polynomial.polyval(place, np.asarray(front))
        behind = np.polynomial.polynomial.polyval(place, np.asarray(rear))
        return np.asarray(np.where(place < self.joint, ahead, behind), dtype=np.float64)

    def height(self, x: ArrayLike) -> FloatArray:
        """Ordinate of the camber line [-] at `x` (shape kept)."""
        return self._pick(x, self.front, self.rear)

    def slope(self, x: ArrayLike) -> FloatArray:
        """Slope dy/dx of the camber line [-] at `x` (shape kept)."""
        _, f1, f2, f3 = self.front
        _, r1, r2, r3 = self.rear
        return self._pick(x, (f1, 2 * f2, 3 * f3), (r1, 2 * r2, 3 * r3))


@dataclass(frozen=True)
class NacaSection:
    """One section of the four- or five-digit family.

    Parameters
    ----------
    digits : str
        Four or five digits.
    thickness_ratio : float
        Largest thickness over chord. [-]
    camber : CamberPolynomial
        The camber line.
    """

    digits: str
    thickness_ratio: float
    camber: CamberPolynomial

    def half_thickness(self, x: ArrayLike, *, closed: bool = True) -> FloatArray:
        """Half the thickness, laid off perpendicular to the camber line.

        Parameters
        ----------
        x : array_like, shape (...)
            Place along the chord. [-] 0 to 1.
        closed : bool, optional
            Use the last coefficient that brings the trailing edge to a point.

        Returns
        -------
        numpy.ndarray, shape (...)
            [-]

        References
        ----------
        .. [1] E. N. Jacobs, K. E. Ward, R. M. Pinkerton, NACA Report 460, 1933, eq. (1).
        """
        place = np.asarray(x, dtype=np.float64)
        a0, a1, a2, a3, a4 = THICKNESS_COEFFICIENTS
        if closed:
            a4 = CLOSED_LAST_COEFFICIENT
        root = a0 * np.sqrt(place)
        return np.asarray(
            5.0
            * self.thickness_ratio
            * (root + place * (a1 + place * (a2 + place * (a3 + place * a4))))
        )


def naca_digits(name: str) -> str | None:
    """Find the digits in a name such as ``NACA 2412``.

    Parameters
    ----------
    name : str
        A section's name.

    Returns
    -------
    str or None
        Four or five digits, or None where the name is of another kind. Whether such a
        section exists is for :func:`naca_section` to say.
    """
    match = _PATTERN.fullmatch(name.strip())
    return match.group(1) if match else None


def naca_section(name: str) -> NacaSection:
    """Thickness and camber line of a NACA section from its digits.

    Parameters
    ----------
    name : str
        Digits, with or without ``NACA`` before them.

    Returns
    -------
    NacaSection
        The section; its camber line is zero for a symmetric one.

    Raises
    ------
    InputError
        Named ``digits``, if no such section exists or its thickness is not 1 to 40 %.

    References
    ----------
    .. [1] NACA Report 460, 1933, eqs. (1)-(3): four digits.
    .. [2] E. N. Jacobs, R. M. Pinkerton, NACA Report 537, 1935, eqs. (1)-(2) and table I:
       five digits. Equation numbers from memory.
    .. [3] E. N. Jacobs, R. M. Pinkerton, H. Greenberg, NACA Report 610, 1937: reflexed lines.
    .. [4] I. H. Abbott, A. E. von Doenhoff, Theory of Wing Sections, Dover 1959,
       secs. 6.4 and 6.5, eqs. (6.2)-(6.8).
    """
    digits = naca_digits(name)
    if digits is None:
        raise InputError("digits", name, _ALLOWED)
    thickness = int(digits[-2:]) / 100.0
    if not 0.01 <= thickness <= 0.40:
        raise InputError("digits", name, _ALLOWED)
    camber = _four_digit_camber(digits) if len(digits) == 4 else _five_digit_camber(digits)
    if camber is None:
        raise InputError("digits", name, _ALLOWED)
    return NacaSection(digits, thickness, camber)


def _four_digit_camber(digits: str) -> CamberPolynomial | None:
    """Join two parabolas where the camber is largest; NACA Report 460, eqs. (2) and (3)."""
    m, p = int(digits[0]) / 100.0, int(digits[1]) / 10.0
    if (m == 0.0) != (p == 0.0):
        return None
    if m == 0.0:
        return CamberPolynomial(0.5, (0.0, 0.0, 0.0, 0.0), (0.0, 0.0, 0.0, 0.0))
    ahead, behind = m / p**2, m / (1.0 - p) ** 2
    return CamberPolynomial(
        p,
        (0.0, 2.0 * p * ahead, -ahead, 0.0),
        ((1.0 - 2.0 * p) * behind, 2.0 * p * behind, -behind, 0.0),
    )


def _five_digit_camber(digits: str) -> CamberPolynomial | None:
    """Lay a cubic ahead of the joint and a line or a cubic behind it; NACA Reports 537, 610."""
    design, place, reflex = int(digits[0]), digits[1], digits[2]
    tables = {"0": _FIVE_DIGIT, "1": _FIVE_DIGIT_REFLEX}
    table = tables.get(reflex, {})
    if place not in table or not 1 <= design <= 6:
        return None
    m, k1, *rest = table[place]
    ratio = rest[0] if rest else 0.0
    k = k1 * design / 2.0 / 6.0
    if reflex == "0":
        rise = m**3
        front = (0.0, k * m**2 * (3.0 - m), -3.0 * k * m, k)
        return CamberPolynomial(m, front, (k * rise, -k * rise, 0.0, 0.0))
    # Report 610: k/6 [(x-m)^3 - r (1-m)^3 x - m^3 x + m^3], the first term times r behind m.
    tilt = -ratio * (1.0 - m) ** 3 - m**3
    front = (0.0, k * (3.0 * m**2 + tilt), -3.0 * k * m, k)
    rear = (
        k * m**3 * (1.0 - ratio),
        k * (3.0 * ratio * m**2 + tilt),
        -3.0 * k * ratio * m,
        k * ratio,
    )
    return CamberPolynomial(m, front, rear)
