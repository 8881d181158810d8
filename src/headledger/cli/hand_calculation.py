"""A hand calculation: options of the command line to an energy balance, and the ledger that shows it."""

from __future__ import annotations

import math
from collections.abc import Iterator, Mapping
from dataclasses import dataclass
from typing import Any

from headledger.cli.quantity_options import QuantityOptions
from headledger.errors import QuantityError
from headledger.physics.balance import EnergyBalance, Point, energy_balance
from headledger.physics.earth import gravity_m_s2, standard_pressure_pa
from headledger.physics.friction import friction_factor
from headledger.physics.liquids import LiquidProperties, liquid_properties
from headledger.physics.losses import RunLoss, head_loss
from headledger.quantities import Dimension, PressureKind, Unit, format_quantity
from headledger.sheets.numbers import fixed

FREE_SURFACE = "surface"
CLEAN_STEEL_ROUGHNESS_M = 45e-6

METRE = Unit("m", Dimension.LENGTH, 1.0)

_SIGNIFICANT_DIGITS = 5
_COLUMN = 16


@dataclass(frozen=True, slots=True, kw_only=True)
class HandCalculation:
    """What lies between two points, in SI, and the units in which it is printed.

    Parameters
    ----------
    first, second : Point
    first_pressure_pa : float
        Of the kind of `pressure_unit`. [Pa]
    flow_m3_s : float
        [m³/s]
    losses : tuple of (str, float)
        Words of each loss, and the head it takes. [m]
    bore_m, roughness_m : float or None
        Of the pipe; no roughness where Hazen–Williams is used. [m]
    liquid : LiquidProperties
    liquid_name : str
    gravity_m_s2 : float
        [m/s²]
    datum_altitude_m : float
        [m]
    pressure_unit, length_unit : Unit
    """

    first: Point
    second: Point
    first_pressure_pa: float
    flow_m3_s: float
    losses: tuple[tuple[str, float], ...]
    bore_m: float | None
    roughness_m: float | None
    liquid: LiquidProperties
    liquid_name: str
    gravity_m_s2: float
    datum_altitude_m: float
    pressure_unit: Unit
    length_unit: Unit

    @property
    def balance(self) -> EnergyBalance:
        """The energy balance from the first point to the second."""
        return energy_balance(
            self.first,
            self.second,
            first_pressure_pa=self.first_pressure_pa,
            flow_m3_s=self.flow_m3_s,
            lost_head_m=sum(head_m for _, head_m in self.losses),
            density_kg_m3=self.liquid.density_kg_m3,
            gravity_m_s2=self.gravity_m_s2,
        )

    @property
    def second_absolute_pressure_pa(self) -> float:
        """Pressure at the second point; a gauge pressure by the standard atmosphere at its altitude. [Pa absolute]"""
        pressure_pa = self.balance.second_pressure_pa
        if self.pressure_unit.kind is PressureKind.ABSOLUTE:
            return pressure_pa
        return pressure_pa + standard_pressure_pa(self.datum_altitude_m + self.second.elevation_m)


def read_hand_calculation(given: Mapping[str, Any]) -> HandCalculation:
    """A hand calculation from the options of the command line.

    Raises
    ------
    JobError
        With a problem for every option that is wrong or missing.
    """
    options = QuantityOptions(given)
    flow_m3_s = options.si("flow", Dimension.FLOW) or 0.0
    bore_m = options.si("bore", Dimension.LENGTH, above_zero=True)
    first, second = (_point(options, end, bore_m) for end in ("from", "to"))
    altitude_m = options.si("altitude", Dimension.LENGTH) or 0.0
    latitude_deg = options.si("latitude", Dimension.ANGLE)
    liquid = _liquid(options)
    pressure_unit, first_pressure_pa = _first_pressure(options)
    length_unit = _length_unit(options)
    run_losses = _run_losses(options, bore_m)
    drop_pa = options.si("drop", Dimension.PRESSURE) or 0.0
    _demand_bore(options, flow_m3_s)
    options.raise_problems()
    assert liquid is not None
    assert pressure_unit is not None
    assert latitude_deg is not None
    gravity = gravity_m_s2(latitude_deg, altitude_m)
    lost = [(words, _head_m(loss, flow_m3_s, liquid, gravity)) for words, loss in run_losses]
    if drop_pa:
        lost.append(("Stated drop", drop_pa / (liquid.density_kg_m3 * gravity)))
    return HandCalculation(
        first=first,
        second=second,
        first_pressure_pa=first_pressure_pa,
        flow_m3_s=flow_m3_s,
        losses=tuple(lost),
        bore_m=bore_m,
        roughness_m=_roughness_m(options),
        liquid=liquid,
        liquid_name=options.text("liquid") or "",
        gravity_m_s2=gravity,
        datum_altitude_m=altitude_m,
        pressure_unit=pressure_unit,
        length_unit=length_unit,
    )


def _point(options: QuantityOptions, end: str, bore_m: float | None) -> Point:
    name = f"{end}_bore"
    own_bore_m = bore_m
    if options.text(name) == FREE_SURFACE:
        own_bore_m = None
    elif options.text(name):
        own_bore_m = options.si(name, Dimension.LENGTH, above_zero=True) or bore_m
    return Point(elevation_m=options.si(f"{end}_elevation", Dimension.LENGTH) or 0.0, bore_m=own_bore_m)


def _length_unit(options: QuantityOptions) -> Unit:
    """That of the elevations, for heads."""
    for name in ("from_elevation", "to_elevation"):
        unit = options.unit(name, Dimension.LENGTH)
        if unit is not None:
            return unit
    return METRE


def _first_pressure(options: QuantityOptions) -> tuple[Unit | None, float]:
    """The unit to print in, of the kind of the first pressure, and that pressure. [Pa]"""
    pressure_pa = options.si("from", Dimension.PRESSURE)
    if pressure_pa is None:
        return None, 0.0
    own = options.unit("from", Dimension.PRESSURE, PressureKind.GAUGE)
    wanted = options.unit("unit", Dimension.PRESSURE, own.kind if own else None)
    if own and wanted and wanted.kind is not own.kind:
        options.refuse("unit", f"is not of the kind of --from, {own.kind}", wanted.text, f"one such as {own.text}")
    return wanted or own, pressure_pa


def _liquid(options: QuantityOptions) -> LiquidProperties | None:
    concentration, by_volume = options.text("concentration"), False
    if concentration is not None and concentration.rstrip().endswith("vol"):
        concentration, by_volume = concentration.rstrip().removesuffix("vol"), True
    share = QuantityOptions({"concentration": concentration}).si("concentration", Dimension.RATIO)
    if concentration is not None and share is None:
        options.refuse("concentration", "is no concentration", concentration, "one such as 30 % or 30 % vol")
    temperature_k = options.si("temperature", Dimension.TEMPERATURE)
    values = {
        "salinity_g_kg": options.si("salinity", Dimension.SALINITY),
        "density_kg_m3": options.si("density", Dimension.DENSITY, above_zero=True),
        "viscosity_pa_s": options.si("viscosity", Dimension.VISCOSITY, above_zero=True),
    }
    if temperature_k is None:
        return None
    try:
        return liquid_properties(
            kind=options.text("liquid") or "",
            temperature_k=temperature_k,
            concentration_fraction=share,
            by_volume=by_volume,
            **values,
        )
    except QuantityError as error:
        options.refuse("liquid", error.fault, error.found, error.expected)
        return None


def _roughness_m(options: QuantityOptions) -> float | None:
    if options.number("hazen_williams") is not None:
        return None
    stated_m = options.si("roughness", Dimension.LENGTH)
    return CLEAN_STEEL_ROUGHNESS_M if stated_m is None else stated_m


def _run_losses(options: QuantityOptions, bore_m: float | None) -> list[tuple[str, RunLoss]]:
    """Each loss alone, so that each has its own line."""
    # The bore of a valve alone does not enter its loss.
    bore = bore_m or 1.0
    losses: list[tuple[str, RunLoss]] = []
    length_m = options.si("length", Dimension.LENGTH, above_zero=True)
    fittings_k, valve_kv = options.number("fittings_k"), options.si("kv", Dimension.FLOW, above_zero=True)
    if length_m:
        c = options.number("hazen_williams")
        law = "Darcy-Weisbach" if c is None else f"Hazen-Williams, C {c:g}"
        pipe = RunLoss(bore_m=bore, length_m=length_m, roughness_m=_roughness_m(options), hazen_williams_c=c)
        losses.append((f"Pipe, {options.text('length')} ({law})", pipe))
    if fittings_k:
        losses.append((f"Fittings, K {fittings_k:g}", RunLoss(bore_m=bore, fittings_k=fittings_k)))
    if valve_kv:
        losses.append((f"Valve, Kv {options.text('kv')}", RunLoss(bore_m=bore, valve_kv_m3_s=valve_kv)))
    return losses


def _demand_bore(options: QuantityOptions, flow_m3_s: float) -> None:
    """Moving liquid has no pipe loss, and at a point without its own bore no velocity head, until the bore is known."""
    bound_to_bore = any(options.text(name) is not None for name in ("length", "fittings_k"))
    both_points_stated = all(options.text(name) is not None for name in ("from_bore", "to_bore"))
    if flow_m3_s and options.text("bore") is None and (bound_to_bore or not both_points_stated):
        options.refuse("bore", "is missing", "", "the inside diameter, since liquid flows")


def _head_m(loss: RunLoss, flow_m3_s: float, liquid: LiquidProperties, gravity: float) -> float:
    head, _ = head_loss(
        loss,
        flow_m3_s,
        density_kg_m3=liquid.density_kg_m3,
        viscosity_pa_s=liquid.viscosity_pa_s,
        gravity_m_s2=gravity,
    )
    return float(head)


def ledger_lines(calculation: HandCalculation) -> Iterator[str]:
    """The balance term by term, then what it rests on."""
    balance = calculation.balance
    length, pressure = calculation.length_unit, calculation.pressure_unit.as_difference()
    rows = [
        ("Pressure at the first point", balance.first_pressure_head_m, False),
        (_elevation_words(calculation), balance.elevation_head_m, True),
        ("Velocity head gained", balance.velocity_head_m, True),
        *((words, -head_m, True) for words, head_m in calculation.losses),
        ("Pressure at the second point", balance.second_pressure_head_m, False),
    ]
    places = [
        _decimals(unit.from_si(scale * max(abs(head_m) for _, head_m, _ in rows)))
        for unit, scale in ((length, 1.0), (pressure, balance.pressure_per_head_pa_m))
    ]
    wide = max(len(words) for words, _, _ in rows) + 2
    yield f"{'':{wide}}{f'head, {length.text}':>{_COLUMN}}{f'pressure, {pressure.text}':>{_COLUMN + 4}}"
    for index, (words, head_m, signed) in enumerate(rows):
        if index == len(rows) - 1:
            yield f"{'':{wide}}{'-' * 10:>{_COLUMN}}{'-' * 10:>{_COLUMN + 4}}"
        head = fixed(length.from_si(head_m), places[0], signed=signed)
        amount = fixed(pressure.from_si(balance.pressure_pa(head_m)), places[1], signed=signed)
        yield f"{words:{wide}}{head:>{_COLUMN}}{amount:>{_COLUMN + 4}}"
    yield ""
    yield f"The second point should read {_second_reading(calculation, places[1])}."
    yield from _basis_lines(calculation)


def _decimals(greatest: float) -> int:
    """Decimal places that give the greatest value five significant digits."""
    if greatest == 0.0 or not math.isfinite(greatest):
        return 3
    return max(0, _SIGNIFICANT_DIGITS - 1 - math.floor(math.log10(abs(greatest))))


def _second_reading(calculation: HandCalculation, decimals: int) -> str:
    unit = calculation.pressure_unit
    kind = "" if unit.text != unit.as_difference().text else f" {unit.kind}"
    return f"{unit.from_si(calculation.balance.second_pressure_pa):.{decimals}f} {unit.text}{kind}"


def _elevation_words(calculation: HandCalculation) -> str:
    first, second = (
        f"{calculation.length_unit.from_si(point.elevation_m):g}" for point in (calculation.first, calculation.second)
    )
    return f"Elevation {first} to {second} {calculation.length_unit.text}"


def _basis_lines(calculation: HandCalculation) -> Iterator[str]:
    liquid = calculation.liquid
    name = calculation.liquid_name if calculation.liquid_name != "other" else "liquid"
    yield (
        f"{name.capitalize()}: {liquid.density_kg_m3:.1f} kg/m3, {1e3 * liquid.viscosity_pa_s:.4g} mPa*s; "
        f"gravity {calculation.gravity_m_s2:.4f} m/s2."
    )
    if calculation.flow_m3_s and calculation.bore_m:
        yield _flow_line(calculation, calculation.bore_m)
    if calculation.second_absolute_pressure_pa < liquid.vapour_pressure_pa:
        vapour = format_quantity(liquid.vapour_pressure_pa, calculation.pressure_unit.as_difference())
        yield (
            f"At the second point that is below the liquid's vapour pressure, {vapour} absolute: "
            "a full pipe cannot read this."
        )


def _flow_line(calculation: HandCalculation, bore_m: float) -> str:
    liquid = calculation.liquid
    speed_m_s = abs(calculation.flow_m3_s) / (math.pi * bore_m**2 / 4.0)
    reynolds = liquid.density_kg_m3 * speed_m_s * bore_m / liquid.viscosity_pa_s
    line = f"In the pipe: {calculation.length_unit.from_si(speed_m_s):.4g} {calculation.length_unit.text}/s"
    line += f", Reynolds number {reynolds:.4g}"
    if calculation.roughness_m is not None:
        factor = float(friction_factor(reynolds, calculation.roughness_m / bore_m))
        line += f", friction factor {factor:.4g}"
    return line + "."
