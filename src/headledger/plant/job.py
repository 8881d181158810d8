"""The job: one system and one visit, as the job folder describes it."""

from __future__ import annotations

from dataclasses import dataclass, field
from enum import StrEnum
from pathlib import Path

from headledger.plant.gauges import Gauge
from headledger.plant.runs import Doubt, Run
from headledger.plant.stations import Station
from headledger.quantities import Dimension, PressureKind, Unit


class LiquidKind(StrEnum):
    """Liquids that the property tables know, and one that brings its own values."""

    WATER = "water"
    SEAWATER = "seawater"
    ETHYLENE_GLYCOL = "ethylene-glycol"
    PROPYLENE_GLYCOL = "propylene-glycol"
    OTHER = "other"


@dataclass(frozen=True, slots=True, kw_only=True)
class LiquidSpec:
    """What the job says of its liquid.

    Parameters
    ----------
    kind : LiquidKind
    concentration_fraction : float or None
        Of glycol. [-]
    concentration_by_volume : bool
    salinity_g_kg : float or None
        [g/kg]
    temperature_k : float
        [K]
    temperature_column, temperature_unit : str or None, Unit or None
        Log column that measures it.
    temperature_sd_k : float
        Standard uncertainty. [K]
    density_kg_m3, viscosity_pa_s, vapour_pressure_pa : float or None
        Only for `other`. [kg/m³], [Pa s], [Pa absolute]
    density_sd_fraction : float
        Standard uncertainty of density at known temperature. [-]
    """

    kind: LiquidKind = LiquidKind.WATER
    concentration_fraction: float | None = None
    concentration_by_volume: bool = False
    salinity_g_kg: float | None = None
    temperature_k: float = 293.15
    temperature_column: str | None = None
    temperature_unit: Unit | None = None
    temperature_sd_k: float = 5.0
    density_kg_m3: float | None = None
    viscosity_pa_s: float | None = None
    vapour_pressure_pa: float | None = None
    density_sd_fraction: float = 0.0005


@dataclass(frozen=True, slots=True, kw_only=True)
class Site:
    """Where the job stands.

    Parameters
    ----------
    datum_altitude_m : float
        Of elevation 0 above sea level. [m]
    latitude_deg : float
        [deg]
    barometer_pa : float or None
        At the datum; None where the standard atmosphere stands in. [Pa absolute]
    barometer_column, barometer_unit : str or None, Unit or None
    barometer_sd_pa : float
        Standard uncertainty. [Pa]
    ambient_k : float or None
        Of instruments and stagnant legs. [K]
    ambient_sd_k : float
        [K]
    """

    datum_altitude_m: float = 0.0
    latitude_deg: float = 45.0
    barometer_pa: float | None = None
    barometer_column: str | None = None
    barometer_unit: Unit | None = None
    barometer_sd_pa: float = 1000.0
    ambient_k: float | None = None
    ambient_sd_k: float = 5.0


class DecisionRule(StrEnum):
    """How a verdict uses the probability of being outside."""

    GUARDED = "guarded"
    SIMPLE = "simple"


@dataclass(frozen=True, slots=True, kw_only=True)
class CheckSettings:
    """How verdicts are given.

    Parameters
    ----------
    decision : DecisionRule
    confidence_fraction : float
        [-]
    tolerance_text : str
        The default tolerance as stated; empty where each gauge's own accuracy stands in.
    """

    decision: DecisionRule = DecisionRule.GUARDED
    confidence_fraction: float = 0.95
    tolerance_text: str = ""


class SpellKind(StrEnum):
    """Flow state of a stretch of the log."""

    STILL = "still"
    FLOWING = "flowing"
    IGNORE = "ignore"


@dataclass(frozen=True, slots=True, kw_only=True)
class StatedFlow:
    """A flow that the site knows for a stated spell.

    Parameters
    ----------
    run : str
    flow_m3_s : float
        [m³/s]
    doubt : Doubt
        Standard uncertainty. [-], [m³/s]
    """

    run: str
    flow_m3_s: float
    doubt: Doubt


@dataclass(frozen=True, slots=True, kw_only=True)
class StatedSpell:
    """A row of spells.csv.

    Parameters
    ----------
    start_s, end_s : float
        Seconds since 1970-01-01 UTC. [s]
    kind : SpellKind
    flows : tuple of StatedFlow
    note : str
    """

    start_s: float
    end_s: float
    kind: SpellKind
    flows: tuple[StatedFlow, ...] = ()
    note: str = ""


@dataclass(frozen=True, slots=True, kw_only=True)
class LevelPoint:
    """A row of levels.csv: one point of the line between two stations.

    Parameters
    ----------
    run : str
    distance_m, elevation_m : float
        From the run's `start`; of the centreline. [m]
    ground_m : float or None
        [m]
    elevation_sd_m : float
        [m]
    """

    run: str
    distance_m: float
    elevation_m: float
    ground_m: float | None = None
    elevation_sd_m: float = 0.025


@dataclass(frozen=True, slots=True, kw_only=True)
class LogSettings:
    """The `[log]` table of job.toml: what overrides the look at a log. None where nothing was stated."""

    delimiter: str | None = None
    decimal: str | None = None
    thousands: str | None = None
    encoding: str | None = None
    header_line: int | None = None
    units_line: int | None = None
    stamp: tuple[str, ...] | None = None
    stamp_format: str | None = None
    day_first: bool | None = None
    shape: str | None = None
    tag_column: str | None = None
    value_column: str | None = None
    quality_column: str | None = None
    good: tuple[str, ...] | None = None


@dataclass(frozen=True, slots=True, kw_only=True)
class DisplayUnits:
    """The units in which the job's own files speak, for everything that is printed without a gauge's unit.

    Parameters
    ----------
    length, flow, pressure : Unit
        Of elevations, of flows, and of pressure differences.
    """

    length: Unit = Unit("m", Dimension.LENGTH, 1.0)
    flow: Unit = Unit("m3/h", Dimension.FLOW, 1.0 / 3600.0)
    pressure: Unit = Unit("kPa", Dimension.PRESSURE, 1000.0, kind=PressureKind.DIFFERENCE)


@dataclass(frozen=True, slots=True, kw_only=True)
class Job:
    """A job folder, read and consistent.

    Parameters
    ----------
    folder : Path
    title, site_name, prepared_by, timezone : str
    stations, runs, gauges : tuple
        In the order of their tables.
    log_files : tuple of Path
        Existing files, in the order stated.
    liquid, site, check, log : LiquidSpec, Site, CheckSettings, LogSettings
    spells : tuple of StatedSpell
    levels : tuple of LevelPoint
    display : DisplayUnits
    hold : tuple of (str, str)
        The `[hold]` table, kept as text.
    files : tuple of Path
        Every job file read (not the logs), for the record of inputs.
    remarks : tuple of str
        What was taken for granted or converted, a sentence each.
    """

    folder: Path
    title: str
    stations: tuple[Station, ...]
    runs: tuple[Run, ...]
    gauges: tuple[Gauge, ...]
    log_files: tuple[Path, ...] = ()
    site_name: str = ""
    prepared_by: str = ""
    timezone: str = "UTC"
    liquid: LiquidSpec = field(default_factory=LiquidSpec)
    site: Site = field(default_factory=Site)
    check: CheckSettings = field(default_factory=CheckSettings)
    log: LogSettings = field(default_factory=LogSettings)
    spells: tuple[StatedSpell, ...] = ()
    levels: tuple[LevelPoint, ...] = ()
    display: DisplayUnits = field(default_factory=DisplayUnits)
    hold: tuple[tuple[str, str], ...] = ()
    files: tuple[Path, ...] = ()
    remarks: tuple[str, ...] = ()

    def station(self, name: str) -> Station:
        """The station of that name."""
        return next(station for station in self.stations if station.name == name)

    def run(self, name: str) -> Run:
        """The run of that name."""
        return next(run for run in self.runs if run.name == name)

    def gauge(self, tag: str) -> Gauge:
        """The gauge of that tag."""
        return next(gauge for gauge in self.gauges if gauge.tag == tag)
