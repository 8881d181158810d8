"""What a job says of a gauge, and of the conditions of a check, as label and value: the same on screen and sheet."""

from __future__ import annotations

from headledger.diagnosis.result import CheckResult, GaugeFound
from headledger.plant.gauges import Gauge, LegFill, Signal
from headledger.plant.job import DecisionRule, Job, LiquidKind
from headledger.quantities import Dimension, PressureKind, format_quantity, parse_unit

Fact = tuple[str, str]

_CELSIUS_ZERO_K = 273.15
# A barometer is spoken of in kPa, whatever the gauges use.
_KILOPASCAL = parse_unit("kPa", Dimension.PRESSURE, default_kind=PressureKind.ABSOLUTE).as_difference()
_LIQUIDS = {
    LiquidKind.WATER: "water",
    LiquidKind.SEAWATER: "seawater",
    LiquidKind.ETHYLENE_GLYCOL: "ethylene glycol",
    LiquidKind.PROPYLENE_GLYCOL: "propylene glycol",
    LiquidKind.OTHER: "liquid of its own",
}


def identity(result: CheckResult, gauge: GaugeFound) -> tuple[Fact, ...]:
    """Which instrument it is, where it hangs, and how well it is meant to read; what is not stated is left out."""
    noun = result.job.gauge(gauge.tag)
    facts = [
        ("Tag", noun.tag),
        ("Serial", noun.serial),
        ("Station", noun.station if noun.low_station is None else f"{noun.station} (high), {noun.low_station} (low)"),
        ("Elevation", _elevation(result.job, noun)),
        ("Leg", _leg(noun)),
        ("Logged as", _logged(result.job, noun)),
        ("Range", _range(noun)),
        ("Reference", _reference(noun)),
        ("Accuracy", noun.accuracy.text),
        ("Tolerance", noun.tolerance.text),
        ("Certificate", noun.certificate),
        ("Calibrated", noun.calibrated),
        ("Due", noun.due),
    ]
    return tuple((label, value) for label, value in facts if value)


def identity_lines(result: CheckResult, gauge: GaugeFound) -> tuple[str, ...]:
    """The same as lines of text, labels in one column."""
    facts = identity(result, gauge)
    width = max(len(label) for label, _ in facts)
    return (*(f"{label.ljust(width)}  {value}" for label, value in facts), *history_lines(result, gauge))


def history_lines(result: CheckResult, gauge: GaugeFound) -> tuple[str, ...]:
    """How it kept to its neighbours over the log; nothing where they do not tell."""
    return tuple(history.says for history in result.histories if history.tag == gauge.tag)


def conditions(job: Job) -> tuple[Fact, ...]:
    """What the whole check stands on: liquid, air, and the rule of decision."""
    liquid = job.liquid
    concentration = ""
    if liquid.concentration_fraction is not None:
        by = "by volume" if liquid.concentration_by_volume else "by mass"
        concentration = f" {100.0 * liquid.concentration_fraction:.4g} % {by}"
    temperature = f"{liquid.temperature_k - _CELSIUS_ZERO_K:.4g} °C"
    if liquid.temperature_column:
        temperature = f"logged as {liquid.temperature_column}"
    barometer = "standard atmosphere of its altitude,"
    if job.site.barometer_pa is not None:
        barometer = format_quantity(job.site.barometer_pa, _KILOPASCAL, 5).removesuffix(f" {_KILOPASCAL.text}")
    facts = [
        ("Liquid", f"{_LIQUIDS[liquid.kind]}{concentration}, {temperature} ± {2.0 * liquid.temperature_sd_k:.2g} K"),
        ("Barometer", f"{barometer} ± {format_quantity(2.0 * job.site.barometer_sd_pa, _KILOPASCAL, 2)}"),
        ("Datum", f"{job.site.datum_altitude_m:.4g} m above sea level, latitude {job.site.latitude_deg:.4g}°"),
        ("Ambient", "" if job.site.ambient_k is None else f"{job.site.ambient_k - _CELSIUS_ZERO_K:.3g} °C"),
        ("Decision rule", decision_words(job)),
    ]
    return tuple((label, value) for label, value in facts if value)


def decision_words(job: Job) -> str:
    """The rule by which a verdict follows from the probability that the error is outside its tolerance."""
    if job.check.decision is DecisionRule.SIMPLE:
        return "simple: fails where its error is more probably outside the tolerance than inside, else passes"
    sure = 100.0 * job.check.confidence_fraction
    return (
        f"guarded: fails where its error is at least {sure:.4g} % likely outside the tolerance, "
        f"passes where it is at most {100.0 - sure:.4g} %, else unresolved"
    )


def _elevation(job: Job, gauge: Gauge) -> str:
    if gauge.elevation_m is None:
        return f"{_length(job, job.station(gauge.station).elevation_m)} (its station's)"
    return _length(job, gauge.elevation_m)


def _length(job: Job, length_m: float) -> str:
    unit = job.display.length
    return f"{length_m / unit.factor:.6g} {unit.text}"


def _leg(gauge: Gauge) -> str:
    if gauge.corrected_to_tap:
        return "corrected to its tap"
    if gauge.leg.fill is LegFill.DRY:
        return "dry"
    if gauge.leg.fill is LegFill.OWN and gauge.leg.density_kg_m3 is not None:
        return f"own fill, {gauge.leg.density_kg_m3:.4g} kg/m³"
    return "process liquid"


def _logged(job: Job, gauge: Gauge) -> str:
    name = f"column {gauge.column}"
    return name if gauge.signal is Signal.OWN_UNIT else f"{name}, {gauge.signal.value}"


def _range(gauge: Gauge) -> str:
    factor, offset = gauge.unit.factor, gauge.unit.offset
    low, high = ((value - offset) / factor for value in (gauge.range_low_pa, gauge.range_high_pa))
    return f"{low:.6g} to {high:.6g} {gauge.unit.text}"


def _reference(gauge: Gauge) -> str:
    if gauge.is_differential:
        return "differential"
    if gauge.unit.kind is PressureKind.ABSOLUTE:
        return "absolute"
    if gauge.sealed_pa is not None:
        return f"sealed at {format_quantity(gauge.sealed_pa, gauge.unit.as_difference(), 5)}"
    return "vented"
