"""Drag of a section that was never measured: friction, laminar bubbles, lift and stall.

The fitted constants were found once from the drag tables of twelve sections
together (UIUC, Summary of Low-Speed Airfoil Data, vols. 1-3; SoarTech 8; and
NREL/SR-500-34515, Reynolds numbers 40,000 to 500,000), none from one section.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from solver.section.estimated_lift import SectionShape

FloatArray = NDArray[np.float64]

BUBBLE_REYNOLDS = 5e4
"""Reynolds number of the distance from laminar separation to reattachment [-]: Carmichael,
NASA CR-165803, 1981, and Lissaman, Ann. Rev. Fluid Mech. 15, 1983; read second-hand."""


@dataclass(frozen=True)
class DragRule:
    """Constants of the drag rule, the same for every section.

    Fields
    ------
    laminar_run : float
        Laminar flow on each surface before it separates, over chord [-].
    bubble_length : float
        Length of a bubble over that of BUBBLE_REYNOLDS [-].
    bubble_drag : float
        Drag of a bubble of one chord that has to raise the pressure coefficient by 1 [-].
    pressure_exponent : float
        How that grows with the rise in pressure [-].
    lift_drag : float
        Of the square of the lift less the ideal lift [-].
    """

    laminar_run: float = 0.79
    bubble_length: float = 0.263
    bubble_drag: float = 0.118
    pressure_exponent: float = 1.66
    lift_drag: float = 0.0176


DRAG_RULE = DragRule()


def plate_friction(reynolds: ArrayLike, *, transition: ArrayLike) -> FloatArray:
    r"""Friction of one side of a flat plate, laminar and then turbulent.

    Parameters
    ----------
    reynolds : array_like
        Of the whole length [-] > 0.
    transition : array_like
        Where the flow turns turbulent, over the length [-]. 1 and more: nowhere.

    Returns
    -------
    numpy.ndarray
        On the area of that side [-].

    Notes
    -----
    .. math::
       c_{lam} = 1.328/\sqrt{Re}, \quad c_{turb} = 0.455/(\log_{10} Re)^{2.58}, \quad
       c = c_{turb}(Re) - x \left[c_{turb}(x Re) - c_{lam}(x Re)\right]

    References
    ----------
    .. [1] H. Schlichting, Boundary-Layer Theory, 7th ed., McGraw-Hill 1979: eq. (7.34)
       Blasius; eq. (21.16) Prandtl and Schlichting; sec. XXI.a.3, Prandtl's composition
       of the two. Equation numbers from memory.
    """
    whole = np.asarray(reynolds, dtype=np.float64)
    share = np.clip(np.asarray(transition, dtype=np.float64), 1e-3, 1.0)
    ahead = share * whole

    def laminar(number: FloatArray) -> FloatArray:
        return np.asarray(1.328 / np.sqrt(number))

    def turbulent(number: FloatArray) -> FloatArray:
        return np.asarray(0.455 / np.log10(np.maximum(number, 10.0)) ** 2.58)

    return np.asarray(turbulent(whole) - share * (turbulent(ahead) - laminar(ahead)))


def form_factor(thickness: ArrayLike) -> FloatArray:
    r"""Drag of a thin body over the friction of a plate.

    Parameters
    ----------
    thickness : array_like
        Over chord [-].

    Returns
    -------
    numpy.ndarray
        :math:`1 + 2 t + 60 t^4` [-].

    References
    ----------
    .. [1] S. F. Hoerner, Fluid-Dynamic Drag, 1965, ch. VI, eq. (6). From memory.
    """
    ratio = np.asarray(thickness, dtype=np.float64)
    return np.asarray(1.0 + 2.0 * ratio + 60.0 * ratio**4)


def attached_drag(
    lift: ArrayLike, shape: SectionShape, reynolds: ArrayLike, *, rule: DragRule = DRAG_RULE
) -> FloatArray:
    r"""Drag of a section before it stalls.

    Parameters
    ----------
    lift : array_like
        [-]
    shape : SectionShape
        Any shape that broadcasts.
    reynolds : array_like
        [-] > 0. Fitted from 40,000 to 500,000.
    rule : DragRule, optional
        Its constants.

    Returns
    -------
    numpy.ndarray
        [-]

    Notes
    -----
    On each surface a laminar run, a bubble of length l = L 50000/Re that ends it, and
    turbulent flow to the trailing edge. The bubble costs
    :math:`k \min(l, 1 - x_s) (q^2 - 1)^m`, the pressure that must be recovered taken from
    the speed :math:`q = 1 + t \pm c_l/4` of thickness and lift on that surface. Lift away
    from the ideal one adds :math:`k_2 (c_l - c_{l,i})^2`.
    """
    cl = np.asarray(lift, dtype=np.float64)
    thickness = np.asarray(shape.thickness, dtype=np.float64)
    length = rule.bubble_length * BUBBLE_REYNOLDS / np.asarray(reynolds, dtype=np.float64)
    friction = plate_friction(reynolds, transition=rule.laminar_run + length)
    drag = 2.0 * friction * form_factor(thickness)
    covered = np.minimum(length, 1.0 - rule.laminar_run)
    for side in (1.0, -1.0):
        speed = 1.0 + thickness + side * 0.25 * cl
        rise = np.maximum(speed**2 - 1.0, 0.0)
        drag = drag + rule.bubble_drag * covered * rise**rule.pressure_exponent
    return np.asarray(drag + rule.lift_drag * (cl - np.asarray(shape.ideal_lift)) ** 2)
