"""Which section each station has, and its coefficients there."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from solver.section.packed import NOMINAL, PackedPolars, SectionLimits, SectionValues

FloatArray = NDArray[np.float64]
IntArray = NDArray[np.int64]


@dataclass(frozen=True, eq=False)
class StationPolars:
    """Which section each station has: a blend of two of the packed sections.

    Fields
    ------
    packed : PackedPolars
    first, second : ndarray of int, shape (n,)
        Indices into the packed sections.
    weight : ndarray, shape (n,)
        Share of the second, 0 to 1 [-].
    """

    packed: PackedPolars
    first: IntArray
    second: IntArray
    weight: FloatArray

    def evaluate(
        self, angle: FloatArray, reynolds: FloatArray, *, band: ArrayLike = NOMINAL
    ) -> SectionValues:
        """Section coefficients and their slopes at every station.

        Parameters
        ----------
        angle, reynolds : ndarray, shape (..., n)
            [rad], [-]
        band : array_like of int, broadcasts with (..., n)
            End of the confidence band.

        Returns
        -------
        SectionValues
        """
        values = self.packed.evaluate(angle, reynolds, band=band, section=self.first)
        if not np.any(self.weight):
            return values
        other = self.packed.evaluate(angle, reynolds, band=band, section=self.second)
        w = self.weight
        return SectionValues(
            *((1.0 - w) * a + w * b for a, b in zip(_fields(values), _fields(other), strict=True))
        )

    def limits(self, reynolds: FloatArray, *, band: ArrayLike = NOMINAL) -> SectionLimits:
        """Largest lift and its angles at every station's Reynolds number.

        Parameters
        ----------
        reynolds : ndarray, shape (..., n)
            [-]
        band : array_like of int, broadcasts with (..., n)

        Returns
        -------
        SectionLimits
        """
        limits = self.packed.limits(reynolds, band=band, section=self.first)
        if not np.any(self.weight):
            return limits
        other = self.packed.limits(reynolds, band=band, section=self.second)
        w = self.weight
        return SectionLimits(
            *((1.0 - w) * a + w * b for a, b in zip(_fields(limits), _fields(other), strict=True))
        )

    def trust(self, angle: FloatArray, reynolds: FloatArray) -> NDArray[np.uint8]:
        """Trust code at every station, the worse of the two sections blended.

        Parameters
        ----------
        angle, reynolds : ndarray, shape (..., n)
            [rad], [-]

        Returns
        -------
        ndarray of uint8, shape (..., n)
            0 valid, 1 extrapolated, 2 beyond stall.
        """
        codes = self.packed.trust(angle, reynolds, section=self.first)
        if not np.any(self.weight):
            return codes
        return np.maximum(codes, self.packed.trust(angle, reynolds, section=self.second))


def _fields(values: SectionValues | SectionLimits) -> tuple[FloatArray, ...]:
    return tuple(getattr(values, name) for name in values.__dataclass_fields__)
