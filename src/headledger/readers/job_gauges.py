"""The table of gauges: rows to nouns."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from datetime import UTC, datetime
from pathlib import Path

from headledger.errors import QuantityError
from headledger.plant.gauges import ErrorLimit, Gauge, Leg, LegFill, Signal
from headledger.plant.runs import Run
from headledger.quantities import Dimension, PressureKind, Unit, nearest, parse_quantity, parse_unit, split_quantity
from headledger.readers.accuracy import parse_limit
from headledger.readers.job_settings import COVERAGE, Defaults
from headledger.readers.tables import Column, Problems, Row, read_table

EN_CLASS_EFFECT_PER_K = 0.0004
"""Temperature effect of a gauge with an EN class, of its span (EN 837-1, from memory). [1/K]"""

STANDARD_ATMOSPHERE_PA = 101_325.0

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


def read_gauges(
    path: Path,
    file: str,
    sheet: str | None,
    runs: Sequence[Run],
    tolerance_text: str,
    defaults: Defaults,
    problems: Problems,
) -> tuple[list[Gauge], list[str]]:
    """Gauges, and warnings about their tolerances, a sentence each."""
    table = read_table(path, file, GAUGE_COLUMNS, problems, sheet=sheet)
    gauges, remarks = [], []
    for row in table.rows:
        gauge = _gauge(row, runs, tolerance_text, defaults)
        if gauge is None:
            continue
        gauges.append(gauge)
        middle = (gauge.range_low_pa + gauge.range_high_pa) / 2.0
        allowed = gauge.accuracy.at(middle, gauge.range_low_pa, gauge.range_high_pa)
        if gauge.tolerance_at(middle) < 0.999 * allowed:
            remarks.append(
                f"{gauge.tag}: its tolerance ({gauge.tolerance.text}) is tighter than its accuracy ({gauge.accuracy.text})."
            )
    return gauges, remarks


def _gauge(row: Row, runs: Sequence[Run], tolerance_text: str, defaults: Defaults) -> Gauge | None:
    """One row of the gauges; None where its unit or range cannot be used."""
    tag, station, low_station = row.needed("tag"), row.needed("station"), row.text("low station") or None
    scale = _range(row, differential=low_station is not None)
    if scale is None:
        return None
    accuracy = _limit(row, "accuracy", row.needed("accuracy"), scale)
    tolerance = _limit(row, "tolerance", row.text("tolerance") or tolerance_text, scale)
    corrected_to_tap, corrected_to_m = _corrected(row)
    doubt = row.positive("elevation uncertainty", zero=True)
    calibration = _pressure(row, "calibration uncertainty", scale)
    return Gauge(
        tag=tag,
        station=station,
        run=row.text("run") or run_of_tap(station, runs),
        unit=scale.unit,
        range_low_pa=scale.low_pa,
        range_high_pa=scale.high_pa,
        accuracy=accuracy or ErrorLimit(limit_pa=scale.span_pa, outer_limit_pa=scale.span_pa),
        tolerance=tolerance or accuracy or ErrorLimit(limit_pa=scale.span_pa, outer_limit_pa=scale.span_pa),
        column=row.text("column") or tag,
        low_station=low_station,
        elevation_m=row.quantity("elevation"),
        elevation_sd_m=defaults.elevation_sd_m if doubt is None else doubt / COVERAGE,
        leg=_leg(row),
        corrected_to_m=corrected_to_m,
        corrected_to_tap=corrected_to_tap,
        sealed_pa=_sealed(row, scale.unit),
        signal=_signal(row),
        temperature_effect_per_k=_temperature_effect(row),
        correction_pa=_pressure(row, "correction", scale) or 0.0,
        calibration_sd_pa=None if calibration is None else abs(calibration) / COVERAGE,
        division_pa=abs(_pressure(row, "division", scale) or 0.0),
        damping_s=row.positive("damping", zero=True) or 0.0,
        serial=row.text("serial"),
        hung_from=_moment(row, "from"),
        hung_until=_moment(row, "until"),
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
    low, high = row.number_of("range low"), row.number_of("range high")
    for column, value in (("range low", low), ("range high", high)):
        if value is None and not row.text(column):
            row.fault(column, "is blank", "", "the end of the range, in the gauge's unit")
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


def _pressure(row: Row, column: str, scale: _Range) -> float | None:
    """A pressure difference in the gauge's unit, or with a unit of its own. [Pa]"""
    text = row.text(column)
    if not text:
        return None
    try:
        number, unit = split_quantity(text.replace(",", ".") if row.table.decimal_comma else text)
        if not unit:
            return number * scale.unit.factor
        return parse_quantity(text, Dimension.PRESSURE, default_kind=PressureKind.DIFFERENCE)
    except QuantityError as error:
        row.fault(column, error.fault, error.found, error.expected)
        return None


def _leg(row: Row) -> Leg:
    """What fills the leg."""
    text = row.text("leg").casefold()
    if text in ("", "process", "dry"):
        return Leg(fill=LegFill.DRY if text == "dry" else LegFill.PROCESS)
    try:
        number, unit = split_quantity(text.replace(",", "."))
        gravity = parse_unit(unit or "SG", Dimension.DENSITY).to_si(number)
    except QuantityError:
        row.fault("leg", "not a filling", row.text("leg"), "process, dry, or a specific gravity such as 1.07 SG")
        return Leg()
    return Leg(fill=LegFill.OWN, density_kg_m3=float(gravity))


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
    text = row.text("reference").casefold()
    if text in ("", "vented"):
        return None
    if unit.kind is not PressureKind.GAUGE:
        row.fault("reference", "only a gauge pressure has one", row.text("reference"), "blank")
        return None
    if text == "sealed":
        return STANDARD_ATMOSPHERE_PA
    try:
        return parse_quantity(
            text.removeprefix("sealed at").strip(), Dimension.PRESSURE, default_kind=PressureKind.ABSOLUTE
        )
    except QuantityError:
        row.fault("reference", "unknown reference", row.text("reference"), "vented, sealed, or sealed at 95.0 kPa")
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
        return EN_CLASS_EFFECT_PER_K if row.text("accuracy").casefold().startswith("class") else None
    try:
        number, unit = split_quantity(text)
    except QuantityError:
        number, unit = 0.0, ""
    if "".join(unit.split()).casefold() not in ("%span/k", "%/k", "%span/degc"):
        row.fault("temperature effect", "not a share of span per kelvin", text, "0.04 % span/K")
        return None
    return number / 100.0


def _moment(row: Row, column: str) -> datetime | None:
    """A time, in UTC where it carries no offset."""
    text = row.text(column)
    if not text:
        return None
    try:
        found = datetime.fromisoformat(text)
    except ValueError:
        row.fault(column, "not a time", text, "2026-03-02T08:00:00Z")
        return None
    return found if found.tzinfo else found.replace(tzinfo=UTC)
