"""Further worked examples of textbooks and handbooks, each by the product's own losses and columns, hand calculation beside it.

Published answers are checked loosely, as printed; where a recomputed value is known it is checked to its last digit.
"""

from __future__ import annotations

from math import pi, sqrt

import numpy as np
import pytest

from headledger.physics.friction import friction_factor
from headledger.physics.liquids import water_properties
from headledger.physics.losses import RunLoss, head_loss
from headledger.physics.tapping import Taps

FOOT, INCH, GALLON = 0.3048, 0.0254, 3.785411784e-3
G = 9.80665


def flow_for_head(run: RunLoss, head_m: float, *, density: float, viscosity: float, gravity: float = G) -> float:
    """Flow at which a run loses a head, by Newton's method on the product's own slope. [m³/s]"""
    flow = pi * run.bore_m**2 / 4.0
    for _ in range(60):
        lost, slope = head_loss(run, flow, density_kg_m3=density, viscosity_pa_s=viscosity, gravity_m_s2=gravity)
        flow -= (float(lost) - head_m) / float(slope)
    return flow


def test_white_6_6_water_in_asphalted_cast_iron() -> None:
    """White, Fluid Mechanics, Ex. 6.6 (from memory): 6 ft/s, 6 in, 200 ft, ε 0.0004 ft, ν 1.1e-5 ft²/s: f 0.02, 4.5 ft; 2 %."""
    run = RunLoss(bore_m=0.5 * FOOT, length_m=200.0 * FOOT, roughness_m=0.0004 * FOOT)
    flow = 6.0 * FOOT * pi * (0.5 * FOOT) ** 2 / 4.0
    viscosity = 1.1e-5 * FOOT**2 * 1000.0
    head, _ = head_loss(run, flow, density_kg_m3=1000.0, viscosity_pa_s=viscosity, gravity_m_s2=32.2 * FOOT)
    assert head / FOOT == pytest.approx(4.5, rel=0.02)


def test_white_6_16_pump_head_against_lift_and_minor_losses() -> None:
    """White, Ex. 6.16 (from memory): 0.2 ft³/s, 400 ft of 2 in, ε/d 0.001, ΣK 12.2, lift 100 ft: 184 ft; 1 %. ν 1.1e-5 ft²/s."""
    bore = FOOT / 6.0
    run = RunLoss(bore_m=bore, length_m=400.0 * FOOT, roughness_m=0.001 * bore, fittings_k=12.2)
    viscosity = 1.1e-5 * FOOT**2 * 1000.0
    head, _ = head_loss(run, 0.2 * FOOT**3, density_kg_m3=1000.0, viscosity_pa_s=viscosity, gravity_m_s2=32.2 * FOOT)
    assert 100.0 + head / FOOT == pytest.approx(184.0, rel=0.01)


def test_white_6_18_three_pipes_in_parallel() -> None:
    """White, Ex. 6.18 (from memory): 100, 150, 80 m of 8, 6, 4 cm, ε 0.24, 0.12, 0.20 mm, 20.3 m: 62.5 + 25.9 + 11.4 m³/h; 0.3 %."""
    pipes = ((100.0, 0.08, 0.24e-3, 62.55), (150.0, 0.06, 0.12e-3, 25.91), (80.0, 0.04, 0.20e-3, 11.41))
    for length, bore, roughness, expected in pipes:
        run = RunLoss(bore_m=bore, length_m=length, roughness_m=roughness)
        flow = flow_for_head(run, 20.3, density=1000.0, viscosity=1.02e-3, gravity=9.81)
        assert flow * 3600.0 == pytest.approx(expected, rel=0.003)


def test_crane_7_13_oil_in_two_inch_schedule_40() -> None:
    """Crane TP-410M 7-13: SG 0.815, 2.7 cSt, 100 ft, 2 US gal/s: 66.5 kPa with a chart's f 0.0230; 1.5 %."""
    density = 815.0
    run = RunLoss(bore_m=2.067 * INCH, length_m=100.0 * FOOT, roughness_m=0.0018 * INCH)
    head, _ = head_loss(run, 2.0 * GALLON, density_kg_m3=density, viscosity_pa_s=2.7e-6 * density, gravity_m_s2=G)
    assert head * density * G / 1e3 == pytest.approx(66.5, rel=0.015)


def test_crane_7_1_smooth_pipe() -> None:
    """Crane TP-410M 7-1: 30 °C, 200 L/min, DN 50 schedule 40 (52.5 mm), smooth: Re 100 600, f 0.0179; 1 %, f by a chart 1.5 %."""
    water = water_properties(303.15)
    velocity = 0.2 / 60.0 / (pi * 0.0525**2 / 4.0)
    reynolds = water.density_kg_m3 * velocity * 0.0525 / water.viscosity_pa_s
    assert reynolds == pytest.approx(100_600.0, rel=0.01)
    assert float(friction_factor(reynolds, 0.0)) == pytest.approx(0.0179, rel=0.015)


def test_munson_3_10_siphon_at_the_vapour_limit() -> None:
    """Munson Ex. 3.10 (from memory): outlet 5 ft below the floor, water 15 ft above it, 14.7 and 0.256 psia: top at 28.2 ft; 1 %."""
    psi, density = 6894.757293168361, 62.4 * 0.45359237 / FOOT**3
    run = RunLoss(bore_m=0.1, fittings_k=1.0)  # all of the 20 ft goes into one velocity head
    flow = flow_for_head(run, 20.0 * FOOT, density=density, viscosity=1e-3)
    velocity = flow / (pi * 0.1**2 / 4.0)
    assert velocity / FOOT == pytest.approx(35.9, rel=0.01)
    top = 15.0 + (14.7 - 0.256) * psi / (density * G) / FOOT - velocity**2 / (2.0 * G) / FOOT
    assert top == pytest.approx(28.2, rel=0.01)


def tap_pressure_pa(head_m: float, elevation_m: float, velocity_pa: float, density: float, gravity: float) -> float:
    """Gauge pressure of a perfect instrument on the pipe."""
    one = Taps(
        head=np.ones((1, 1)), velocity=np.ones((1, 1)), column_m=np.array([elevation_m]), constant_pa=np.zeros(1)
    )
    found = one.readings_pa(np.array([head_m]), np.array([velocity_pa]), density_kg_m3=density, gravity_m_s2=gravity)
    return float(found[0])


def test_cengel_siphon_of_gasoline_crest_pressure() -> None:
    """Çengel (from memory): outlet 0.75 m below the tank's surface, crest 2.75 m above the outlet, 750 kg/m³: 3.84 m/s, 81.1 kPa."""
    gravity = 9.81
    velocity = sqrt(2.0 * gravity * 0.75)
    assert velocity == pytest.approx(3.84, abs=0.005)
    moving = 0.5 * 750.0 * velocity**2
    crest = 101.3e3 + tap_pressure_pa(0.75, 2.75, moving, 750.0, gravity)
    assert crest / 1e3 == pytest.approx(81.1, abs=0.05)


def test_cengel_manometer_column() -> None:
    """Çengel (from memory): SG 0.85, 55 cm, 96 kPa: 100.6 kPa."""
    assert 96.0 + tap_pressure_pa(0.55, 0.0, 0.0, 850.0, 9.81) / 1e3 == pytest.approx(100.6, abs=0.05)


def test_cengel_manometer_of_three_liquids() -> None:
    """Çengel (from memory): 85.6 kPa; water 0.1 m, oil 0.2 m (850), mercury 0.35 m (13 600): 130 kPa."""
    columns = ((-0.1, 1000.0), (-0.2, 850.0), (0.35, 13_600.0))
    found = 85.6e3 + sum(tap_pressure_pa(height, 0.0, 0.0, density, 9.81) for height, density in columns)
    assert found / 1e3 == pytest.approx(130.0, abs=0.5)


def test_cengel_jet_of_a_main_at_400_kpa() -> None:
    """Çengel (from memory): 400 kPa gauge of water lifts a jet 40.8 m."""
    assert tap_pressure_pa(40.8, 0.0, 0.0, 1000.0, 9.81) == pytest.approx(400e3, rel=0.05 / 40.8)
