"""The judgement number by number against a reference by brute force: full covariances, sizes on a grid, verdicts by drawing.

The reference is `tests/reference/worked_job.py`, plain numpy on its own matrices; `worked_job.json` is what it prints.
"""

from __future__ import annotations

import math
from functools import lru_cache

import pytest

from headledger.diagnosis.estimate import Model
from headledger.diagnosis.priors import CountPrior
from headledger.diagnosis.result import CauseKind, Place
from headledger.diagnosis.search import Explanation, Posterior, search
from headledger.diagnosis.state import evaluate
from headledger.diagnosis.verdicts import judge_gauge

from .worked_job import REFERENCE, worked_model, worked_points

PER_KPA = 12 * math.log(1000.0)  # twelve readings: a density per kPa is a thousand times one per Pa, each
KINDS = (CauseKind.ZERO_SHIFT, CauseKind.WRONG_ELEVATION, CauseKind.SPAN_ERROR, CauseKind.BLOCKAGE)
CASES = list(REFERENCE)


@lru_cache(maxsize=8)
def weighed(case: str) -> tuple[Model, Posterior]:
    """Model and posterior of one case, linearised where the reference is."""
    reference = REFERENCE[case]
    model = worked_model(reference["readings_kpa"])
    points = worked_points(reference["head_at_a_m"])
    return model, search(model, kinds=KINDS, prior=CountPrior(of=(0.5, 0.5)), points=points)


def explanation_of(posterior: Posterior, kind: str, at: str) -> Explanation:
    """The explanation of one cause, or of none."""
    if kind == "none":
        return next(e for e in posterior.explanations if not e.chosen)
    place = Place(run=at) if kind == "blockage" else Place(gauge=at)
    return next(e for e in posterior.explanations if (CauseKind(kind), place) in e.keys)


@pytest.mark.parametrize("case", CASES)
def test_evaluate_worked_job_gives_its_nominal_readings(case: str) -> None:
    reference = REFERENCE[case]
    model = worked_model(reference["readings_kpa"])
    points = worked_points(reference["head_at_a_m"])
    for spell, point, nominal in zip(model.spells, points, reference["nominal_kpa"], strict=True):
        assert evaluate(model.layout, spell, point).reading_pa / 1e3 == pytest.approx(nominal, abs=1e-4)


@pytest.mark.parametrize("case", CASES)
def test_search_worked_job_gives_its_evidence_of_every_explanation(case: str) -> None:
    _, posterior = weighed(case)
    none = posterior.frame.log_evidence_of_none + PER_KPA
    assert none == pytest.approx(REFERENCE[case]["log_evidence_of_none"], rel=1e-3)
    for row in REFERENCE[case]["explanations"]:
        explanation = explanation_of(posterior, row["kind"], row["at"])
        found = none + explanation.frame.log_gain(explanation.chosen)
        assert found == pytest.approx(row["log_evidence"], rel=1e-3), row


@pytest.mark.parametrize("case", CASES)
def test_search_worked_job_gives_its_posterior(case: str) -> None:
    _, posterior = weighed(case)
    assert sum(e.probability for e in posterior.explanations) == pytest.approx(1.0)
    for row in REFERENCE[case]["explanations"]:
        found = explanation_of(posterior, row["kind"], row["at"]).probability
        assert found == pytest.approx(row["probability"], rel=1e-3, abs=1e-6), row


@pytest.mark.parametrize("case", CASES)
def test_search_worked_job_gives_its_sizes(case: str) -> None:
    _, posterior = weighed(case)
    for row in REFERENCE[case]["explanations"]:
        if row["kind"] == "none" or row["probability"] < 1e-3:
            continue
        explanation = explanation_of(posterior, row["kind"], row["at"])
        size = explanation.frame.size(explanation.chosen, explanation.chosen[0])
        unit = size_unit(posterior, row["kind"])
        assert size.mean / unit == pytest.approx(row["size"], rel=1e-3), row
        assert size.sd / unit == pytest.approx(row["size_sd"], rel=1e-3), row


def size_unit(posterior: Posterior, kind: str) -> float:
    """What one unit of the reference's size is in ours: kPa, m, ratio, and kPa lost at 36 m³/h for a loss coefficient."""
    if kind == "zero-shift":
        return 1e3
    if kind != "blockage":
        return 1.0
    state = posterior.frame.linear.states[1]
    return 1e3 / float(state.velocity_pa[0])


@pytest.mark.parametrize("case", CASES)
def test_judge_gauge_worked_job_gives_its_verdicts(case: str) -> None:
    model, posterior = weighed(case)
    for index, row in enumerate(REFERENCE[case]["gauges"]):
        judged = judge_gauge(model, posterior, index)
        assert judged.outside_probability == pytest.approx(row["outside_probability"], abs=0.01), row
        assert judged.verdict == row["verdict"]
