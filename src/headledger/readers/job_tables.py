"""The tables of stations and runs: rows to nouns."""

from __future__ import annotations

import re
from dataclasses import replace

from headledger.errors import QuantityError
from headledger.physics.losses import KV_FROM_CV
from headledger.plant.runs import Doubt, LossKind, PumpCurve, Run, RunState
from headledger.plant.stations import Exchange, Station, StationKind
from headledger.quantities import Dimension, PressureKind, Unit, parse_number, parse_unit, split_quantity
from headledger.readers.job_settings import COVERAGE, Defaults
from headledger.readers.pipes import find_pipe, fittings_k
from headledger.readers.tables import Column, Row, Table

LENGTH, PRESSURE, FLOW = Dimension.LENGTH, Dimension.PRESSURE, Dimension.FLOW
ROUGHNESS_M = 45e-6
"""Of clean commercial steel, where nothing is stated. [m]"""

LOSS_OF_UNKNOWN_PIPE = 0.40
"""± on the loss of a run with a length but neither roughness nor C, where the job states none. [-]"""

KV_UNIT_M3_S = 1.0 / 3600.0

STATION_COLUMNS = {
    "station": Column(required=True),
    "elevation": Column(dimension=LENGTH, required=True),
    "kind": Column(),
    "exchange": Column(),
    "level of": Column(),
    "level column": Column(),
    "level unit": Column(),
    "elevation uncertainty": Column(dimension=LENGTH),
}

RUN_COLUMNS = {
    "run": Column(required=True),
    "from": Column(required=True),
    "to": Column(required=True),
    "length": Column(dimension=LENGTH),
    "bore": Column(dimension=LENGTH),
    "pipe": Column(),
    "roughness": Column(dimension=LENGTH),
    "hazen-williams C": Column(),
    "fittings K": Column(),
    "fittings": Column(),
    "Kv": Column(dimension=FLOW),
    "Cv": Column(),
    "rated drop": Column(dimension=PRESSURE),
    "rated flow": Column(dimension=FLOW),
    "loss": Column(),
    "item": Column(),
    "pump curve": Column(),
    "pump flow unit": Column(),
    "pump head unit": Column(),
    "speed column": Column(),
    "flow column": Column(),
    "flow unit": Column(),
    "flow Kvs": Column(dimension=FLOW),
    "flow uncertainty": Column(),
    "loss uncertainty": Column(),
    "temperature": Column(dimension=Dimension.TEMPERATURE),
    "temperature column": Column(),
    "rating": Column(dimension=PRESSURE, kind=PressureKind.GAUGE),
    "state": Column(),
}


def read_stations(table: Table, defaults: Defaults) -> list[tuple[Station, str]]:
    """Stations, each with the word that says what its elevation is of."""
    stations = []
    for row in table.rows:
        doubt = row.positive("elevation uncertainty", zero=True)
        row.needed("elevation")
        station = Station(
            name=row.needed("station"),
            elevation_m=row.elevation("elevation") or 0.0,
            elevation_sd_m=defaults.elevation_sd_m if doubt is None else doubt / COVERAGE,
            kind=StationKind(row.choice("kind", ("", "surface", "pipe")) or "pipe"),
            exchange=Exchange(row.choice("exchange", ("", "open", "closed")) or "closed"),
            exchange_stated=bool(row.text("exchange")),
            level_column=row.text("level column") or None,
            level_unit=_unit(row, "level unit", LENGTH),
        )
        if station.level_column and station.kind is not StationKind.SURFACE:
            row.fault("level column", "only a surface has one", station.level_column, "kind surface, or a blank cell")
        _paired(row, "level column", "level unit", "the unit of the level column, such as m")
        level_of = row.choice("level of", ("centreline", "invert", "crown"))
        if level_of != "centreline" and station.kind is StationKind.SURFACE:
            row.fault("level of", "a surface has no bore", level_of, "a blank cell")
        stations.append((station, level_of))
    return stations


def _paired(row: Row, column: str, other: str, expected: str) -> None:
    """Note a cell that needs another beside it."""
    if row.text(column) and not row.text(other):
        row.fault(other, f"is blank beside {column} {row.text(column)}", "", expected)


def _unit(row: Row, column: str, dimension: Dimension, kind: PressureKind | None = None) -> Unit | None:
    """A unit named in a cell."""
    text = row.text(column)
    if not text:
        return None
    try:
        return parse_unit(text, dimension, default_kind=kind)
    except QuantityError as error:
        row.fault(column, error.fault, error.found, error.expected)
        return None


def share_of(row: Row, column: str) -> float | None:
    """A ± per cent as a standard uncertainty, None where blank or faulty."""
    text = row.text(column)
    if not text:
        return None
    try:
        number, unit = split_quantity(text)
    except QuantityError:
        number, unit = 0.0, ""
    if unit != "%" or number == 0.0:
        row.fault(column, "not a share in per cent", text, "±15 %")
        return None
    return abs(number) / 100.0 / COVERAGE


def read_runs(table: Table, defaults: Defaults) -> tuple[list[Run], list[str]]:
    """Runs, and what was taken from published tables or for granted, a sentence each."""
    remarks: list[str] = []
    return [_run(row, defaults, remarks) for row in table.rows], remarks


def _run(row: Row, defaults: Defaults, remarks: list[str]) -> Run:
    """One row of the runs."""
    name = row.needed("run")
    length = row.positive("length", zero=True) or 0.0
    williams = row.positive("hazen-williams C")
    roughness = row.positive("roughness", zero=True)
    run = Run(
        name=name,
        start=row.needed("from"),
        end=row.needed("to"),
        bore_m=_bore(row, name, remarks),
        length_m=length,
        roughness_m=None if williams else (ROUGHNESS_M if roughness is None else roughness),
        hazen_williams_c=williams,
        fittings_k=_fittings(row, name, remarks),
        valve_kv_m3_s=_valve(row),
        rated_drop_pa=row.positive("rated drop"),
        rated_flow_m3_s=row.positive("rated flow"),
        loss=LossKind(row.choice("loss", ("fixed", "free"))),
        loss_sd_fraction=_loss_doubt(row, defaults, unknown=length > 0.0 and roughness is None and not williams),
        item=row.text("item"),
        pump=_pump(row),
        speed_column=row.text("speed column") or None,
        rating_pa=row.positive("rating"),
    )
    _check_run(row, run)
    return _with_temperature(row, _with_state(row, _with_meter(row, run, defaults)), remarks)


def _check_run(row: Row, run: Run) -> None:
    """Note what of a run does not go together."""
    _paired(row, "rated drop", "rated flow", "the flow at which the drop is rated")
    _paired(row, "rated flow", "rated drop", "the drop at the rated flow")
    if run.start and run.start == run.end:
        row.fault("to", "a run must lead to another station", run.end, "two different stations")
    if run.roughness_m is not None and run.roughness_m >= run.bore_m:
        unit = row.table.unit_text("roughness")
        row.fault("roughness", "is not smaller than the bore", f"{row.text('roughness')} {unit}", "0.045 mm for steel")
    if run.speed_column and run.pump is None:
        row.fault("speed column", "needs a pump curve", run.speed_column, "a pump curve such as 0:32; 20:30; 40:24")


def _with_temperature(row: Row, run: Run, remarks: list[str]) -> Run:
    """The run with the temperature of its liquid, where it has one of its own."""
    stated, column = row.positive("temperature"), row.text("temperature column") or None
    unit = row.table.units.get("temperature")
    if column and unit is None:
        unit = parse_unit("degC", Dimension.TEMPERATURE)
        remarks.append(f"{run.name}: its temperature column {column} is taken to be in degC.")
    return replace(run, temperature_k=stated, temperature_column=column, temperature_unit=unit if column else None)


def _bore(row: Row, name: str, remarks: list[str]) -> float:
    """Inside diameter, stated or from a table of pipes. [m]"""
    stated, words = row.positive("bore"), row.text("pipe")
    if not words:
        if not row.text("bore"):
            row.fault("bore", "is blank", "", "the inside diameter, or a pipe such as DN 100 sch 40")
        return 1.0 if stated is None else stated
    try:
        pipe = find_pipe(words)
    except QuantityError as error:
        row.fault("pipe", error.fault, error.found, error.expected)
        return 1.0
    size = f"bore {1000.0 * pipe.bore_m:.1f} mm, wall {1000.0 * pipe.wall_m:.2f} mm"
    if stated is None:
        remarks.append(f"{name}: {words} is taken as {size}.")
        return pipe.bore_m
    remarks.append(f"{name}: its stated bore of {1000.0 * stated:.1f} mm stands; {words} would be {size}.")
    return stated


def _fittings(row: Row, name: str, remarks: list[str]) -> float:
    """Sum of loss coefficients, stated and in words. [-]"""
    stated = row.number_of("fittings K") or 0.0
    if stated < 0.0:
        row.fault("fittings K", "must not be negative", row.text("fittings K"))
    if not row.text("fittings"):
        return stated
    try:
        found = fittings_k(row.text("fittings"))
    except QuantityError as error:
        row.fault("fittings", error.fault, error.found, error.expected)
        return stated
    remarks.append(f"{name}: {row.text('fittings')} is taken as K = {found:.2f}.")
    return stated + found


def _valve(row: Row) -> float | None:
    """Kv of an installed valve. [m³/s]"""
    kv, cv = row.positive("Kv"), row.positive("Cv")
    if kv is not None and cv is not None:
        row.fault("Cv", "Kv and Cv are both given", row.text("Cv"), "one of them")
    return kv if kv is not None else (None if cv is None else cv * KV_FROM_CV * KV_UNIT_M3_S)


def _loss_doubt(row: Row, defaults: Defaults, *, unknown: bool) -> float:
    """Standard uncertainty of a run's loss. [-]"""
    own = share_of(row, "loss uncertainty")
    if own is not None:
        return own
    return LOSS_OF_UNKNOWN_PIPE / COVERAGE if unknown and not defaults.loss_stated else defaults.loss_sd_fraction


def _pump(row: Row) -> PumpCurve | None:
    """A pump's curve."""
    text = row.text("pump curve")
    if not text:
        return None
    flow, head = _unit(row, "pump flow unit", FLOW), _unit(row, "pump head unit", LENGTH)
    _paired(row, "pump curve", "pump flow unit", "the unit of its flows, such as m3/h")
    _paired(row, "pump curve", "pump head unit", "the unit of its heads, such as m")
    if flow is None or head is None:
        return None
    try:
        cells = [pair.split(":") for pair in text.split(";") if pair.strip()]
        pairs = [tuple(parse_number(number.replace(",", ".")) for number in cell) for cell in cells]
    except QuantityError:
        pairs = []
    if len({pair[0] for pair in pairs}) < 2 or any(len(pair) != 2 for pair in pairs):
        row.fault("pump curve", "not a list of flow:head pairs at two flows or more", text, "0:32; 20:30; 40:24")
        return None
    return PumpCurve(
        flow_m3_s=tuple(float(flow.to_si(pair[0])) for pair in pairs),
        head_m=tuple(float(head.to_si(pair[1])) for pair in pairs),
    )


def _with_meter(row: Row, run: Run, defaults: Defaults) -> Run:
    """The run with its flow meter."""
    column, kvs = row.text("flow column"), row.positive("flow Kvs")
    unit = _unit(row, "flow unit", PRESSURE if kvs is not None else FLOW, PressureKind.DIFFERENCE)
    doubt = flow_doubt(row, "flow uncertainty", defaults)
    _paired(row, "flow column", "flow unit", "the unit of the flow column, such as m3/h")
    _paired(row, "flow Kvs", "flow column", "the log column that holds the valve's differential pressure")
    if not column:
        return run
    return replace(run, flow_column=column, flow_unit=unit, flow_kvs_m3_s=kvs, flow_doubt=doubt)


def flow_doubt(row: Row, column: str, defaults: Defaults) -> Doubt:
    """Standard uncertainty of a flow from its cell: a share of the flow, or a flow; the job's where blank."""
    text, doubt = row.text(column), Doubt(relative_fraction=defaults.flow_sd_fraction)
    if not text:
        return doubt
    try:
        number, unit = split_quantity(text)
        if re.fullmatch(r"%(?: of)?(?: reading| rdg)?", unit.strip()):
            doubt = Doubt(relative_fraction=abs(number) / 100.0 / COVERAGE)
        else:
            doubt = Doubt(absolute=abs(float(parse_unit(unit, FLOW).to_si(number))) / COVERAGE)
    except QuantityError as error:
        row.fault(column, error.fault, error.found, "±2 % or ±0.5 m3/h")
        return doubt
    if number == 0.0:
        row.fault(column, "must be positive", text, "±2 % or ±0.5 m3/h")
    return doubt


def _with_state(row: Row, run: Run) -> Run:
    """The run with the state of its valve: open, closed, or the log column that says."""
    text = row.text("state")
    if text.casefold() in ("", "open", "closed"):
        return replace(run, state=RunState(text.casefold() or "open"))
    return replace(run, state=RunState.COLUMN, state_column=text)
