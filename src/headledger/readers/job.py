"""A job folder to a job: its tables read, joined and checked against one another, with every problem reported at once."""

from __future__ import annotations

from collections import Counter
from collections.abc import Sequence
from dataclasses import replace
from pathlib import Path
from zoneinfo import ZoneInfo, ZoneInfoNotFoundError

from headledger.plant.gauges import Gauge
from headledger.plant.job import DisplayUnits, Job, LevelPoint, LiquidKind, StatedSpell
from headledger.plant.runs import Run
from headledger.plant.stations import Exchange, Station, StationKind
from headledger.quantities import Dimension, PressureKind, Unit
from headledger.readers.job_files import JobFiles
from headledger.readers.job_gauges import GAUGE_COLUMNS, GaugeContext, read_gauges
from headledger.readers.job_links import check_links
from headledger.readers.job_settings import (
    Defaults,
    Section,
    read_check,
    read_liquid,
    read_log_settings,
    read_settings,
    read_site,
)
from headledger.readers.job_site import LEVEL_COLUMNS, SpellContext, read_levels, read_spells, spell_columns
from headledger.readers.job_tables import RUN_COLUMNS, STATION_COLUMNS, read_runs, read_stations
from headledger.readers.tables import Problems, Table


def read_job(folder: Path | str, *, logs_needed: bool = True) -> Job:
    """The job in a folder.

    Parameters
    ----------
    folder : Path or str
        Holds job.toml and its tables.
    logs_needed : bool
        Whether a log that is not there is a problem; a plan is made before there is any.

    Returns
    -------
    Job

    Raises
    ------
    JobError
        With every problem of every file.
    """
    folder = Path(folder)
    problems = Problems()
    sections = read_settings(folder, problems)
    settings, defaults = read_check(sections["check"])
    timezone = _timezone(sections["job"])
    files = JobFiles(folder, sections["job"], problems)
    stations, runs, gauges = _tables(files)
    check_links(stations, runs, gauges)
    placed = read_stations(stations, defaults)
    run_list, run_remarks = read_runs(runs, defaults)
    gauge_list, gauge_remarks = read_gauges(gauges, GaugeContext(run_list, timezone, settings.tolerance_text, defaults))
    spells, levels = _optional(files, run_list, timezone, defaults)
    liquid, site, log = read_liquid(sections["liquid"]), read_site(sections["site"]), read_log_settings(sections["log"])
    log_files, log_remarks = files.logs(needed=logs_needed)
    texts = {key: sections["job"].text(key) for key in ("title", "site", "prepared_by")}
    problems.raise_if_any()
    job = Job(
        folder=folder,
        title=texts["title"] or folder.resolve().name,
        site_name=texts["site"],
        prepared_by=texts["prepared_by"],
        timezone=timezone.key,
        stations=tuple(_with_exchange(_at_centreline(station, of, run_list), run_list) for station, of in placed),
        runs=tuple(run_list),
        gauges=tuple(gauge_list),
        log_files=log_files,
        liquid=liquid,
        site=site,
        check=settings,
        log=log,
        spells=tuple(spells),
        levels=tuple(levels),
        display=_display(stations.units.get("elevation"), run_list, gauge_list),
        hold=tuple((key, str(value)) for key, value in sections["hold"].values.items()),
        files=tuple(files.read),
    )
    granted = _taken_for_granted(job)
    return replace(job, remarks=(*granted, *run_remarks, *gauge_remarks, *log_remarks, *unused_yet(job)))


def unused_yet(job: Job) -> tuple[str, ...]:
    """What is read but has no part in the judgement yet, a sentence each."""
    remarks = []
    if any(run.rating_pa is not None for run in job.runs):
        remarks.append("runs: ratings are not used yet; they limit a pressure hold.")
    if job.hold:
        remarks.append("[hold]: not used yet; a check does not look at holds.")
    return tuple(remarks)


def _tables(files: JobFiles) -> tuple[Table, Table, Table]:
    """The tables of stations, runs and gauges."""
    return (
        files.table("stations", STATION_COLUMNS, needed=True),
        files.table("runs", RUN_COLUMNS, needed=True),
        files.table("gauges", GAUGE_COLUMNS, needed=True),
    )


def _optional(
    files: JobFiles, runs: Sequence[Run], zone: ZoneInfo, defaults: Defaults
) -> tuple[list[StatedSpell], list[LevelPoint]]:
    """Spells and levels, where the job has them."""
    by_name = {run.name: run for run in runs}
    return (
        read_spells(files.table("spells", spell_columns(by_name)), SpellContext(by_name, zone, defaults)),
        read_levels(files.table("levels", LEVEL_COLUMNS), by_name, defaults),
    )


def _timezone(section: Section) -> ZoneInfo:
    """The timezone of stamps without an offset."""
    name = section.text("timezone", "UTC")
    try:
        return ZoneInfo(name)
    except (ZoneInfoNotFoundError, ValueError, OSError):
        section.fault("timezone", "unknown timezone", name, "a name such as UTC or Europe/Lisbon")
        return ZoneInfo("UTC")


def _at_centreline(station: Station, of: str, runs: Sequence[Run]) -> Station:
    """A station whose elevation is of the centreline."""
    bores = [run.bore_m for run in runs if station.name in (run.start, run.end)]
    half = (max(bores) if bores else 0.0) / 2.0
    shift = {"centreline": 0.0, "invert": half, "crown": -half}[of]
    return replace(station, elevation_m=station.elevation_m + shift) if shift else station


def _with_exchange(station: Station, runs: Sequence[Run]) -> Station:
    """A station whose exchange is settled: by its cell, else open at an end of the pipe and at a surface."""
    if station.exchange_stated:
        return station
    ends = sum(station.name in (run.start, run.end) for run in runs)
    is_open = ends <= 1 or station.kind is StationKind.SURFACE
    return replace(station, exchange=Exchange.OPEN if is_open else Exchange.CLOSED)


def _display(length: Unit | None, runs: Sequence[Run], gauges: Sequence[Gauge]) -> DisplayUnits:
    """The units in which the job's own files speak."""
    plain = DisplayUnits()
    flow = next(
        (run.flow_unit for run in runs if run.flow_unit and run.flow_unit.dimension is Dimension.FLOW), plain.flow
    )
    common = Counter(gauge.unit.as_difference() for gauge in gauges if gauge.unit.kind is not PressureKind.DIFFERENCE)
    pressure = common.most_common(1)[0][0] if common else plain.pressure
    if length is None:
        return DisplayUnits(flow=flow, pressure=pressure)
    return DisplayUnits(length=length, flow=flow, pressure=pressure)


def _taken_for_granted(job: Job) -> list[str]:
    """What the job left open and how it was filled, a sentence each."""
    remarks = []
    assumed = [s.name for s in job.stations if s.exchange is Exchange.OPEN and not s.exchange_stated]
    if assumed:
        remarks.append(f"taken as open to flow in or out: {', '.join(assumed)}.")
    surfaces = {s.name for s in job.stations if s.kind is StationKind.SURFACE}
    for run in job.runs:
        if run.end in surfaces and run.fittings_k == 0.0:
            remarks.append(f"{run.name}: ends at the surface {run.end} with no K; an exit is K = 1.")
        if run.start in surfaces and run.fittings_k == 0.0:
            remarks.append(f"{run.name}: starts at the surface {run.start} with no K; an entrance is about K = 0.5.")
    williams = [run.name for run in job.runs if run.hazen_williams_c is not None]
    if williams and job.liquid.kind is not LiquidKind.WATER:
        remarks.append(
            f"{', '.join(williams)}: Hazen–Williams holds for water only, and the liquid is {job.liquid.kind}."
        )
    if job.liquid.kind is LiquidKind.SEAWATER and job.liquid.salinity_g_kg is None:
        remarks.append("salinity: not stated; 35 g/kg is taken.")
    if job.liquid.kind is LiquidKind.OTHER and job.liquid.viscosity_pa_s is None:
        remarks.append("viscosity: not stated; that of water is taken.")
    return remarks
