"""The tables of stations and runs: rows to nouns."""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path

from headledger.errors import QuantityError
from headledger.physics.losses import KV_FROM_CV
from headledger.plant.runs import Doubt, LossKind, PumpCurve, Run, RunState
from headledger.plant.stations import Exchange, Station, StationKind
from headledger.quantities import Dimension, PressureKind, Unit, parse_number, parse_unit, split_quantity
from headledger.readers.job_settings import COVERAGE, Defaults
from headledger.readers.pipes import fittings_k, pipe_bore_m
from headledger.readers.tables import Column, Problems, Row, read_table

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
    "rating": Column(dimension=PRESSURE),
    "state": Column(),
}


def read_stations(
    path: Path, file: str, sheet: str | None, defaults: Defaults, problems: Problems
) -> tuple[list[tuple[Station, str]], Unit | None]:
    """Stations with the word that says what their elevation is of, and the unit of elevations."""
    table = read_table(path, file, STATION_COLUMNS, problems, sheet=sheet)
    stations = []
    for row in table.rows:
        doubt = row.positive("elevation uncertainty", zero=True)
        elevation = row.quantity("elevation")
        if elevation is None and not row.text("elevation") and "elevation" in table.units:
            row.fault("elevation", "is blank", "", "the elevation, in the unit of the column")
        level_unit = _unit(row, "level unit", LENGTH) if row.text("level column") else None
        if row.text("level column") and not row.text("level unit"):
            row.fault("level unit", "is blank", "", "the unit of the level column")
        station = Station(
            name=row.needed("station"),
            elevation_m=elevation or 0.0,
            elevation_sd_m=defaults.elevation_sd_m if doubt is None else doubt / COVERAGE,
            kind=StationKind.SURFACE if row.choice("kind", ("", "surface")) else StationKind.PIPE,
            exchange=Exchange(row.choice("exchange", ("closed", "open"))),
            exchange_stated=bool(row.text("exchange")),
            level_column=row.text("level column") or None,
            level_unit=level_unit,
        )
        stations.append((station, row.choice("level of", ("centreline", "invert", "crown"))))
    return stations, table.units.get("elevation")


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
        factor = parse_unit(unit, Dimension.RATIO).factor
    except QuantityError as error:
        row.fault(column, error.fault, error.found, "±15 %")
        return None
    return abs(number) * factor / COVERAGE


def read_runs(
    path: Path, file: str, sheet: str | None, defaults: Defaults, problems: Problems
) -> tuple[list[Run], list[str]]:
    """Runs, and what was taken from published tables, a sentence each."""
    table = read_table(path, file, RUN_COLUMNS, problems, sheet=sheet)
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
        temperature_k=row.quantity("temperature"),
        temperature_column=row.text("temperature column") or None,
    )
    if (run.rated_drop_pa is None) != (run.rated_flow_m3_s is None):
        row.fault("rated drop", "needs a rated flow beside it, and the other way round", "", "both or neither")
    if run.start and run.start == run.end:
        row.fault("to", "a run must lead to another station", run.end, "two different stations")
    return _with_state(row, _with_meter(row, run, defaults))


def _bore(row: Row, name: str, remarks: list[str]) -> float:
    """Inside diameter, stated or from a table of pipes. [m]"""
    bore = row.positive("bore")
    if bore is not None:
        return bore
    if row.text("pipe"):
        try:
            found = pipe_bore_m(row.text("pipe"))
        except QuantityError as error:
            row.fault("pipe", error.fault, error.found, error.expected)
            return 1.0
        remarks.append(f"{name}: pipe {row.text('pipe')} is taken as {1000.0 * found:.1f} mm bore.")
        return found
    if not row.text("bore"):
        row.fault("bore", "is blank", "", "the inside diameter, or a pipe such as DN 100 sch 40")
    return 1.0


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
    remarks.append(f"{name}: fittings {row.text('fittings')} are taken as K = {found:.2f}.")
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
    if flow is None or head is None:
        if not row.text("pump flow unit") or not row.text("pump head unit"):
            row.fault("pump curve", "needs its units", text, "pump flow unit and pump head unit, such as m3/h and m")
        return None
    try:
        pairs = [
            tuple(parse_number(n.replace(",", ".")) for n in pair.split(":"))
            for pair in text.split(";")
            if pair.strip()
        ]
        if len(pairs) < 2 or any(len(pair) != 2 for pair in pairs):
            raise QuantityError("not a pump curve", text, "two pairs or more")
    except QuantityError:
        row.fault("pump curve", "not a list of flow:head pairs", text, "0:32; 20:30; 40:24")
        return None
    return PumpCurve(
        flow_m3_s=tuple(float(flow.to_si(pair[0])) for pair in pairs),
        head_m=tuple(float(head.to_si(pair[1])) for pair in pairs),
    )


def _with_meter(row: Row, run: Run, defaults: Defaults) -> Run:
    """The run with its flow meter."""
    column = row.text("flow column")
    if not column:
        return run
    kvs = row.positive("flow Kvs")
    unit = _unit(row, "flow unit", PRESSURE if kvs is not None else FLOW, PressureKind.DIFFERENCE)
    if not row.text("flow unit"):
        row.fault("flow unit", "is blank", "", "the unit of the flow column, such as m3/h")
    return replace(run, flow_column=column, flow_unit=unit, flow_kvs_m3_s=kvs, flow_doubt=_flow_doubt(row, defaults))


def _flow_doubt(row: Row, defaults: Defaults) -> Doubt:
    """Standard uncertainty of a meter: a share of its reading, or a flow."""
    text = row.text("flow uncertainty")
    if not text:
        return Doubt(relative_fraction=defaults.flow_sd_fraction)
    try:
        number, unit = split_quantity(text)
        if unit.startswith("%"):
            return Doubt(relative_fraction=abs(number) / 100.0 / COVERAGE)
        return Doubt(absolute=abs(float(parse_unit(unit, FLOW).to_si(number))) / COVERAGE)
    except QuantityError as error:
        row.fault("flow uncertainty", error.fault, error.found, "±2 % or ±0.5 m3/h")
        return Doubt(relative_fraction=defaults.flow_sd_fraction)


def _with_state(row: Row, run: Run) -> Run:
    """The run with the state of its valve: open, closed, or the log column that says."""
    text = row.text("state")
    if text.casefold() in ("", "open", "closed"):
        return replace(run, state=RunState(text.casefold() or "open"))
    return replace(run, state=RunState.COLUMN, state_column=text)
