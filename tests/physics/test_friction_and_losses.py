"""Friction and losses against thirty digits, textbooks and the laws that any loss obeys."""

from __future__ import annotations

import tomllib
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from headledger.physics.friction import friction_factor, friction_factor_and_slope
from headledger.physics.losses import (
    KV_FROM_CV,
    LossTable,
    RunLoss,
    head_loss,
    narrowing_k,
    pump_head,
    pump_polynomial,
    velocity_head_m,
    widening_k,
)

REFERENCE: dict[str, Any] = tomllib.loads(
    (Path(__file__).parent.parent / "reference" / "friction.toml").read_text(encoding="utf-8")
)
TEXTBOOK = REFERENCE["textbook"]
G = 9.80665
FOOT, POUND_FORCE = 0.3048, 4.4482216152605
WATER = {"density_kg_m3": 998.2, "viscosity_pa_s": 1.0016e-3, "gravity_m_s2": G}

runs = st.builds(
    RunLoss,
    bore_m=st.floats(0.006, 2.0),
    length_m=st.floats(0.0, 500.0),
    roughness_m=st.floats(0.0, 1e-4),
    fittings_k=st.floats(0.0, 20.0),
    valve_kv_m3_s=st.one_of(st.none(), st.floats(1e-4, 1.0)),
    hazen_williams_c=st.one_of(st.none(), st.floats(60.0, 150.0)),
    rated_drop_pa=st.one_of(st.none(), st.floats(1e3, 1e5)),
    rated_flow_m3_s=st.floats(1e-3, 1.0),
)
velocities = st.floats(1e-5, 8.0)


@pytest.mark.parametrize(("reynolds", "roughness", "factor"), REFERENCE["colebrook"]["rows"])
def test_friction_factor_matches_thirty_digits(reynolds: float, roughness: float, factor: float) -> None:
    assert friction_factor(reynolds, roughness) == pytest.approx(factor, rel=REFERENCE["colebrook"]["tolerance"])


def test_friction_factor_laminar_is_64_over_reynolds() -> None:
    assert friction_factor(1000.0, 0.01) == pytest.approx(0.064, rel=1e-15)


@pytest.mark.parametrize("at", [2000.0, 4000.0])
@pytest.mark.parametrize("roughness", [0.0, 1e-3, 0.05])
def test_friction_factor_joins_with_value_and_slope(at: float, roughness: float) -> None:
    below, above = (friction_factor_and_slope(at * (1.0 + side), roughness) for side in (-1e-9, 1e-9))
    assert below[0] == pytest.approx(above[0], rel=1e-8)
    assert below[1] == pytest.approx(above[1], abs=1e-6)


@settings(max_examples=100, deadline=None)
@given(reynolds=st.floats(10.0, 1e8), roughness=st.floats(0.0, 0.05))
def test_friction_factor_slope_is_the_central_difference(reynolds: float, roughness: float) -> None:
    """In ln Re. At 2000 and 4000 the curvature has a step, so the difference is off by as much as the step's width."""
    step = 1e-5
    below, above = (float(friction_factor_and_slope(reynolds * np.exp(s), roughness)[0]) for s in (-step, step))
    slope = float(friction_factor_and_slope(reynolds, roughness)[1])
    assert slope == pytest.approx(np.log(above / below) / (2.0 * step), abs=1e-4)


@pytest.mark.parametrize("roughness", [0.0, 1e-4, 0.05])
def test_friction_loss_rises_with_flow_all_through_the_join(roughness: float) -> None:
    """Loss goes with f Re²; a solver needs it to rise."""
    reynolds = np.linspace(1900.0, 4200.0, 2301)
    factor, _ = friction_factor_and_slope(reynolds, roughness)
    assert np.all(np.diff(factor * reynolds**2) > 0.0)


def test_friction_factor_of_an_array_equals_that_of_each_value() -> None:
    reynolds = np.geomspace(500.0, 1e8, 40_000)
    many = friction_factor(reynolds, 1e-4)
    each = [float(friction_factor(r, 1e-4)) for r in reynolds[::5000]]
    assert many[::5000] == pytest.approx(each, rel=1e-14)


def test_head_loss_white_example_6_7() -> None:
    """Hand: V = 6.37 m/s, Re = 128,000, h = f 500/0.2 V²/2g."""
    case = TEXTBOOK["white_6_7"]
    run = RunLoss(bore_m=0.2, length_m=500.0, roughness_m=0.0013 * 0.2)
    head, _ = head_loss(run, 0.2, density_kg_m3=900.0, viscosity_pa_s=900.0 * 1e-5, gravity_m_s2=9.81)
    assert head == pytest.approx(case["head_m"], rel=case["tolerance"])
    assert friction_factor(128_000.0, 0.0013) == pytest.approx(case["f"], rel=case["tolerance"])


def test_head_loss_cengel_example_8_3_in_feet_and_pounds() -> None:
    """Hand: 0.2 ft³/s in 2 in is 9.17 ft/s; 62.36 lb/ft³, 7.536e-4 lb/(ft s)."""
    case = TEXTBOOK["cengel_8_3"]
    density, viscosity = 62.36 * 0.45359237 / FOOT**3, 7.536e-4 * 0.45359237 / FOOT
    run = RunLoss(bore_m=2.0 * 0.0254, length_m=200.0 * FOOT, roughness_m=7e-6 * FOOT)
    head, _ = head_loss(run, 0.2 * FOOT**3, density_kg_m3=density, viscosity_pa_s=viscosity, gravity_m_s2=G)
    assert head / FOOT == pytest.approx(case["head_ft"], rel=case["tolerance"])
    assert head * density * G / (POUND_FORCE / FOOT**2) == pytest.approx(case["drop_psf"], rel=case["tolerance"])


def test_head_loss_cengel_example_8_8_with_fittings() -> None:
    case = TEXTBOOK["cengel_8_8"]
    run = RunLoss(bore_m=0.05, length_m=89.0, roughness_m=0.26e-3, fittings_k=2.36)
    head, _ = head_loss(run, 0.006, density_kg_m3=999.7, viscosity_pa_s=1.307e-3, gravity_m_s2=9.81)
    assert head == pytest.approx(case["head_m"], rel=case["tolerance"])


def test_head_loss_hazen_williams_matches_the_exact_form() -> None:
    case = REFERENCE["hazen_williams"]
    head, _ = head_loss(RunLoss(bore_m=0.2, length_m=100.0, hazen_williams_c=120.0), 0.05, **WATER)
    assert head == pytest.approx(case["head_m"], abs=case["half_digit_m"])
    assert head == pytest.approx(case["rounded_form_head_m"], rel=case["tolerance"])


def test_head_loss_hazen_williams_agrees_with_the_form_of_fire_protection() -> None:
    case = REFERENCE["hazen_williams_fire"]
    run = RunLoss(bore_m=6.065 * 0.0254, length_m=FOOT, hazen_williams_c=120.0)
    head, _ = head_loss(run, 500.0 * 3.785411784e-3 / 60.0, **WATER)
    psi = POUND_FORCE / 0.0254**2
    assert head * case["density_kg_m3"] * G / psi == pytest.approx(case["psi_per_foot"], rel=case["tolerance"])


def test_head_loss_hazen_williams_agrees_with_the_metric_form_of_fire_protection() -> None:
    case = REFERENCE["hazen_williams_fire_metric"]
    run = RunLoss(bore_m=0.15405, length_m=1.0, hazen_williams_c=120.0)
    head, _ = head_loss(run, 1.893 / 60.0, **WATER)
    assert head * case["density_kg_m3"] * G / 1e5 == pytest.approx(case["bar_per_metre"], rel=case["tolerance"])


def test_head_loss_at_rest_has_the_laminar_slope() -> None:
    """Hagen–Poiseuille: dh/dQ = 128 ν L/(π g D⁴), for water at 20 °C in 50 m of 20 mm."""
    head, slope = head_loss(RunLoss(bore_m=0.02, length_m=50.0, roughness_m=1e-5), np.zeros(2), **WATER)
    expected = 128.0 * 1.0016e-3 / 998.2 * 50.0 / (np.pi * G * 0.02**4)
    assert head.tolist() == [0.0, 0.0]
    assert slope == pytest.approx(expected, rel=1e-12)


def test_head_loss_of_a_valve_as_a_loss_coefficient_matches_crane() -> None:
    case = REFERENCE["valve"]
    run = RunLoss(bore_m=case["bore_m"], valve_kv_m3_s=case["kv_m3_h"] / 3600.0)
    head, _ = head_loss(run, 0.05, **WATER)
    assert head / velocity_head_m(0.05, case["bore_m"], G) == pytest.approx(case["k"], abs=case["half_digit"])


def test_valve_of_cv_50_passes_100_gallons_at_4_psi() -> None:
    """Cv = Q √(SG/Δp) in US gallons a minute and psi, water of 1000 kg/m³; exact."""
    run = RunLoss(bore_m=0.1, valve_kv_m3_s=KV_FROM_CV * 50.0 / 3600.0)
    head, _ = head_loss(run, 100.0 * 3.785411784e-3 / 60.0, **WATER)
    assert head * 1000.0 * G / (POUND_FORCE / 0.0254**2) == pytest.approx(4.0, rel=1e-8)


def test_head_loss_of_a_valve_is_one_bar_at_its_kv() -> None:
    """IEC 60534 (from memory): 10 m³/h through Kv 20 loses 0.25 bar of water of 1000 kg/m³."""
    run = RunLoss(bore_m=0.1, valve_kv_m3_s=20.0 / 3600.0)
    head, _ = head_loss(run, 10.0 / 3600.0, density_kg_m3=1000.0, viscosity_pa_s=1e-3, gravity_m_s2=G)
    assert head * 1000.0 * G == pytest.approx(0.25e5, rel=1e-12)


def test_kv_from_cv_is_the_exact_ratio() -> None:
    """Cv/Kv = 1.1560992283536566 (fluids library, from the exact gallon and pound)."""
    assert pytest.approx(1.1560992283536566, rel=1e-9) == 1.0 / KV_FROM_CV


def test_head_loss_of_rated_equipment_goes_with_flow_squared() -> None:
    run = RunLoss(bore_m=0.1, rated_drop_pa=30e3, rated_flow_m3_s=0.02)
    head, _ = head_loss(run, 0.01, **WATER)
    assert head * 998.2 * G == pytest.approx(7.5e3, rel=1e-12)


@pytest.mark.parametrize(("ratio", "widening", "narrowing"), REFERENCE["coefficients"]["rows"])
def test_widening_and_narrowing_match_borda_carnot_and_crane(ratio: float, widening: float, narrowing: float) -> None:
    assert widening_k(ratio) == pytest.approx(widening, abs=0.5e-6)
    assert narrowing_k(ratio) == pytest.approx(narrowing, abs=0.5e-6)


def test_pressure_rises_where_the_bore_widens_at_one_level() -> None:
    """Bernoulli with Borda–Carnot, bore 50 to 100 mm: Δp/½ρv₁² = 1 − β⁴ − (1 − β²)² = 0.375 for β = 0.5."""
    before = float(velocity_head_m(0.004, 0.05, G))
    after = float(velocity_head_m(0.004, 0.1, G))
    assert (before - after - widening_k(0.5) * before) / before == pytest.approx(0.375, rel=1e-12)


@settings(max_examples=60, deadline=None)
@given(run=runs, velocity=velocities)
def test_head_loss_is_odd_and_rises_with_flow(run: RunLoss, velocity: float) -> None:
    flow = velocity * np.pi * run.bore_m**2 / 4.0
    heads, slopes = head_loss(run, np.array([-flow, 0.0, flow, 1.1 * flow]), **WATER)
    assert heads[0] == pytest.approx(-heads[2], rel=1e-14, abs=1e-300)
    assert heads[1] == 0.0
    assert heads[3] >= heads[2] >= 0.0
    assert np.all(np.isfinite(slopes))
    assert np.all(slopes >= 0.0)


@settings(max_examples=60, deadline=None)
@given(run=runs, velocity=velocities)
def test_head_loss_slope_is_the_central_difference(run: RunLoss, velocity: float) -> None:
    flow = velocity * np.pi * run.bore_m**2 / 4.0
    step = 1e-5 * flow
    heads, slopes = head_loss(run, np.array([flow - step, flow, flow + step]), **WATER)
    assert slopes[1] == pytest.approx((heads[2] - heads[0]) / (2.0 * step), rel=1e-4, abs=1e-9)


@settings(max_examples=40, deadline=None)
@given(velocity=velocities, share=st.floats(0.05, 0.95))
def test_head_loss_of_two_runs_in_series_is_that_of_the_whole(velocity: float, share: float) -> None:
    def loss(length: float) -> float:
        run = RunLoss(bore_m=0.1, length_m=length, roughness_m=45e-6)
        return float(head_loss(run, velocity * 0.00785, **WATER)[0])

    assert loss(share * 80.0) + loss((1.0 - share) * 80.0) == pytest.approx(loss(80.0), rel=1e-12)


def test_loss_table_of_many_runs_equals_each_alone() -> None:
    several = [
        RunLoss(bore_m=0.1, length_m=50.0, roughness_m=45e-6),
        RunLoss(bore_m=0.05, length_m=20.0, hazen_williams_c=130.0, fittings_k=2.0),
    ]
    flows = np.array([[0.01, 0.002], [0.0, -0.001]])
    heads, slopes = LossTable(several, **WATER).evaluate(flows)
    for column, run in enumerate(several):
        head, slope = head_loss(run, flows[:, column], **WATER)
        assert heads[:, column] == pytest.approx(head, rel=1e-14)
        assert slopes[:, column] == pytest.approx(slope, rel=1e-14)


def test_pump_curve_passes_through_three_pairs_and_follows_the_affinity_laws() -> None:
    """H(nQ, n) = n² H(Q, 1)."""
    flows, heads = (0.0, 0.01, 0.02), (32.0, 30.0, 24.0)
    curve = pump_polynomial(flows, heads)
    for flow, head in zip(flows, heads, strict=True):
        assert pump_head(curve, flow, 1.0)[0] == pytest.approx(head, rel=1e-9)
        assert pump_head(curve, 0.8 * flow, 0.8)[0] == pytest.approx(0.64 * head, rel=1e-9)
    assert pump_head(curve, 0.01, 0.0) == (0.0, 0.0)


@given(
    flow=st.floats(-0.05, 0.05),
    speed=st.floats(0.1, 1.5),
    curve=st.tuples(st.floats(5.0, 80.0), st.floats(-800.0, 800.0), st.floats(-2e4, 0.0)),
)
def test_pump_head_follows_the_affinity_laws(flow: float, speed: float, curve: tuple[float, float, float]) -> None:
    """H(nQ, n) = n² H(Q, 1), for curves that lean either way at no flow."""
    head, _ = pump_head(curve, flow, 1.0)
    assert pump_head(curve, speed * flow, speed)[0] == pytest.approx(speed**2 * head, rel=1e-9, abs=1e-9)


def test_pump_curve_of_two_pairs_is_a_line() -> None:
    curve = pump_polynomial((0.0, 0.02), (40.0, 20.0))
    assert pump_head(curve, 0.005, 1.0) == pytest.approx((35.0, -1000.0), rel=1e-12)


def test_pump_curve_through_more_than_three_pairs_is_the_least_squares_quadratic() -> None:
    """Hand: residuals ±δ in the pattern +1 −3 +3 −1 on even steps are orthogonal to every quadratic, so the fit ignores them."""
    flows = np.array([0.0, 0.01, 0.02, 0.03])
    heads = 40.0 - 300.0 * flows - 8000.0 * flows**2 + 0.1 * np.array([1.0, -3.0, 3.0, -1.0])
    assert pump_polynomial(flows.tolist(), heads.tolist()) == pytest.approx((40.0, -300.0, -8000.0), rel=1e-9)


@given(flow=st.floats(-0.05, 0.05), speed=st.floats(0.1, 1.2))
def test_pump_slope_is_the_central_difference(flow: float, speed: float) -> None:
    curve = (40.0, -300.0, -8000.0)
    below, above = (pump_head(curve, flow + side, speed)[0] for side in (-1e-4, 1e-4))
    assert pump_head(curve, flow, speed)[1] == pytest.approx((above - below) / 2e-4, rel=1e-7, abs=1e-6)
