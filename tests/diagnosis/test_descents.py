"""Where lines turn down, what a pocket there takes, and whether the flow would sweep it out."""

from __future__ import annotations

import math
import tomllib
from pathlib import Path
from typing import Any

import numpy as np
import pytest

from headledger.diagnosis.causes.air_pocket import marks
from headledger.diagnosis.causes.base import View
from headledger.diagnosis.descents import descents, sweep_of
from headledger.diagnosis.estimate import Model
from headledger.diagnosis.findings import Finding, list_findings
from headledger.diagnosis.layout import Layout
from headledger.diagnosis.result import CauseKind
from headledger.diagnosis.search import search
from headledger.diagnosis.wording import cause_sentence
from headledger.plant.job import Job, LevelPoint, LiquidKind, LiquidSpec

from .made_systems import gauge, job, loss_m, model, run, spell, station

POCKET = tomllib.loads((Path(__file__).parent.parent / "reference" / "gas.toml").read_text(encoding="utf-8"))["pocket"]
FLOW = 0.01
AREA_M2 = math.pi * 0.1**2 / 4.0


def sloping_line(slope_deg: float, length_m: float = 60.0, **more: Any) -> Job:
    """Three runs of 100 mm; the one in the middle falls at a slope."""
    fall_m = length_m * math.sin(math.radians(slope_deg))
    heights = {"A": 0.0, "B": 2.0, "C": 2.0 - fall_m, "D": 3.0 - fall_m}
    stations = [station(n, z, is_open=n in "AD") for n, z in heights.items()]
    runs = [
        run("R1", "A", "B", flow_column="FT"),
        run("R2", "B", "C", length_m=length_m, hazen_williams_c=1e9),
        run("R3", "C", "D"),
    ]
    gauges = [gauge(f"PT-{n}", n, r) for n, r in (("A", "R1"), ("B", "R1"), ("C", "R2"), ("D", "R3"))]
    return job(stations, runs, gauges, **more)


def flowing(made: Job, flow_m3_s: float = FLOW, pocket_m: float = 0.0) -> Model:
    """The line at rest and at three flows, with a pocket in R2 while it flows."""
    spells = [spell(made, 1, dict.fromkeys("ABCD", 40.0))]
    for number, flow in enumerate((flow_m3_s, 0.6 * flow_m3_s, 0.8 * flow_m3_s), start=2):
        lost = loss_m(flow)
        heads = {"A": 40.0, "B": 40.0 - lost, "C": 40.0 - 2 * lost - pocket_m, "D": 40.0 - 3 * lost - pocket_m}
        spells.append(spell(made, number, heads, dict.fromkeys(("R1", "R2", "R3"), flow)))
    return model(made, spells)


def pocket_finding(made: Model) -> Finding:
    return next(f for f in list_findings(search(made)) if f.kind is CauseKind.AIR_POCKET)


def test_pocket_of_a_height_lowers_the_readings_after_it_by_that_column() -> None:
    """20 m of pocket on 10° stand 3.473 m high: 34.00 kPa of 998.2 kg/m³, at every flow, and nothing before it or at rest."""
    liquid = LiquidSpec(
        kind=LiquidKind.OTHER,
        density_kg_m3=POCKET["density_kg_m3"],
        viscosity_pa_s=1e-3,
        vapour_pressure_pa=2_300.0,
        temperature_sd_k=0.0,
        density_sd_fraction=0.0005,
    )
    extent_m = POCKET["length_m"] * math.sin(math.radians(POCKET["slope_deg"]))
    assert extent_m == pytest.approx(POCKET["extent_m"], abs=POCKET["extent_digits_m"])
    made = flowing(sloping_line(POCKET["slope_deg"], liquid=liquid))
    view = View(made, search(made, kinds=()).leading.frame.linear)
    (mark,) = [m for m in marks(view) if m.place.run == "R2" and m.form == ""]
    for rows, one in zip(view.linear.rows, made.spells, strict=True):
        change = extent_m * mark.vector[rows.start : rows.start + rows.gauges.size]
        taken = 0.0 if one.is_still else POCKET["drop_pa"]
        expected = np.where(rows.gauges >= 2, -taken, 0.0)
        # heads before and after a pocket are told apart, whichever of them the linear model holds fixed
        assert change - change[0] == pytest.approx(expected, abs=POCKET["drop_digits_pa"])


def test_descents_of_a_levelled_line_have_each_its_own_length_and_slope() -> None:
    """Up to 20 m at 100 m, down 5 m in 10 m (30°), up, then upright from 12 m to 4 m at the end of a 130 m run."""
    levels = (
        LevelPoint(run="R", distance_m=100.0, elevation_m=20.0),
        LevelPoint(run="R", distance_m=110.0, elevation_m=15.0),
        LevelPoint(run="R", distance_m=122.0, elevation_m=18.0),
    )
    made = job(
        [station("A", 0.0), station("B", 10.0)],
        [run("R", "A", "B", length_m=130.0)],
        [gauge("PT", "A", "R")],
        levels=levels,
    )
    forward = descents(Layout(made), 0, 1.0)
    assert [(d.distance_m, d.fall_m, d.length_m) for d in forward] == [(100.0, 5.0, 10.0), (122.0, 8.0, 8.0)]
    assert [math.degrees(d.slope_rad) for d in forward] == pytest.approx([30.0, 90.0])
    backward = descents(Layout(made), 0, -1.0)
    assert [(d.distance_m, d.fall_m, d.length_m) for d in backward] == [(122.0, 3.0, 12.0), (100.0, 20.0, 100.0)]
    assert descents(Layout(made), 0, 0.0) == ()


@pytest.mark.parametrize(
    ("slope_deg", "flow_m3_s", "said"),
    [
        (30.0, 0.005, "At 0.64 m/s it stays: authors put clearing between 0.79 and 1.00 m/s on that slope."),
        (10.0, 0.0055, "At 0.70 m/s it may move: authors put clearing between 0.45 and 0.99 m/s on that slope."),
        (
            10.0,
            0.010,
            "At 1.3 m/s it should be swept out: authors put clearing between 0.45 and 0.99 m/s on that slope.",
        ),
    ],
)
def test_pocket_is_said_to_stay_move_or_be_swept_by_the_greatest_velocity(
    slope_deg: float, flow_m3_s: float, said: str
) -> None:
    """Froude numbers 0.450 to 1.0 at 10°, 0.8 to 1.006 at 30°, times 0.990 m/s in 100 mm; the flow over 7854 mm²."""
    made = flowing(sloping_line(slope_deg), flow_m3_s, pocket_m=4.0)
    found = pocket_finding(made)
    sweep = sweep_of(made.layout, found)
    assert sweep is not None
    assert sweep.velocity_m_s == pytest.approx(flow_m3_s / AREA_M2, rel=0.03)
    assert said in cause_sentence(made, found)


def test_pocket_on_an_upright_leg_is_held_against_what_is_said_of_the_vertical() -> None:
    """A run without a length: Froude numbers 1.01 to 1.23 times 0.990 m/s."""
    base = sloping_line(30.0, 12.0)
    upright = job(base.stations, [r if r.name != "R2" else run("R2", "B", "C") for r in base.runs], base.gauges)
    made = flowing(upright, 0.005, pocket_m=4.0)
    sweep = sweep_of(made.layout, pocket_finding(made))
    assert sweep is not None
    assert (sweep.lowest_m_s, sweep.highest_m_s) == pytest.approx((1.000, 1.218), abs=0.001)
