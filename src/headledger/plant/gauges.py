"""Gauges and transmitters: where each hangs, what fills its leg, and how well it is meant to read."""

from __future__ import annotations

from dataclasses import dataclass
from datetime import datetime
from enum import StrEnum

from headledger.quantities import Unit


class LegFill(StrEnum):
    """What fills the line between tap and instrument."""

    PROCESS = "process"
    DRY = "dry"
    OWN = "own fill"


@dataclass(frozen=True, slots=True, kw_only=True)
class Leg:
    """The line between tap and instrument.

    Parameters
    ----------
    fill : LegFill
    density_kg_m3 : float or None
        Of an own fill. [kg/m³]
    """

    fill: LegFill = LegFill.PROCESS
    density_kg_m3: float | None = None


@dataclass(frozen=True, slots=True, kw_only=True)
class ErrorLimit:
    """A stated limit of error, the sum of its parts.

    Parameters
    ----------
    limit_pa : float
        Constant part: a percentage of span, or a pressure; of a graded class the limit in the middle half of the range. [Pa]
    outer_limit_pa : float
        The same in the first and last quarter of the range; equal to `limit_pa` unless the class is graded (ASME B40.100). [Pa]
    reading_fraction : float
        Part that grows with the reading. [-]
    text : str
        As written, for the sheet.

    Notes
    -----
    The 25 % and 75 % points of a graded range belong to its middle half.
    """

    limit_pa: float = 0.0
    outer_limit_pa: float = 0.0
    reading_fraction: float = 0.0
    text: str = ""

    def at(self, reading_pa: float, low_pa: float, high_pa: float) -> float:
        """Limit of error at a reading of a range from `low_pa` to `high_pa`. [Pa]"""
        quarter = (high_pa - low_pa) / 4.0
        inside = low_pa + quarter <= reading_pa <= high_pa - quarter
        return (self.limit_pa if inside else self.outer_limit_pa) + self.reading_fraction * abs(reading_pa)


class Signal(StrEnum):
    """What the log holds in place of the gauge's own unit; spread over its range."""

    OWN_UNIT = "unit"
    MILLIAMPERE = "4-20 mA"
    MILLIAMPERE_ROOT = "4-20 mA root"
    VOLT_1_5 = "1-5 V"
    VOLT_0_10 = "0-10 V"
    PERCENT = "%"


@dataclass(frozen=True, slots=True, kw_only=True)
class Gauge:
    """One instrument as the job describes it. All pressures are in its own reference (gauge, absolute or difference).

    Parameters
    ----------
    tag, station : str
    low_station : str or None
        Makes it a differential gauge.
    run : str
        The run on whose bore the (high) tap sits; resolved by the reader.
    elevation_m : float or None
        Of the sensing element; None where it is taken to be the station's. [m]
    elevation_sd_m : float
        Standard uncertainty of it; of no use where `elevation_m` is None. [m]
    leg : Leg
    corrected_to_m : float or None
        Elevation to which the logged value is already corrected; the tap's where `corrected_to_tap`. [m]
    corrected_to_tap : bool
    unit : Unit
    sealed_pa : float or None
        Absolute pressure sealed in behind a gauge reference; None for a vented one. [Pa]
    range_low_pa, range_high_pa : float
        [Pa]
    signal : Signal
    accuracy, tolerance : ErrorLimit
        What is known beforehand, and the pass/fail limit.
    temperature_effect_per_k : float or None
        Of span. [1/K]
    correction_pa : float
        Of its certificate, added to every reading. [Pa]
    calibration_sd_pa : float or None
        Standard uncertainty that replaces the accuracy as what is known beforehand. [Pa]
    division_pa : float
        Smallest step of what is recorded. [Pa]
    damping_s : float
        Time constant. [s]
    column : str
        Log column.
    serial : str
        Rows of one serial are one instrument.
    hung_from, hung_until : datetime or None
        When it hung there.
    certificate, calibrated, due : str
        Printed on the sheet.
    """

    tag: str
    station: str
    run: str
    unit: Unit
    range_low_pa: float
    range_high_pa: float
    accuracy: ErrorLimit
    tolerance: ErrorLimit
    column: str
    low_station: str | None = None
    elevation_m: float | None = None
    elevation_sd_m: float = 0.025
    leg: Leg = Leg()
    corrected_to_m: float | None = None
    corrected_to_tap: bool = False
    sealed_pa: float | None = None
    signal: Signal = Signal.OWN_UNIT
    temperature_effect_per_k: float | None = None
    correction_pa: float = 0.0
    calibration_sd_pa: float | None = None
    division_pa: float = 0.0
    damping_s: float = 0.0
    serial: str = ""
    hung_from: datetime | None = None
    hung_until: datetime | None = None
    certificate: str = ""
    calibrated: str = ""
    due: str = ""

    @property
    def span_pa(self) -> float:
        """Width of the range. [Pa]"""
        return self.range_high_pa - self.range_low_pa

    @property
    def is_differential(self) -> bool:
        """Whether it reads the difference of two taps."""
        return self.low_station is not None

    def tolerance_at(self, reading_pa: float) -> float:
        """Pass/fail limit at a reading. [Pa]"""
        return self.tolerance.at(reading_pa, self.range_low_pa, self.range_high_pa)
