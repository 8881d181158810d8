"""Systems that technicians meet, and whether the judgement holds on them: readings from heads worked out by hand."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from headledger.diagnosis.circulation import circulations
from headledger.diagnosis.estimate import Model
from headledger.diagnosis.findings import list_findings
from headledger.diagnosis.result import CauseKind, Place, Verdict
from headledger.diagnosis.search import Posterior, search
from headledger.diagnosis.state import spell_graph
from headledger.diagnosis.vapour import vapour_findings
from headledger.diagnosis.verdicts import judge_gauge
from headledger.diagnosis.wording import verdict_sentence
from headledger.plant.job import LevelPoint, LiquidKind, LiquidSpec
from headledger.plant.runs import LossKind, PumpCurve, RunState

from .made_systems import GRAVITY, gauge, job, loss_m, model, run, spell, station

FLOW = 0.012  # m³/s, 1.5 m/s in 100 mm


def verdicts(made: Model, posterior: Posterior) -> dict[str, Verdict]:
    return {noun.tag: judge_gauge(made, posterior, i).verdict for i, noun in enumerate(made.layout.job.gauges)}


def leading(posterior: Posterior) -> set[tuple[CauseKind, str]]:
    return {(kind, place.gauge or place.run or place.station) for kind, place in posterior.leading.keys}


def high_rise(*, shift_pa: dict[str, float] | None = None) -> Model:
    """Two zones of a tall building with a pressure-reducing valve between them: 60 m above it, 35 m below it at rest."""
    places = ("MAIN", "FLOOR2", "VALVE-IN", "VALVE-OUT", "FLOOR9", "FLOOR14")
    heights = (0.0, 6.0, 8.0, 8.0, 14.0, 20.0)
    stations = [station(n, z, is_open=n in ("MAIN", "FLOOR14")) for n, z in zip(places, heights, strict=True)]
    names = ("A", "B", "PRV", "C", "D")
    runs = [
        run(
            name,
            places[i],
            places[i + 1],
            **({"loss": LossKind.FREE, "item": "pressure-reducing valve"} if name == "PRV" else {}),
            **({"flow_column": "FT"} if name == "A" else {}),
        )
        for i, name in enumerate(names)
    ]
    gauges = [gauge(f"PT-{i}", name, names[max(i - 1, 0)]) for i, name in enumerate(places)]
    made = job(stations, runs, gauges)
    spells = [spell(made, 1, dict(zip(places, (60.0, 60.0, 60.0, 35.0, 35.0, 35.0), strict=True)), shift_pa=shift_pa)]
    for number, (flow, behind) in enumerate(((FLOW, 33.0), (0.6 * FLOW, 34.0)), start=2):
        lost = loss_m(flow)
        heads = (60.0, 60.0 - lost, 60.0 - 2 * lost, behind, behind - lost, behind - 2 * lost)
        flows = dict.fromkeys(names, flow)
        spells.append(spell(made, number, dict(zip(places, heads, strict=True)), flows, shift_pa=shift_pa))
    return model(made, spells)


def test_reducing_valve_of_unknown_drop_is_no_finding_at_rest_or_flowing():
    made = high_rise()
    posterior = search(made)
    assert posterior.clean_probability > 0.5
    assert set(verdicts(made, posterior).values()) == {Verdict.PASS}


def test_gauge_behind_a_reducing_valve_is_still_found():
    """Three gauges share the lower zone's head: the one that reads 0.3 bar high stands alone."""
    made = high_rise(shift_pa={"PT-4": 30_000.0})
    posterior = search(made)
    assert verdicts(made, posterior)["PT-4"] is Verdict.FAIL
    assert {kind for kind, _ in leading(posterior)} <= {CauseKind.ZERO_SHIFT, CauseKind.WRONG_ELEVATION}
    assert {place for _, place in leading(posterior)} == {"PT-4"}


def pumped_main(*, curve: bool, item: str = "check valve") -> Model:
    """A well at 4 m, a pump that lifts 50 m, a check valve, a main to a tank at 40 m; at rest the valve holds the main's head."""
    places = ("WELL", "PUMP-OUT", "MAIN", "HILL", "TANK")
    heights = (0.0, 0.5, 1.0, 20.0, 36.0)
    stations = [station(n, z, is_open=n in ("WELL", "TANK")) for n, z in zip(places, heights, strict=True)]
    lift = PumpCurve(flow_m3_s=(0.0, 0.02), head_m=(55.0, 40.0)) if curve else None
    runs = [
        run("PUMP", "WELL", "PUMP-OUT", item="pump", pump=lift, fittings_k=0.0),
        run("CHECK", "PUMP-OUT", "MAIN", item=item, fittings_k=2.0),
        run("RISE", "MAIN", "HILL", flow_column="FT"),
        run("CREST", "HILL", "TANK"),
    ]
    names = [r.name for r in runs]
    gauges = [gauge(f"PT-{i}", name, names[max(i - 1, 0)]) for i, name in enumerate(places)]
    made = job(stations, runs, gauges)
    # at rest the well stands at 4 m, the main at the tank's 40 m
    spells = [spell(made, 1, dict(zip(places, (4.0, 4.0, 40.0, 40.0, 40.0), strict=True)))]
    for number, flow in enumerate((FLOW, 0.7 * FLOW), start=2):
        lost, valve = loss_m(flow), loss_m(flow, k=2.0)
        added = 55.0 - 750.0 * flow
        heads = (4.0, 4.0 + added, 4.0 + added - valve, 4.0 + added - valve - lost, 4.0 + added - valve - 2 * lost)
        spells.append(
            spell(made, number, dict(zip(places, heads, strict=True)), dict.fromkeys(names, flow), speeds={"PUMP": 1.0})
        )
    return model(made, spells)


@pytest.mark.parametrize("curve", [True, False])
def test_pumped_main_behind_a_check_valve_at_rest_is_sound(curve: bool):
    made = pumped_main(curve=curve)
    posterior = search(made)
    assert posterior.clean_probability > 0.5
    found = verdicts(made, posterior)
    assert set(found.values()) <= {Verdict.PASS, Verdict.UNCHECKED}
    assert all(found[tag] is Verdict.PASS for tag in ("PT-2", "PT-3", "PT-4"))


def test_pumped_main_without_its_check_valve_described_raises_an_alarm():
    """The same readings, with nothing in the drawing that could hold the main's head at rest, are no sound job."""
    made = pumped_main(curve=True, item="")
    assert search(made).clean_probability < 0.01


def test_check_valve_that_would_have_to_hold_the_wrong_way_costs_an_explanation():
    """The head on the valve's inlet side cannot be the higher one at rest."""
    made = pumped_main(curve=True)
    turned = [replace(s, reading_pa=s.reading_pa.copy()) for s in made.spells]
    turned[0].reading_pa[:2] += 40.0 * 1000.0 * GRAVITY  # 4 m becomes 44 m, above the main's 40 m
    sound, wrong = search(made), search(Model(made.layout, turned))
    assert sound.clean_probability > 0.5
    assert wrong.clean_probability < 0.05


def test_warm_riser_and_cool_return_weigh_what_they_weigh():
    """A supply at 70 °C and a return at 20 °C, 40 m high, joined below: water of 977.77 and 998.21 kg/m³ (IAPWS-95).

    With one head E at the foot, in metres of the return's water, the top of the supply stands (1 - 977.77/998.21) 40 m = 0.82 m higher
    than the return's own, 8.0 kPa: nearly the tolerance. The readings are those of hydrostatics in each column.
    """
    warm, cool = 977.765, 998.207
    stations = [station("FOOT", 0.0), station("SUPPLY-TOP", 40.0), station("RETURN-TOP", 40.0)]
    runs = [
        run("SUPPLY", "FOOT", "SUPPLY-TOP", temperature_k=343.15, length_m=40.0),
        run("RETURN", "RETURN-TOP", "FOOT", length_m=40.0),
    ]
    gauges = [
        gauge("PT-F", "FOOT", "RETURN"),
        gauge("PT-S", "SUPPLY-TOP", "SUPPLY"),
        gauge("PT-R", "RETURN-TOP", "RETURN"),
    ]
    liquid = LiquidSpec(kind=LiquidKind.WATER, temperature_k=293.15, temperature_sd_k=0.5)
    made = job(stations, runs, gauges, liquid=liquid)
    foot = 600_000.0
    readings = np.array([foot, foot - warm * GRAVITY * 40.0, foot - cool * GRAVITY * 40.0])
    heads = dict.fromkeys(("FOOT", "SUPPLY-TOP", "RETURN-TOP"), 0.0)
    own = np.array([343.15, np.nan])
    still = spell(made, 1, heads, reading_pa=readings, run_temperature_k=own)
    right = model(made, [still])
    state = search(right, kinds=()).leading.frame.linear.states[0]
    assert float(state.reading_pa[1] - state.reading_pa[2]) == pytest.approx((cool - warm) * GRAVITY * 40.0, abs=5.0)
    assert judge_gauge(right, search(right), 1).error_pa == pytest.approx(0.0, abs=1_500.0)
    alike = model(made, [replace(still, run_temperature_k=None)])
    assert abs(judge_gauge(alike, search(alike), 1).error_pa) > 4_000.0


def test_closed_loop_of_unequal_columns_is_said_to_circulate():
    """Warm up, cool down, joined above and below: (998.21 - 977.77) g 40 m = 8.0 kPa drives it round."""
    stations = [station("FOOT", 0.0), station("TOP", 40.0)]
    runs = [run("UP", "FOOT", "TOP", temperature_k=343.15), run("DOWN", "TOP", "FOOT")]
    liquid = LiquidSpec(kind=LiquidKind.WATER, temperature_k=293.15, temperature_sd_k=0.5)
    made = job(stations, runs, [gauge("PT-F", "FOOT", "DOWN"), gauge("PT-T", "TOP", "UP")], liquid=liquid)
    still = spell(made, 1, {"FOOT": 50.0, "TOP": 50.0}, run_temperature_k=np.array([343.15, np.nan]))
    (said,) = circulations(model(made, [still]))
    assert said.startswith("UP, DOWN: their columns differ by 8 kPa round the loop")
    assert circulations(model(made, [replace(still, run_temperature_k=None)])) == ()


def siphon_line(pocket_m: float = 0.0, crest_m: float = 30.0, head_m: float = 45.0) -> Model:
    """One run of 400 m that climbs to a crest at 150 m and falls again, as levels give it; stations at 2 m and 4 m."""
    stations = [station(n, z, is_open=n in "AD") for n, z in (("A", 0.0), ("B", 2.0), ("C", 4.0), ("D", 5.0))]
    runs = [
        run("R1", "A", "B", flow_column="FT"),
        run("R2", "B", "C", length_m=400.0, hazen_williams_c=1e9),
        run("R3", "C", "D"),
    ]
    levels = (
        LevelPoint(run="R2", distance_m=150.0, elevation_m=crest_m),
        LevelPoint(run="R2", distance_m=250.0, elevation_m=12.0),
        LevelPoint(run="R2", distance_m=300.0, elevation_m=15.0),
    )
    gauges = [gauge(f"PT-{n}", n, r) for n, r in (("A", "R1"), ("B", "R1"), ("C", "R2"), ("D", "R3"))]
    made = job(stations, runs, gauges, levels=levels)
    spells = [spell(made, 1, dict.fromkeys("ABCD", head_m))]
    for number, flow in enumerate((FLOW, 0.6 * FLOW, 0.8 * FLOW), start=2):
        lost = loss_m(flow)
        heads = {"A": head_m, "B": head_m - lost, "C": head_m - 2 * lost - pocket_m, "D": head_m - 3 * lost - pocket_m}
        spells.append(spell(made, number, heads, dict.fromkeys(("R1", "R2", "R3"), flow)))
    return model(made, spells)


def test_pocket_is_sought_at_the_high_points_that_levels_give():
    """From B to C the pipe rises in all: no descent to trap air on without levels; with them there are two, of 18 and 11 m."""
    found = [f for f in list_findings(search(siphon_line(pocket_m=4.0))) if f.kind is CauseKind.AIR_POCKET]
    assert {f.place for f in found} == {Place(run="R2", distance_m=150.0), Place(run="R2", distance_m=300.0)}
    assert sum(f.probability for f in found) > 0.9
    assert found[0].rivals[0].place == found[1].place
    assert found[0].mark.reported(found[0].size) == pytest.approx(4.0, abs=0.4)
    bare = siphon_line(pocket_m=4.0)
    bare = Model(type(bare.layout)(replace(bare.layout.job, levels=())), bare.spells)
    assert not any(f.kind is CauseKind.AIR_POCKET and f.place.run == "R2" for f in list_findings(search(bare)))


def test_pocket_higher_than_a_descent_is_on_the_other():
    """14 m of gas find room on the descent of 18 m alone."""
    (found,) = [f for f in list_findings(search(siphon_line(pocket_m=14.0))) if f.kind is CauseKind.AIR_POCKET]
    assert found.place == Place(run="R2", distance_m=150.0)
    assert found.probability > 0.9


def test_crest_below_vapour_pressure_is_found_where_levels_give_it():
    """A head of 20 m under a crest at 30 m: 101.3 - 98.1 = 3.3 kPa absolute at rest; with 1.2 m lost on the way it is below 2.3 kPa."""
    made = siphon_line(crest_m=30.0, head_m=20.0)
    (found,) = vapour_findings(made, search(made))
    assert found.place == Place(run="R2", distance_m=150.0)
    assert found.probability > 0.9
    assert "below the liquid's vapour pressure" in found.statement
    high = siphon_line(crest_m=30.0, head_m=45.0)
    assert vapour_findings(high, search(high)) == ()


def test_valve_whose_state_is_not_logged_parts_the_heads():
    stations = [station(n, z, is_open=n in "AD") for n, z in (("A", 0.0), ("B", 1.0), ("C", 1.0), ("D", 3.0))]
    runs = [
        run("R1", "A", "B", flow_column="FT"),
        run("V", "B", "C", state=RunState.COLUMN, state_column="ZS"),
        run("R3", "C", "D"),
    ]
    gauges = [gauge(f"PT-{n}", n, r) for n, r in (("A", "R1"), ("B", "R1"), ("C", "R3"), ("D", "R3"))]
    made = job(stations, runs, gauges)
    unsure = spell(made, 1, {"A": 40.0, "B": 40.0, "C": 22.0, "D": 22.0}, is_unsure=(False, True, False))
    found = model(made, [unsure])
    assert spell_graph(found.layout, unsure).parts == 2
    posterior = search(found)
    assert posterior.clean_probability > 0.4
    known = model(made, [replace(unsure, is_unsure=())])
    assert search(known).clean_probability < 0.01


def test_gauge_whose_flow_nothing_determines_is_unchecked_and_says_why():
    """A branch with no meter, no surface and one gauge at its end: neither its loss nor its flow is known."""
    stations = [
        station(n, z, is_open=n in ("A", "D", "E")) for n, z in (("A", 0.0), ("B", 1.0), ("D", 3.0), ("E", 2.0))
    ]
    runs = [run("R1", "A", "B"), run("R2", "B", "D"), run("BR", "B", "E", fittings_k=200.0)]
    gauges = [gauge("PT-A", "A", "R1"), gauge("PT-B", "B", "R1"), gauge("PT-E", "E", "BR")]
    made = job(stations, runs, gauges)
    flows = {"R1": FLOW, "R2": 0.7 * FLOW, "BR": 0.3 * FLOW}
    heads = {"A": 40.0, "B": 40.0 - loss_m(FLOW), "D": 36.0, "E": 40.0 - loss_m(FLOW) - loss_m(0.3 * FLOW, k=200.0)}
    found = model(made, [spell(made, 1, heads, flows)])
    posterior = search(found)
    judged = judge_gauge(found, posterior, 2)
    assert judged.verdict is Verdict.UNCHECKED
    sentence = verdict_sentence(made.gauges[2], judged, [], [])
    assert sentence.startswith(
        "PT-E: nothing else in the data determines the pressure at this gauge, since the flow in "
    )
    assert "BR" in sentence
    assert "is not determined" in sentence


def test_dead_leg_has_the_head_of_its_branch_at_every_flow():
    """A branch that ends closed carries nothing: its gauge reads the head where it leaves, and is checked."""
    stations = [station(n, z, is_open=n in ("A", "C")) for n, z in (("A", 0.0), ("B", 1.0), ("C", 3.0), ("END", 8.0))]
    runs = [run("R1", "A", "B", flow_column="FT"), run("R2", "B", "C"), run("LEG", "B", "END", fittings_k=50.0)]
    gauges = [gauge(f"PT-{n}", n, r) for n, r in (("A", "R1"), ("B", "R1"), ("C", "R2"), ("END", "LEG"))]
    made = job(stations, runs, gauges)
    spells = []
    for number, flow in enumerate((FLOW, 0.6 * FLOW), start=1):
        lost = loss_m(flow)
        heads = {"A": 40.0, "B": 40.0 - lost, "C": 40.0 - 2 * lost, "END": 40.0 - lost}
        spells.append(spell(made, number, heads, {"R1": flow, "R2": flow, "LEG": 0.0}))
    found = model(made, spells)
    posterior = search(found)
    assert posterior.leading.frame.linear.states[0].flow_m3_s[2] == 0.0
    assert set(verdicts(found, posterior).values()) == {Verdict.PASS}


def test_parallel_runs_share_a_metered_flow_by_their_losses():
    """K = 10 and K = 40 side by side: flows 2 to 1 by hand, so 8 and 4 L/s of 12."""
    stations = [station(n, z, is_open=n in "AC") for n, z in (("A", 0.0), ("B", 1.0), ("C", 2.0), ("Z", 2.0))]
    stations = [s for s in stations if s.name != "Z"]
    runs = [
        run("IN", "A", "B", flow_column="FT"),
        run("LEFT", "B", "C", fittings_k=10.0),
        run("RIGHT", "B", "C", fittings_k=40.0),
    ]
    gauges = [gauge("PT-A", "A", "IN"), gauge("PT-B", "B", "IN"), gauge("PT-C", "C", "LEFT")]
    made = job(stations, runs, gauges)
    heads = {"A": 40.0, "B": 40.0 - loss_m(FLOW), "C": 40.0 - loss_m(FLOW) - loss_m(2 * FLOW / 3)}
    found = model(made, [spell(made, 1, heads, {"IN": FLOW, "LEFT": 2 * FLOW / 3, "RIGHT": FLOW / 3})])
    posterior = search(found)
    flows = posterior.leading.frame.linear.states[0].flow_m3_s
    assert flows == pytest.approx([FLOW, 2 * FLOW / 3, FLOW / 3], rel=0.03)
    assert set(verdicts(found, posterior).values()) == {Verdict.PASS}


@pytest.mark.parametrize("metered", [True, False])
def test_closed_circuit_with_a_pump_is_sound_with_and_without_a_meter(metered: bool):
    """Lift 20 - 40 000 Q² against two losses of K = 10 and one of K = 20 round the circuit; no liquid enters or leaves.

    Without a meter the flow follows from where curve and losses meet, by hand: with h = K Q² / (2 g A²), A the bore's area.
    """
    per_k = loss_m(1.0, k=1.0)
    flow = float(np.sqrt(20.0 / (40_000.0 + 40.0 * per_k)))
    stations = [station(n, z) for n, z in (("A", 0.0), ("B", 1.0), ("C", 12.0), ("D", 6.0))]
    curve = PumpCurve(flow_m3_s=(0.0, 0.01, 0.02), head_m=(20.0, 16.0, 4.0))
    runs = [
        run("PUMP", "A", "B", pump=curve, fittings_k=0.0, **({"flow_column": "FT"} if metered else {})),
        run("UP", "B", "C"),
        run("EMITTER", "C", "D", fittings_k=20.0),
        run("BACK", "D", "A"),
    ]
    gauges = [gauge(f"PT-{n}", n, r) for n, r in (("A", "BACK"), ("B", "PUMP"), ("C", "UP"), ("D", "EMITTER"))]
    made = job(stations, runs, gauges)
    lost = loss_m(flow)
    lift = 20.0 - 40_000.0 * flow**2
    heads = {"A": 30.0, "B": 30.0 + lift, "C": 30.0 + lift - lost, "D": 30.0 + lift - 3 * lost}
    assert heads["D"] - lost == pytest.approx(30.0, abs=1e-9)
    flows = dict.fromkeys([r.name for r in runs], flow)
    spells = [spell(made, 1, dict.fromkeys("ABCD", 32.0)), spell(made, 2, heads, flows, speeds={"PUMP": 1.0})]
    found = model(made, spells)
    posterior = search(found)
    assert posterior.leading.frame.linear.states[1].flow_m3_s == pytest.approx([flow] * 4, rel=0.03)
    assert set(verdicts(found, posterior).values()) == {Verdict.PASS}
    assert posterior.clean_probability > 0.5


def test_two_systems_in_one_job_do_not_disturb_each_other():
    """Separate parts: a gauge 0.4 bar high in one, nothing amiss in the other."""
    names = ("A", "B", "C", "P", "Q", "R")
    stations = [station(n, float(i), is_open=n in "ACPR") for i, n in enumerate(names)]
    runs = [
        run("R1", "A", "B", flow_column="FT1"), run("R2", "B", "C"), run("R3", "P", "Q", flow_column="FT2"), run("R4", "Q", "R"),
    ]  # fmt: skip
    gauges = [gauge(f"PT-{n}", n, r) for n, r in zip(names, ("R1", "R1", "R2", "R3", "R3", "R4"), strict=True)]
    made = job(stations, runs, gauges)
    spells = []
    for number, (one, two) in enumerate(((0.0, 0.0), (FLOW, 0.5 * FLOW), (0.7 * FLOW, FLOW)), start=1):
        heads = {"A": 40.0, "B": 40.0 - loss_m(one), "C": 40.0 - 2 * loss_m(one)}
        heads |= {"P": 55.0, "Q": 55.0 - loss_m(two), "R": 55.0 - 2 * loss_m(two)}
        flows = {"R1": one, "R2": one, "R3": two, "R4": two} if one else None
        spells.append(spell(made, number, heads, flows, shift_pa={"PT-Q": 40_000.0}))
    found = model(made, spells)
    posterior = search(found)
    judged = verdicts(found, posterior)
    assert judged.pop("PT-Q") is Verdict.FAIL
    assert set(judged.values()) == {Verdict.PASS}
