"""The energy balance against worked examples of textbooks, and its laws."""

from __future__ import annotations

import math
import tomllib
from pathlib import Path
from typing import Any

import pytest
from hypothesis import given
from hypothesis import strategies as st

from headledger.physics.balance import EnergyBalance, Point, energy_balance
from headledger.physics.losses import RunLoss, head_loss

EXAMPLES: dict[str, dict[str, Any]] = tomllib.loads(
    (Path(__file__).parents[1] / "reference" / "energy_balance.toml").read_text(encoding="utf-8")
)


def lost_head_m(example: dict[str, Any]) -> float:
    loss = RunLoss(
        bore_m=example["bore_m"],
        length_m=example["length_m"],
        roughness_m=example["roughness_m"],
        fittings_k=example.get("fittings_k", 0.0),
    )
    head, _ = head_loss(
        loss,
        example["flow_m3_s"],
        density_kg_m3=example["density_kg_m3"],
        viscosity_pa_s=example["viscosity_pa_s"],
        gravity_m_s2=example["gravity_m_s2"],
    )
    return float(head)


def balance(first: Point, second: Point, **changes: float) -> EnergyBalance:
    values = {
        "first_pressure_pa": 0.0,
        "flow_m3_s": 0.0,
        "lost_head_m": 0.0,
        "density_kg_m3": 1000.0,
        "gravity_m_s2": 9.80665,
    } | changes
    return energy_balance(first, second, **values)


def test_nozzle_above_a_fire_hose_keeps_almost_no_pressure():
    example = EXAMPLES["fire_hose"]
    found = balance(
        Point(elevation_m=0.0, bore_m=example["first_bore_m"]),
        Point(elevation_m=example["second_elevation_m"], bore_m=example["second_bore_m"]),
        first_pressure_pa=example["first_pressure_pa"],
        flow_m3_s=example["flow_m3_s"],
        density_kg_m3=example["density_kg_m3"],
        gravity_m_s2=example["gravity_m_s2"],
    )
    assert found.second_pressure_pa == pytest.approx(example["second_pressure_pa"], abs=example["digits_pa"])


def test_pressure_in_a_hose_behind_a_nozzle_is_the_published_one():
    """Against the flow, from nozzle to hose; bores from the two speeds at a flow of half a litre a second."""
    example = EXAMPLES["garden_hose"]
    flow_m3_s = 0.0005
    nozzle, hose = (
        Point(elevation_m=0.0, bore_m=math.sqrt(4.0 * flow_m3_s / (math.pi * speed)))
        for speed in (example["outlet_speed_m_s"], example["hose_speed_m_s"])
    )
    found = balance(
        nozzle,
        hose,
        first_pressure_pa=example["outlet_pressure_pa"],
        flow_m3_s=-flow_m3_s,
        density_kg_m3=example["density_kg_m3"],
    )
    assert found.second_pressure_pa == pytest.approx(example["hose_pressure_pa"], abs=example["digits_pa"])


def test_pressure_at_the_foot_of_a_dam_is_the_published_one():
    example = EXAMPLES["dam"]
    found = balance(
        Point(elevation_m=example["depth_m"]),
        Point(elevation_m=0.0),
        density_kg_m3=example["density_kg_m3"],
        gravity_m_s2=example["gravity_m_s2"],
    )
    assert found.second_pressure_pa == pytest.approx(example["pressure_pa"], abs=example["digits_pa"])


def test_gravity_line_between_surfaces_needs_the_published_elevation():
    """Surface to surface nothing is left over, so the first stands above the second by what is lost."""
    example = EXAMPLES["gravity_line"]
    lost_m = lost_head_m(example)
    assert lost_m == pytest.approx(example["lost_head_m"], rel=example["relative_digits"])
    found = balance(
        Point(elevation_m=example["first_elevation_m"]),
        Point(elevation_m=example["second_elevation_m"]),
        flow_m3_s=example["flow_m3_s"],
        lost_head_m=lost_m,
    )
    assert found.second_pressure_head_m == pytest.approx(0.0, abs=example["relative_digits"] * example["lost_head_m"])


def test_oil_down_a_slope_loses_the_published_pressure():
    example = EXAMPLES["oil_downhill"]
    fall_m = example["length_m"] * math.sin(math.radians(example["slope_deg"]))
    found = balance(
        Point(elevation_m=fall_m, bore_m=example["bore_m"]),
        Point(elevation_m=0.0, bore_m=example["bore_m"]),
        flow_m3_s=example["flow_m3_s"],
        lost_head_m=lost_head_m(example),
        density_kg_m3=example["density_kg_m3"],
        gravity_m_s2=example["gravity_m_s2"],
    )
    assert -found.second_pressure_pa == pytest.approx(example["pressure_fall_pa"], rel=example["relative_digits"])


def test_level_stainless_line_loses_the_published_pressure():
    example = EXAMPLES["level_stainless_line"]
    found = balance(
        Point(elevation_m=0.0, bore_m=example["bore_m"]),
        Point(elevation_m=0.0, bore_m=example["bore_m"]),
        flow_m3_s=example["flow_m3_s"],
        lost_head_m=lost_head_m(example),
        density_kg_m3=example["density_kg_m3"],
        gravity_m_s2=example["gravity_m_s2"],
    )
    assert -found.second_pressure_pa == pytest.approx(example["pressure_fall_pa"], rel=example["relative_digits"])


@given(shift_m=st.floats(-1000.0, 1000.0), fall_m=st.floats(-100.0, 100.0), flow=st.floats(-0.1, 0.1))
def test_shifting_the_datum_changes_nothing(shift_m: float, fall_m: float, flow: float):
    first, second = Point(elevation_m=fall_m, bore_m=0.1), Point(elevation_m=0.0, bore_m=0.2)
    moved = (Point(elevation_m=fall_m + shift_m, bore_m=0.1), Point(elevation_m=shift_m, bore_m=0.2))
    assert balance(*moved, flow_m3_s=flow).second_pressure_pa == pytest.approx(
        balance(first, second, flow_m3_s=flow).second_pressure_pa, abs=1e-5
    )


@given(fall_m=st.floats(-100.0, 100.0), flow=st.floats(-0.1, 0.1), lost_m=st.floats(-50.0, 50.0))
def test_going_back_the_same_way_gives_the_first_pressure(fall_m: float, flow: float, lost_m: float):
    first, second = Point(elevation_m=fall_m, bore_m=0.1), Point(elevation_m=0.0, bore_m=0.15)
    there = balance(first, second, first_pressure_pa=3e5, flow_m3_s=flow, lost_head_m=lost_m)
    back = balance(second, first, first_pressure_pa=there.second_pressure_pa, flow_m3_s=-flow, lost_head_m=-lost_m)
    assert back.second_pressure_pa == pytest.approx(3e5, abs=1e-4)


def test_widening_at_one_level_raises_the_pressure():
    """Common practice: where a bore widens without loss the pressure rises."""
    found = balance(Point(elevation_m=0.0, bore_m=0.1), Point(elevation_m=0.0, bore_m=0.2), flow_m3_s=0.02)
    assert found.second_pressure_pa > 0.0
