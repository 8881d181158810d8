"""A job folder to a job: its tables read, joined and checked against one another, with every problem reported at once."""

from __future__ import annotations

from collections import Counter
from collections.abc import Iterable, Sequence
from dataclasses import replace
from pathlib import Path
from zoneinfo import ZoneInfo, ZoneInfoNotFoundError

from headledger.plant.gauges import Gauge
from headledger.plant.job import DisplayUnits, Job, LevelPoint, StatedSpell
from headledger.plant.runs import LossKind, Run
from headledger.plant.stations import Exchange, Station, StationKind
from headledger.quantities import Dimension, PressureKind, Unit, nearest
from headledger.readers.job_gauges import read_gauges
from headledger.readers.job_settings import (
    FILE,
    Defaults,
    Section,
    read_check,
    read_liquid,
    read_log_settings,
    read_settings,
    read_site,
)
from headledger.readers.job_site import SpellContext, read_levels, read_spells
from headledger.readers.job_tables import read_runs, read_stations
from headledger.readers.tables import Problems

WALK_FILE = "walk.csv"
MOST_LOGS = 10_000


def read_job(folder: Path | str) -> Job:
    """The job in a folder.

    Parameters
    ----------
    folder : Path or str
        Holds job.toml and its tables.

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
    files = _Files(folder, sections["job"], problems)
    stations, length_unit = _stations(files, defaults)
    runs, run_remarks = _runs(files, defaults)
    gauges, gauge_remarks = _gauges(files, runs, settings.tolerance_text, defaults)
    if not problems.found:
        _check_links([s for s, _ in stations], runs, gauges, problems)
    timezone = _timezone(sections["job"])
    spells, levels = _optional(files, runs, timezone, defaults)
    log_files = files.logs()
    liquid, site, log = read_liquid(sections["liquid"]), read_site(sections["site"]), read_log_settings(sections["log"])
    problems.raise_if_any()
    placed = tuple(_at_centreline(station, of, runs) for station, of in stations)
    placed = tuple(_with_exchange(station, runs) for station in placed)
    job = Job(
        folder=folder,
        title=sections["job"].text("title") or folder.resolve().name,
        site_name=sections["job"].text("site"),
        prepared_by=sections["job"].text("prepared_by"),
        timezone=timezone.key,
        stations=placed,
        runs=tuple(runs),
        gauges=tuple(gauges),
        log_files=log_files,
        liquid=liquid,
        site=site,
        check=settings,
        log=log,
        spells=tuple(spells),
        levels=tuple(levels),
        display=_display(length_unit, runs, gauges),
        hold=tuple((key, str(value)) for key, value in sections["hold"].values.items()),
        files=tuple(files.read),
    )
    return replace(job, remarks=(*_taken_for_granted(job), *run_remarks, *gauge_remarks, *unused_yet(job)))


def unused_yet(job: Job) -> tuple[str, ...]:
    """What is read but has no part in the judgement yet, a sentence each."""
    remarks = []
    if job.levels:
        remarks.append("levels: not used yet; high points between stations are not looked at.")
    if any(run.loss is LossKind.FREE for run in job.runs):
        names = ", ".join(run.name for run in job.runs if run.loss is LossKind.FREE)
        remarks.append(f"{names}: loss = free is not used yet; the loss is taken as described.")
    if any(run.temperature_k is not None or run.temperature_column for run in job.runs):
        remarks.append("runs: temperatures of their own are not used yet; the job's liquid temperature stands.")
    if job.site.barometer_column:
        remarks.append("barometer: its log column is not used yet; the standard atmosphere stands in.")
    if any(run.item.casefold() == "check valve" for run in job.runs):
        remarks.append("check valves: not used yet; at rest both sides are taken as one head.")
    return tuple(remarks)


class _Files:
    """The files that job.toml names, each kept inside the job folder."""

    def __init__(self, folder: Path, section: Section, problems: Problems) -> None:
        self.folder, self.section, self.problems = folder, section, problems
        self.read: list[Path] = [folder / FILE]

    def table(self, key: str, *, needed: bool) -> tuple[Path, str, str | None] | None:
        """Path, name in messages and sheet of a table; None where it is not given or cannot be found."""
        name = self.section.text(key)
        if not name:
            if needed:
                self.section.fault(key, "is missing", "", f'{key} = "{key}.csv"')
            return None
        file, _, sheet = name.partition("#")
        path = self._inside(key, file)
        if path is None:
            return None
        if not path.is_file():
            near = nearest(file, [p.name for p in self.folder.iterdir()])
            self.section.fault(key, "there is no such file", file, near or "a file in the job folder")
            return None
        if path not in self.read:
            self.read.append(path)
        return path, name, sheet or None

    def _inside(self, key: str, file: str) -> Path | None:
        """A path within the job folder."""
        path = self.folder / file
        if Path(file).is_absolute() or not path.resolve().is_relative_to(self.folder.resolve()):
            self.section.fault(key, "leads out of the job folder", file, "a file inside it; copy it there")
            return None
        return path

    def logs(self) -> tuple[Path, ...]:
        """Existing log files in the order stated, and the walk where there is one."""
        walk = self.folder / WALK_FILE
        stated = self.section.values.get("logs", [] if walk.is_file() else None)
        if stated is None:
            self.section.fault("logs", "is missing", "", 'logs = ["log.csv"]')
            return ()
        if isinstance(stated, str):
            stated = [stated]
        if not (isinstance(stated, list) and all(isinstance(item, str) for item in stated)):
            self.section.fault("logs", "must be a list of paths", repr(stated), 'logs = ["log.csv"]')
            return ()
        found: list[Path] = []
        for item in stated:
            found += [path for path in self._matching(item) if path not in found]
        if walk.is_file() and walk not in found:
            found.append(walk)
        if not found and not stated:
            self.section.fault("logs", "names no log", "[]", 'logs = ["log.csv"]')
        return tuple(found)

    def _matching(self, pattern: str) -> list[Path]:
        """Files that a path or glob names."""
        if self._inside("logs", pattern) is None:
            return []
        if not any(mark in pattern for mark in "*?["):
            path = self.folder / pattern
            if path.is_file():
                return [path]
            near = nearest(pattern, [p.name for p in self.folder.iterdir()])
            self.section.fault("logs", "there is no such file", pattern, near or "a log in the job folder")
            return []
        found = []
        for path in self.folder.glob(pattern):
            if path.is_file():
                found.append(path)
            if len(found) > MOST_LOGS:
                self.section.fault("logs", "matches too many files", pattern, f"at most {MOST_LOGS}")
                return []
        if not found:
            self.section.fault("logs", "matches no file", pattern, "a log in the job folder")
        return sorted(found)


def _stations(files: _Files, defaults: Defaults) -> tuple[list[tuple[Station, str]], Unit | None]:
    """Stations as the table has them."""
    table = files.table("stations", needed=True)
    return ([], None) if table is None else read_stations(*table, defaults, files.problems)


def _runs(files: _Files, defaults: Defaults) -> tuple[list[Run], list[str]]:
    """Runs as the table has them."""
    table = files.table("runs", needed=True)
    return ([], []) if table is None else read_runs(*table, defaults, files.problems)


def _gauges(
    files: _Files, runs: Sequence[Run], tolerance_text: str, defaults: Defaults
) -> tuple[list[Gauge], list[str]]:
    """Gauges as the table has them."""
    table = files.table("gauges", needed=True)
    return ([], []) if table is None else read_gauges(*table, runs, tolerance_text, defaults, files.problems)


def _optional(
    files: _Files, runs: Sequence[Run], zone: ZoneInfo, defaults: Defaults
) -> tuple[list[StatedSpell], list[LevelPoint]]:
    """Spells and levels, where the job has them."""
    by_name = {run.name: run for run in runs}
    spells, levels = files.table("spells", needed=False), files.table("levels", needed=False)
    return (
        read_spells(*spells, SpellContext(by_name, zone, defaults), files.problems) if spells else [],
        read_levels(*levels, by_name, defaults, files.problems) if levels else [],
    )


def _timezone(section: Section) -> ZoneInfo:
    """The timezone of stamps without an offset."""
    name = section.text("timezone", "UTC")
    try:
        return ZoneInfo(name)
    except (ZoneInfoNotFoundError, ValueError, OSError):
        section.fault("timezone", "unknown timezone", name, "a name such as UTC or Europe/Lisbon")
        return ZoneInfo("UTC")


def _check_links(stations: Sequence[Station], runs: Sequence[Run], gauges: Sequence[Gauge], problems: Problems) -> None:
    """Names told twice, names of nothing, and stations that no run reaches."""
    for file, what, names in (
        ("stations.csv", "station", [s.name for s in stations]),
        ("runs.csv", "run", [r.name for r in runs]),
        ("gauges.csv", "tag", [g.tag for g in gauges]),
    ):
        for name, count in Counter(names).items():
            if count > 1:
                problems.add(file, f"{what} {name} stands {count} times", name, "unique names")
    known = [station.name for station in stations]
    for run in runs:
        for column, name in (("from", run.start), ("to", run.end)):
            _check_name(problems, f"runs.csv, {run.name}, {column}", "no such station", name, known)
    reached = {run.start for run in runs} | {run.end for run in runs}
    for station in stations:
        if len(stations) > 1 and station.name not in reached:
            problems.add(f"stations.csv, {station.name}", "no run reaches this station", "", "a run from or to it")
    run_names = [run.name for run in runs]
    for gauge in gauges:
        place = f"gauges.csv, {gauge.tag}"
        _check_name(problems, f"{place}, station", "no such station", gauge.station, known)
        if gauge.low_station is not None:
            _check_name(problems, f"{place}, low station", "no such station", gauge.low_station, known)
        if gauge.run:
            _check_name(problems, f"{place}, run", "no such run", gauge.run, run_names)


def _check_name(problems: Problems, place: str, fault: str, name: str, known: Iterable[str]) -> None:
    """Note a name of nothing, with the nearest that there is."""
    known = list(known)
    if name not in known:
        close = nearest(name, known)
        problems.add(place, fault, name, f"did you mean {close}?" if close else "one of " + ", ".join(known[:12]))


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
        if (run.end in surfaces or run.start in surfaces) and run.fittings_k == 0.0:
            remarks.append(f"{run.name}: ends at a surface with no K; an exit is K = 1, an entrance about 0.5.")
    return remarks
