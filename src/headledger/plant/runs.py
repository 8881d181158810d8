"""Runs: pipe and equipment between two stations."""

from __future__ import annotations

import math
from dataclasses import dataclass
from enum import StrEnum

from headledger.quantities import Unit


class LossKind(StrEnum):
    """Whether a run's loss follows from its description or is unknown in every spell."""

    FIXED = "fixed"
    FREE = "free"


class RunState(StrEnum):
    """Whether liquid can pass a run; `COLUMN` when a log column says."""

    OPEN = "open"
    CLOSED = "closed"
    COLUMN = "column"


@dataclass(frozen=True, slots=True, kw_only=True)
class Doubt:
    """Standard uncertainty of a measured value: a part that grows with it and a part that does not.

    Parameters
    ----------
    relative_fraction : float
        Of the value. [-]
    absolute : float
        In the SI unit of the value.
    """

    relative_fraction: float = 0.0
    absolute: float = 0.0


@dataclass(frozen=True, slots=True, kw_only=True)
class PumpCurve:
    """Lift of a pump at its curve speed: the pairs as given, fitted by a line or a quadratic in flow.

    Parameters
    ----------
    flow_m3_s, head_m : tuple of float
        At least two pairs. [m³/s], [m]
    """

    flow_m3_s: tuple[float, ...]
    head_m: tuple[float, ...]


@dataclass(frozen=True, slots=True, kw_only=True)
class Run:
    """Pipe and equipment from station `start` to station `end`; flow is positive in that direction.

    Parameters
    ----------
    name, start, end : str
    length_m, bore_m : float
        [m]
    roughness_m : float or None
        Absolute roughness for Darcy–Weisbach with Colebrook–White; None where Hazen–Williams is used. [m]
    hazen_williams_c : float or None
        [-]
    fittings_k : float
        Sum of loss coefficients on this bore's velocity head. [-]
    valve_kv_m3_s : float or None
        Flow of water (1000 kg/m³) that loses 1 bar across the installed valve. [m³/s]
    rated_drop_pa, rated_flow_m3_s : float or None
        Of installed equipment, with the job's own liquid. [Pa], [m³/s]
    loss : LossKind
    loss_sd_fraction : float
        Standard uncertainty of the run's whole loss (or of its pump's lift), as a fraction. [-]
    item : str
        What is installed: strainer, valve, exchanger, check valve, pump, ….
    pump : PumpCurve or None
    speed_column : str or None
        Log column of relative pump speed.
    flow_column, flow_unit : str or None, Unit or None
        Log column that measures this run's flow.
    flow_kvs_m3_s : float or None
        Where the flow column is a differential pressure over a metering valve: its flow at 1 bar, 1000 kg/m³. [m³/s]
    flow_doubt : Doubt
        Standard uncertainty of the meter. [-], [m³/s]
    temperature_k : float or None
        Of the liquid in this run, where it differs from the job's. [K]
    temperature_column, temperature_unit : str or None, Unit or None
    rating_pa : float or None
        Highest gauge pressure allowed. [Pa]
    state : RunState
    state_column : str or None
        Log column that is 1 when the run is open.
    """

    name: str
    start: str
    end: str
    bore_m: float
    length_m: float = 0.0
    roughness_m: float | None = None
    hazen_williams_c: float | None = None
    fittings_k: float = 0.0
    valve_kv_m3_s: float | None = None
    rated_drop_pa: float | None = None
    rated_flow_m3_s: float | None = None
    loss: LossKind = LossKind.FIXED
    loss_sd_fraction: float = 0.075
    item: str = ""
    pump: PumpCurve | None = None
    speed_column: str | None = None
    flow_column: str | None = None
    flow_unit: Unit | None = None
    flow_kvs_m3_s: float | None = None
    flow_doubt: Doubt = Doubt(relative_fraction=0.01)
    temperature_k: float | None = None
    temperature_column: str | None = None
    temperature_unit: Unit | None = None
    rating_pa: float | None = None
    state: RunState = RunState.OPEN
    state_column: str | None = None

    @property
    def area_m2(self) -> float:
        """Cross-section of the bore. [m²]"""
        return math.pi * self.bore_m**2 / 4.0

    @property
    def is_check_valve(self) -> bool:
        """Whether it lets liquid pass forwards alone."""
        return "check valve" in self.item.casefold() or "non-return" in self.item.casefold()

    @property
    def lifts_unknown(self) -> bool:
        """Whether a pump without a curve stands here: what it adds while liquid moves is not known."""
        return self.pump is None and "pump" in self.item.casefold()

    @property
    def is_pump(self) -> bool:
        """Whether a pump's curve is installed here."""
        return self.pump is not None
