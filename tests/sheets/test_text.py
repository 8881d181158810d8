"""The text report: what it answers, its width, and that nothing of a file is taken for markup."""

from __future__ import annotations

import io
from dataclasses import replace

import pytest
from rich.cells import cell_len

from headledger.diagnosis.result import CheckResult, Verdict
from headledger.plant.digest import Reject
from headledger.sheets.text import write_report
from tests.made_results import found_gauge


class Terminal(io.StringIO):
    """A stream that takes itself for a terminal."""

    def isatty(self) -> bool:
        return True


def report_of(result: CheckResult, **options: int | bool) -> str:
    stream = io.StringIO()
    write_report(result, stream, **options)  # type: ignore[arg-type]
    return stream.getvalue()


def section(report: str, title: str) -> str:
    return report.split(f"\n{title}\n")[1].split("\n\n")[0]


def unwrapped(report: str) -> str:
    return " ".join(report.split())


def test_report_of_trouble_answers_the_five_questions(troubled_result: CheckResult):
    report = unwrapped(report_of(troubled_result))
    assert "Anything wrong? Yes. Of 5 gauges 1 fails, 1 is unresolved, 1 is unchecked and 2 pass." in report
    assert "Where? PT-3 reads 0.21 bar high at every flow." in report
    assert "Gauge or pipe? PT-3: the gauge. Run R2: not told apart: the pipe 55 %, the gauge 42 %." in report
    assert (
        "How sure? Zero-shift at PT-3 96 %; blockage at run R2 55 %, or span-error at PT-4 42 %; that nothing is wrong < 1 %."
        in report
    )
    assert "What next? At PT-3: see to a zero shift" in report
    assert "Find out on site whether it is a blockage or a span error." in report
    assert "To check PT-5:" in report


def test_report_asked_why_tells_odds_readings_and_budgets(troubled_result: CheckResult):
    """PT-1 stays within chance before and after; PT-3 is off by 0.21 bar, and in spell 2 says nothing any more."""
    plain, asked = report_of(troubled_result), report_of(troubled_result, why=True)
    behind = section(asked, "Behind 96 %  zero-shift at PT-3 (accepted)")
    rows = [" ".join(line.split()) for line in behind.splitlines() if line.strip().startswith("PT-")]
    assert rows == [
        "PT-2 1 -0.070 0.030 ▲ off -0.002 0.030 ✓ fits bar",
        "PT-3 1 +0.210 0.030 ▲ off 0.000 0.030 ✓ fits bar",
        "PT-3 2 +0.205 0.030 ▲ off – – – spoilt bar",
        "PT-4 2 -0.035 0.030 ▲ off +0.040 0.030 ▲ off bar",
    ]
    assert "- The readings favour it 32 to 1 over a wrong elevation at PT-3." in behind
    assert "2 readings fit with no cause and with it." in behind
    assert "elevation of S4 [survey] 38 %" in unwrapped(asked)
    before, after = asked.index("\nBehind"), asked.index("\nNot used from the logs")
    assert asked[:before] + asked[after:] == plain


def test_report_of_a_sound_job_says_no(sound_result: CheckResult):
    report = report_of(sound_result)
    assert "Anything wrong?  No. All 5 gauges pass." in report
    assert "Where?" not in report
    assert "Findings" not in report


def test_gauge_table_puts_the_worst_first_with_mark_and_word(troubled_result: CheckResult):
    rows = [line.split() for line in section(report_of(troubled_result), "Gauges").splitlines()]
    assert [row[:3] for row in rows[1:]] == [
        ["▲", "fail", "PT-3"],
        ["?", "unresolved", "PT-4"],
        ["–", "unchecked", "PT-5"],
        ["✓", "pass", "PT-1"],
        ["✓", "pass", "PT-2"],
    ]
    assert rows[1][3:] == ["S3", "+0.210", "0.030", "0.060", "barg", ">", "99", "%"]


def test_findings_name_probability_and_rivals(troubled_result: CheckResult):
    findings = unwrapped(section(report_of(troubled_result), "Findings"))
    assert "96 % zero-shift at PT-3 (accepted) PT-3 reads 0.21 bar high at every flow." in findings
    assert "55 % blockage at run R2" in findings


def test_spells_name_runs_of_one_flow_together(troubled_result: CheckResult):
    spells = section(report_of(troubled_result), "Spells (times in UTC)")
    assert "R1, R2, R3: 36.00 ± 0.72 m3/h" in spells
    assert "2026-03-02 08:30 – 08:45" in spells


def test_spell_times_follow_the_zone_of_the_job(troubled_result: CheckResult):
    """Oslo is one hour ahead of UTC in early March."""
    job = replace(troubled_result.job, timezone="Europe/Oslo")
    spells = section(report_of(replace(troubled_result, job=job)), "Spells (times in Europe/Oslo)")
    assert "2026-03-02 09:30 – 09:45" in spells


def test_square_brackets_of_titles_and_cells_are_kept(troubled_result: CheckResult):
    job = replace(troubled_result.job, title="Loop [bar] [/x] [red]")
    gauge = found_gauge("PT[1]", "S[m]", Verdict.FAIL, why="[kPa] :smile: kept")
    report = report_of(replace(troubled_result, job=job, gauges=(gauge,)))
    for kept in ("Loop [bar] [/x] [red]", "PT[1]", "S[m]", "[kPa] :smile: kept", "BAD [x]"):
        assert kept in report


@pytest.mark.parametrize("width", [60, 80, 160])
def test_no_line_is_wider_than_asked(troubled_result: CheckResult, width: int):
    lines = report_of(troubled_result, width=width).splitlines()
    assert max(cell_len(line) for line in lines) <= width


def test_report_to_a_pipe_has_no_escape_and_no_trailing_space(troubled_result: CheckResult):
    report = report_of(troubled_result)
    assert "\x1b" not in report
    assert all(line == line.rstrip() for line in report.splitlines())
    assert max(map(len, report.splitlines())) <= 80


def test_report_to_a_terminal_without_colour_keeps_marks_and_words(
    troubled_result: CheckResult, monkeypatch: pytest.MonkeyPatch
):
    monkeypatch.setenv("TERM", "xterm-256color")
    coloured, plain = Terminal(), Terminal()
    write_report(troubled_result, coloured, width=80)
    write_report(troubled_result, plain, width=80, color=False)
    assert "\x1b[1;31m" in coloured.getvalue()
    assert "31m" not in plain.getvalue()
    assert "▲ fail" in plain.getvalue()


def test_no_color_variable_takes_colour_away(troubled_result: CheckResult, monkeypatch: pytest.MonkeyPatch):
    monkeypatch.setenv("TERM", "xterm-256color")
    monkeypatch.setenv("NO_COLOR", "1")
    stream = Terminal()
    write_report(troubled_result, stream, width=80)
    assert "31m" not in stream.getvalue()


def test_long_tags_fold_and_lose_nothing(sound_result: CheckResult):
    tag = "AREA-51/PUMP-HOUSE/DISCHARGE/PT-0001-A-OLD"
    gauge = found_gauge(tag, "a station with a long name indeed", Verdict.FAIL)
    table = section(report_of(replace(sound_result, gauges=(gauge,))), "Gauges")
    assert "…" not in table
    assert "+0.005" in table


def test_rejects_beyond_the_list_are_counted(troubled_result: CheckResult):
    rejects = tuple(
        Reject(file="log.csv", line=line, column="PT-1", text="x", why="not a number") for line in range(2, 32)
    )
    report = report_of(replace(troubled_result, rejects=rejects, reject_count=1234))
    listed = unwrapped(section(report, "Not used from the logs"))
    assert listed.startswith("1234 entries")
    assert "and 1224 more" in listed


def test_cautions_close_the_report(sound_result: CheckResult):
    assert "A reading of zero does not prove" in section(report_of(sound_result), "Caution")
