"""The constants of the second residual, as the compiled kernels take them."""

from __future__ import annotations

import numpy as np

from solver.section.boundary_layer.constants import ClosureConstants
from tests.solver.section import second_residual
from tests.solver.section.second_closures import EQUILIBRIUM, INITIAL_SHEAR, Closures

CHOSEN = Closures()
"""What the kernels are made to do."""


def chosen_constants() -> ClosureConstants:
    """Name the constants of `CHOSEN` as the kernels do; the coupling's are left alone."""
    return ClosureConstants(
        separated_growth=CHOSEN.separated_growth,
        growth_from_h=3.5,
        growth_to_h=4.5,
        dissipation_rise=CHOSEN.dissipation_rise,
        dissipation_from_h=CHOSEN.dissipation_from,
        dissipation_span=CHOSEN.dissipation_span,
        initial_stress=INITIAL_SHEAR,
        lag=second_residual.LAG_CONSTANT,
        equilibrium=EQUILIBRIUM,
        inner_layer=CHOSEN.inner_layer,
        relaxing=CHOSEN.relaxing,
    )


def constants() -> np.ndarray:
    """Lay the constants of `CHOSEN` out for the kernels."""
    return chosen_constants().as_array()
