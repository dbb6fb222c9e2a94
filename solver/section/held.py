"""The counterfactual: the same sections, were their Reynolds number high.

A fourth end of the band beside low, nominal and high: the nominal curves, with lift
and its limits at every Reynolds number those of the highest in the section's table.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace
from typing import Final

import numpy as np
from numpy.typing import NDArray

from solver.section.packed import HIGH, NOMINAL, PackedPolars, pack_polars
from solver.section.polar import Polar

FloatArray = NDArray[np.float64]

HELD: Final = HIGH + 1
"""Index of the counterfactual behind the ends of the confidence band."""


def pack_with_held(
    polars: Sequence[Polar], *, drag_factor: float = 1.0, largest_lift_debit: float = 0.0
) -> PackedPolars:
    """Pack sections with the counterfactual as a fourth end of the band.

    Parameters
    ----------
    polars : sequence of Polar
    drag_factor, largest_lift_debit : float
        As for :func:`solver.section.packed.pack_polars`.

    Returns
    -------
    PackedPolars
        Whose band index runs to :data:`HELD`.

    Raises
    ------
    InputError
        As for :func:`solver.section.packed.pack_polars`.
    """
    plain, held = (
        pack_polars(
            polars,
            drag_factor=drag_factor,
            largest_lift_debit=largest_lift_debit,
            hold_at_reynolds=hold,
        )
        for hold in (None, np.inf)
    )
    size = plain.cells.shape[0] // (HIGH + 1)

    def joined(name: str) -> FloatArray:
        one = slice(NOMINAL, NOMINAL + 1)
        return np.concatenate([getattr(plain, name), getattr(held, name)[one]])

    return replace(
        plain,
        cells=np.concatenate([plain.cells, held.cells[NOMINAL * size : (NOMINAL + 1) * size]]),
        limit_lines=joined("limit_lines"),
        largest_lift=joined("largest_lift"),
        knee_angle=joined("knee_angle"),
        peak_angle=joined("peak_angle"),
        zero_lift_angle=joined("zero_lift_angle"),
    )
