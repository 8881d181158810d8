"""The table of gauges: rows to nouns."""

from __future__ import annotations

import re
from collections.abc import Sequence
from dataclasses import dataclass
from datetime import datetime
from zoneinfo import ZoneInfo

from headledger.errors import QuantityError
from headledger.plant.gauges import ErrorLimit, Gauge, Leg, LegFill, Signal
from headledger.plant.runs import Run
from headledger.quantities import (
    Dimension,
    PressureKind,
    Unit,
    nearest,
    parse_pressure,
    parse_quantity,
    parse_unit,
    split_quantity,
)
from headledger.readers.accuracy import parse_limit
from headledger.readers.job_settings import COVERAGE, Defaults
from headledger.readers.job_site import moment
from headledger.readers.tables import Column, Row, Table

EN_CLASS_EFFECT_PER_K = 0.0004
"""Temperature effect of a gauge with an EN class, of its span (EN 837-1, from memory). [1/K]"""

STANDARD_ATMOSPHERE_PA = 101_325.0
"""What is sealed in behind a gauge where its pressure is not stated. [Pa absolute]"""

HEAVIEST_FILL_KG_M3 = 14_000.0
"""Mercury is the heaviest filling of a leg. [kg/m³]"""

GAUGE_COLUMNS = {
    "tag": Column(required=True),
    "station": Column(required=True),
    "low station": Column(),
    "run": Column(),
    "elevation": Column(dimension=Dimension.LENGTH),
    "leg": Column(),
    "corrected": Column(),
    "unit": Column(required=True),
    "reference": Column(),
    "range low": Column(required=True),
    "range high": Column(required=True),
    "signal": Column(),
    "accuracy": Column(required=True),
    "tolerance": Column(),
    "temperature effect": Column(),
    "correction": Column(),
    "calibration uncertainty": Column(),
    "division": Column(),
    "damping": Column(dimension=Dimension.TIME),
    "column": Column(),
    "elevation uncertainty": Column(dimension=Dimension.LENGTH),
    "serial": Column(),
    "from": Column(),
    "until": Column(),
    "certificate": Column(),
    "calibrated": Column(),
    "due": Column(),
}


@dataclass(frozen=True, slots=True)
class _Range:
    """A gauge's unit and range in pascals."""

    unit: Unit
    low_pa: float
    high_pa: float

    @property
    def span_pa(self) -> float:
        """Width. [Pa]"""
        return self.high_pa - self.low_pa


@dataclass(frozen=True, slots=True)
class GaugeContext:
    """What a row of gauges needs to be understood."""

    runs: Sequence[Run]
    zone: ZoneInfo
    tolerance_text: str
    defaults: Defaults


def read_gauges(table: Table, context: GaugeContext) -> tuple[list[Gauge], list[str]]:
    """Gauges, and what was taken for granted or is to be warned of, a sentence each."""
    gauges, remarks = [], []
    for row in table.rows:
        gauge = _gauge(row, context)
        if gauge is None:
            continue
        gauges.append(gauge)
        ending = [run for run in context.runs if run.end == gauge.station]
        if not row.text("run") and len({run.bore_m for run in ending}) > 1:
            others = ", ".join(run.name for run in ending if run.name != gauge.run)
            remarks.append(
                f"{gauge.tag}: taken to sit on {gauge.run}, which ends at {gauge.station} wider than {others}."
            )
        if _is_tight(gauge):
            remarks.append(
                f"{gauge.tag}: its tolerance ({gauge.tolerance.text}) is tighter than its accuracy "
                f"({gauge.accuracy.text})."
            )
    return gauges, remarks


def _is_tight(gauge: Gauge) -> bool:
    """Whether the tolerance lies inside the accuracy anywhere on the range."""
    low, high = gauge.range_low_pa, gauge.range_high_pa
    readings = (low, low + 0.25 * gauge.span_pa, (low + high) / 2.0, high)
    return any(gauge.tolerance_at(pa) < (1.0 - 1e-9) * gauge.accuracy.at(pa, low, high) for pa in readings)


def _gauge(row: Row, context: GaugeContext) -> Gauge | None:
    """One row of the gauges; None where its unit or range cannot be used."""
    tag, station, low_station = row.needed("tag"), row.needed("station"), row.text("low station") or None
    scale = _range(row, differential=low_station is not None)
    hung_from, hung_until = _hung(row, context.zone)
    leg, signal, effect = _leg(row), _signal(row), _temperature_effect(row)
    elevation, doubt = row.elevation("elevation"), row.positive("elevation uncertainty", zero=True)
    corrected_to_tap, corrected_to_m = _corrected(row)
    accuracy_text = row.needed("accuracy")
    if scale is None:
        return None
    accuracy = _limit(row, "accuracy", accuracy_text, scale)
    tolerance = _limit(row, "tolerance", row.text("tolerance") or context.tolerance_text, scale)
    calibration = _pressure(row, "calibration uncertainty", scale, zero=False)
    whole = ErrorLimit(limit_pa=scale.span_pa, outer_limit_pa=scale.span_pa)
    return Gauge(
        tag=tag,
        station=station,
        run=row.text("run") or run_of_tap(station, context.runs),
        unit=scale.unit,
        range_low_pa=scale.low_pa,
        range_high_pa=scale.high_pa,
        accuracy=accuracy or whole,
        tolerance=tolerance or accuracy or whole,
        column=row.text("column") or tag,
        low_station=low_station,
        elevation_m=elevation,
        elevation_sd_m=context.defaults.elevation_sd_m if doubt is None else doubt / COVERAGE,
        leg=leg,
        corrected_to_m=corrected_to_m,
        corrected_to_tap=corrected_to_tap,
        sealed_pa=_sealed(row, scale.unit),
        signal=signal,
        temperature_effect_per_k=effect,
        correction_pa=_pressure(row, "correction", scale) or 0.0,
        calibration_sd_pa=None if calibration is None else calibration / COVERAGE,
        division_pa=_pressure(row, "division", scale, zero=True) or 0.0,
        damping_s=row.positive("damping", zero=True) or 0.0,
        serial=row.text("serial"),
        hung_from=hung_from,
        hung_until=hung_until,
        certificate=row.text("certificate"),
        calibrated=row.text("calibrated"),
        due=row.text("due"),
    )


def run_of_tap(station: str, runs: Sequence[Run]) -> str:
    """The run on whose bore a tap at a station sits: the widest that ends there, else the first that starts there."""
    ending = [run for run in runs if run.end == station]
    if ending:
        return max(ending, key=lambda run: run.bore_m).name
    return next((run.name for run in runs if run.start == station), "")


def _range(row: Row, *, differential: bool) -> _Range | None:
    """Unit and range of a gauge."""
    text = row.needed("unit")
    if not text:
        return None
    try:
        kind = PressureKind.DIFFERENCE if differential else PressureKind.GAUGE
        unit = parse_unit(text, Dimension.PRESSURE, default_kind=kind)
    except QuantityError as error:
        row.fault("unit", error.fault, error.found, error.expected)
        return None
    if differential and unit.kind is not PressureKind.DIFFERENCE:
        row.fault("unit", "a differential gauge's unit carries no suffix", text, unit.as_difference().text)
        return None
    if not differential and unit.kind is PressureKind.DIFFERENCE:
        plain = unit.as_difference().text
        row.fault("unit", "only a differential gauge reads a difference", text, f"{plain}g, {plain}a or a low station")
        return None
    row.needed("range low"), row.needed("range high")
    low, high = row.number_of("range low"), row.number_of("range high")
    if low is None or high is None:
        return None
    if high <= low:
        row.fault(
            "range high",
            "the range is turned round or empty",
            f"{low:g} to {high:g} {text}",
            "a high end above the low end",
        )
        return None
    return _Range(unit, float(unit.to_si(low)), float(unit.to_si(high)))


def _limit(row: Row, column: str, text: str, scale: _Range) -> ErrorLimit | None:
    """A stated limit of error."""
    if not text:
        return None
    try:
        return parse_limit(text, scale.span_pa)
    except QuantityError as error:
        row.fault(column, error.fault, error.found, error.expected)
        return None


def _pressure(row: Row, column: str, scale: _Range, *, zero: bool | None = None) -> float | None:
    """A pressure difference in the gauge's unit, or with a unit of its own. [Pa]

    Any sign unless `zero` is given, which says whether zero is allowed beside what is positive.
    """
    text = row.text(column)
    if not text:
        return None
    try:
        number, unit = split_quantity(text)
        factor = parse_unit(unit, Dimension.PRESSURE).factor if unit else scale.unit.factor
    except QuantityError as error:
        row.fault(column, error.fault, error.found, error.expected)
        return None
    if zero is not None and (number < 0.0 or (number == 0.0 and not zero)):
        row.fault(column, "must not be negative" if zero else "must be positive", text)
        return None
    return number * factor


def _leg(row: Row) -> Leg:
    """What fills the leg."""
    text = row.text("leg").casefold()
    if text in ("", "process", "dry"):
        return Leg(fill=LegFill.DRY if text == "dry" else LegFill.PROCESS)
    try:
        number, unit = split_quantity(text.replace(",", "."))
        gravity = float(parse_unit(unit or "SG", Dimension.DENSITY).to_si(number))
    except QuantityError:
        gravity = 0.0
    if not 0.0 < gravity <= HEAVIEST_FILL_KG_M3:
        expected = nearest(text, ["process", "dry"]) or "process, dry, or a specific gravity such as 1.07 SG"
        row.fault("leg", "not a filling", row.text("leg"), expected)
        return Leg()
    return Leg(fill=LegFill.OWN, density_kg_m3=gravity)


def _corrected(row: Row) -> tuple[bool, float | None]:
    """Whether the value is corrected to its tap, and the level to which it is otherwise. [m]"""
    text = row.text("corrected")
    if text.casefold() in ("", "no"):
        return False, None
    if text.casefold() == "yes":
        return True, None
    try:
        return False, parse_quantity(text, Dimension.LENGTH)
    except QuantityError:
        row.fault("corrected", "neither yes nor a level", text, "yes, no, or a level such as 0 m")
        return False, None


def _sealed(row: Row, unit: Unit) -> float | None:
    """Pressure sealed in behind a gauge reference. [Pa absolute]"""
    text = row.text("reference")
    if text.casefold() in ("", "vented"):
        return None
    if unit.kind is not PressureKind.GAUGE:
        row.fault("reference", "only a gauge pressure has one", text, "a blank cell")
        return None
    if text.casefold() == "sealed":
        return STANDARD_ATMOSPHERE_PA
    stated = re.fullmatch(r"sealed at\s+(.+)", text, re.IGNORECASE)
    if not stated:
        row.fault("reference", "unknown reference", text, "vented, sealed, or sealed at 95.0 kPa")
        return None
    try:
        return parse_pressure(stated[1], PressureKind.ABSOLUTE)
    except QuantityError as error:
        row.fault("reference", error.fault, error.found, error.expected)
        return None


def _signal(row: Row) -> Signal:
    """What the log holds."""
    text = " ".join(row.text("signal").split())
    if not text or text.casefold() == "unit":
        return Signal.OWN_UNIT
    for signal in Signal:
        if signal.value.casefold() == text.casefold():
            return signal
    close = nearest(text, [s.value for s in Signal])
    row.fault("signal", "unknown signal", text, close or ", ".join(s.value for s in Signal if s is not Signal.OWN_UNIT))
    return Signal.OWN_UNIT


def _temperature_effect(row: Row) -> float | None:
    """Temperature effect of an instrument, of its span. [1/K]"""
    text = row.text("temperature effect")
    if not text:
        return EN_CLASS_EFFECT_PER_K if re.search(r"\bcl(?:ass|\.)", row.text("accuracy"), re.IGNORECASE) else None
    try:
        number, unit = split_quantity(text)
    except QuantityError:
        number, unit = -1.0, ""
    if number < 0.0 or "".join(unit.split()).casefold() not in ("%span/k", "%/k", "%span/degc", "%span/°c"):
        row.fault("temperature effect", "not a share of span per kelvin", text, "0.04 % span/K")
        return None
    return number / 100.0


def _hung(row: Row, zone: ZoneInfo) -> tuple[datetime | None, datetime | None]:
    """When the instrument hung there."""
    start, end = moment(row, "from", zone), moment(row, "until", zone)
    if start and end and end <= start:
        row.fault("until", "is not after from", row.text("until"), f"a time after {row.text('from')}")
    return start, end
