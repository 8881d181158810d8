"""Any piping graph: solved from a cold start, mass and energy kept, and the textbooks' answers."""

from __future__ import annotations

import os

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from headledger.errors import NetworkError
from headledger.physics.losses import LossTable, RunLoss, pump_head
from headledger.physics.solver import Piping, Solved, solve_piping

# The suite draws some; all of them with HEADLEDGER_GRAPHS=2000.
GRAPHS = int(os.environ.get("HEADLEDGER_GRAPHS", "150"))
GRAVITY, DENSITY, VISCOSITY = 9.80665, 998.2, 1.0016e-3


def quadratic(resistance: list[float]):
    """``h = r Q |Q|``."""
    r = np.array(resistance)

    def losses(flow):
        return r * flow * np.abs(flow), 2.0 * r * np.abs(flow)

    return losses


def imbalance(piping: Piping, losses, solved: Solved) -> tuple[float, float]:
    """Greatest mass lost at a station without a known head, against the greatest flow; greatest energy lost along an open run."""
    net = np.zeros(piping.station_count)
    for run, (start, end) in enumerate(piping.ends):
        net[start] -= solved.flow_m3_s[run]
        net[end] += solved.flow_m3_s[run]
    for station, draw in piping.draw_m3_s.items():
        net[station] -= draw
    mass = max((abs(net[s]) for s in range(piping.station_count) if s not in piping.head_m), default=0.0)
    drop, _ = losses(solved.flow_m3_s)
    energy = max(
        (
            abs(solved.head_m[start] - solved.head_m[end] - drop[run])
            for run, (start, end) in enumerate(piping.ends)
            if piping.is_open[run] and not (piping.one_way and piping.one_way[run] and solved.flow_m3_s[run] == 0.0)
        ),
        default=0.0,
    )
    return mass / max(float(np.abs(solved.flow_m3_s).max(initial=0.0)), 1e-300), energy


def random_system(seed: int) -> tuple[Piping, tuple[RunLoss, ...]]:
    """A connected graph of 2 to 25 stations with loops, bores from 6 mm to 2 m mixed, one to four known heads, draws over six decades."""
    random = np.random.default_rng(seed)
    stations = int(random.integers(2, 26))
    ends = [(int(random.integers(0, s)), s) for s in range(1, stations)]
    for _ in range(int(random.integers(0, stations))):
        start, end = random.choice(stations, 2, replace=False)
        ends.append((int(start), int(end)))
    runs = []
    for _ in ends:
        bore = float(10.0 ** random.uniform(np.log10(0.006), np.log10(2.0)))
        plain = random.random() < 0.8
        runs.append(
            RunLoss(
                bore_m=bore,
                length_m=float(10.0 ** random.uniform(-1.0, 3.5)),
                roughness_m=float(bore * random.uniform(0.0, 0.03)) if plain else None,
                hazen_williams_c=None if plain else float(random.uniform(60.0, 150.0)),
                fittings_k=float(random.choice([0.0, random.uniform(0.0, 30.0)])),
            )
        )
    count = min(stations, int(random.integers(1, 5)))
    known = {int(s): float(random.uniform(0.0, 80.0)) for s in random.choice(stations, count, replace=False)}
    if random.random() < 0.15:
        known = dict.fromkeys(known, 40.0)  # nothing flows
    scale = float(10.0 ** random.uniform(-7.0, -1.0))
    draws = {
        s: scale * float(random.normal())
        for s in range(stations)
        if s not in known and random.random() < 0.3 and random.random() < 0.85
    }
    piping = Piping(
        station_count=stations, ends=tuple(ends), is_open=(True,) * len(ends), head_m=known, draw_m3_s=draws
    )
    return piping, tuple(runs)


systems = st.integers(0, 2**32 - 1).map(random_system)


@settings(max_examples=GRAPHS)
@given(system=systems)
def test_any_graph_is_solved_from_a_cold_start_with_mass_and_energy_kept(system):
    """Mass to 1e-9 of the greatest flow, energy to 1e-9 m, or to the rounding that a main's flow in a bore of millimetres brings."""
    piping, runs = system
    table = LossTable(runs, density_kg_m3=DENSITY, viscosity_pa_s=VISCOSITY, gravity_m_s2=GRAVITY)
    solved = solve_piping(piping, table.evaluate)
    mass, energy = imbalance(piping, table.evaluate, solved)
    assert mass <= 1e-9
    drop, _ = table.evaluate(solved.flow_m3_s)
    allowed = max(1e-9, solved.rounding_m, 1e-13 * len(runs) * float(np.abs(drop).max()))
    assert energy <= allowed
    for station, head in piping.head_m.items():
        assert solved.head_m[station] == pytest.approx(head, abs=allowed)


def test_rounding_is_below_a_nanometre_where_flows_suit_their_bores():
    """Of 200 graphs whose drops stay below 100 m, each keeps every energy balance to 1e-9 m without any allowance."""
    kept = 0
    for seed in range(1000):
        piping, runs = random_system(seed)
        table = LossTable(runs, density_kg_m3=DENSITY, viscosity_pa_s=VISCOSITY, gravity_m_s2=GRAVITY)
        solved = solve_piping(piping, table.evaluate)
        if float(np.abs(table.evaluate(solved.flow_m3_s)[0]).max()) < 100.0:
            kept += 1
            assert imbalance(piping, table.evaluate, solved)[1] <= 1e-9, seed
        if kept == 200:
            break
    assert kept == 200


@settings(max_examples=max(20, GRAPHS // 10))
@given(system=systems, factor=st.floats(0.3, 3.0))
def test_the_balance_is_one_whatever_the_start(system, factor: float):
    piping, runs = system
    table = LossTable(runs, density_kg_m3=DENSITY, viscosity_pa_s=VISCOSITY, gravity_m_s2=GRAVITY)
    cold = solve_piping(piping, table.evaluate)
    warm = solve_piping(piping, table.evaluate, start_m3_s=factor * cold.flow_m3_s)
    scale = max(1.0, float(np.abs(cold.head_m).max()))
    assert warm.head_m == pytest.approx(cold.head_m, abs=1e-6 * scale)


def test_two_parallel_runs_share_by_the_root_of_their_resistances():
    """R Q² alike in both: Q₁/Q₂ = √(r₂/r₁) = 2; 3 m³/s in all, so 2 and 1, and 8 m lost by hand."""
    piping = Piping(station_count=2, ends=((0, 1), (0, 1)), is_open=(True, True), head_m={0: 20.0}, draw_m3_s={1: 3.0})
    solved = solve_piping(piping, quadratic([2.0, 8.0]))
    assert solved.flow_m3_s == pytest.approx([2.0, 1.0], rel=1e-12)
    assert solved.head_m == pytest.approx([20.0, 12.0], rel=1e-12)


def test_three_surfaces_meet_in_one_junction():
    """Surfaces at 100, 80, 60 m, each by r = 100 to one junction: by symmetry the middle one is at rest, the others √0.2 each."""
    piping = Piping(
        station_count=4, ends=((0, 3), (1, 3), (2, 3)), is_open=(True,) * 3, head_m={0: 100.0, 1: 80.0, 2: 60.0}
    )
    solved = solve_piping(piping, quadratic([100.0] * 3))
    assert solved.head_m[3] == pytest.approx(80.0, abs=1e-9)
    assert solved.flow_m3_s[[0, 2]] == pytest.approx([0.2**0.5, -(0.2**0.5)], rel=1e-9)
    # the loss of a quadratic at rest has no slope: 1e-10 m of head moves 1e-6 m3/s there
    assert abs(solved.flow_m3_s[1]) <= 1e-6


def test_closed_circuit_with_a_pump_runs_where_its_curve_meets_the_losses():
    """Lift 30 - 200 Q² against 100 Q² round the circuit: Q² = 0.1 by hand."""

    def losses(flow):
        drop, slope = quadratic([0.0, 60.0, 40.0])(flow)
        lift, lift_slope = pump_head((30.0, 0.0, -200.0), float(flow[0]), 1.0)
        drop[0] -= lift
        slope[0] -= lift_slope
        return drop, slope

    piping = Piping(station_count=3, ends=((0, 1), (1, 2), (2, 0)), is_open=(True,) * 3, head_m={0: 5.0})
    solved = solve_piping(piping, losses)
    assert solved.flow_m3_s == pytest.approx([0.1**0.5] * 3, rel=1e-9)
    assert solved.head_m == pytest.approx([5.0, 15.0, 9.0], rel=1e-9)


def test_check_valve_shuts_against_backflow_and_holds_the_higher_head():
    piping = Piping(
        station_count=3, ends=((0, 1), (1, 2)), is_open=(True, True), one_way=(True, False), head_m={0: 10.0, 2: 30.0}
    )
    solved = solve_piping(piping, quadratic([5.0, 5.0]))
    assert solved.flow_m3_s == pytest.approx([0.0, 0.0], abs=1e-9)
    assert solved.head_m == pytest.approx([10.0, 30.0, 30.0], abs=1e-6)
    turned = Piping(
        station_count=3, ends=((0, 1), (1, 2)), is_open=(True, True), one_way=(True, False), head_m={0: 30.0, 2: 10.0}
    )
    assert solve_piping(turned, quadratic([5.0, 5.0])).flow_m3_s == pytest.approx([2.0**0.5] * 2, rel=1e-9)


def test_shut_run_parts_the_system():
    piping = Piping(
        station_count=3, ends=((0, 1), (1, 2)), is_open=(True, False), head_m={0: 10.0, 2: 30.0}, draw_m3_s={1: 1.0}
    )
    solved = solve_piping(piping, quadratic([4.0, 4.0]))
    assert solved.flow_m3_s == pytest.approx([1.0, 0.0])
    assert solved.head_m == pytest.approx([10.0, 6.0, 30.0])


def test_part_without_a_known_head_whose_draws_do_not_sum_to_nothing_is_refused_by_name():
    piping = Piping(
        station_count=2, ends=((0, 1),), is_open=(True,), draw_m3_s={0: -1.0, 1: 2.0}, names=("PLANT", "HALL")
    )
    with pytest.raises(NetworkError, match="part of PLANT has no known head"):
        solve_piping(piping, quadratic([1.0]))


def test_pump_whose_lift_outgrows_every_loss_is_refused_with_a_place():
    """Lift 10 + Q against 0.5 Q: no flow at which they meet."""

    def losses(flow):
        return np.array([0.5 * flow[0] - 10.0 - flow[0], 0.0]), np.array([-0.5, 0.0])

    piping = Piping(station_count=2, ends=((0, 1), (1, 0)), is_open=(True, True), head_m={0: 0.0}, names=("A", "B"))
    with pytest.raises(NetworkError, match="no balance was reached"):
        solve_piping(piping, losses)
