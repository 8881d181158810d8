"""The five answers where causes are several, rivals, or none."""

from __future__ import annotations

from dataclasses import replace

from headledger.diagnosis.result import CauseKind, CheckResult, Place, Rival, Verdict
from headledger.sheets.headline import headline, leading_causes
from tests.made_results import BLOCKAGE, ZERO_SHIFT, found_gauge


def answers(result: CheckResult) -> dict[str, str]:
    return {answer.question: " ".join(answer.lines) for answer in headline(result)}


def test_rival_of_a_leading_cause_does_not_lead_beside_it():
    rival = replace(
        BLOCKAGE,
        kind=CauseKind.SPAN_ERROR,
        place=Place(gauge="PT-4"),
        probability=0.42,
        rivals=(Rival(kind=CauseKind.BLOCKAGE, place=Place(run="R2"), probability=0.55),),
    )
    assert leading_causes((ZERO_SHIFT, BLOCKAGE, rival)) == (ZERO_SHIFT, BLOCKAGE)


def test_unlikely_cause_without_rivals_does_not_lead():
    assert leading_causes((replace(BLOCKAGE, probability=0.3, rivals=()),)) == ()


def test_trouble_without_a_cause_names_the_gauges(sound_result: CheckResult):
    gauges = (found_gauge("A", "S1", Verdict.UNRESOLVED), found_gauge("B", "S2", Verdict.UNRESOLVED))
    said = answers(replace(sound_result, gauges=gauges, clean_probability=0.4))
    assert said["Anything wrong?"] == "Perhaps. All 2 gauges are unresolved."
    assert said["Where?"] == "A and B; no cause stands out."
    assert "another flow" in said["What next?"]


def test_accepted_cause_under_passing_gauges_is_trouble_all_the_same(sound_result: CheckResult):
    said = answers(replace(sound_result, causes=(replace(BLOCKAGE, accepted=True, probability=0.99, rivals=()),)))
    assert said["Anything wrong?"] == "Yes, although all 5 gauges pass."
    assert said["Gauge or pipe?"] == "The pipe."


def test_rivals_of_one_kind_ask_for_the_place(sound_result: CheckResult):
    rival = Rival(kind=CauseKind.BLOCKAGE, place=Place(run="R3"), probability=0.4)
    said = answers(replace(sound_result, causes=(replace(BLOCKAGE, rivals=(rival,)),), clean_probability=0.01))
    assert said["What next?"] == "Find out on site where it is, a blockage: run R2 or run R3."


def test_nothing_checked_says_so_and_what_would_help(sound_result: CheckResult):
    said = answers(replace(sound_result, gauges=(found_gauge("A", "S1", Verdict.UNCHECKED),)))
    assert said["Anything wrong?"] == "Nothing could be checked. Of 1 gauge 1 is unchecked."
    assert said["What next?"].startswith("To check A:")
