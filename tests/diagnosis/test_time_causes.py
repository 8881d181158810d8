"""Causes that act in time or change the model itself: readings made with each by hand, and found again among all kinds."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from headledger.diagnosis.estimate import Model
from headledger.diagnosis.findings import Finding, list_findings
from headledger.diagnosis.means import SpellMeans
from headledger.diagnosis.result import CauseKind, Verdict
from headledger.diagnosis.search import Posterior, search
from headledger.diagnosis.verdicts import judge_gauge
from headledger.plant.gauges import Gauge
from headledger.plant.job import SpellKind
from headledger.plant.runs import PumpCurve

from .made_systems import DENSITY, GRAVITY, gauge, job, loss_m, run, spell, station
from .made_systems import model as made_model

FLOW = 0.012
PLACES = "ABCDE"
HEIGHTS = (0.0, 3.0, 8.0, 5.0, 2.0)
PIECES = 4


def line(**more) -> tuple[Model, list[SpellMeans]]:
    """Five stations in a row, a meter, three spells of four pieces of 225 s each: at rest and at two flows."""
    stations = [station(n, z, is_open=n in "AE") for n, z in zip(PLACES, HEIGHTS, strict=True)]
    runs = [run(f"R{i + 1}", PLACES[i], PLACES[i + 1], **({"flow_column": "FT"} if i == 0 else {})) for i in range(4)]
    gauges = [gauge(f"PT-{n}", n, f"R{max(i, 1)}", **more) for i, n in enumerate(PLACES)]
    made = job(stations, runs, gauges)
    spells = []
    for number, flow in enumerate((0.0, FLOW, 0.7 * FLOW), start=1):
        lost = loss_m(flow)
        heads = {n: 45.0 + number - k * lost for k, n in enumerate(PLACES)}
        flows = dict.fromkeys((r.name for r in runs), flow) if flow else None
        whole = spell(made, number, heads, flows)
        for piece in range(PIECES):
            start_s = whole.start_s + 225.0 * piece
            spells.append(replace(whole, start_s=start_s, end_s=start_s + 225.0, reading_pa=whole.reading_pa.copy()))
    return made_model(made, spells), spells


def found(model: Model, spells: list[SpellMeans]) -> tuple[Model, Posterior, tuple[Finding, ...]]:
    """Judged readings."""
    made = Model(model.layout, spells)
    posterior = search(made)
    return made, posterior, list_findings(posterior)


def test_line_of_pieces_without_trouble_is_sound():
    made, posterior, _ = found(*line())
    assert posterior.clean_probability > 0.5
    assert {judge_gauge(made, posterior, g).verdict for g in range(5)} == {Verdict.PASS}


def test_drift_is_found_with_its_rate_and_beginning():
    """PT-C wanders up by 0.3 bar an hour from the second spell's start, at 2000 s, on; the log ends at 3900 s, 0.16 bar higher."""
    model, spells = line()
    for one in spells:
        since = [max(t - 2000.0, 0.0) for t in (one.start_s, one.end_s)]
        one.reading_pa[2] += 30_000.0 / 3600.0 * (since[1] ** 2 - since[0] ** 2) / (2.0 * (one.end_s - one.start_s))
    made, posterior, findings = found(model, spells)
    assert findings[0].kind is CauseKind.DRIFT
    assert findings[0].place.gauge == "PT-C"
    assert findings[0].size == pytest.approx(30_000.0 / 3600.0, rel=0.1)
    assert findings[0].mark.start_s == pytest.approx(2000.0, abs=300.0)
    begin_s = findings[0].mark.start_s
    assert begin_s is not None
    assert abs(begin_s - 2000.0) < 2.0 * findings[0].start_sd_s
    assert judge_gauge(made, posterior, 2).verdict is Verdict.FAIL
    assert judge_gauge(made, posterior, 1).verdict is Verdict.PASS


def test_step_is_found_where_it_happens():
    """PT-D reads 0.15 bar high from 2450 s on, the middle of the second spell."""
    model, spells = line()
    for one in spells:
        one.reading_pa[3] += 15_000.0 if one.start_s >= 2450.0 else 0.0
    _, _, findings = found(model, spells)
    assert findings[0].kind is CauseKind.STEP
    assert findings[0].place.gauge == "PT-D"
    assert findings[0].size == pytest.approx(15_000.0, abs=1_500.0)
    assert findings[0].mark.start_s == 2450.0
    # one moment between two pieces of 225 s is sure, and within a piece nothing is known: 225 / √12
    assert findings[0].start_sd_s == pytest.approx(225.0 / 12.0**0.5, rel=0.02)


def test_frozen_gauge_is_found_and_fails_though_its_class_is_narrow():
    """PT-B keeps its reading of the first spell, from 1225 s on, while its station moves by more than a metre."""
    model, spells = line()
    stuck = float(spells[1].reading_pa[1])
    for one in spells:
        if one.start_s >= 1225.0:
            one.reading_pa[1] = stuck
    made, posterior, findings = found(model, spells)
    assert findings[0].kind is CauseKind.FROZEN
    assert findings[0].place.gauge == "PT-B"
    assert findings[0].accepted
    assert judge_gauge(made, posterior, 1).verdict is Verdict.FAIL
    assert {judge_gauge(made, posterior, g).verdict for g in (0, 2, 3, 4)} == {Verdict.PASS}


def test_gauge_at_the_end_of_its_range_is_no_liar_about_the_rest():
    """PT-A would read above its 5.6 bar; it stands at 5.6, and the other four agree with one another."""
    model, spells = line()
    gauges = (replace(model.layout.job.gauges[0], range_high_pa=560_000.0), *model.layout.job.gauges[1:])
    model = Model(type(model.layout)(replace(model.layout.job, gauges=gauges)), spells)
    assert min(one.reading_pa[0] for one in spells) < 560_000.0 < max(one.reading_pa[0] for one in spells) + 1e6
    for one in spells:
        one.reading_pa[0] = min(float(one.reading_pa[0]), 560_000.0)
    assert sum(one.reading_pa[0] == 560_000.0 for one in spells) >= 4
    made, posterior, findings = found(model, spells)
    assert (findings[0].kind, findings[0].place.gauge) == (CauseKind.AT_LIMIT, "PT-A")
    assert {judge_gauge(made, posterior, g).verdict for g in (1, 2, 3, 4)} == {Verdict.PASS}


def test_shut_valve_is_found_behind_which_a_section_keeps_its_head():
    """R3 shut, everything at rest: A to C stand at 45, 49 and 53 m, D and E stay at 46 m throughout."""
    model, spells = line()
    still = []
    for one in spells:
        heads = np.array([41.0 + 4.0 * one.id] * 3 + [46.0] * 2)
        readings = DENSITY * GRAVITY * (heads - np.array(HEIGHTS)) + 101_325.0
        still.append(replace(one, kind=SpellKind.STILL, reading_pa=readings, flow_m3_s=np.full(4, np.nan)))
    made, posterior, findings = found(model, still)
    assert (findings[0].kind, findings[0].place.run) == (CauseKind.CLOSED_OFF, "R3")
    assert findings[0].accepted
    assert {judge_gauge(made, posterior, g).verdict for g in range(5)} == {Verdict.PASS}


def test_two_causes_of_which_one_spoils_a_gauge_are_found_together():
    """A gauge that is stuck and a run that loses 2 m more at full flow."""
    model, spells = line()
    stuck = float(spells[0].reading_pa[1])
    for one in spells:
        more = 0.0 if one.is_still else 2.0 * (one.flow_m3_s[0] / FLOW) ** 2
        one.reading_pa[3:] -= DENSITY * GRAVITY * more
        one.reading_pa[1] = stuck
    _, _, findings = found(model, spells)
    likely = {(f.kind, f.place.gauge or f.place.run) for f in findings if f.probability > 0.8}
    assert (CauseKind.FROZEN, "PT-B") in likely
    assert (CauseKind.BLOCKAGE, "R3") in likely


def differential(**more) -> tuple[Model, list[SpellMeans]]:
    """The line with a differential gauge across R2 besides: what it should read is the loss of R2, with the column between its taps."""
    model, spells = line()
    made = model.layout.job
    dp: Gauge = replace(
        made.gauges[1],
        tag="DP-1",
        column="DP-1",
        low_station="C",
        range_low_pa=-100_000.0,
        range_high_pa=100_000.0,
        **more,
    )
    changed = []
    for one in spells:
        flow = 0.0 if one.is_still else float(one.flow_m3_s[0])
        reading = DENSITY * GRAVITY * loss_m(flow)
        changed.append(
            replace(one, reading_pa=np.append(one.reading_pa, reading), noise_pa=np.append(one.noise_pa, 100.0))
        )
    job_with = replace(made, gauges=(*made.gauges, dp))
    return Model(type(model.layout)(job_with), changed), changed


def test_differential_gauge_in_order_is_sound():
    made, posterior, _ = found(*differential())
    assert posterior.clean_probability > 0.5
    assert judge_gauge(made, posterior, 5).verdict is Verdict.PASS


def test_crossed_lines_are_found():
    model, spells = differential()
    for one in spells:
        one.reading_pa[5] = -one.reading_pa[5]
    _, _, findings = found(model, spells)
    assert (findings[0].kind, findings[0].place.gauge) == (CauseKind.CROSSED_LINES, "DP-1")


def test_open_equalising_valve_is_found():
    model, spells = differential()
    for one in spells:
        one.reading_pa[5] = 0.0
    made, posterior, findings = found(model, spells)
    assert (findings[0].kind, findings[0].place.gauge) == (CauseKind.EQUALISED, "DP-1")
    assert judge_gauge(made, posterior, 5).verdict is Verdict.FAIL


def test_square_root_too_many_is_found():
    """A range of 0 to 60 kPa: a difference of 11.7 kPa, 0.195 of span, is logged as √0.195 = 0.44 of span."""
    model, spells = differential()
    gauges = list(model.layout.job.gauges)
    gauges[5] = replace(gauges[5], range_low_pa=0.0, range_high_pa=60_000.0)
    model = Model(type(model.layout)(replace(model.layout.job, gauges=tuple(gauges))), spells)
    for one in spells:
        one.reading_pa[5] = 60_000.0 * np.sqrt(max(one.reading_pa[5], 0.0) / 60_000.0)
    _, _, findings = found(model, spells)
    assert (findings[0].kind, findings[0].place.gauge) == (CauseKind.ROOT, "DP-1")


def test_pump_that_lifts_less_than_its_curve_is_found():
    """Lift 55 - 750 Q by the curve, 0.85 of that in truth; at rest it adds nothing."""
    places = ("WELL", "OUT", "MAIN", "TOP")
    stations = [station(n, z, is_open=n in ("WELL", "TOP")) for n, z in zip(places, (0.0, 1.0, 3.0, 10.0), strict=True)]
    curve = PumpCurve(flow_m3_s=(0.0, 0.02), head_m=(55.0, 40.0))
    runs = [
        run("PUMP", "WELL", "OUT", item="pump", pump=curve, fittings_k=0.0),
        run("R2", "OUT", "MAIN", flow_column="FT"),
        run("R3", "MAIN", "TOP"),
    ]
    gauges = [gauge(f"PT-{n}", n, r) for n, r in zip(places, ("PUMP", "PUMP", "R2", "R3"), strict=True)]
    made = job(stations, runs, gauges)
    spells = [spell(made, 1, dict.fromkeys(places, 12.0))]
    for number, flow in enumerate((FLOW, 0.6 * FLOW), start=2):
        lift, lost = 0.85 * (55.0 - 750.0 * flow), loss_m(flow)
        heads = dict(zip(places, (10.0, 10.0 + lift, 10.0 + lift - lost, 10.0 + lift - 2 * lost), strict=True))
        spells.append(spell(made, number, heads, dict.fromkeys(("PUMP", "R2", "R3"), flow), speeds={"PUMP": 1.0}))
    _, _, findings = found(made_model(made, spells), spells)
    assert (findings[0].kind, findings[0].place.run) == (CauseKind.PUMP_LIFT, "PUMP")
    assert findings[0].mark.reported(findings[0].size) == pytest.approx(0.85, abs=0.03)
