"""Looped and pumped networks of the textbooks, closed by the product's graph and losses, Newton's method beside them."""

from __future__ import annotations

import tomllib
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from numpy.typing import NDArray

from headledger.physics.losses import (
    ENTRANCE_SHARP_K,
    EXIT_K,
    LossTable,
    RunLoss,
    narrowing_k,
    pump_head,
    pump_polynomial,
)
from headledger.physics.network import build_graph

TEXTBOOK: dict[str, Any] = tomllib.loads(
    (Path(__file__).parent.parent / "reference" / "textbook.toml").read_text(encoding="utf-8")
)
FOOT, INCH, GALLON = 0.3048, 0.0254, 3.785411784e-3
POUND = 0.45359237
G, G_ENGLISH = 9.81, 32.174 * FOOT
SLUG_FT3, LBF_S_FT2 = 515.3788184, 47.88025898
Array = NDArray[np.float64]


def two_loop_flows_cfs(exchanger_ft_s2: float) -> Array:
    """Flows of the two-loop example with so much loss of an exchanger in pipe 1, h = k Q² in feet and cubic feet a second."""
    case = TEXTBOOK["two_loops"]
    density, viscosity = case["density_slug_ft3"] * SLUG_FT3, case["viscosity_lbf_s_ft2"] * LBF_S_FT2
    pipes = [
        RunLoss(
            bore_m=bore * INCH,
            length_m=length * FOOT,
            roughness_m=case["roughness_ft"] * FOOT,
            rated_drop_pa=exchanger_ft_s2 * FOOT * density * G_ENGLISH if number == 0 else None,
            rated_flow_m3_s=FOOT**3,
        )
        for number, (length, bore) in enumerate(zip(case["length_ft"], case["bore_in"], strict=True))
    ]
    graph = build_graph(6, case["ends"], is_open=[True] * 7, exchanges=[False] * 6, preference=tuple(range(7)))
    losses = LossTable(pipes, density_kg_m3=density, viscosity_pa_s=viscosity, gravity_m_s2=G_ENGLISH)
    start = np.array(case["start_cfs"]) * FOOT**3
    round_trips = np.zeros(graph.basis.size)
    for _ in range(40):
        lost, slope = losses.evaluate(start + graph.flow @ round_trips)
        round_trips -= np.linalg.solve(graph.loop @ (slope[:, None] * graph.flow), graph.loop @ lost)
    lost, _ = losses.evaluate(start + graph.flow @ round_trips)
    assert graph.loop @ lost == pytest.approx(np.zeros(2), abs=1e-9)
    return np.asarray((start + graph.flow @ round_trips) / FOOT**3)


def test_build_graph_two_loops_share_a_pipe_and_close_as_published() -> None:
    case = TEXTBOOK["two_loops"]
    assert two_loop_flows_cfs(0.0) == pytest.approx(case["flow_cfs"], abs=case["tolerance_cfs"])


def test_build_graph_two_loops_with_an_exchanger_close_as_published() -> None:
    case = TEXTBOOK["two_loops"]
    found = two_loop_flows_cfs(case["exchanger_ft_s2"])
    assert found == pytest.approx(case["flow_with_exchanger_cfs"], abs=case["tolerance_cfs"])


def test_build_graph_pump_lifts_through_two_parallel_pipes() -> None:
    """Pump of so much power to the liquid, H = P/(ρ g Q); unknown are the pump's flow and the narrow pipe's."""
    case = TEXTBOOK["cengel_8_7"]
    density, power_w = case["density_kg_m3"], case["shaft_power_w"] * case["efficiency"]
    graph = build_graph(
        3,
        ((0, 1), (1, 2), (1, 2)),
        is_open=[True] * 3,
        exchanges=[True, False, True],
        preference=(0, 1, 2),
    )
    assert graph.basis.tolist() == [0, 1]
    pipes = [RunLoss(bore_m=1.0)] + [
        RunLoss(bore_m=bore, length_m=case["length_m"], roughness_m=case["roughness_m"]) for bore in case["bore_m"]
    ]
    losses = LossTable(pipes, density_kg_m3=density, viscosity_pa_s=case["viscosity_pa_s"], gravity_m_s2=G)
    low, high = case["surface_m"]
    # the chord's loop, and the energy line from the lower surface to the upper one
    rows = np.vstack([graph.loop, -graph.path[2]])
    unknown = np.array([0.02, 0.005])
    lift = 0.0
    for _ in range(60):
        flow = graph.flow @ unknown
        lost, slope = losses.evaluate(flow)
        lift = power_w / (density * G * flow[0])
        lost[0], slope[0] = -lift, lift / flow[0]
        miss = rows @ lost + np.array([0.0, low - high])
        unknown -= np.linalg.solve(rows @ (slope[:, None] * graph.flow), miss)
    flow = graph.flow @ unknown
    drops = losses.evaluate(flow)[0]
    tolerance = case["tolerance"]
    assert flow == pytest.approx(case["flow_m3_s"], rel=tolerance)
    assert drops[1:] == pytest.approx([case["head_lost_m"]] * 2, rel=tolerance)
    assert lift == pytest.approx(case["lift_m"], rel=tolerance)
    drops[0] = -lift
    assert graph.heads_m(np.array([low]), drops)[2] == pytest.approx(high, abs=1e-9)


def test_losses_in_series_of_two_bores_pass_the_flow_of_crane_7_19() -> None:
    """The narrow pipe stands with its own length over bore, but at the ratio of the nominal bores, as in the example.

    With the real ratio, 0.6737, all of its coefficients weigh 4 % less on the wide bore and 139.4 US gal/min pass.
    """
    case = TEXTBOOK["crane_7_19"]
    wide_bore, narrow_bore = case["wide_bore_in"] * INCH, case["wide_bore_in"] * INCH * case["bore_ratio"]
    scale = narrow_bore / (case["narrow_bore_in"] * INCH)
    roughness = case["roughness_in"] * INCH
    wide = RunLoss(
        bore_m=wide_bore,
        length_m=case["wide_length_ft"] * FOOT,
        roughness_m=roughness,
        fittings_k=ENTRANCE_SHARP_K + case["equivalent_lengths"] * case["turbulent_factor"],
    )
    narrow = RunLoss(
        bore_m=narrow_bore,
        length_m=case["narrow_length_ft"] * FOOT * scale,
        roughness_m=roughness * scale,
        fittings_k=narrowing_k(case["bore_ratio"]) + EXIT_K,
    )
    density = case["density_lb_ft3"] * POUND / FOOT**3
    losses = LossTable(
        [wide, narrow], density_kg_m3=density, viscosity_pa_s=case["viscosity_pa_s"], gravity_m_s2=9.80665
    )
    flow = 0.008
    for _ in range(40):
        lost, slope = losses.evaluate([flow, flow])
        flow -= (float(lost.sum()) - case["head_ft"] * FOOT) / float(slope.sum())
    assert flow * 60.0 / GALLON == pytest.approx(case["flow_gal_min"], abs=case["half_digit_gal_min"])


def test_pump_head_at_half_speed_matches_crane_7_33() -> None:
    """Any curve through the stated point will do; this one falls from 150 ft at no flow."""
    case = TEXTBOOK["crane_7_33"]
    gallon_a_minute = GALLON / 60.0
    curve = pump_polynomial((0.0, case["flow_gal_min"] * gallon_a_minute), (150.0 * FOOT, case["head_ft"] * FOOT))
    head, _ = pump_head(curve, case["slowed_flow_gal_min"] * gallon_a_minute, case["speed_ratio"])
    assert head / FOOT == pytest.approx(case["slowed_head_ft"], rel=case["tolerance"])
