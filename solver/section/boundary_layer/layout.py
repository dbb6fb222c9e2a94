"""Arrays of the kernels, grouped; and where in them things stand.

n is the number of nodes of the body, w that of stations in the wake. A station's
state is (ln theta, ln dstar, ln ue, a), with a = ln S, S the square root of the
shear stress coefficient, in turbulent layers and a = n, the amplification factor, in
laminar ones. Lengths are over chord, speeds over that of the free stream.
"""

from __future__ import annotations

from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

FloatArray = NDArray[np.float64]
IntArray = NDArray[np.int64]
BoolArray = NDArray[np.bool_]

LN_THETA, LN_DSTAR, LN_SPEED, LAST, PLACE = range(5)
"""Columns of a state, of which slopes have one more: the place along the surface."""

LN_ENERGY, FRICTION, GAIN, RATE, LN_EQUILIBRIUM, LN_THICKNESS = range(6)
"""Rows of what a station yields: ln Hs; xi cf/(2 theta); xi (2 CD/Hs - cf/2)/theta;
da/dxi; and in turbulent layers ln S in equilibrium and ln delta."""

MOMENTUM, SHAPE, THIRD = range(3)
"""Rows of a cell's equations, the third of them growth or lag."""


class Sloped(NamedTuple):
    """A quantity of a station with its slopes over H and ln Rt."""

    value: float
    over_h: float
    over_rt: float


class Regime(NamedTuple):
    """What all cells of a flow have in common.

    Fields
    ------
    reynolds : float
        On chord and the free stream. [-]
    critical : float
        Amplification factor at which the flow turns turbulent. [-]
    constants : numpy.ndarray, shape (14,)
        See :class:`~solver.section.boundary_layer.constants.ClosureConstants`.
    """

    reynolds: float
    critical: float
    constants: FloatArray


class Pair(NamedTuple):
    """The two stations of a cell.

    Fields
    ------
    one, two : numpy.ndarray, shape (4,)
        States.
    xi : numpy.ndarray, shape (2,)
        Places along the surface, from the stagnation point. [-]
    """

    one: FloatArray
    two: FloatArray
    xi: FloatArray


class Quantities(NamedTuple):
    """What the equations of a cell are made of, at both of its stations.

    Fields
    ------
    value : numpy.ndarray, shape (2, 6)
    slope : numpy.ndarray, shape (2, 6, 5)
        Over the state and the place of the same station.
    cross : numpy.ndarray, shape (2,)
        Slopes of the growth at station two over ln theta and ln dstar of station one.
    """

    value: FloatArray
    slope: FloatArray
    cross: FloatArray


class Equations(NamedTuple):
    """Residuals of a cell with their slopes over the states and places of both stations.

    Fields
    ------
    residual : numpy.ndarray, shape (3,)
    first, second : numpy.ndarray, shape (3, 5)
    """

    residual: FloatArray
    first: FloatArray
    second: FloatArray


class CellArrays(NamedTuple):
    """Arrays that any cell fills.

    Fields
    ------
    quantities : Quantities
    equations : Equations
        The result.
    """

    quantities: Quantities
    equations: Equations


class Blend(NamedTuple):
    """Arrays that a cell with transition fills besides.

    Fields
    ------
    laminar : Equations
        Its laminar ones.
    share_first, share_second : numpy.ndarray, shape (5,)
        Slopes of its turbulent share over the states and places of both stations.
    guess : numpy.ndarray, shape (4,)
        Its first station, were it turbulent.
    """

    laminar: Equations
    share_first: FloatArray
    share_second: FloatArray
    guess: FloatArray


class Scratch(NamedTuple):
    """Arrays that cells fill, made once for all of them.

    Two groups, since every array that a function is given costs it a little.
    """

    cell: CellArrays
    blend: Blend


class Stations(NamedTuple):
    """Where body and wake have stations.

    Fields
    ------
    arc : numpy.ndarray, shape (n,)
        Along the surface, once round from the trailing edge over the upper side. [-]
    distance : numpy.ndarray, shape (w + 1,)
        Along the wake, from the trailing edge. [-]
    """

    arc: FloatArray
    distance: FloatArray


class Stagnation(NamedTuple):
    """The node before the stagnation point, and where that lies along the surface."""

    node: int
    arc: float


class Linear(NamedTuple):
    """A speed of the potential flow: base + defect @ m + sheet @ gamma.

    Fields
    ------
    base : numpy.ndarray, shape (k,)
        Without boundary layers. [-]
    defect : numpy.ndarray, shape (k, n + w)
        For the mass defects m = ue dstar, negative on the upper side, where the flow
        runs against the nodes.
    sheet : numpy.ndarray, shape (k, w + 1)
        For the vortex sheet gamma of a curved wake.
    """

    base: FloatArray
    defect: FloatArray
    sheet: FloatArray


class PotentialFlow(NamedTuple):
    """The potential flow at one angle.

    Fields
    ------
    along : Linear
        Speeds along body and wake, k = n + w.
    across : Linear
        Speeds across the wake's panels midway, k = w.
    path : numpy.ndarray, shape (w,)
        Direction of those panels. [rad]
    """

    along: Linear
    across: Linear
    path: FloatArray


class LayerState(NamedTuple):
    """The layers of a point while it is iterated; the kernels write into its arrays.

    Fields
    ------
    stations : numpy.ndarray, shape (n + w, 4)
        (ln theta, ln dstar, ln ue, ln S) of body and wake.
    amplification : numpy.ndarray, shape (n,)
        n, kept where the flow is turbulent. [-]
    turbulent_from : numpy.ndarray of int, shape (2,)
        First turbulent node of the upper and the lower side, -1 where there is none.
    place : numpy.ndarray, shape (2,)
        Node before the stagnation point, and its arc length.
    sheet : numpy.ndarray, shape (w + 1,)
        Strength of the wake's vortex sheet for each unit of mass defect.
    share : numpy.ndarray, shape (2,)
        Turbulent share of the cells with transition. [-]
    laminar : numpy.ndarray of bool, shape (n + w,)
        False in the wake.
    """

    stations: FloatArray
    amplification: FloatArray
    turbulent_from: IntArray
    place: FloatArray
    sheet: FloatArray
    share: FloatArray
    laminar: BoolArray

    def copy(self) -> LayerState:
        """Return the same state in arrays of its own."""
        return LayerState(
            self.stations.copy(),
            self.amplification.copy(),
            self.turbulent_from.copy(),
            self.place.copy(),
            self.sheet.copy(),
            self.share.copy(),
            self.laminar.copy(),
        )


def blank_state(body: int, wake: int) -> LayerState:
    """Make the arrays of a state.

    Parameters
    ----------
    body, wake : int
        Numbers n and w of stations.

    Returns
    -------
    LayerState
        All zero, and laminar nowhere.
    """
    total = body + wake
    return LayerState(
        stations=np.zeros((total, 4)),
        amplification=np.zeros(body),
        turbulent_from=np.full(2, -1),
        place=np.zeros(2),
        sheet=np.zeros(wake + 1),
        share=np.zeros(2),
        laminar=np.zeros(total, dtype=np.bool_),
    )


class March(NamedTuple):
    """What marches leave for Newton's system: how changes depend on its unknowns.

    The unknowns are the changes of all mass defects and of the stagnation point's place;
    a last column holds the constants.

    Fields
    ------
    cells : numpy.ndarray, shape (n + w, 3, 7)
        Changes of (ln theta, ln ue, a) at a station, over those at the one before it,
        both mass defects and the shift of the stagnation point, and the constant.
    speeds : numpy.ndarray, shape (n + w, n + w + 2)
        Change of ln ue at every station.
    ends : numpy.ndarray, shape (2, 3, n + w + 2)
        Changes at the trailing edge of either side.
    first : numpy.ndarray, shape (3, n + w + 2)
        Changes at the first station of the wake, but for what `cells` has of its own
        mass defect and constant.
    """

    cells: FloatArray
    speeds: FloatArray
    ends: FloatArray
    first: FloatArray
