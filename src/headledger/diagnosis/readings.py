"""The log in the job's own terms: every column that counts on one grid of time, in SI and in each gauge's own reference."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from headledger.diagnosis.layout import Layout, liquid_at, liquid_limits_k
from headledger.errors import JobError, Problem, QuantityError
from headledger.plant.digest import Digest, common_grid
from headledger.plant.gauges import Gauge, Signal
from headledger.plant.job import Job, LiquidSpec
from headledger.plant.runs import Run, RunState
from headledger.quantities import Dimension, PressureKind, Unit, parse_unit
from headledger.readers.job_settings import BAROMETER_UNSTATED_PA, COVERAGE

Array = NDArray[np.float64]

CURRENT_LOW_MA, CURRENT_HIGH_MA = 4.0, 20.0
"""Live-zero current signal (IEC 60381-1, from memory)."""


@dataclass(frozen=True, slots=True, kw_only=True)
class Timeline:
    """Every column that counts, by blocks of time.

    Parameters
    ----------
    width_s : float
        [s]
    start_s : ndarray, shape (blocks,)
        Start of each block, seconds since 1970-01-01 UTC; blocks without a row are left out. [s]
    samples : ndarray of int, shape (blocks,)
    reading_pa, reading_count, reading_variance_pa2 : ndarray, shape (blocks, gauges)
        Block means, values in each, variance within; nan and 0 where there are none. [Pa], [-], [Pa²]
    flow_m3_s, flow_count, flow_variance : ndarray, shape (blocks, runs)
        [m³/s]
    level_m : ndarray, shape (blocks, stations)
        Of surfaces with a level column, nan elsewhere. [m]
    temperature_k : ndarray, shape (blocks,)
        nan where the job names no column. [K]
    barometer_pa : ndarray, shape (blocks,)
        At the datum; nan where the job names no column. [Pa absolute]
    run_temperature_k : ndarray, shape (blocks, runs)
        nan where a run names no column. [K]
    speed_ratio, open_fraction : ndarray, shape (blocks, runs)
        nan where a run has no such column. [-]
    remarks : tuple of str
        Conversions made and columns not found, a sentence each.
    gauge_files, flow_files : tuple of str
        The log that each gauge and each meter was read from; empty where none has it.
    """

    width_s: float
    start_s: Array
    samples: NDArray[np.int64]
    reading_pa: Array
    reading_count: NDArray[np.int64]
    reading_variance_pa2: Array
    flow_m3_s: Array
    flow_count: NDArray[np.int64]
    flow_variance: Array
    level_m: Array
    temperature_k: Array
    barometer_pa: Array
    run_temperature_k: Array
    speed_ratio: Array
    open_fraction: Array
    remarks: tuple[str, ...] = ()
    gauge_files: tuple[str, ...] = ()
    flow_files: tuple[str, ...] = ()

    @property
    def middle_s(self) -> Array:
        """Middle of each block. [s]"""
        return self.start_s + self.width_s / 2.0


@dataclass(frozen=True, slots=True)
class _Column:
    """One log column on the common grid."""

    mean: Array
    count: NDArray[np.int64]
    variance: Array
    unit: str
    file: str


class _Columns:
    """Columns of all logs by name, on one grid."""

    def __init__(self, digests: Sequence[Digest]) -> None:
        self.digests = common_grid(digests)
        self.width_s = self.digests[0].width_s
        self.index = np.unique(np.concatenate([digest.index for digest in self.digests]))
        self.samples = np.zeros(self.index.size, dtype=np.int64)
        self._where: dict[str, tuple[Digest, int, NDArray[np.int64]]] = {}
        for digest in self.digests:
            at = np.searchsorted(self.index, digest.index)
            np.maximum.at(self.samples, at, digest.rows)
            for column, name in enumerate(digest.columns):
                self._where.setdefault(name.strip().casefold(), (digest, column, at))

    @property
    def names(self) -> list[str]:
        """Names of all columns as the logs give them."""
        return [name for digest in self.digests for name in digest.columns]

    def file_of(self, name: str | None) -> str:
        """The log that has a column; empty where none has."""
        found = self._where.get(name.strip().casefold()) if name else None
        return found[0].file if found else ""

    def get(self, name: str | None) -> _Column | None:
        """A column by name; None where no log has it."""
        found = self._where.get(name.strip().casefold()) if name else None
        if found is None:
            return None
        digest, column, at = found
        mean, variance = np.full(self.index.size, np.nan), np.full(self.index.size, np.nan)
        count = np.zeros(self.index.size, dtype=np.int64)
        mean[at], variance[at] = digest.mean[:, column], digest.variance[:, column]
        count[at] = digest.count[:, column]
        return _Column(mean, count, variance, digest.units[column], digest.file)


def read_timeline(layout: Layout, digests: Sequence[Digest]) -> Timeline:
    """The logs of a job in its own terms.

    Parameters
    ----------
    layout : Layout
    digests : sequence of Digest
        One a log file, at least one.

    Returns
    -------
    Timeline

    Raises
    ------
    JobError
        No log has a column for any gauge.
    """
    job, columns, remarks = layout.job, _Columns(digests), []
    blocks = columns.index.size
    middle_s = (columns.index + 0.5) * columns.width_s
    density = float(liquid_at(job.liquid, job.liquid.temperature_k).density_kg_m3)
    reading = _empty(blocks, len(job.gauges))
    for index, gauge in enumerate(job.gauges):
        column = columns.get(gauge.column)
        if column is None:
            remarks.append(f"{gauge.tag}: no log has a column {gauge.column!r}; it cannot be checked.")
            continue
        _fill_gauge(reading, index, gauge, column, middle_s, remarks)
    if not (reading[1] > 0).any():
        raise JobError([_no_overlap(job, columns)])
    flow = _empty(blocks, len(job.runs))
    speed, opened = np.full((blocks, len(job.runs)), np.nan), np.full((blocks, len(job.runs)), np.nan)
    for index, run in enumerate(job.runs):
        _fill_run(columns, run, index, flow, (speed, opened), density, remarks)
    return Timeline(
        width_s=columns.width_s,
        start_s=columns.index * columns.width_s,
        samples=columns.samples,
        reading_pa=reading[0],
        reading_count=reading[1],
        reading_variance_pa2=reading[2],
        flow_m3_s=flow[0],
        flow_count=flow[1],
        flow_variance=flow[2],
        level_m=_levels(columns, job, remarks),
        temperature_k=_temperature(
            columns, job.liquid, job.liquid.temperature_column, job.liquid.temperature_unit, "liquid", remarks
        ),
        barometer_pa=_barometer(columns, job),
        run_temperature_k=np.column_stack(
            [
                _temperature(columns, job.liquid, r.temperature_column, r.temperature_unit, r.name, remarks)
                for r in job.runs
            ]
        )
        if job.runs
        else np.zeros((blocks, 0)),
        speed_ratio=speed,
        open_fraction=opened,
        remarks=tuple(remarks),
        gauge_files=tuple(columns.file_of(gauge.column) for gauge in job.gauges),
        flow_files=tuple(columns.file_of(run.flow_column) for run in job.runs),
    )


def _empty(blocks: int, width: int) -> tuple[Array, NDArray[np.int64], Array]:
    """Means, counts and variances without a value."""
    return np.full((blocks, width), np.nan), np.zeros((blocks, width), dtype=np.int64), np.full((blocks, width), np.nan)


def _no_overlap(job: Job, columns: _Columns) -> Problem:
    """The problem of logs that share no tag with the job."""
    return Problem(
        place=", ".join(sorted({digest.file for digest in columns.digests})),
        fault="no column is one of the job's gauges",
        found=", ".join(columns.names[:8]) or "no columns",
        expected="columns named as the gauges: " + ", ".join(gauge.column for gauge in job.gauges[:8]),
    )


def _logged_unit(column: _Column, own: Unit, what: str, remarks: list[str], default_kind: PressureKind | None) -> Unit:
    """The unit in which a column is logged: the log's own where it names one, else the job's."""
    if not column.unit:
        return own
    try:
        logged = parse_unit(column.unit, own.dimension, default_kind=default_kind)
    except QuantityError as error:
        raise JobError([Problem(f"{column.file}, unit of {what}", error.fault, error.found, error.expected)]) from error
    if (logged.factor, logged.offset) != (own.factor, own.offset):
        remarks.append(f"{what}: logged in {logged.text}, converted to {own.text}.")
    return logged


def _hanging(gauge: Gauge, middle_s: Array) -> NDArray[np.bool_]:
    """Whether the gauge hung where this row of the table says, block by block."""
    hanging = np.ones(middle_s.size, dtype=bool)
    if gauge.hung_from is not None:
        hanging &= middle_s >= gauge.hung_from.timestamp()
    if gauge.hung_until is not None:
        hanging &= middle_s <= gauge.hung_until.timestamp()
    return hanging


def signal_span(gauge: Gauge) -> tuple[float, float]:
    """Factor and offset that turn what the log holds into pascals in the gauge's own reference."""
    low, span = gauge.range_low_pa, gauge.span_pa
    ends = {
        Signal.MILLIAMPERE: (CURRENT_LOW_MA, CURRENT_HIGH_MA),
        Signal.MILLIAMPERE_ROOT: (CURRENT_LOW_MA, CURRENT_HIGH_MA),
        Signal.VOLT_1_5: (1.0, 5.0),
        Signal.VOLT_0_10: (0.0, 10.0),
        Signal.PERCENT: (0.0, 100.0),
    }.get(gauge.signal)
    if ends is None:
        return gauge.unit.factor, gauge.unit.offset
    factor = span / (ends[1] - ends[0])
    return factor, low - factor * ends[0]


def _fill_gauge(
    reading: tuple[Array, NDArray[np.int64], Array],
    index: int,
    gauge: Gauge,
    column: _Column,
    middle_s: Array,
    remarks: list[str],
) -> None:
    """One gauge's column in pascals."""
    if gauge.signal is Signal.OWN_UNIT:
        unit = _logged_unit(column, gauge.unit, gauge.tag, remarks, gauge.unit.kind)
        factor, offset = unit.factor, unit.offset
    else:
        factor, offset = signal_span(gauge)
    mean, variance = column.mean * factor + offset, column.variance * factor**2
    if gauge.signal is Signal.MILLIAMPERE_ROOT:
        share = (mean - gauge.range_low_pa) / gauge.span_pa
        mean = gauge.range_low_pa + gauge.span_pa * share * np.abs(share)
        variance = variance * (2.0 * share) ** 2
    mean = mean + gauge.correction_pa
    hung = _hanging(gauge, middle_s)
    reading[0][:, index] = np.where(hung, mean, np.nan)
    reading[1][:, index] = np.where(hung, column.count, 0)
    reading[2][:, index] = variance


def _fill_run(
    columns: _Columns,
    run: Run,
    index: int,
    flow: tuple[Array, NDArray[np.int64], Array],
    states: tuple[Array, Array],
    density_kg_m3: float,
    remarks: list[str],
) -> None:
    """One run's meter, pump speed and valve state."""
    column = columns.get(run.flow_column)
    if run.flow_column and column is None:
        remarks.append(f"{run.name}: no log has a column {run.flow_column!r} for its flow.")
    if column is not None and run.flow_unit is not None:
        unit = _logged_unit(column, run.flow_unit, f"flow of {run.name}", remarks, PressureKind.DIFFERENCE)
        value, variance = column.mean * unit.factor + unit.offset, column.variance * unit.factor**2
        if run.flow_kvs_m3_s is not None and run.flow_unit.dimension is Dimension.PRESSURE:
            value, variance = _valve_flow(run.flow_kvs_m3_s * (1000.0 / density_kg_m3) ** 0.5, value, variance)
        flow[0][:, index], flow[1][:, index], flow[2][:, index] = value, column.count, variance
    speed = columns.get(run.speed_column)
    if run.speed_column and speed is None:
        remarks.append(f"{run.name}: no log has a column {run.speed_column!r} for its speed.")
    if speed is not None:
        states[0][:, index] = speed.mean
    state = columns.get(run.state_column) if run.state is RunState.COLUMN else None
    if run.state is RunState.COLUMN and state is None:
        remarks.append(
            f"{run.name}: no log has a column {run.state_column!r} for its state; whether it is open is taken as not known."
        )
    if state is not None:
        states[1][:, index] = state.mean


def _valve_flow(kvs_m3_s: float, drop_pa: Array, variance: Array) -> tuple[Array, Array]:
    """Flow through a metering valve from its differential pressure, and its variance; `kvs_m3_s` for the liquid at hand."""
    flow = kvs_m3_s * np.sign(drop_pa) * np.sqrt(np.abs(drop_pa) / 1e5)
    with np.errstate(divide="ignore", invalid="ignore"):
        slope = np.where(drop_pa != 0.0, flow / (2.0 * drop_pa), 0.0)
    return flow, variance * slope**2


def _levels(columns: _Columns, job: Job, remarks: list[str]) -> Array:
    """Measured surfaces. [m]"""
    levels = np.full((columns.index.size, len(job.stations)), np.nan)
    for index, station in enumerate(job.stations):
        column = columns.get(station.level_column)
        if station.level_column and column is None:
            remarks.append(f"{station.name}: no log has a column {station.level_column!r} for its level.")
        if column is not None and station.level_unit is not None:
            unit = _logged_unit(column, station.level_unit, f"level of {station.name}", remarks, None)
            levels[:, index] = column.mean * unit.factor + unit.offset
    return levels


def with_logged_barometer(job: Job, digests: Sequence[Digest]) -> Job:
    """The job with the barometer that its log column has on average; doubted as nobody's word where no log has the column.

    Parameters
    ----------
    job : Job
    digests : sequence of Digest

    Returns
    -------
    Job
    """
    if job.site.barometer_column is None:
        return job
    logged_pa = _barometer(_Columns(digests), job)
    if np.isfinite(logged_pa).any():
        mean_pa = float(np.nanmean(logged_pa))
        said = f"barometer: logged as {job.site.barometer_column}, {mean_pa / 1000.0:.2f} kPa on average."
        return replace(job, site=replace(job.site, barometer_pa=mean_pa), remarks=(*job.remarks, said))
    said = f"barometer: no log has a column {job.site.barometer_column!r}; the standard atmosphere stands in."
    doubt_pa = max(job.site.barometer_sd_pa, BAROMETER_UNSTATED_PA / COVERAGE)
    return replace(job, site=replace(job.site, barometer_sd_pa=doubt_pa), remarks=(*job.remarks, said))


def _barometer(columns: _Columns, job: Job) -> Array:
    """Logged barometer, block by block. [Pa absolute]"""
    column, own = columns.get(job.site.barometer_column), job.site.barometer_unit
    if column is None or own is None:
        return np.full(columns.index.size, np.nan)
    unit = _logged_unit(column, own, "barometer", [], PressureKind.ABSOLUTE)
    return np.asarray(column.mean * unit.factor + unit.offset)


def _temperature(
    columns: _Columns, liquid: LiquidSpec, name: str | None, own: Unit | None, what: str, remarks: list[str]
) -> Array:
    """Measured temperature of the liquid, everywhere or in one run. [K]"""
    column = columns.get(name)
    if name and column is None:
        remarks.append(f"{what}: no log has a column {name!r} for its temperature.")
    if column is None or own is None:
        return np.full(columns.index.size, np.nan)
    unit = _logged_unit(column, own, f"temperature of {what}", remarks, None)
    logged_k = column.mean * unit.factor + unit.offset
    low_k, high_k = liquid_limits_k(liquid)
    # a sensor that fell off says nothing of the liquid
    outside = (logged_k < low_k) | (logged_k > high_k)
    if outside.any():
        remarks.append(
            f"{what}: {int(outside.sum())} of {int(np.isfinite(logged_k).sum())} blocks of its logged temperature lie outside "
            f"{low_k - 273.15:.1f} to {high_k - 273.15:.1f} °C, where the liquid is known; they were left aside."
        )
    return np.asarray(np.where(outside, np.nan, logged_k))
