"""Sight: the smallest trouble that readings would show, against lengths of marks worked out by hand."""

from __future__ import annotations

from dataclasses import replace
from math import sqrt

import numpy as np
import pytest

from headledger.diagnosis.layout import Layout
from headledger.diagnosis.planned import plan_states
from headledger.diagnosis.result import CauseKind, GaugeSight, PlanResult, TroubleSight, Verdict
from headledger.diagnosis.sight import SEEN, plan_job
from headledger.diagnosis.starting import first_points
from headledger.plant.gauges import ErrorLimit
from headledger.plant.job import Job, SpellKind, StatedFlow, StatedSpell
from headledger.plant.runs import Doubt, PumpCurve
from headledger.plant.stations import Exchange, Station, StationKind

from .made_systems import DENSITY, GRAVITY, gauge, job, loss_m, model, run, spell, station

STILL = StatedSpell(start_s=0.0, end_s=0.0, kind=SpellKind.STILL)


def flowing(**flows_m3_s: float) -> StatedSpell:
    """A flow state with these flows, metered to 1 %."""
    stated = tuple(
        StatedFlow(run=name, flow_m3_s=flow, doubt=Doubt(relative_fraction=0.01)) for name, flow in flows_m3_s.items()
    )
    return StatedSpell(start_s=0.0, end_s=0.0, kind=SpellKind.FLOWING, flows=stated)


def line(count: int) -> Job:
    """So many stations in a row on one level, each with a gauge, the first run metered."""
    names = [f"S{n}" for n in range(count)]
    stations = [station(name, 0.0, is_open=n in (0, count - 1)) for n, name in enumerate(names)]
    runs = [run(f"R{n}", names[n - 1], names[n]) for n in range(1, count)]
    runs[0] = replace(runs[0], flow_column="FT")
    gauges = [gauge(f"P{n}", name, f"R{max(n, 1)}") for n, name in enumerate(names)]
    return job(stations, runs, gauges)


def trouble(plan: PlanResult, kind: CauseKind, place: str) -> TroubleSight:
    return next(one for one in plan.sight.troubles if one.kind is kind and place in (one.place.gauge, one.place.run))


def gauge_sight(plan: PlanResult, tag: str) -> GaugeSight:
    return next(one for one in plan.sight.gauges if one.tag == tag)


@pytest.mark.parametrize("count", [3, 5])
def test_shift_among_equal_gauges_at_rest_is_seen_at_the_length_worked_out_by_hand(count: int):
    """At rest on one level n gauges share one unknown head: ``uᵀV⁻¹u = (1 − 1/n)/s²``.

    s of one gauge, in the middle of its range: offset 0.8 × 2500 / √3 Pa, survey of its station 5 mm of water, scatter 5 % of 10 kPa.
    Two such marks correlate by −1/(n − 1), so that a shift is told from one of the other sign elsewhere at √(1 − 1/(n−1)²) of it.
    """
    plan = plan_job(line(count), [STILL])
    s = sqrt((0.8 * 2500.0 / sqrt(3.0)) ** 2 + (0.005 * DENSITY * GRAVITY) ** 2 + 500.0**2)
    shift = trouble(plan, CauseKind.ZERO_SHIFT, "P1")
    assert shift.seen is not None
    assert shift.seen == pytest.approx(SEEN * s / sqrt(1.0 - 1.0 / count), rel=1e-3)
    assert shift.placed == pytest.approx(shift.seen / sqrt(1.0 - 1.0 / (count - 1) ** 2), rel=1e-3)


def test_two_gauges_at_rest_show_a_shift_but_never_whose():
    shift = trouble(plan_job(line(2), [STILL]), CauseKind.ZERO_SHIFT, "P0")
    assert shift.seen is not None
    assert shift.placed is None
    assert shift.alike[0].place.gauge == "P1"
    assert shift.alike[0].correlation == pytest.approx(1.0, abs=1e-3)
    assert "at no size told from trouble elsewhere" in shift.says


def test_shift_and_elevation_of_one_gauge_are_never_named_apart():
    """A column of liquid adds the same at every flow, as a shift does."""
    shift = trouble(plan_job(line(4), [STILL, flowing(R1=0.01)]), CauseKind.ZERO_SHIFT, "P2")
    assert shift.named is None
    assert CauseKind.WRONG_ELEVATION in {alike.kind for alike in shift.alike if not alike.elsewhere}
    assert "readings alone do not tell it from" in shift.says


def test_blockage_needs_flow_to_be_seen():
    at_rest = plan_job(line(4), [STILL])
    assert not [one for one in at_rest.sight.troubles if one.kind is CauseKind.BLOCKAGE]
    moving = plan_job(line(4), [STILL, flowing(R1=0.01)])
    faster = plan_job(line(4), [STILL, flowing(R1=0.02)])
    slow, fast = (trouble(plan, CauseKind.BLOCKAGE, "R2") for plan in (moving, faster))
    assert slow.seen is not None
    assert fast.seen is not None
    assert fast.seen < slow.seen
    # K = 1 takes ½ρv² of its bore
    assert fast.pa_per_size == pytest.approx(DENSITY * GRAVITY * loss_m(0.02, k=1.0), rel=1e-4)


def test_gauge_alone_is_unchecked_and_says_why():
    lone = replace(line(3), gauges=line(3).gauges[:1])
    plan = plan_job(lone, [STILL])
    one = gauge_sight(plan, "P0")
    assert one.verdict is Verdict.UNCHECKED
    assert one.says.startswith("P0: nothing else in the data determines the pressure at this gauge")


def test_gauge_with_a_tolerance_below_what_can_be_known_cannot_pass():
    described = line(3)
    tight = ErrorLimit(limit_pa=300.0, outer_limit_pa=300.0)
    described = replace(described, gauges=(*described.gauges[:2], replace(described.gauges[2], tolerance=tight)))
    plan = plan_job(described, [STILL])
    assert gauge_sight(plan, "P2").verdict is Verdict.UNRESOLVED
    assert "cannot pass, however good it is" in gauge_sight(plan, "P2").says
    assert gauge_sight(plan, "P1").verdict is Verdict.PASS


def test_gauge_more_brings_what_was_said_of_it():
    described = line(4)
    without = replace(described, gauges=(described.gauges[0], described.gauges[3]))
    plan = plan_job(without, [STILL, flowing(R1=0.01)])
    best = plan.sight.further[0]
    assert best.station in ("S1", "S2")
    assert best.sharper_ratio > 1.2
    index = int(best.station[1:])
    with_it = replace(without, gauges=(*without.gauges, described.gauges[index]))
    after = plan_job(with_it, [STILL, flowing(R1=0.01)])
    # told from the far gauge only now
    assert trouble(plan, CauseKind.ZERO_SHIFT, "P0").placed is None
    assert trouble(after, CauseKind.ZERO_SHIFT, "P0").placed is not None


def test_missing_still_spell_is_proposed_where_only_flow_is_planned():
    plan = plan_job(line(3), [flowing(R1=0.01)])
    assert SpellKind.STILL in {more.kind for more in plan.sight.further}
    assert any(more.says.startswith("A still spell") for more in plan.sight.further)


def test_flow_between_two_surfaces_is_that_of_bernoulli():
    """10 m of fall over one K = 40 and nothing else: ``v = √(2 g 10 / 40)``."""
    upper = Station(name="A", elevation_m=10.0, elevation_sd_m=0.01, kind=StationKind.SURFACE, exchange=Exchange.OPEN)
    lower = Station(name="C", elevation_m=0.0, elevation_sd_m=0.01, kind=StationKind.SURFACE, exchange=Exchange.OPEN)
    runs = [run("R1", "A", "B", fittings_k=15.0), run("R2", "B", "C", fittings_k=25.0)]
    described = job([upper, station("B", -5.0), lower], runs, [gauge("P1", "B", "R1")])
    planned = plan_states(Layout(described), [StatedSpell(start_s=0.0, end_s=0.0, kind=SpellKind.FLOWING)])
    flow_m3_s = float(planned.points[0].flow_m3_s[0])
    # the weight of 10 m of air is left out by hand: 0.1 % of the fall
    assert flow_m3_s == pytest.approx(np.pi * 0.1**2 / 4.0 * sqrt(2.0 * GRAVITY * 10.0 / 40.0), rel=2e-3)


def test_pump_between_surfaces_works_where_its_curve_meets_the_system():
    """Curve 30 m − (10 m at 0.02 m³/s)·(Q/0.02)², lift 5 m, K = 10: ``25 = (10/0.02² + 10/(2 g A²)) Q²``."""
    low = Station(name="A", elevation_m=0.0, elevation_sd_m=0.01, kind=StationKind.SURFACE, exchange=Exchange.OPEN)
    high = Station(name="C", elevation_m=5.0, elevation_sd_m=0.01, kind=StationKind.SURFACE, exchange=Exchange.OPEN)
    curve = PumpCurve(flow_m3_s=(0.0, 0.01, 0.02), head_m=(30.0, 27.5, 20.0))
    runs = [run("PU", "A", "B", fittings_k=0.0, pump=curve, item="pump"), run("R2", "B", "C")]
    described = job([low, station("B", 0.0), high], runs, [gauge("P1", "B", "R2")])
    planned = plan_states(Layout(described), [StatedSpell(start_s=0.0, end_s=0.0, kind=SpellKind.FLOWING)])
    area = np.pi * 0.1**2 / 4.0
    by_hand = sqrt(25.0 / (10.0 / 0.02**2 + 10.0 / (2.0 * GRAVITY * area**2)))
    assert float(planned.points[0].flow_m3_s[0]) == pytest.approx(by_hand, rel=2e-3)


def parallel() -> Job:
    """A feed that divides into two equal runs and joins again; gauges before, between and behind; the feed metered."""
    stations = [
        station("S0", 0.0, is_open=True),
        station("A", 0.0),
        station("B", 0.0),
        station("S1", 0.0, is_open=True),
    ]
    runs = [
        run("F", "S0", "A", flow_column="FT"),
        run("R1", "A", "B"),
        run("R2", "A", "B"),
        run("D", "B", "S1"),
    ]
    gauges = [gauge("P0", "S0", "F"), gauge("PA", "A", "F"), gauge("PB", "B", "D"), gauge("P1", "S1", "D")]
    return job(stations, runs, gauges)


def test_flows_that_no_plan_gives_close_their_loop():
    planned = plan_states(Layout(parallel()), [flowing(F=0.02)])
    layout = Layout(parallel())
    flows = layout.graph((True,) * 4).flow @ planned.points[0].flow_m3_s
    assert flows == pytest.approx([0.02, 0.01, 0.01, 0.02], rel=1e-4)


def test_blockage_that_moves_the_flow_is_as_long_as_its_true_readings_are():
    """One of two equal ways takes K more: ``Q1 √(10 + k) = Q2 √10``, worked out here, lies λ = 6 from the sound system at its sight."""
    described = parallel()
    plan = plan_job(described, [STILL, flowing(F=0.02)])
    k = trouble(plan, CauseKind.BLOCKAGE, "R1").seen
    assert k is not None
    share = sqrt(10.0) / (sqrt(10.0 + k) + sqrt(10.0))
    feed, between = loss_m(0.02), loss_m(0.02 * share, k=10.0 + k)
    heads = {"S0": 50.0, "A": 50.0 - feed, "B": 50.0 - feed - between, "S1": 50.0 - 2.0 * feed - between}
    flows = {"F": 0.02, "R1": 0.02 * share, "R2": 0.02 * (1.0 - share), "D": 0.02}
    noise = np.full(4, 500.0)
    still = spell(described, 1, dict.fromkeys(heads, 50.0), noise_pa=noise)
    moving = spell(described, 2, heads, flows, noise_pa=noise, flow_noise_m3_s=np.zeros(4))
    judged = model(described, [still, moving])
    points = first_points(judged.layout, judged.spells)
    for _ in range(6):
        linear = judged.linearise(points)
        points = judged.moved(linear, np.zeros(linear.row_count))
    assert float(np.linalg.norm(judged.linearise(points).white.residual)) == pytest.approx(SEEN, rel=0.05)
