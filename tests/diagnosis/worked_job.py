"""The worked job of the reference as nouns: four gauges on a line of three runs, one still and two flowing spells."""

from __future__ import annotations

import json
from pathlib import Path
from typing import Any

import numpy as np

from headledger.diagnosis.estimate import Model
from headledger.diagnosis.layout import Layout
from headledger.diagnosis.means import SpellMeans
from headledger.diagnosis.state import Point
from headledger.plant.gauges import ErrorLimit, Gauge
from headledger.plant.job import Job, LiquidKind, LiquidSpec, Site, SpellKind
from headledger.plant.runs import Doubt, Run
from headledger.plant.stations import Exchange, Station
from headledger.quantities import Dimension, PressureKind, Unit

REFERENCE: dict[str, Any] = json.loads((Path(__file__).parent.parent / "reference" / "worked_job.json").read_text())
NAMES = "ABCD"
ELEVATIONS_M = (10.0, 2.0, 6.0, 0.0)
FLOWS_M3_S = (0.0, 36.0 / 3600.0, 18.0 / 3600.0)
LATITUDE_DEG = 45.49963  # where WGS 84 gravity is 9.80665 m/s² to 1e-7


def worked_layout() -> Layout:
    """The job's arrays. Readings are absolute against a barometer of nothing, so that no air column counts."""
    unit = Unit("psia", Dimension.PRESSURE, 6894.757293168361, kind=PressureKind.ABSOLUTE)
    stations = tuple(
        Station(
            name=name,
            elevation_m=z,
            elevation_sd_m=0.005,
            exchange=Exchange.OPEN if name in "AD" else Exchange.CLOSED,
        )
        for name, z in zip(NAMES, ELEVATIONS_M, strict=True)
    )
    runs = tuple(
        Run(
            name=f"R{i + 1}",
            start=NAMES[i],
            end=NAMES[i + 1],
            bore_m=0.1,
            roughness_m=0.0,
            rated_drop_pa=20e3,
            rated_flow_m3_s=36.0 / 3600.0,
            loss_sd_fraction=0.075,
            flow_column="FT-1" if i == 0 else None,
            flow_doubt=Doubt(relative_fraction=0.01),
        )
        for i in range(3)
    )
    gauges = tuple(
        Gauge(
            tag=f"PT-{name}",
            station=name,
            run="R1" if name == "A" else f"R{NAMES.index(name)}",
            unit=unit,
            range_low_pa=0.0,
            range_high_pa=600e3,
            accuracy=ErrorLimit(limit_pa=3e3, outer_limit_pa=3e3),
            tolerance=ErrorLimit(limit_pa=6e3, outer_limit_pa=6e3),
            column=f"PT-{name}",
        )
        for name in NAMES
    )
    liquid = LiquidSpec(
        kind=LiquidKind.OTHER,
        density_kg_m3=1000.0,
        viscosity_pa_s=1e-3,
        vapour_pressure_pa=2e3,
        temperature_sd_k=0.0,
        density_sd_fraction=0.0005,
    )
    return Layout(
        Job(
            folder=Path(),
            title="worked job",
            stations=stations,
            runs=runs,
            gauges=gauges,
            liquid=liquid,
            site=Site(latitude_deg=LATITUDE_DEG, barometer_pa=0.0, barometer_sd_pa=0.0),
        )
    )


def worked_model(readings_kpa: list[list[float]]) -> Model:
    """The model of one set of readings."""
    spells = [
        SpellMeans(
            id=index + 1,
            kind=SpellKind.FLOWING if flow else SpellKind.STILL,
            start_s=1000.0 * index,
            end_s=1000.0 * index + 900.0,
            samples=900,
            reading_pa=np.array(readings_kpa[index]) * 1e3,
            noise_pa=np.full(4, 20.0),
            flow_m3_s=np.array([flow if flow else np.nan, np.nan, np.nan]),
            flow_noise_m3_s=np.zeros(3),
            flow_relative_sd=np.full(3, 0.01),
            flow_absolute_sd_m3_s=np.zeros(3),
            level_m=np.full(4, np.nan),
            level_sd_m=np.full(4, np.nan),
            temperature_k=293.15,
            speed_ratio=np.zeros(3),
            is_open=(True, True, True),
        )
        for index, flow in enumerate(FLOWS_M3_S)
    ]
    return Model(worked_layout(), spells)


def worked_points(head_at_a_m: list[float]) -> tuple[Point, ...]:
    """Where the reference linearises."""
    return tuple(
        Point(reference_head_m=np.array([head]), flow_m3_s=np.array([flow]) if flow else np.zeros(0))
        for head, flow in zip(head_at_a_m, FLOWS_M3_S, strict=True)
    )
