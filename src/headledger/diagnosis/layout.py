"""The job as arrays: indices, taps, losses and pump curves, made once and shared by every spell and every explanation."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property

import numpy as np
from numpy.typing import NDArray

from headledger.physics.earth import gravity_m_s2, standard_pressure_pa
from headledger.physics.liquids import LiquidProperties, liquid_properties, temperature_limits_k
from headledger.physics.losses import LossTable, RunLoss, pump_polynomial
from headledger.physics.network import Graph, build_graph
from headledger.physics.tapping import AIR_WEIGHT_PA_M, Taps
from headledger.plant.gauges import Gauge, LegFill
from headledger.plant.job import Job, LiquidSpec
from headledger.plant.runs import LossKind, Run
from headledger.plant.stations import Exchange, StationKind
from headledger.quantities import PressureKind

Array = NDArray[np.float64]


@dataclass(frozen=True, slots=True, kw_only=True)
class ElevationDoubt:
    """One surveyed elevation and how the gauges depend on it.

    Parameters
    ----------
    owner : str
        ``station NAME`` or ``gauge TAG``.
    sd_m : float
        Standard uncertainty. [m]
    liquid : ndarray, shape (gauges,)
        Columns of flowing liquid that each gauge loses per metre of error. [-]
    constant_pa_m : ndarray, shape (gauges,)
        What each gauge gains per metre besides. [Pa/m]
    """

    owner: str
    sd_m: float
    liquid: Array
    constant_pa_m: Array


def liquid_at(spec: LiquidSpec, temperature_k: float) -> LiquidProperties:
    """Properties of the job's liquid at a temperature."""
    return liquid_properties(
        kind=str(spec.kind),
        temperature_k=temperature_k,
        concentration_fraction=spec.concentration_fraction,
        by_volume=spec.concentration_by_volume,
        salinity_g_kg=spec.salinity_g_kg,
        density_kg_m3=spec.density_kg_m3,
        viscosity_pa_s=spec.viscosity_pa_s,
        vapour_pressure_pa=spec.vapour_pressure_pa,
    )


def liquid_limits_k(spec: LiquidSpec) -> tuple[float, float]:
    """Coldest and hottest temperature at which the job's liquid is known. [K]"""
    return temperature_limits_k(
        kind=str(spec.kind),
        concentration_fraction=spec.concentration_fraction,
        by_volume=spec.concentration_by_volume,
    )


def still_liquid_k(spec: LiquidSpec, temperature_k: float) -> float:
    """A temperature, or the nearest one at which the job's liquid is known. [K]"""
    low_k, high_k = liquid_limits_k(spec)
    return min(max(temperature_k, low_k), high_k)


def run_loss(run: Run) -> RunLoss:
    """What of a run loses head, in the terms of physics."""
    return RunLoss(
        bore_m=run.bore_m,
        length_m=run.length_m,
        roughness_m=run.roughness_m,
        hazen_williams_c=run.hazen_williams_c,
        fittings_k=run.fittings_k,
        valve_kv_m3_s=run.valve_kv_m3_s,
        rated_drop_pa=run.rated_drop_pa,
        rated_flow_m3_s=run.rated_flow_m3_s,
    )


class Layout:
    """A job's piping and instruments as arrays; every property is computed once.

    Parameters
    ----------
    job : Job
    """

    def __init__(self, job: Job) -> None:
        self.job = job
        self.station_index = {station.name: index for index, station in enumerate(job.stations)}
        self.run_index = {run.name: index for index, run in enumerate(job.runs)}
        self.gauge_index = {gauge.tag: index for index, gauge in enumerate(job.gauges)}
        self.ends = tuple((self.station_index[run.start], self.station_index[run.end]) for run in job.runs)
        self.area_m2: Array = np.array([run.area_m2 for run in job.runs])
        self.gravity_m_s2 = float(gravity_m_s2(job.site.latitude_deg, job.site.datum_altitude_m))
        self._graphs: dict[tuple[tuple[bool, ...], tuple[bool, ...]], Graph] = {}
        self._tables: dict[tuple[bytes, bytes], LossTable] = {}
        self._ties: dict[tuple[tuple[bool, ...], bool], tuple[bool, ...]] = {}

    @property
    def gauge_count(self) -> int:
        """Number of gauges."""
        return len(self.job.gauges)

    @property
    def run_count(self) -> int:
        """Number of runs."""
        return len(self.job.runs)

    @cached_property
    def barometer_pa(self) -> float:
        """At the datum: stated, or the standard atmosphere's. [Pa absolute]"""
        stated = self.job.site.barometer_pa
        return stated if stated is not None else float(standard_pressure_pa(self.job.site.datum_altitude_m))

    @cached_property
    def nominal_density_kg_m3(self) -> float:
        """Of the job's liquid at its stated temperature. [kg/m³]"""
        return float(liquid_at(self.job.liquid, self.job.liquid.temperature_k).density_kg_m3)

    @cached_property
    def station_elevation_m(self) -> Array:
        """Elevation of each station. [m]"""
        return np.array([station.elevation_m for station in self.job.stations])

    @cached_property
    def pumps(self) -> dict[int, tuple[float, ...]]:
        """Polynomial of each pump's lift, by run."""
        return {
            index: tuple(pump_polynomial(run.pump.flow_m3_s, run.pump.head_m))
            for index, run in enumerate(self.job.runs)
            if run.pump is not None
        }

    @cached_property
    def exchanges(self) -> tuple[bool, ...]:
        """Whether liquid may enter or leave at each station."""
        return tuple(
            station.exchange is Exchange.OPEN or station.kind is StationKind.SURFACE for station in self.job.stations
        )

    @cached_property
    def preference(self) -> tuple[int, ...]:
        """Runs in the order in which their flows are taken as independent: metered first, the surest meter ahead."""

        def rank(index: int) -> tuple[bool, float, int]:
            run = self.job.runs[index]
            return (run.flow_column is None, run.flow_doubt.relative_fraction, index)

        return tuple(sorted(range(self.run_count), key=rank))

    def ties(self, is_open: tuple[bool, ...], *, still: bool) -> tuple[bool, ...]:
        """Which runs tie the heads of their ends.

        Not those that are shut, nor a loss that is free; nor, while liquid moves, a pump without a curve; nor, at rest, a check
        valve, which may hold a higher head on its `end` side.
        """
        key = (is_open, still)
        if key not in self._ties:
            self._ties[key] = tuple(
                opened
                and run.loss is not LossKind.FREE
                and not (run.lifts_unknown and not still)
                and not (run.is_check_valve and still)
                for run, opened in zip(self.job.runs, is_open, strict=True)
            )
        return self._ties[key]

    def graph(self, is_open: tuple[bool, ...], ties: tuple[bool, ...] | None = None) -> Graph:
        """The piping graph in one state of its valves; `ties` as of `ties`, all open runs by default."""
        key = (is_open, is_open if ties is None else ties)
        if key not in self._graphs:
            self._graphs[key] = build_graph(
                len(self.job.stations),
                self.ends,
                is_open=is_open,
                exchanges=self.exchanges,
                preference=self.preference,
                ties=key[1],
            )
        return self._graphs[key]

    def loss_table(self, density_kg_m3: Array, viscosity_pa_s: Array) -> LossTable:
        """Losses of all runs, each with its own liquid; arguments of shape (runs,). [kg/m³], [Pa s]"""
        key = (density_kg_m3.tobytes(), viscosity_pa_s.tobytes())
        if key not in self._tables:
            self._tables[key] = LossTable(
                [run_loss(run) for run in self.job.runs],
                density_kg_m3=density_kg_m3,
                viscosity_pa_s=viscosity_pa_s,
                gravity_m_s2=self.gravity_m_s2,
            )
        return self._tables[key]

    @cached_property
    def fall_m(self) -> Array:
        """How far each run falls from its start to its end. [m]"""
        height = self.station_elevation_m
        return np.array([height[start] - height[end] for start, end in self.ends]).reshape(self.run_count)

    @cached_property
    def profiles(self) -> tuple[tuple[Array, Array], ...]:
        """The line of each run between its stations: distances from its start and elevations, shape (points,) each. [m], [m]"""
        found = []
        for run, (start, end) in zip(self.job.runs, self.ends, strict=True):
            inner = sorted(
                (point.distance_m, point.elevation_m)
                for point in self.job.levels
                if point.run == run.name and 0.0 < point.distance_m < run.length_m
            )
            height = self.station_elevation_m
            points = [(0.0, float(height[start])), *inner, (run.length_m, float(height[end]))]
            found.append((np.array([x for x, _ in points]), np.array([z for _, z in points])))
        return tuple(found)

    @cached_property
    def levelled(self) -> frozenset[str]:
        """Runs whose line between its stations is given."""
        return frozenset(point.run for point in self.job.levels)

    @cached_property
    def process_leg_m(self) -> Array:
        """Height of each gauge's column of flowing liquid, from where it reads up to its tap, shape (gauges,). [m]"""
        return np.array([self._process_leg(gauge) for gauge in self.job.gauges])

    def _process_leg(self, gauge: Gauge) -> float:
        """The same of one gauge; 0 for a leg of another fill, and where it reads at its tap. [m]"""
        reads_at_m = gauge.elevation_m if gauge.corrected_to_m is None else gauge.corrected_to_m
        other_fill = gauge.corrected_to_m is None and self.leg_density_kg_m3(gauge) is not None
        if reads_at_m is None or gauge.is_differential or gauge.corrected_to_tap or other_fill:
            return 0.0
        return self.job.station(gauge.station).elevation_m - reads_at_m

    @cached_property
    def tap_run(self) -> NDArray[np.int64]:
        """The run on whose bore each gauge's (high) tap sits, −1 where it has none, shape (gauges,)."""
        return np.array([self.run_index.get(gauge.run, -1) for gauge in self.job.gauges], dtype=np.int64)

    @cached_property
    def ambient_leg_density_kg_m3(self) -> float | None:
        """Density of stagnant process legs, where the ambient temperature is given. [kg/m³]"""
        ambient = self.job.site.ambient_k
        if ambient is None:
            return None
        return float(liquid_at(self.job.liquid, still_liquid_k(self.job.liquid, ambient)).density_kg_m3)

    def leg_density_kg_m3(self, gauge: Gauge) -> float | None:
        """Density of what fills a gauge's leg where that is not the flowing liquid; 0 for a dry leg. [kg/m³]"""
        if gauge.leg.fill is LegFill.DRY:
            return 0.0
        return gauge.leg.density_kg_m3 if gauge.leg.fill is LegFill.OWN else self.ambient_leg_density_kg_m3

    @cached_property
    def taps(self) -> Taps:
        """How every gauge's reading follows from heads and velocities."""
        head = np.zeros((self.gauge_count, len(self.job.stations)))
        velocity = np.zeros((self.gauge_count, self.run_count))
        column, constant = np.zeros(self.gauge_count), np.zeros(self.gauge_count)
        for row, gauge in enumerate(self.job.gauges):
            head[row, self.station_index[gauge.station]] = 1.0
            if gauge.run in self.run_index:
                velocity[row, self.run_index[gauge.run]] = 1.0
            if gauge.low_station is not None:
                head[row, self.station_index[gauge.low_station]] -= 1.0
                low_run = self._run_ending_at(gauge.low_station)
                if low_run >= 0:
                    velocity[row, low_run] -= 1.0
            column[row], constant[row] = self._column(gauge)
        return Taps(head=head, velocity=velocity, column_m=column, constant_pa=constant)

    def _run_ending_at(self, station: str) -> int:
        """The widest run that ends at a station, else one that starts there, else −1."""
        for at_end in (True, False):
            found = [i for i, run in enumerate(self.job.runs) if (run.end if at_end else run.start) == station]
            if found:
                return max(found, key=lambda index: self.job.runs[index].bore_m)
        return -1

    def _column(self, gauge: Gauge) -> tuple[float, float]:
        """Elevation that the flowing liquid's column counts down to, and the constant part. [m], [Pa]"""
        tap_m = self.job.station(gauge.station).elevation_m
        instrument_m = tap_m if gauge.elevation_m is None else gauge.elevation_m
        leg = self.leg_density_kg_m3(gauge)
        if gauge.low_station is not None:
            return self._differential_column(gauge, leg)
        constant = self._reference(gauge, instrument_m)
        if gauge.corrected_to_tap:
            return tap_m, constant
        if gauge.corrected_to_m is not None:
            return gauge.corrected_to_m, constant
        if leg is None:
            return instrument_m, constant
        return tap_m, constant + leg * self.gravity_m_s2 * (tap_m - instrument_m)

    def _differential_column(self, gauge: Gauge, leg: float | None) -> tuple[float, float]:
        """The same for an instrument with two taps."""
        between = self.job.station(gauge.station).elevation_m - self.job.station(str(gauge.low_station)).elevation_m
        if gauge.corrected_to_tap or gauge.corrected_to_m is not None:
            return between, 0.0
        return (0.0, 0.0) if leg is None else (between, leg * self.gravity_m_s2 * between)

    def _reference(self, gauge: Gauge, instrument_m: float) -> float:
        """What an instrument's reference adds to a pressure against the barometer at the datum. [Pa]"""
        if gauge.unit.kind is PressureKind.ABSOLUTE:
            return self.barometer_pa
        if gauge.sealed_pa is not None:
            return self.barometer_pa - gauge.sealed_pa
        return AIR_WEIGHT_PA_M * instrument_m

    @cached_property
    def follows_barometer(self) -> Array:
        """1 for gauges whose reading moves with the barometer, else 0, shape (gauges,)."""
        return np.array(
            [
                float(not g.is_differential and (g.unit.kind is PressureKind.ABSOLUTE or g.sealed_pa is not None))
                for g in self.job.gauges
            ]
        )

    @cached_property
    def elevation_doubts(self) -> tuple[ElevationDoubt, ...]:
        """Every surveyed elevation that some gauge depends on."""
        liquid: dict[str, Array] = {}
        constant: dict[str, Array] = {}
        deviation: dict[str, float] = {}

        def add(owner: str, sd_m: float, row: int, of_liquid: float, of_constant: float) -> None:
            deviation[owner] = sd_m
            liquid.setdefault(owner, np.zeros(self.gauge_count))[row] += of_liquid
            constant.setdefault(owner, np.zeros(self.gauge_count))[row] += of_constant

        for row, gauge in enumerate(self.job.gauges):
            for owner, sd_m, of_liquid, of_constant in self._elevations_of(gauge):
                add(owner, sd_m, row, of_liquid, of_constant)
        return tuple(
            ElevationDoubt(owner=owner, sd_m=deviation[owner], liquid=liquid[owner], constant_pa_m=constant[owner])
            for owner in liquid
        )

    def _elevations_of(self, gauge: Gauge) -> list[tuple[str, float, float, float]]:
        """Owner, doubt, liquid columns lost and pressure gained per metre, of each elevation a gauge depends on."""
        leg = self.leg_density_kg_m3(gauge)
        tap = self.job.station(gauge.station)
        at_tap = (f"station {tap.name}", tap.elevation_sd_m)
        corrected = gauge.corrected_to_tap or gauge.corrected_to_m is not None
        if gauge.low_station is not None:
            low = self.job.station(gauge.low_station)
            if leg is None and not corrected:
                return []
            fill = 0.0 if corrected or leg is None else leg * self.gravity_m_s2
            return [(*at_tap, 1.0, fill), (f"station {low.name}", low.elevation_sd_m, -1.0, -fill)]
        own = at_tap if gauge.elevation_m is None else (f"gauge {gauge.tag}", gauge.elevation_sd_m)
        if gauge.corrected_to_tap:
            return [(*at_tap, 1.0, 0.0)]
        if leg is None or gauge.corrected_to_m is not None:
            return [(*own, 1.0, 0.0)]
        fill = leg * self.gravity_m_s2
        return [(*at_tap, 1.0, fill), (*own, 0.0, -fill)]
