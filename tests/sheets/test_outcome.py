"""When a check comes to trouble, and when to nothing."""

from __future__ import annotations

from dataclasses import replace

import pytest

from headledger.diagnosis.result import CheckResult, Verdict
from headledger.sheets.outcome import Outcome, outcome_of
from tests.made_results import BLOCKAGE, ZERO_SHIFT, found_gauge

PASS = found_gauge("A", "S1", Verdict.PASS)
UNCHECKED = found_gauge("B", "S2", Verdict.UNCHECKED)


@pytest.mark.parametrize(
    ("changes", "expected"),
    [
        ({"gauges": (PASS,)}, Outcome.SOUND),
        ({"gauges": (PASS, UNCHECKED)}, Outcome.SOUND),
        ({"gauges": (UNCHECKED,)}, Outcome.NOTHING_CHECKED),
        ({"gauges": ()}, Outcome.NOTHING_CHECKED),
        ({"gauges": (PASS, found_gauge("C", "S1", Verdict.FAIL))}, Outcome.TROUBLE),
        ({"gauges": (PASS, found_gauge("C", "S1", Verdict.UNRESOLVED))}, Outcome.TROUBLE),
        ({"gauges": (PASS,), "causes": (ZERO_SHIFT,)}, Outcome.TROUBLE),
        ({"gauges": (PASS,), "causes": (BLOCKAGE,)}, Outcome.SOUND),
        ({"gauges": (PASS,), "clean_probability": 0.1}, Outcome.SOUND),
        ({"gauges": (PASS,), "clean_probability": 0.099}, Outcome.TROUBLE),
        ({"gauges": (UNCHECKED,), "clean_probability": 0.05}, Outcome.TROUBLE),
    ],
)
def test_outcome_follows_verdicts_causes_and_clean_probability(
    sound_result: CheckResult, changes: dict[str, object], expected: Outcome
):
    assert outcome_of(replace(sound_result, **changes)) is expected  # type: ignore[arg-type]
