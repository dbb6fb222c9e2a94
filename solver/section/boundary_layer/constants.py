"""The constants of the boundary layer's equations that are not taken as they were published."""

from __future__ import annotations

from dataclasses import astuple, dataclass

import numpy as np
from numpy.typing import NDArray

PLACES = 16
"""Of the kernels' array; those without a field are zero."""


@dataclass(frozen=True)
class ClosureConstants:
    """One set for all sections, in the order in which the kernels read them.

    Fields
    ------
    separated_growth : float
        Share of the envelope's growth rate in separated laminar layers, a stand-in
        for following separate frequencies. Set by comparison. [-]
    growth_from_h, growth_to_h : float
        Shape parameters between which that share comes in. Set by comparison. [-]
    dissipation_rise : float
        Turbulent dissipation grows by this share for each unit of the shape
        parameter above `dissipation_from_h`. Set by comparison. [-]
    dissipation_from_h : float
        Set by comparison. [-]
    initial_stress : float
        Shear stress at transition over that of equilibrium. Published [1]_. [-]
    lag : float
        Rate at which shear stress follows equilibrium. Published [1]_, [2]_. [-]
    equilibrium : float
        Of shear stress in equilibrium. Published [1]_. [-]
    wake_curvature : float
        Share of the pressure jump across a curved wake that is kept; 1 is the
        published form [3]_, 0 leaves it out. [-]
    wall_curvature : float
        The same for the pressure gradient across the layer at a curved wall. [-]
    wake_smoothing : float
        Length over which the wake's curvature is taken, each way, in sums of its
        displacement and momentum thickness. Set by trial. [-]

    References
    ----------
    .. [1] M. Drela, M. B. Giles, Viscous-inviscid analysis of transonic and low
       Reynolds number airfoils, AIAA Journal 25(10), 1987.
    .. [2] J. E. Green, D. J. Weeks, J. W. F. Brooman, Prediction of turbulent boundary
       layers and wakes in compressible flow by a lag-entrainment method, ARC R&M 3791,
       1973.
    .. [3] R. C. Lock, M. C. P. Firmin, Survey of techniques for estimating viscous
       effects in external aerodynamics, in: Numerical Methods in Aeronautical Fluid
       Dynamics, Academic Press, 1982.
    """

    separated_growth: float = 0.6
    growth_from_h: float = 3.5
    growth_to_h: float = 4.5
    dissipation_rise: float = 0.1
    dissipation_from_h: float = 2.5
    initial_stress: float = 0.7
    lag: float = 4.2
    equilibrium: float = 0.015
    wake_curvature: float = 1.0
    wall_curvature: float = 1.0
    wake_smoothing: float = 2.0

    def as_array(self) -> NDArray[np.float64]:
        """Lay the constants out as the kernels take them.

        Returns
        -------
        numpy.ndarray, shape (PLACES,)
            The fields in their order, then zeros.
        """
        values = np.zeros(PLACES)
        given = astuple(self)
        values[: len(given)] = given
        return values
