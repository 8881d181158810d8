"""The table for spreadsheets."""

from __future__ import annotations

import csv
import io
from dataclasses import replace

import pytest

from headledger.diagnosis.result import CheckResult, Verdict
from headledger.sheets.spreadsheet import COLUMNS, harmless, result_to_csv
from tests.made_results import found_gauge


def test_table_has_a_row_a_gauge_and_spell(troubled_result: CheckResult):
    rows = list(csv.DictReader(io.StringIO(result_to_csv(troubled_result))))
    assert tuple(rows[0]) == COLUMNS
    assert [(row["tag"], row["spell"]) for row in rows if row["tag"] == "PT-3"] == [("PT-3", "1"), ("PT-3", "2")]
    row = next(row for row in rows if row["tag"] == "PT-3")
    assert (row["reading"], row["expected"], row["expected u95"], row["error"]) == ("3.41", "3.2", "0.03", "0.21")
    assert row["start"] == "2026-03-02T08:00:00Z"
    alone = next(row for row in rows if row["tag"] == "PT-5")
    assert (alone["expected"], alone["error"]) == ("", "")


@pytest.mark.parametrize("start", ["=", "+", "-", "@", "\t", "\r"])
def test_text_that_looks_like_a_formula_cannot_run(start: str):
    assert harmless(f"{start}cmd|'/c calc'!A0") == f"'{start}cmd|'/c calc'!A0"
    assert harmless("PT-3") == "PT-3"


def test_tag_that_looks_like_a_formula_is_made_harmless(sound_result: CheckResult):
    job = replace(sound_result.job, gauges=(replace(sound_result.job.gauges[0], tag="=1+1"),))
    result = replace(sound_result, job=job, gauges=(found_gauge("=1+1", "S1", Verdict.PASS, why="@SUM(A1)"),))
    rows = list(csv.DictReader(io.StringIO(result_to_csv(result))))
    assert {(row["tag"], row["why"]) for row in rows} == {("'=1+1", "'@SUM(A1)")}
