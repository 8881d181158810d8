"""Graphs by hand: mass at stations, energy along runs and around loops; and what a tap reads."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from numpy.typing import NDArray

from headledger.physics.network import Graph, build_graph
from headledger.physics.tapping import Taps

G = 9.80665
TREE = ((0, 1), (1, 2), (1, 3), (3, 4), (3, 5))


def graph_of(
    ends: tuple[tuple[int, int], ...], exchanges: set[int], preference: tuple[int, ...] | None = None
) -> Graph:
    """A graph with every run open."""
    stations = max(max(pair) for pair in ends) + 1
    return build_graph(
        stations,
        ends,
        is_open=[True] * len(ends),
        exchanges=[s in exchanges for s in range(stations)],
        preference=preference or tuple(range(len(ends))),
    )


def test_build_graph_line_has_one_flow_and_sums_its_drops() -> None:
    graph = graph_of(((0, 1), (1, 2), (2, 3)), {0, 3})
    assert graph.basis.tolist() == [0]
    assert graph.flow[:, 0].tolist() == [1.0, 1.0, 1.0]
    heads = graph.heads_m(np.array([50.0]), np.array([1.0, 2.0, 4.0]))
    assert heads.tolist() == [50.0, 49.0, 47.0, 43.0]


def test_build_graph_tree_gives_the_header_as_the_sum_of_its_metered_branches() -> None:
    graph = graph_of(TREE, {0, 2, 4, 5}, preference=(1, 3, 4, 0, 2))
    assert graph.basis.tolist() == [1, 3, 4]
    assert (graph.flow @ np.array([2.0, 3.0, 5.0])).tolist() == [10.0, 2.0, 8.0, 3.0, 5.0]


def test_build_graph_without_exchange_has_no_flow() -> None:
    assert graph_of(TREE, set()).basis.size == 0


def test_build_graph_shut_run_parts_the_stations() -> None:
    graph = build_graph(
        4,
        ((0, 1), (1, 2), (2, 3)),
        is_open=[True, False, True],
        exchanges=[True, False, False, True],
        preference=(0, 1, 2),
    )
    assert graph.parts == 2
    assert graph.part.tolist() == [0, 0, 1, 1]
    assert graph.heads_m(np.array([40.0, 12.0]), np.zeros(3)).tolist() == [40.0, 40.0, 12.0, 12.0]


def test_build_graph_run_turned_round_turns_its_flow_alone() -> None:
    graph = graph_of(((0, 1), (2, 1), (2, 3)), {0, 3})
    assert graph.flow[:, 0].tolist() == [1.0, -1.0, 1.0]


@settings(max_examples=40, deadline=None)
@given(flows=st.lists(st.floats(-5.0, 5.0), min_size=3, max_size=3))
def test_build_graph_any_independent_flows_balance_at_closed_stations(flows: list[float]) -> None:
    graph = graph_of(TREE, {0, 2, 4, 5})
    all_flows = graph.flow @ np.array(flows)
    for station in (1, 3):
        into = sum(f for (_, end), f in zip(TREE, all_flows, strict=True) if end == station)
        out = sum(f for (start, _), f in zip(TREE, all_flows, strict=True) if start == station)
        assert into == pytest.approx(out, abs=1e-12)


def solve(graph: Graph, coefficients: NDArray[np.float64], inflow: float) -> NDArray[np.float64]:
    """Flows that close every loop, h = r Q|Q|, with the first independent run carrying `inflow`; Newton's method."""
    flows = np.full(graph.basis.size, inflow / 3.0)
    flows[0] = inflow
    for _ in range(60):
        q = graph.flow @ flows
        residual = graph.loop @ (coefficients * q * np.abs(q))
        slopes = (graph.loop @ ((2.0 * coefficients * np.abs(q))[:, None] * graph.flow))[:, 1:]
        flows[1:] -= np.linalg.solve(slopes, residual)
    return np.asarray(graph.flow @ flows)


def test_build_graph_loops_solve_the_symmetric_bridge() -> None:
    """Open encyclopedia's Hardy Cross example (from memory): r = 1, 5, 1, 5, 1; 10 in and out: 20/3, 10/3, 10/3, 10/3, 20/3."""
    ends = ((4, 0), (0, 1), (0, 2), (1, 2), (1, 3), (2, 3), (3, 5))
    graph = graph_of(ends, {4, 5})
    q = solve(graph, np.array([0.0, 1.0, 5.0, 1.0, 5.0, 1.0, 0.0]), 10.0)
    assert q[1:6] == pytest.approx([20 / 3, 10 / 3, 10 / 3, 10 / 3, 20 / 3], abs=1e-9)
    heads = graph.heads_m(np.array([100.0]), np.array([0.0, 1.0, 5.0, 1.0, 5.0, 1.0, 0.0]) * q * np.abs(q))
    # by hand from station 1 to 4: 1 × (20/3)² + 5 × (10/3)² = 100
    assert heads[0] - heads[3] == pytest.approx(100.0, abs=1e-9)


def taps(head: list[list[float]], velocity: list[list[float]], column: list[float], constant: list[float]) -> Taps:
    """Taps from plain lists."""
    return Taps(
        head=np.array(head), velocity=np.array(velocity), column_m=np.array(column), constant_pa=np.array(constant)
    )


def test_readings_ten_metre_water_column_is_98_kpa() -> None:
    """Hand: 1000 kg/m³ × 9.80665 m/s² × 10 m = 98 066.5 Pa."""
    one = taps([[1.0]], [[0.0]], [2.0], [0.0])
    found = one.readings_pa(np.array([12.0]), np.zeros(1), density_kg_m3=1000.0, gravity_m_s2=G)
    assert found[0] == pytest.approx(98_066.5, rel=1e-12)


def test_readings_lose_the_velocity_pressure_of_their_bore() -> None:
    """Hand: ½ × 1000 × 3² = 4500 Pa."""
    one = taps([[1.0]], [[1.0]], [0.0], [0.0])
    found = one.readings_pa(np.array([10.0]), np.array([4500.0]), density_kg_m3=1000.0, gravity_m_s2=G)
    assert found[0] == pytest.approx(98_066.5 - 4500.0, rel=1e-12)


def test_readings_of_a_differential_gauge_are_the_difference_of_its_taps() -> None:
    both = taps([[1.0, -1.0], [1.0, 0.0], [0.0, 1.0]], [[1.0, -1.0], [1.0, 0.0], [0.0, 1.0]], [0.0] * 3, [0.0] * 3)
    found = both.readings_pa(np.array([30.0, 26.0]), np.array([500.0, 200.0]), density_kg_m3=990.0, gravity_m_s2=9.81)
    assert found[0] == pytest.approx(found[1] - found[2], rel=1e-12)
