"""Odds and residuals behind a finding, against the worked job by brute force: full covariances, sizes on a grid."""

from __future__ import annotations

import math
from functools import lru_cache

import numpy as np
import pytest

from headledger.diagnosis.estimate import Model
from headledger.diagnosis.evidence import evidence_of, left_over
from headledger.diagnosis.findings import list_findings
from headledger.diagnosis.priors import CountPrior
from headledger.diagnosis.result import CauseKind, CheckResult, Evidence, Place
from headledger.diagnosis.search import Explanation, Posterior, search
from headledger.diagnosis.wording import against_sentence, beside_words, misfit_sentence, odds_words
from tests.reference.worked_job import NOISE_SD, causes, marks

from .test_time_causes import found as judged
from .test_time_causes import line
from .worked_job import REFERENCE, worked_model, worked_points

KINDS = (CauseKind.ZERO_SHIFT, CauseKind.WRONG_ELEVATION, CauseKind.SPAN_ERROR, CauseKind.BLOCKAGE)
SHIFTED, BLOCKED = "PT-C reads 14 kPa high", "R2 loses 18 kPa more at 36 m3/h"
PT_C = Place(gauge="PT-C")


@lru_cache(maxsize=4)
def weighed(case: str) -> tuple[Model, Posterior]:
    """One case with one cause at most, linearised where the reference is."""
    model = worked_model(REFERENCE[case]["readings_kpa"])
    points = worked_points(REFERENCE[case]["head_at_a_m"])
    return model, search(model, kinds=KINDS, prior=CountPrior(of=(0.5, 0.5)), points=points)


def evidence_for(case: str, kind: CauseKind) -> Evidence:
    model, posterior = weighed(case)
    findings = list_findings(posterior)
    all_of_it = evidence_of(model, posterior, findings)
    evidence = next(e for f, e in zip(findings, all_of_it, strict=True) if f.kind is kind)
    assert evidence is not None
    return evidence


def reference_row(case: str, kind: str, at: str) -> dict[str, float]:
    return next(row for row in REFERENCE[case]["explanations"] if (row["kind"], row["at"]) == (kind, at))


@pytest.mark.parametrize("other", [CauseKind.ZERO_SHIFT, CauseKind.SPAN_ERROR, None])
def test_evidence_against_a_rival_is_the_reference_s(other: CauseKind | None) -> None:
    """Log evidences of 14 kPa at PT-C by brute force: wrong elevation −26.589, zero shift −26.720, span error −29.617, none −72.439."""
    own = reference_row(SHIFTED, "wrong-elevation", "PT-C")
    stead = reference_row(SHIFTED, str(other or "none"), "PT-C" if other else "")
    against = next(a for a in evidence_for(SHIFTED, CauseKind.WRONG_ELEVATION).against if a.kind is other)
    assert against.place == (PT_C if other else Place())
    assert against.evidence_nats == pytest.approx(own["log_evidence"] - stead["log_evidence"], rel=1e-3, abs=3e-3)
    assert against.prior_nats == pytest.approx(math.log(own["prior"] / stead["prior"]), abs=1e-9)


def brute_force(case: str) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    """Residuals, their covariance, and nominal readings of the reference, in kPa."""
    nominal = np.array(REFERENCE[case]["nominal_kpa"])
    _, jacobian, deviations = marks(nominal)
    covariance = (jacobian * deviations**2) @ jacobian.T + NOISE_SD**2 * np.eye(nominal.size)
    return (np.array(REFERENCE[case]["readings_kpa"]) - nominal).ravel(), covariance, nominal


def left_by_conditioning(residual: np.ndarray, covariance: np.ndarray, gauge: int) -> tuple[np.ndarray, np.ndarray]:
    """A gauge's residuals less what all the other gauges' say they should be, and the variance of that. [kPa], [kPa²]"""
    mine = np.arange(gauge, residual.size, 4)
    rest = np.setdiff1d(np.arange(residual.size), mine)
    gain = np.linalg.solve(covariance[np.ix_(rest, rest)], covariance[np.ix_(rest, mine)]).T
    return residual[mine] - gain @ residual[rest], np.diag(
        covariance[np.ix_(mine, mine)] - gain @ covariance[np.ix_(rest, mine)]
    )


@pytest.mark.parametrize(
    ("case", "kind", "at"),
    [(SHIFTED, CauseKind.ZERO_SHIFT, "PT-C"), (BLOCKED, CauseKind.BLOCKAGE, "R2")],
)
def test_residuals_before_and_after_are_those_of_conditioning(case: str, kind: CauseKind, at: str) -> None:
    """Every gauge in every spell. What a cause of the gauge's own is fitted with is no further doubt; that of another is."""
    residual, covariance, nominal = brute_force(case)
    effect = next(mark.ravel() for name, place, mark, *_ in causes(nominal) if (name, place) == (kind, at))
    row = reference_row(case, kind, at)
    evidence = evidence_for(case, kind)
    left = residual - row["size"] * effect
    for gauge, tag in enumerate(f"PT-{name}" for name in "ABCD"):
        before, variance = left_by_conditioning(residual, covariance, gauge)
        after, _ = left_by_conditioning(left, covariance, gauge)
        moved, _ = left_by_conditioning(effect, covariance, gauge)
        doubt = 0.0 if tag == at else (row["size_sd"] * moved) ** 2
        found = [r for r in evidence.residuals if r.tag == tag]
        assert [r.spell for r in found] == [1, 2, 3]
        assert [r.before_pa / 1e3 for r in found] == pytest.approx(list(before), rel=2e-3, abs=5e-3)
        assert [r.sd_before_pa / 1e3 for r in found] == pytest.approx(list(variance**0.5), rel=2e-3)
        assert [(r.after_pa or 0.0) / 1e3 for r in found] == pytest.approx(list(after), rel=2e-3, abs=5e-3)
        assert [(r.sd_after_pa or 0.0) / 1e3 for r in found] == pytest.approx(list((variance + doubt) ** 0.5), rel=2e-3)


def test_misfit_is_the_sum_of_squares_in_standard_deviations() -> None:
    residual, covariance, nominal = brute_force(SHIFTED)
    effect = next(mark.ravel() for name, at, mark, *_ in causes(nominal) if (name, at) == ("zero-shift", "PT-C"))
    left = residual - reference_row(SHIFTED, "zero-shift", "PT-C")["size"] * effect
    evidence = evidence_for(SHIFTED, CauseKind.ZERO_SHIFT)
    assert evidence.count == 12
    assert evidence.misfit_before == pytest.approx(float(residual @ np.linalg.solve(covariance, residual)), rel=1e-3)
    assert evidence.misfit_after == pytest.approx(float(left @ np.linalg.solve(covariance, left)), rel=2e-3)
    assert evidence.says == misfit_sentence(evidence.misfit_before, evidence.misfit_after, 12, "")


def test_gauge_in_order_before_any_cause_is_off_by_its_deviation_about_one_time_in_three() -> None:
    """The sound job: of twelve residuals none is beyond three deviations, and they are not all far inside one."""
    model, posterior = weighed("sound")
    none = next(e for e in posterior.explanations if not e.chosen)
    left = left_over(model, none)
    ratio = np.abs(left.off_pa / left.sd_pa)
    assert ratio.max() < 3.0
    assert ratio.max() > 0.5


def test_stuck_gauge_has_no_residual_after() -> None:
    """PT-B keeps one reading throughout: with the finding it says nothing, and the other four say the same as one another."""
    model, spells = line()
    stuck = float(spells[1].reading_pa[1])
    for one in spells:
        one.reading_pa[1] = stuck if one.start_s >= 1225.0 else one.reading_pa[1]
    made, posterior, findings = judged(model, spells)
    evidence = evidence_of(made, posterior, findings)[0]
    assert evidence is not None
    own = [r for r in evidence.residuals if r.tag == "PT-B"]
    assert [r.spell for r in own] == [1, 2, 3]
    assert all(r.after_pa is None and r.sd_after_pa is None for r in own)
    assert max(abs(r.before_pa) / r.sd_before_pa for r in own) > 3.0
    others = [r for r in evidence.residuals if r.tag != "PT-B"]
    assert all(r.after_pa is not None and abs(r.after_pa) < 0.2 * (r.sd_after_pa or 0.0) for r in others)


def test_log_priors_and_evidences_add_up_to_the_weights_of_a_whole_search() -> None:
    """Prior odds and odds of the readings multiply to the odds of the probabilities that are reported."""
    model = worked_model(REFERENCE[SHIFTED]["readings_kpa"])
    posterior = search(model)
    top = posterior.leading
    kinds = len({mark.kind for mark in posterior.frame.marks}) + posterior.other_kinds
    for one in posterior.explanations[:40]:
        odds = math.log(top.probability / one.probability)
        evidence, prior = top.log_evidence - one.log_evidence, top.log_prior - one.log_prior
        assert evidence + prior == pytest.approx(odds, abs=1e-6)
        if len(one.chosen) == 1 and not one.frame.marks[one.chosen[0]].spoils:
            assert one.log_prior == pytest.approx(_prior_of_one(posterior, one, kinds), abs=1e-9)


def _prior_of_one(posterior: Posterior, one: Explanation, kinds: int) -> float:
    """35 % of jobs have one cause; kinds alike, places alike, forms by their share."""
    mark = one.frame.marks[one.chosen[0]]
    places = len({other.place for other in posterior.frame.marks if other.kind is mark.kind})
    return math.log(0.35 * mark.share / kinds / places)


def test_findings_from_between_the_means_have_no_evidence(any_sample: CheckResult) -> None:
    for cause in any_sample.causes:
        traits = (CauseKind.NOISY, CauseKind.SLUGGISH, CauseKind.CLOCK_OFFSET, CauseKind.LEAK)
        assert (cause.evidence is None) == (cause.kind in traits or cause.probability < 0.02)


@pytest.mark.parametrize(
    ("nats", "words"),
    [
        (math.log(40.0), "40 to 1"),
        (-math.log(3.2), "3.2 to 1"),
        (math.log(999.4), "999 to 1"),
        (800.0, "more than 1000 to 1"),
        (-800.0, "more than 1000 to 1"),
    ],
)
def test_odds_words_name_the_larger_side_and_end_at_a_thousand(nats: float, words: str) -> None:
    assert odds_words(nats) == words


@pytest.mark.parametrize(
    ("evidence", "prior", "says"),
    [
        (40.0, 1.0, "The readings favour it 40 to 1 over a wrong elevation at PT-3."),
        (1.0 / 5.0, 2.0, "The readings favour a wrong elevation at PT-3 over it, 5 to 1; beforehand it was the likelier, 2 to 1."),
        (20.0, 1.0 / 8.0, "The readings favour it 20 to 1 over a wrong elevation at PT-3; beforehand it was the less likely, 8 to 1."),
        (1.0, 1.0, "The readings do not tell it from a wrong elevation at PT-3, and beforehand neither was likelier."),
        (1.1, 3.0, "The readings do not tell it from a wrong elevation at PT-3: only what was likelier beforehand decides, 3 to 1 for it."),
    ],
)  # fmt: skip
def test_against_sentence_tells_readings_from_what_was_known_before(evidence: float, prior: float, says: str) -> None:
    nats = (math.log(evidence), math.log(prior))
    assert against_sentence(CauseKind.WRONG_ELEVATION, Place(gauge="PT-3"), *nats, "") == says


def test_against_nothing_in_its_stead_names_what_stays() -> None:
    nats = (math.log(40.0), 0.0)
    assert against_sentence(None, Place(), *nats, "").endswith("over nothing wrong.")
    assert against_sentence(None, Place(), *nats, "a leak at R1").endswith("over a leak at R1 alone.")


def test_misfit_sentence_names_what_stands_beside() -> None:
    leak = (CauseKind.LEAK, Place())
    step = (CauseKind.STEP, PT_C)
    assert beside_words([step, leak]) == beside_words([leak, step]) == "a leak and a step at PT-C"
    assert misfit_sentence(84.2, 11.4, 18, "a leak") == (
        "Misfit 84 → 11 over 18 readings with it and a leak (sum of squares, in standard deviations)."
    )


def test_log_prior_of_a_stuck_gauge_is_that_of_one_cause_at_one_gauge_from_one_moment() -> None:
    """35 % of jobs have one cause; kinds alike, five gauges alike, eleven moments alike: twelve pieces, the last no moment to begin."""
    model, spells = line()
    stuck = float(spells[1].reading_pa[1])
    for one in spells:
        one.reading_pa[1] = stuck if one.start_s >= 1225.0 else one.reading_pa[1]
    _, posterior, _ = judged(model, spells)
    kinds = len({mark.kind for mark in posterior.frame.marks} | {CauseKind.WRONG_UNIT}) + posterior.other_kinds
    alone = next(e for e in posterior.explanations if e.keys == {(CauseKind.FROZEN, Place(gauge="PT-B"))})
    assert alone.log_prior == pytest.approx(math.log(0.35 / kinds / 5.0 / 11.0), abs=1e-9)
