"""What to do next: what settles most per minute, and what its result does to the judgement."""

from __future__ import annotations

import numpy as np
import pytest
from scipy.special import ndtr

from headledger.diagnosis.answers import Answer, answered
from headledger.diagnosis.findings import list_findings
from headledger.diagnosis.more_spells import Foreseen, joint_bits
from headledger.diagnosis.next_checks import next_checks
from headledger.diagnosis.result import CauseKind, Place
from headledger.diagnosis.search import search
from headledger.diagnosis.site_actions import ACTIONS, Action, ActionKind, parse_answer
from headledger.errors import JobError

from .made_systems import gauge, job, loss_m, model, run, spell, station
from .worked_job import REFERENCE, worked_layout, worked_model

HIGH = "PT-C reads 14 kPa high"
BLOCKED = "R2 loses 18 kPa more at 36 m3/h"


def test_zero_shift_against_wrong_elevation_is_worth_a_bit_and_a_zero_check():
    """Two explanations of about even weight that a zero check tells apart for sure: one bit, by the definition of the bit."""
    model = worked_model(REFERENCE[HIGH]["readings_kpa"])
    posterior = search(model)
    checks = next_checks(model, posterior, list_findings(posterior))
    best = checks[0]
    assert (best.action, best.place) == ("zero-check", Place(gauge="PT-C"))
    assert best.gain_bits == pytest.approx(1.0, abs=0.15)
    assert ("wrong-elevation", "zero-shift") in {tuple(sorted(pair)) for pair in best.separates}
    assert "survey" in [check.action for check in checks]
    assert all(check.caution and check.says for check in checks)
    rates = [round(check.gain_bits / check.minutes, 3) for check in checks]
    assert rates == sorted(rates, reverse=True)


@pytest.mark.parametrize(("outcome_pa", "kind"), [(14_000.0, CauseKind.ZERO_SHIFT), (0.0, CauseKind.WRONG_ELEVATION)])
def test_result_of_a_zero_check_settles_it(outcome_pa: float, kind: CauseKind):
    model = worked_model(REFERENCE[HIGH]["readings_kpa"])
    posterior = search(model)
    action = Action(kind=ActionKind.ZERO_CHECK, place=Place(gauge="PT-C"))
    after = answered(model, posterior, [Answer(action=action, outcome=outcome_pa)])
    assert after.probability((kind, Place(gauge="PT-C"))) > 0.95
    assert sum(e.probability for e in after.explanations) == pytest.approx(1.0)


def test_survey_that_finds_the_elevation_wrong_settles_it_too():
    """14 kPa is a column of 14 000 / (1000 x 9.80665) = 1.43 m."""
    model = worked_model(REFERENCE[HIGH]["readings_kpa"])
    action = Action(kind=ActionKind.SURVEY, place=Place(gauge="PT-C"))
    after = answered(model, search(model), [Answer(action=action, outcome=1.43)])
    assert after.probability((CauseKind.WRONG_ELEVATION, Place(gauge="PT-C"))) > 0.95


def test_look_into_a_blocked_run_moves_the_odds_by_its_reliability():
    """A look that is right 19 times in 20 multiplies the odds by 19 or divides them by it."""
    model = worked_model(REFERENCE[BLOCKED]["readings_kpa"])
    posterior = search(model)
    place = Place(run="R2")
    before = posterior.probability((CauseKind.BLOCKAGE, place))
    action = Action(kind=ActionKind.STROKE_VALVE, place=place)
    after = answered(model, posterior, [Answer(action=action, outcome=0.0)])
    odds = before / (1.0 - before) / 19.0
    assert after.probability((CauseKind.BLOCKAGE, place)) == pytest.approx(odds / (1.0 + odds), rel=0.05)


def test_sound_job_calls_for_nothing():
    model = worked_model(REFERENCE["sound"]["readings_kpa"])
    posterior = search(model)
    assert next_checks(model, posterior, list_findings(posterior)) == ()


def test_every_action_has_its_minutes_and_caution():
    assert set(ACTIONS) == set(ActionKind)
    assert all(facts.minutes > 0 and facts.caution.endswith(".") for facts in ACTIONS.values())
    assert ACTIONS[ActionKind.SURVEY].risk < ACTIONS[ActionKind.OPEN_STRAINER].risk


@pytest.mark.parametrize(
    ("text", "kind", "place", "outcome"),
    [
        ("zero-check PT-C = 0.01 bar", ActionKind.ZERO_CHECK, Place(gauge="PT-C"), 1000.0),
        ("survey PT-C = -30 mm", ActionKind.SURVEY, Place(gauge="PT-C"), -0.03),
        ("open-strainer R2 = yes", ActionKind.OPEN_STRAINER, Place(run="R2"), 1.0),
        ("vent R1=no", ActionKind.VENT, Place(run="R1"), 0.0),
    ],
)
def test_parse_answer_reads_what_was_found(text: str, kind: ActionKind, place: Place, outcome: float):
    action, value = parse_answer(text, worked_layout().job)
    assert action == Action(kind=kind, place=place)
    assert value == pytest.approx(outcome)


@pytest.mark.parametrize(
    ("text", "says"),
    [
        ("zero-chek PT-C = 1 bar", "names no action, expected zero-check"),
        ("zero-check PT-X = 1 bar", "names no gauge of the job"),
        ("open-strainer R2 = perhaps", "must be answered with yes or no"),
        ("zero-check PT-C = 3", "answer"),
        ("nothing", "is no answer"),
    ],
)
def test_parse_answer_refuses_what_it_cannot_read_and_says_what_would_be_right(text: str, says: str):
    with pytest.raises(JobError, match=says):
        parse_answer(text, worked_layout().job)


def test_information_never_exceeds_that_of_the_explanations():
    """What an action can settle is at most the entropy of what is open."""
    for name in (HIGH, BLOCKED):
        model = worked_model(REFERENCE[name]["readings_kpa"])
        posterior = search(model)
        share = np.array([e.probability for e in posterior.explanations if e.probability > 0.0])
        entropy = float(-(share * np.log2(share)).sum())
        for check in next_checks(model, posterior, list_findings(posterior)):
            assert -1e-9 <= check.gain_bits <= entropy + 1e-6


def normal(mean: float) -> Foreseen:
    return Foreseen(mean=np.array([mean]), covariance=np.eye(1))


@pytest.mark.parametrize(("apart", "bits"), [(0.0, 0.0), (2.0, 0.486), (12.0, 1.0)])
def test_bits_of_two_normal_readings_are_those_of_two_signals_in_noise(apart: float, bits: float):
    """Two equally likely means ±1 in unit noise carry 0.486 bit (capacity of a binary signal in Gaussian noise at Es/N0 = −3 dB;
    Proakis, Digital Communications, 4th ed., fig. 7.1-4, from memory); apart by nothing 0, by far 1. 200 draws leave about 0.05.
    """
    found, overlap = joint_bits([(0.5, [(1.0, normal(0.0))]), (0.5, [(1.0, normal(apart))])])
    assert found == pytest.approx(bits, abs=0.06)
    assert overlap[0, 0] == pytest.approx(1.0)
    # two unit normals overlap by 2 Φ(−d/2)
    assert overlap[0, 1] == pytest.approx(float(2.0 * ndtr(-apart / 2.0)), abs=0.06)


def test_shift_or_blockage_seen_at_one_flow_calls_for_another_state():
    """At one flow the last gauge of a line reads 30 kPa low: its own shift, or a loss before it. Only another flow tells."""
    stations = [station("A", 0.0, is_open=True), station("B", 0.0), station("C", 0.0, is_open=True)]
    runs = [run("R1", "A", "B", flow_column="FT"), run("R2", "B", "C")]
    described = job(stations, runs, [gauge("PA", "A", "R1"), gauge("PB", "B", "R1"), gauge("PC", "C", "R2")])
    loss = loss_m(0.01)
    heads = {"A": 40.0, "B": 40.0 - loss, "C": 40.0 - 2.0 * loss}
    judged = model(described, [spell(described, 1, heads, {"R1": 0.01, "R2": 0.01}, shift_pa={"PC": -30_000.0})])
    posterior = search(judged)
    checks = next_checks(judged, posterior, list_findings(posterior))
    more = next(check for check in checks if check.action in ("still-spell", "other-flow"))
    assert more.gain_bits > 0.3
    assert any("blockage" in pair for pair in more.separates)
    assert more.says.startswith("Log a spell at")
    assert "whoever runs the system" in more.caution


def test_spell_is_logged_and_not_answered():
    with pytest.raises(JobError, match="is no answer but more of the log"):
        parse_answer("other-flow R1 = yes", worked_layout().job)
