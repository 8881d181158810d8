"""Decision rules, and what a verdict may lean on."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from headledger.diagnosis.estimate import Model
from headledger.diagnosis.layout import Layout
from headledger.diagnosis.own_error import expected_readings
from headledger.diagnosis.result import Verdict
from headledger.diagnosis.search import search
from headledger.diagnosis.verdicts import decide, judge_gauge
from headledger.plant.job import CheckSettings, DecisionRule
from headledger.plant.runs import RunState

from .worked_job import REFERENCE, worked_model

GUARDED = CheckSettings(decision=DecisionRule.GUARDED, confidence_fraction=0.95)
SIMPLE = CheckSettings(decision=DecisionRule.SIMPLE)


@pytest.mark.parametrize(
    ("outside", "verdict"),
    [
        (0.0, Verdict.PASS),
        (0.05, Verdict.PASS),
        (0.06, Verdict.UNRESOLVED),
        (0.94, Verdict.UNRESOLVED),
        (0.95, Verdict.FAIL),
    ],
)
def test_decide_guarded_uses_the_confidence_on_both_sides(outside: float, verdict: Verdict) -> None:
    assert decide(outside, unchecked=False, settings=GUARDED) is verdict


@pytest.mark.parametrize(("outside", "verdict"), [(0.49, Verdict.PASS), (0.51, Verdict.FAIL)])
def test_decide_simple_takes_the_more_probable_side(outside: float, verdict: Verdict) -> None:
    assert decide(outside, unchecked=False, settings=SIMPLE) is verdict


def test_decide_unchecked_outranks_pass_but_not_fail() -> None:
    assert decide(0.0, unchecked=True, settings=GUARDED) is Verdict.UNCHECKED
    assert decide(0.99, unchecked=True, settings=GUARDED) is Verdict.FAIL


def test_expected_readings_hold_the_reading_of_a_sound_gauge() -> None:
    """The prediction from everything else is within its own doubt of what the sound job's gauges read, spell by spell."""
    model = worked_model(REFERENCE["sound"]["readings_kpa"])
    posterior = search(model)
    for gauge in range(4):
        expected = expected_readings(model, posterior.leading, gauge)
        readings = np.array([spell.reading_pa[gauge] for spell in model.spells])
        slack = 3.0 * np.hypot(expected.sd_pa, 3e3 / np.sqrt(3.0))
        assert np.all(np.abs(readings - expected.value_pa) < slack)


def test_judge_gauge_alone_behind_a_shut_valve_is_unchecked() -> None:
    """With R3 shut, nothing but PT-D itself says what the head at D is; it stays where it was when the valve was shut."""
    readings = [[*row[:3], 411.0 + 0.02 * spell] for spell, row in enumerate(REFERENCE["sound"]["readings_kpa"])]
    model = worked_model(readings)
    job = model.layout.job
    runs = tuple(replace(run, state=RunState.CLOSED) if run.name == "R3" else run for run in job.runs)
    stations = tuple(
        replace(s, exchange=type(s.exchange).OPEN if s.name in "AC" else type(s.exchange).CLOSED) for s in job.stations
    )
    spells = [replace(spell, is_open=(True, True, False)) for spell in model.spells]
    shut = Model(Layout(replace(job, runs=runs, stations=stations)), spells)
    posterior = search(shut)
    assert judge_gauge(shut, posterior, 3).verdict is Verdict.UNCHECKED
    assert judge_gauge(shut, posterior, 1).verdict is Verdict.PASS


def test_judge_gauge_without_any_reading_is_unchecked() -> None:
    readings = [list(row) for row in REFERENCE["sound"]["readings_kpa"]]
    for row in readings:
        row[2] = float("nan")
    model = worked_model(readings)
    judged = judge_gauge(model, search(model), 2)
    assert judged.verdict is Verdict.UNCHECKED
    assert np.isnan(judged.outside_probability)


def test_flow_sd_of_a_metered_line_is_its_meters_at_most() -> None:
    """±2 % (k = 2) of 36 m³/h: 1 % standard; the losses, known to 7.5 %, cannot narrow it much and never widen it."""
    model = worked_model(REFERENCE["sound"]["readings_kpa"])
    linear = search(model).leading.frame.linear
    sd = model.flow_sd_m3_s(linear, 1)
    assert np.all(sd <= 0.01 * 0.0100001)
    assert np.all(sd > 0.008 * 0.01)
    assert np.all(model.flow_sd_m3_s(linear, 0) == 0.0)


def test_search_without_a_meter_finds_the_flow_from_the_losses() -> None:
    """The sound line with its meter taken away: 36 m³/h comes from the drops, within what ±15 % on every loss leaves."""
    model = worked_model(REFERENCE["sound"]["readings_kpa"])
    blind = Model(model.layout, [replace(s, flow_m3_s=np.full(3, np.nan)) for s in model.spells])
    posterior = search(blind)
    linear = posterior.leading.frame.linear
    flow, sd = float(linear.states[1].flow_m3_s[0]), float(blind.flow_sd_m3_s(linear, 1)[0])
    assert flow == pytest.approx(0.01, abs=3.0 * sd)
    assert 0.005 * 0.01 < sd < 0.06 * 0.01
    assert {judge_gauge(blind, posterior, g).verdict for g in range(4)} == {Verdict.PASS}
