"""The one answer of a check: sound, trouble, or nothing that could be checked."""

from __future__ import annotations

from enum import StrEnum

from headledger.diagnosis.result import CheckResult, Verdict

# Below this probability of "nothing is wrong" a job is in trouble, even if no single cause stands out.
CLEAN_FLOOR = 0.1


class Outcome(StrEnum):
    """What a check comes to."""

    SOUND = "sound"
    TROUBLE = "trouble"
    NOTHING_CHECKED = "nothing checked"


def outcome_of(result: CheckResult) -> Outcome:
    """What a check comes to.

    Trouble is a gauge that fails or is unresolved, an accepted cause, or that nothing is wrong being improbable.
    Without trouble it is sound if any gauge passes.
    """
    verdicts = {gauge.verdict for gauge in result.gauges}
    if verdicts & {Verdict.FAIL, Verdict.UNRESOLVED}:
        return Outcome.TROUBLE
    if any(cause.accepted for cause in result.causes) or result.clean_probability < CLEAN_FLOOR:
        return Outcome.TROUBLE
    return Outcome.SOUND if Verdict.PASS in verdicts else Outcome.NOTHING_CHECKED
