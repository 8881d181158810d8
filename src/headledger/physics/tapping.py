"""From the energy line at the stations to what perfect instruments tapped there would read.

Heads are metres of the flowing liquid above the job's datum; pressures of heads are taken against the barometer at the datum, so a tap's
absolute pressure is its head pressure plus that barometer.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]

AIR_WEIGHT_PA_M = 12.0
"""Fall of the barometer with height near the ground: the weight of air of about 1.2 kg/m³. [Pa/m]"""


@dataclass(frozen=True, slots=True, kw_only=True)
class Taps:
    """How the readings of all instruments follow from heads and velocities: ``ρ g (H E − z) − V ½ρv² + c``.

    Parameters
    ----------
    head : ndarray, shape (gauges, stations)
        ``H``: 1 at the (high) tap, −1 at a low tap. [-]
    velocity : ndarray, shape (gauges, runs)
        ``V``: 1 at the run on whose bore the (high) tap sits, −1 at the low tap's. [-]
    column_m : ndarray, shape (gauges,)
        ``z``: elevation down to which the flowing liquid's own column counts. [m]
    constant_pa : ndarray, shape (gauges,)
        ``c``: what does not depend on the flowing liquid: an own fill's column, air around a vented instrument, an absolute
        or sealed reference. [Pa]
    """

    head: Array
    velocity: Array
    column_m: Array
    constant_pa: Array

    def readings_pa(self, head_m: Array, velocity_pa: Array, *, density_kg_m3: float, gravity_m_s2: float) -> Array:
        """What perfect instruments would read, each in its own reference.

        Parameters
        ----------
        head_m : ndarray, shape (stations,)
            Total heads. [m]
        velocity_pa : ndarray, shape (runs,)
            Velocity pressure ½ρv² in each run. [Pa]
        density_kg_m3, gravity_m_s2 : float
            [kg/m³], [m/s²]

        Returns
        -------
        ndarray, shape (gauges,)
            [Pa]

        Notes
        -----
        Static pressure at a tap is total less velocity pressure (Bernoulli); a leg adds ρ_leg g (z_tap − z_instrument).
        """
        column = density_kg_m3 * gravity_m_s2 * (self.head @ head_m - self.column_m)
        return np.asarray(column - self.velocity @ velocity_pa + self.constant_pa)
