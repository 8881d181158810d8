"""What each spell says: one mean for every column that counts, with the doubt of that mean."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from headledger.plant.job import SpellKind

Array = NDArray[np.float64]


@dataclass(frozen=True, slots=True, kw_only=True)
class SpellMeans:
    """Means over one spell, in SI and in each gauge's own reference.

    Parameters
    ----------
    id : int
    kind : SpellKind
        Still or flowing.
    start_s, end_s : float
        [s since 1970-01-01 UTC]
    samples : int
    reading_pa, noise_pa : ndarray, shape (gauges,)
        nan where a gauge gave nothing; `noise_pa` is the standard deviation of the mean. [Pa]
    flow_m3_s, flow_noise_m3_s : ndarray, shape (runs,)
        nan where no meter gave a flow. [m³/s]
    flow_relative_sd, flow_absolute_sd_m3_s : ndarray, shape (runs,)
        Standard uncertainty of the meter (or of the stated flow). [-], [m³/s]
    level_m, level_sd_m : ndarray, shape (stations,)
        Of surfaces, nan elsewhere. [m]
    temperature_k : float
        [K]
    speed_ratio : ndarray, shape (runs,)
        Of pumps; 0 elsewhere. [-]
    is_open : tuple of bool, length runs
    is_unsure : tuple of bool
        Runs of whose valve it is not known whether it is open: liquid may pass, and by what loss is not known; none by default.
    barometer_pa : float or None
        At the datum in this spell, where it is logged. [Pa absolute]
    run_temperature_k : ndarray, shape (runs,), optional
        Of runs whose liquid has a temperature of its own, nan elsewhere. [K]
    """

    id: int
    kind: SpellKind
    start_s: float
    end_s: float
    samples: int
    reading_pa: Array
    noise_pa: Array
    flow_m3_s: Array
    flow_noise_m3_s: Array
    flow_relative_sd: Array
    flow_absolute_sd_m3_s: Array
    level_m: Array
    level_sd_m: Array
    temperature_k: float
    speed_ratio: Array
    is_open: tuple[bool, ...]
    is_unsure: tuple[bool, ...] = ()
    run_temperature_k: Array | None = None
    barometer_pa: float | None = None

    @property
    def is_still(self) -> bool:
        """Whether nothing flows."""
        return self.kind is SpellKind.STILL
