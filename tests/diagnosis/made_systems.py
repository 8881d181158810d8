"""Small systems made from heads that are worked out by hand: what gauges read follows from head, elevation and one density."""

from __future__ import annotations

from collections.abc import Sequence
from pathlib import Path
from typing import Any

import numpy as np

from headledger.diagnosis.estimate import Model
from headledger.diagnosis.layout import Layout
from headledger.diagnosis.means import SpellMeans
from headledger.plant.gauges import ErrorLimit, Gauge
from headledger.plant.job import Job, LiquidKind, LiquidSpec, Site, SpellKind
from headledger.plant.runs import Doubt, Run
from headledger.plant.stations import Exchange, Station
from headledger.quantities import Dimension, PressureKind, Unit

BARA = Unit("bara", Dimension.PRESSURE, 1e5, kind=PressureKind.ABSOLUTE)
GRAVITY, DENSITY, BAROMETER_PA = 9.80665, 1000.0, 101_325.0
LATITUDE_DEG = 45.49963  # where WGS 84 gravity is 9.80665 m/s² to 1e-7


def station(name: str, elevation_m: float, *, is_open: bool = False) -> Station:
    """A place on the pipe, surveyed to 10 mm."""
    exchange = Exchange.OPEN if is_open else Exchange.CLOSED
    return Station(name=name, elevation_m=elevation_m, elevation_sd_m=0.005, exchange=exchange)


def run(name: str, start: str, end: str, **more: Any) -> Run:
    """A run of 100 mm bore with one loss coefficient of 10 and a loss known to 10 %."""
    given: dict[str, Any] = {"bore_m": 0.1, "fittings_k": 10.0, "roughness_m": 0.0, "loss_sd_fraction": 0.05}
    if "flow_column" in more:
        more.setdefault("flow_doubt", Doubt(relative_fraction=0.01))
    return Run(name=name, start=start, end=end, **(given | more))


def gauge(tag: str, at: str, on: str, **more: Any) -> Gauge:
    """An absolute gauge of 0 to 10 bar, 0.25 % of span, tolerance 1 %, on its tap."""
    return Gauge(
        tag=tag,
        station=at,
        run=on,
        unit=BARA,
        range_low_pa=0.0,
        range_high_pa=1e6,
        accuracy=ErrorLimit(limit_pa=2_500.0, outer_limit_pa=2_500.0),
        tolerance=ErrorLimit(limit_pa=10_000.0, outer_limit_pa=10_000.0),
        column=tag,
        **more,
    )


def job(stations: Sequence[Station], runs: Sequence[Run], gauges: Sequence[Gauge], **more: Any) -> Job:
    """A job with a liquid of 1000 kg/m³ and a barometer of 1013.25 mbar."""
    liquid = LiquidSpec(
        kind=LiquidKind.OTHER,
        density_kg_m3=DENSITY,
        viscosity_pa_s=1e-3,
        vapour_pressure_pa=2_300.0,
        temperature_sd_k=0.0,
        density_sd_fraction=0.0005,
    )
    site = Site(latitude_deg=LATITUDE_DEG, barometer_pa=BAROMETER_PA, barometer_sd_pa=100.0)
    given: dict[str, Any] = {"folder": Path(), "title": "made system", "liquid": liquid, "site": site}
    return Job(stations=tuple(stations), runs=tuple(runs), gauges=tuple(gauges), **(given | more))


def loss_m(flow_m3_s: float, k: float = 10.0, bore_m: float = 0.1) -> float:
    """``K v²/2g``."""
    velocity = flow_m3_s / (np.pi * bore_m**2 / 4.0)
    return float(k * velocity * abs(velocity) / (2.0 * GRAVITY))


def spell(
    made: Job,
    number: int,
    heads_m: dict[str, float],
    flow_m3_s: dict[str, float] | None = None,
    *,
    shift_pa: dict[str, float] | None = None,
    speeds: dict[str, float] | None = None,
    **more: Any,
) -> SpellMeans:
    """What the gauges read where the energy line has these heads: ``ρ g (E − z) − ½ρv² + barometer``, and a metered flow.

    `flow_m3_s` by run: those with a meter are logged, all take their velocity head off. None is at rest.
    """
    flows = flow_m3_s or {}
    heights = {s.name: s.elevation_m for s in made.stations}
    areas = {r.name: r.area_m2 for r in made.runs}
    readings = []
    for noun in made.gauges:
        at = heights[noun.station] if noun.elevation_m is None else noun.elevation_m
        velocity = flows.get(noun.run, 0.0) / areas[noun.run]
        pressure = DENSITY * GRAVITY * (heads_m[noun.station] - at) - 0.5 * DENSITY * velocity**2 + BAROMETER_PA
        readings.append(pressure + (shift_pa or {}).get(noun.tag, 0.0))
    metered = np.array([flows.get(r.name, 0.0) if r.flow_column and flows else np.nan for r in made.runs])
    count = len(made.runs)
    fields: dict[str, Any] = {
        "id": number,
        "kind": SpellKind.FLOWING if flows else SpellKind.STILL,
        "start_s": 1000.0 * number,
        "end_s": 1000.0 * number + 900.0,
        "samples": 900,
        "reading_pa": np.array(readings),
        "noise_pa": np.full(len(made.gauges), 100.0),
        "flow_m3_s": metered,
        "flow_noise_m3_s": np.where(np.isfinite(metered), 1e-5, 0.0),
        "flow_relative_sd": np.array([r.flow_doubt.relative_fraction for r in made.runs]),
        "flow_absolute_sd_m3_s": np.zeros(count),
        "level_m": np.full(len(made.stations), np.nan),
        "level_sd_m": np.full(len(made.stations), np.nan),
        "temperature_k": 293.15,
        "speed_ratio": np.array([(speeds or {}).get(r.name, 0.0) for r in made.runs]),
        "is_open": (True,) * count,
    }
    return SpellMeans(**(fields | more))


def model(made: Job, spells: Sequence[SpellMeans]) -> Model:
    """The model of a made system."""
    return Model(Layout(made), spells)
