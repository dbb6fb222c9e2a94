"""Records of computed against measured points, and the figures pooled from them."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass, fields

import numpy as np
from numpy.typing import NDArray

FloatArray = NDArray[np.float64]

LOWEST_REYNOLDS = 55_000.0
RANGES = {
    "below 90k": (LOWEST_REYNOLDS, 90e3),
    "90k-170k": (90e3, 170e3),
    "above 170k": (170e3, np.inf),
}
"""Reynolds number ranges, the lower end included."""

DRAG, LIFT, LARGEST_LIFT, CONVERGED = "drag", "lift", "largest lift", "converged"

Record = tuple[str, str, str, float, float, float, float, float]
"""In the order of the fields of :class:`Comparison`."""


@dataclass(frozen=True)
class Figures:
    """Pooled figures; NaN where there is no point. `missed`: asked, but not reached.

    Drag errors are relative, lift errors absolute; bias is computed minus measured.
    """

    drag_points: int
    drag_missed: int
    drag_mean: float
    drag_median: float
    drag_bias: float
    drag_bias_mean: float
    lift_points: int
    lift_missed: int
    lift_bias: float
    lift_bias_median: float
    lift_rms: float
    largest_runs: int
    largest_missed: int
    largest_bias: float
    largest_rms: float
    points: int
    converged: float


@dataclass(frozen=True, eq=False)
class Comparison:
    """One record a point, as arrays of one length.

    Fields
    ------
    section, table, quantity : ndarray of str
        `quantity` is "drag", "lift", "largest lift" or "converged".
    reynolds : ndarray
        Of the run; for "converged" of the computed column [-].
    angle : ndarray
        Of the measured point, or of the computed one for "converged" [rad].
    lift : ndarray
        Measured lift; NaN for "converged" [-].
    measured, computed : ndarray
        The two values; `computed` is NaN where it is not reached [-].
    """

    section: NDArray[np.str_]
    table: NDArray[np.str_]
    quantity: NDArray[np.str_]
    reynolds: FloatArray
    angle: FloatArray
    lift: FloatArray
    measured: FloatArray
    computed: FloatArray

    @classmethod
    def of(cls, records: Iterable[Record]) -> Comparison:
        """Lay records out as arrays."""
        rows = list(zip(*records, strict=True)) or [()] * len(fields(cls))
        section, table, quantity = (np.array(row, dtype=np.str_) for row in rows[:3])
        return cls(section, table, quantity, *(np.array(row, dtype=np.float64) for row in rows[3:]))

    @property
    def error(self) -> FloatArray:
        """Computed minus measured, for drag as a share of the measured [-]."""
        scale = np.where(self.quantity == DRAG, self.measured, 1.0)
        return (self.computed - self.measured) / scale

    def select(self, mask: NDArray[np.bool_]) -> Comparison:
        """Those records where `mask` is true."""
        return Comparison(*(getattr(self, field.name)[mask] for field in fields(self)))

    def part(
        self,
        *,
        sections: Iterable[str] | None = None,
        without: Iterable[str] = (),
        reynolds: tuple[float, float] = (0.0, np.inf),
    ) -> Comparison:
        """Those records of the sections named, in a range of Reynolds numbers."""
        mask = (self.reynolds >= reynolds[0]) & (self.reynolds < reynolds[1])
        mask &= ~np.isin(self.section, list(without))
        if sections is not None:
            mask &= np.isin(self.section, list(sections))
        return self.select(mask)

    def figures(self) -> Figures:
        """Pool all records."""
        error = {name: self.error[self.quantity == name] for name in (DRAG, LIFT, LARGEST_LIFT)}
        count = {name: int(np.count_nonzero(np.isfinite(e))) for name, e in error.items()}
        missed = {name: e.size - count[name] for name, e in error.items()}
        drag, lift, largest = (e[np.isfinite(e)] for e in error.values())
        states = self.computed[self.quantity == CONVERGED]
        return Figures(
            drag_points=count[DRAG],
            drag_missed=missed[DRAG],
            drag_mean=_mean(np.abs(drag)),
            drag_median=_median(np.abs(drag)),
            drag_bias=_median(drag),
            drag_bias_mean=_mean(drag),
            lift_points=count[LIFT],
            lift_missed=missed[LIFT],
            lift_bias=_mean(lift),
            lift_bias_median=_median(lift),
            lift_rms=_mean(lift**2) ** 0.5,
            largest_runs=count[LARGEST_LIFT],
            largest_missed=missed[LARGEST_LIFT],
            largest_bias=_mean(largest),
            largest_rms=_mean(largest**2) ** 0.5,
            points=states.size,
            converged=_mean(states),
        )


def _mean(values: FloatArray) -> float:
    return float(np.mean(values)) if values.size else float("nan")


def _median(values: FloatArray) -> float:
    return float(np.median(values)) if values.size else float("nan")
