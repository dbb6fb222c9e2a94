"""The constants of the second residual, as the compiled kernels take them."""

from __future__ import annotations

import numpy as np

from solver.section.boundary_layer import closures as kernels
from tests.solver.section import second_closures, second_residual
from tests.solver.section.second_closures import Closures

CHOSEN = Closures(ramp="smooth", falling="before")
"""What the kernels are made to do."""


def constants() -> np.ndarray:
    """Lay out the constants of `CHOSEN` for the kernels."""
    values = np.zeros(16)
    values[kernels.SEPARATED_GROWTH] = CHOSEN.separated_growth
    values[kernels.GROWTH_FROM_H], values[kernels.GROWTH_TO_H] = 3.5, 4.5
    values[kernels.DISSIPATION_RISE] = CHOSEN.extra_dissipation
    values[kernels.DISSIPATION_FROM_H] = 2.5
    values[kernels.INITIAL_STRESS] = second_closures.INITIAL_SHEAR
    values[kernels.LAG] = second_residual.LAG_CONSTANT
    values[kernels.EQUILIBRIUM] = 0.015
    return values
