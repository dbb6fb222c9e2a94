"""What the aircraft carries, and in what air."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

FloatArray = NDArray[np.float64]


@dataclass(frozen=True, eq=False)
class Load:
    """What the aircraft carries, in what air, balanced where.

    Fields
    ------
    force, balance_x : float or ndarray, shape (...)
        Load factor times weight [N], and balance point behind the wing root's leading
        edge [m]; an array loads or balances each case of a batch by itself.
    density : float
        [kg/m3]
    kinematic_viscosity : float
        [m2/s]

    Notes
    -----
    With density and viscosity 1 the speed is speed over viscosity and the force is
    what the wing itself sees: lift coefficient and Reynolds number decide all else.
    """

    force: float | FloatArray
    density: float
    kinematic_viscosity: float
    balance_x: float | FloatArray

    def case(self, index: int) -> Load:
        """What one case of a batch carries and where it balances.

        Parameters
        ----------
        index : int

        Returns
        -------
        Load
        """
        force, balance = np.asarray(self.force), np.asarray(self.balance_x)
        return replace(
            self,
            force=force[index] if force.ndim else self.force,
            balance_x=balance[index] if balance.ndim else self.balance_x,
        )

    @property
    def forces(self) -> FloatArray:
        """The force as an array, shape (...) [N]."""
        return np.asarray(self.force, dtype=np.float64)

    def area_at(self, speed: FloatArray) -> FloatArray:
        """Lift over dynamic pressure that carries the load at a speed [m2]."""
        return np.asarray(self.forces / (0.5 * self.density * np.square(speed)))

    def speed_at(self, lift_area: FloatArray) -> FloatArray:
        """Speed at which a lift area carries the load [m/s]."""
        return np.asarray(np.sqrt(2.0 * self.forces / (self.density * lift_area)))
