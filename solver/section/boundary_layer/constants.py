"""The constants of the boundary layer's equations that are not taken as they were published."""

from __future__ import annotations

from dataclasses import astuple, dataclass

import numpy as np
from numpy.typing import NDArray

(
    SEPARATED_GROWTH,
    GROWTH_FROM_H,
    GROWTH_TO_H,
    DISSIPATION_RISE,
    DISSIPATION_FROM_H,
    DISSIPATION_SPAN,
    INITIAL_STRESS,
    LAG,
    EQUILIBRIUM,
    INNER_LAYER,
    WAKE_CURVATURE,
    WALL_CURVATURE,
    WAKE_SMOOTHING,
    RELAXING,
) = range(14)
"""Places of the fields below in the kernels' array."""


@dataclass(frozen=True)
class ClosureConstants:
    """One set for all sections, in the order in which the kernels read them.

    Fields
    ------
    separated_growth : float
        Share of the envelope's growth rate in separated laminar layers, a stand-in
        for following separate frequencies. Set by comparison. [-]
    growth_from_h, growth_to_h : float
        Shape parameters between which that share comes in. Set by trial. [-]
    dissipation_rise : float
        Turbulent dissipation is 1 + rise * span * (1 - exp(-(H - from_h)/span)) times
        the published one above `dissipation_from_h`. Set by comparison. [-]
    dissipation_from_h, dissipation_span : float
        Set by comparison. [-]
    initial_stress : float
        Shear stress at transition over that of equilibrium. Published [1]_. [-]
    lag : float
        Rate at which shear stress follows equilibrium. Published [1]_, [2]_. [-]
    equilibrium : float
        Of shear stress in equilibrium. Published [1]_. [-]
    inner_layer : float
        What the viscous inner layer takes from H - 1 in the equilibrium stress, times
        Rt: the equilibrium relation belongs to the outer layer. Set by comparison. [-]
    wake_curvature : float
        Share of the pressure jump across a curved wake that is kept; 1 is the
        published form [3]_, 0 leaves it out. [-]
    wall_curvature : float
        The same for the pressure gradient across the layer at a curved wall. [-]
    wake_smoothing : float
        Length over which the wake's curvature is taken, each way, in sums of its
        displacement and momentum thickness. Set by trial: below 0.6 the curvature
        that the sheet itself causes grows without bound. [-]
    relaxing : float
        Length over which the energy shape parameter of turbulent layers relaxes, in
        momentum thicknesses: a matter of the difference equations, not of physics. [-]

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

    separated_growth: float = 0.74
    growth_from_h: float = 3.5
    growth_to_h: float = 4.5
    dissipation_rise: float = 0.3
    dissipation_from_h: float = 1.8
    dissipation_span: float = 1.0
    initial_stress: float = 0.7
    lag: float = 4.2
    equilibrium: float = 0.015
    inner_layer: float = 18.0
    wake_curvature: float = 1.0
    wall_curvature: float = 1.0
    wake_smoothing: float = 1.0
    relaxing: float = 5.0

    def as_array(self) -> NDArray[np.float64]:
        """Lay the constants out as the kernels take them.

        Returns
        -------
        numpy.ndarray, shape (14,)
            The fields in their order.
        """
        return np.array(astuple(self))
