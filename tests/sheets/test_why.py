"""The rows behind findings and uncertainties: units, marks with their words, bars."""

from __future__ import annotations

from dataclasses import replace

from headledger.diagnosis.result import BudgetShare, CheckResult, Verdict
from headledger.sheets.why import budget_bars, finding_title, moved, own_residuals, with_evidence
from tests.made_results import PSIG, ZERO_SHIFT, found_gauge


def test_reading_is_in_the_unit_of_its_gauge(troubled_result: CheckResult):
    """21 000 Pa are 3.0458 psi (NIST SP 811: 1 psi is 6 894.757 Pa); twice 1 500 Pa are 0.44 psi."""
    gauges = (*troubled_result.gauges[:2], replace(troubled_result.gauges[2], unit=PSIG), *troubled_result.gauges[3:])
    row = next(row for row in moved(replace(troubled_result, gauges=gauges), ZERO_SHIFT).rows if row[0] == "PT-3")
    assert row == ("PT-3", "1", "+3.05", "0.44", "▲ off", "0.00", "0.44", "✓ fits", "psi")


def test_moved_leaves_out_what_fits_all_along_and_counts_it(troubled_result: CheckResult):
    told = moved(troubled_result, ZERO_SHIFT)
    assert [row[:2] for row in told.rows] == [("PT-2", "1"), ("PT-3", "1"), ("PT-3", "2"), ("PT-4", "2")]
    assert told.rest == "2 readings fit with no cause and with it."


def test_own_residuals_are_those_of_one_gauge_with_marks_and_words(troubled_result: CheckResult):
    line = own_residuals(ZERO_SHIFT, troubled_result.gauges[2])
    assert line == (
        "PT-3 off with no cause → with it, bar: spell 1: +0.210 ± 0.030 ▲ off → 0.000 ± 0.030 ✓ fits; "
        "spell 2: +0.205 ± 0.030 ▲ off → – spoilt."
    )
    assert own_residuals(ZERO_SHIFT, found_gauge("PT-5", "S4", Verdict.PASS)) == ""
    assert own_residuals(replace(ZERO_SHIFT, evidence=None), troubled_result.gauges[2]) == ""


def test_bars_are_as_long_as_their_share_of_the_largest():
    budget = (
        BudgetShare(what="a", percent=60.0),
        BudgetShare(what="b", percent=39.5),
        BudgetShare(what="c", percent=0.5),
    )
    assert budget_bars(budget, 12) == (("a", "█" * 12, "60 %"), ("b", "█" * 8, "40 %"), ("c", "█", "under 1 %"))
    assert budget_bars((), 12) == ()


def test_only_findings_with_numbers_are_shown(troubled_result: CheckResult):
    bare = replace(ZERO_SHIFT, evidence=None)
    assert with_evidence((bare, *troubled_result.causes)) == troubled_result.causes
    assert finding_title(ZERO_SHIFT) == "96 %  zero-shift at PT-3 (accepted)"
