"""The screen by its behaviour: what stands on it, what keys do, how errors and stops end."""

from __future__ import annotations

import re
import threading
from collections.abc import Callable, Iterator
from contextlib import contextmanager
from dataclasses import replace
from pathlib import Path

import pytest
from rich.style import Style
from rich.text import Text
from textual.color import Color
from textual.pilot import Pilot
from textual.widgets import Label, Static

from headledger.diagnosis.result import CheckResult, Verdict
from headledger.errors import JobError, NetworkError, NothingToCheckError, Problem
from headledger.sheets.drawing import Drawing
from headledger.tui.app import FolderCheck, HeadledgerApp
from headledger.tui.ending import Ending
from headledger.tui.gauge_search import GaugeSearch
from headledger.tui.screens.ended import EndedScreen
from headledger.tui.screens.findings import FindingsScreen
from headledger.tui.screens.gauge import GaugeScreen
from headledger.tui.screens.sight import SightScreen
from headledger.tui.screens.working import WorkingScreen
from headledger.tui.widgets.answers import Answers
from headledger.tui.widgets.findings_list import FindingsList
from headledger.tui.widgets.gauge_detail import GaugeDetail
from headledger.tui.widgets.gauge_table import GaugeTable
from headledger.tui.widgets.picture_view import PictureView
from tests.made_results import found_gauge
from tests.sample_results import sample_result

SMALL, LARGE = (80, 24), (160, 48)


def answers_with(result: CheckResult) -> FolderCheck:
    def check(folder: Path, *, on_progress: Callable[[str, float], None], should_stop: Callable[[], bool]):
        return result

    return check


def raises(error: Exception) -> FolderCheck:
    def check(folder: Path, *, on_progress: Callable[[str, float], None], should_stop: Callable[[], bool]):
        raise error

    return check


class HeldCheck:
    """A check that stands at half way until it is let go, or is asked to stop and looks."""

    def __init__(self, result: CheckResult) -> None:
        self._result = result
        self.let_go = threading.Event()
        self.at_half = threading.Event()
        self.runs = 0

    def __call__(
        self, folder: Path, *, on_progress: Callable[[str, float], None], should_stop: Callable[[], bool]
    ) -> CheckResult:
        self.runs += 1
        on_progress("weighing causes", 0.5)
        self.at_half.set()
        while not self.let_go.wait(0.005) and not should_stop():
            pass
        return self._result


@contextmanager
def held(result: CheckResult) -> Iterator[HeldCheck]:
    """A held check that is let go whatever happens, so that no test hangs."""
    check = HeldCheck(result)
    try:
        yield check
    finally:
        check.let_go.set()


async def settled(pilot: Pilot[None]) -> None:
    await pilot.app.workers.wait_for_complete()
    await pilot.pause()


def shown(app: HeadledgerApp, selector: str) -> str:
    return "\n".join(str(widget.render()) for widget in app.screen.query(selector).results(Static))


def contrast(ink: Color, paper: Color) -> float:
    """Contrast ratio by relative luminance, as WCAG 2.1 defines both."""

    def luminance(color: Color) -> float:
        linear = [c / 12.92 if c <= 0.03928 else ((c + 0.055) / 1.055) ** 2.4 for c in color.normalized]
        return 0.2126 * linear[0] + 0.7152 * linear[1] + 0.0722 * linear[2]

    dark, light = sorted((luminance(ink), luminance(paper)))
    return (light + 0.05) / (dark + 0.05)


def picture(app: HeadledgerApp) -> Drawing:
    drawing = app.screen.query_one("#picture", PictureView).drawing
    assert drawing is not None
    return drawing


def table_rows(app: HeadledgerApp) -> list[list[str]]:
    table = app.screen.query_one(GaugeTable)
    return [[str(cell) for cell in table.get_row_at(row)] for row in range(table.row_count)]


@pytest.mark.parametrize("size", [SMALL, LARGE])
async def test_findings_screen_shows_answers_gauges_and_findings(troubled_result: CheckResult, size: tuple[int, int]):
    app = HeadledgerApp(Path("riser"), check=answers_with(troubled_result))
    async with app.run_test(size=size) as pilot:
        await settled(pilot)
        assert isinstance(app.screen, FindingsScreen)
        assert shown(app, ".question").splitlines() == [
            "Anything wrong?", "Where?", "Gauge or pipe?", "How sure?", "What next?",
        ]  # fmt: skip
        assert "PT-3 reads 0.21 bar high at every flow." in shown(app, ".answer")
        assert [row[:2] for row in table_rows(app)] == [
            ["▲ fail", "PT-3"],
            ["? unresolved", "PT-4"],
            ["– unchecked", "PT-5"],
            ["✓ pass", "PT-1"],
            ["✓ pass", "PT-2"],
        ]
        assert "Or it is a span error at PT-4 (42 %)" in shown(app, ".finding")
        assert app.ending is Ending.FOUND


@pytest.mark.parametrize("size", [SMALL, LARGE])
async def test_every_part_of_the_screen_has_room(troubled_result: CheckResult, size: tuple[int, int]):
    app = HeadledgerApp(Path("riser"), check=answers_with(troubled_result))
    async with app.run_test(size=size) as pilot:
        await settled(pilot)
        screen = app.screen.region
        for selector in ("TitleLine", "Answers", "#picture", "GaugeTable", "#caution", "Footer"):
            region = app.screen.query_one(selector).region
            assert region.area > 0, selector
            assert screen.contains_region(region), selector
        assert app.screen.query_one(GaugeTable).region.height >= 6
        assert app.screen.query_one("#picture").region.height >= 10
        assert app.screen.query_one("#aside").display is (size == LARGE)


async def test_findings_stand_beside_the_picture_where_there_is_width_and_in_its_place_where_not(
    troubled_result: CheckResult,
):
    for size, beside in ((SMALL, False), (LARGE, True)):
        app = HeadledgerApp(Path("riser"), check=answers_with(troubled_result))
        async with app.run_test(size=size) as pilot:
            await settled(pilot)
            await pilot.press("f")
            await pilot.pause()
            aside = app.screen.query_one("#aside").region
            assert aside.height >= 12
            assert app.screen.query_one("#line").display is beside
            if beside:
                assert aside.x >= app.screen.query_one("#picture").region.right


async def test_arrow_keys_choose_the_gauge_in_picture_and_detail(troubled_result: CheckResult):
    app = HeadledgerApp(Path("riser"), check=answers_with(troubled_result))
    async with app.run_test(size=SMALL) as pilot:
        await settled(pilot)
        assert [mark.label for mark in picture(app).marks if mark.chosen] == ["PT-3"]
        detail = shown(app, "GaugeDetail")
        assert "PT-3 at S3   ▲ fail" in detail
        assert "  1 still    3.410     3.200  0.030  +0.210" in detail
        await pilot.press("down")
        await pilot.pause()
        assert [mark.label for mark in picture(app).marks if mark.chosen] == ["PT-4"]
        await pilot.press("down")
        detail = shown(app, "GaugeDetail")
        assert "PT-5 at S4   – unchecked" in detail
        assert "Nothing else in the data determines the pressure at PT-5." in detail


async def test_arrow_keys_step_through_the_spells_and_round(troubled_result: CheckResult):
    """The first picture is the one with flow, where losses show."""
    app = HeadledgerApp(Path("riser"), check=answers_with(troubled_result))
    async with app.run_test(size=SMALL) as pilot:
        await settled(pilot)
        assert picture(app).caption.startswith("Spell 2 of 2, flowing, 36.00 ± 0.72 m3/h")
        assert "▸ 2 flowing" in shown(app, "GaugeDetail")
        await pilot.press("right")
        assert picture(app).caption.startswith("Spell 1 of 2, still; grade line ± 0.10 m")
        assert "▸ 1 still" in shown(app, "GaugeDetail")
        await pilot.press("left")
        assert picture(app).caption.startswith("Spell 2 of 2")


async def test_key_w_draws_another_way_and_is_there_only_where_there_is_one(
    troubled_result: CheckResult,
):
    branched = sample_result("branched-sound")
    app = HeadledgerApp(Path("branched"), check=answers_with(branched))
    async with app.run_test(size=SMALL) as pilot:
        await settled(pilot)
        seen = set()
        for _ in range(3):
            seen.add(picture(app).stops[-1].text)
            await pilot.press("w")
        assert seen == {"NORTH", "EAST", "SOUTH"}
        assert "way" in {binding.binding.id for binding in app.screen.active_bindings.values()}
    app = HeadledgerApp(Path("riser"), check=answers_with(troubled_result))
    async with app.run_test(size=SMALL) as pilot:
        await settled(pilot)
        assert "way" not in {binding.binding.id for binding in app.screen.active_bindings.values()}


async def test_choosing_a_gauge_off_the_way_draws_one_past_it():
    app = HeadledgerApp(Path("branched"), check=answers_with(sample_result("branched-sound")))
    async with app.run_test(size=SMALL) as pilot:
        await settled(pilot)
        table = app.screen.query_one(GaugeTable)
        for tag in ("PT-33", "PT-35", "PI-34"):
            table.choose(tag)
            await pilot.pause()
            assert [mark.label for mark in picture(app).marks if mark.chosen] == [tag]


async def test_enter_opens_the_page_of_a_gauge_and_escape_comes_back_to_where_it_ended(troubled_result: CheckResult):
    app = HeadledgerApp(Path("riser"), check=answers_with(troubled_result))
    async with app.run_test(size=SMALL) as pilot:
        await settled(pilot)
        await pilot.press("enter")
        await pilot.pause()
        assert isinstance(app.screen, GaugeScreen)
        assert "PT-3 at S3   ▲ fail" in shown(app, "GaugeDetail")
        assert "PT-3 reads 0.21 bar high at every flow." in shown(app, ".finding")
        assert "Range      0 to 10 barg" in shown(app, "#identity")
        drawing = app.screen.query_one("#trend", PictureView).drawing
        assert drawing is not None
        assert drawing.caption.startswith("PT-3: reading and expected")
        await pilot.press("n", "right")
        await pilot.pause()
        assert "PT-4 at S4   ? unresolved" in shown(app, "GaugeDetail")
        assert "Run R2 loses 0.31 bar more" in shown(app, ".finding")
        assert "▸ 1 still" in shown(app, "GaugeDetail")
        await pilot.press("escape")
        await pilot.pause()
        assert isinstance(app.screen, FindingsScreen)
        assert [mark.label for mark in picture(app).marks if mark.chosen] == ["PT-4"]
        assert picture(app).caption.startswith("Spell 1 of 2")


async def test_page_of_a_gauge_that_said_nothing_says_so_without_a_trend(troubled_result: CheckResult):
    result = replace(troubled_result, trend=None)
    app = HeadledgerApp(Path("riser"), check=answers_with(result))
    async with app.run_test(size=LARGE) as pilot:
        await settled(pilot)
        await pilot.press("enter")
        await pilot.pause()
        assert app.screen.query_one("#trend", PictureView).drawing is None
        assert "PT-3 at S3" in shown(app, "GaugeDetail")


async def test_palette_finds_a_gauge_by_a_part_of_its_tag(troubled_result: CheckResult):
    app = HeadledgerApp(Path("riser"), check=answers_with(troubled_result))
    async with app.run_test(size=SMALL) as pilot:
        await settled(pilot)
        search = GaugeSearch(app.screen)
        assert [hit.text async for hit in search.discover()] == ["PT-3", "PT-4", "PT-5", "PT-1", "PT-2"]
        hits = [hit async for hit in search.search("t-5")]
        assert [str(hit.help) for hit in hits] == ["– unchecked, at S4"]
        hits[0].command()
        await pilot.pause()
        assert isinstance(app.screen, GaugeScreen)
        assert "PT-5 at S4" in shown(app, "GaugeDetail")


async def test_help_names_every_key_of_the_screen(troubled_result: CheckResult):
    app = HeadledgerApp(Path("riser"), check=answers_with(troubled_result))
    async with app.run_test(size=LARGE) as pilot:
        await settled(pilot)
        for key in ("←", "→", "↑", "↓", "enter", "**w**", "**a**", "**f**", "**g**", "**r**"):
            assert key in FindingsScreen.HELP
        await pilot.press("question_mark")
        await pilot.pause()
        assert app.screen.query("HelpPanel")


async def test_key_a_unfolds_the_answers(troubled_result: CheckResult):
    app = HeadledgerApp(Path("riser"), check=answers_with(troubled_result))
    async with app.run_test(size=SMALL) as pilot:
        await settled(pilot)
        answers = app.screen.query_one(Answers)
        assert answers.region.height == 5
        await pilot.press("a")
        await pilot.pause()
        assert answers.region.height > 5
        assert app.screen.query_one(GaugeTable).region.height >= 4
        await pilot.press("a")
        await pilot.pause()
        assert answers.region.height == 5


async def test_keys_move_between_gauges_and_findings(troubled_result: CheckResult):
    app = HeadledgerApp(Path("riser"), check=answers_with(troubled_result))
    async with app.run_test(size=SMALL) as pilot:
        await settled(pilot)
        assert isinstance(app.focused, GaugeTable)
        await pilot.press("f")
        await pilot.pause()
        aside = app.screen.query_one("#aside")
        assert app.focused is aside
        assert aside.region.contains_region(app.screen.query_one(FindingsList).region)
        await pilot.press("f")
        assert isinstance(app.focused, GaugeTable)
        await pilot.press("f")
        await pilot.press("g")
        assert isinstance(app.focused, GaugeTable)
        assert app.screen.query_one("#line").display


async def test_brackets_of_names_and_sentences_are_shown_as_written(troubled_result: CheckResult):
    job = replace(troubled_result.job, title="Loop [bar] [/x] [red]")
    gauge = found_gauge("PT[1]", "S[m]", Verdict.FAIL, why="[kPa] [/] kept")
    cause = replace(troubled_result.causes[0], says="reads [bar] high [/b]")
    spells = tuple(replace(spell, grade=()) for spell in troubled_result.spells)
    result = replace(troubled_result, job=job, spells=spells, gauges=(gauge,), causes=(cause,))
    app = HeadledgerApp(Path("riser"), check=answers_with(result))
    async with app.run_test(size=LARGE) as pilot:
        await settled(pilot)
        assert "Loop [bar] [/x] [red]" in shown(app, "TitleLine")
        assert table_rows(app)[0][1] == "PT[1]"
        assert "PT[1] at S[m]" in shown(app, "GaugeDetail")
        assert "[kPa] [/] kept" in shown(app, "GaugeDetail")
        assert "reads [bar] high [/b]" in shown(app, ".finding")
        assert "reads [bar] high [/b]" in shown(app, ".answer")


async def test_unusable_job_lists_every_problem(troubled_result: CheckResult):
    problems = [
        Problem("gauges.csv, row 4, unit", "is no unit of pressure", "[brag]", "a unit such as barg"),
        Problem("runs.csv, row 2, bore [mm]", "is blank"),
    ]
    app = HeadledgerApp(Path("riser"), check=raises(JobError(problems)))
    async with app.run_test(size=SMALL) as pilot:
        await settled(pilot)
        assert isinstance(app.screen, EndedScreen)
        assert "2 problems" in shown(app, "#heading")
        assert shown(app, ".problem").splitlines() == [str(problem) for problem in problems]
        assert app.ending is Ending.REFUSED


@pytest.mark.parametrize(
    ("error", "ending"),
    [
        (NothingToCheckError("no spell holds a reading"), Ending.NOTHING_TO_CHECK),
        (NetworkError("run R1 has no solution"), Ending.REFUSED),
        (ZeroDivisionError("division by zero"), Ending.FAULT),
    ],
)
async def test_error_in_the_thread_is_told_on_the_screen(error: Exception, ending: Ending):
    app = HeadledgerApp(Path("riser"), check=raises(error))
    async with app.run_test(size=SMALL) as pilot:
        await settled(pilot)
        assert app.ending is ending
        assert str(error) in shown(app, ".problem")
        await pilot.press("q")
    assert not app.is_running


async def test_working_screen_stands_while_the_check_runs(sound_result: CheckResult):
    with held(sound_result) as check:
        app = HeadledgerApp(Path("riser"), check=check)
        async with app.run_test(size=SMALL) as pilot:
            assert isinstance(app.screen, WorkingScreen)
            assert check.at_half.wait(5)
            await pilot.pause()
            assert str(app.screen.query_one("#step", Label).render()) == "Checking: weighing causes"
            check.let_go.set()
            await settled(pilot)
            assert isinstance(app.screen, FindingsScreen)


async def test_escape_stops_the_check_and_its_half_result_is_not_shown(sound_result: CheckResult):
    with held(sound_result) as check:
        app = HeadledgerApp(Path("riser"), check=check)
        async with app.run_test(size=SMALL) as pilot:
            assert check.at_half.wait(5)
            await pilot.press("escape")
            await wait_until(pilot, lambda: isinstance(app.screen, EndedScreen))
            assert app.ending is Ending.STOPPED
            assert "stopped" in shown(app, "#heading")


async def test_check_again_runs_the_check_anew(sound_result: CheckResult):
    with held(sound_result) as check:
        app = HeadledgerApp(Path("riser"), check=check)
        async with app.run_test(size=SMALL) as pilot:
            assert check.at_half.wait(5)
            await pilot.press("escape")
            await wait_until(pilot, lambda: isinstance(app.screen, EndedScreen))
            check.let_go.set()
            await pilot.press("r")
            await wait_until(pilot, lambda: isinstance(app.screen, FindingsScreen))
            assert check.runs == 2
            assert app.ending is Ending.FOUND


async def test_flood_of_progress_ends_with_the_newest(sound_result: CheckResult):
    done = threading.Event()

    def check(folder: Path, *, on_progress: Callable[[str, float], None], should_stop: Callable[[], bool]):
        for step in range(2000):
            on_progress(f"step {step}", step / 2000)
        done.wait(10)
        return sound_result

    app = HeadledgerApp(Path("riser"), check=check)
    async with app.run_test(size=SMALL) as pilot:
        try:
            step = app.screen.query_one("#step", Label)
            await wait_until(pilot, lambda: str(step.render()) == "Checking: step 1999")
            assert isinstance(app.screen, WorkingScreen)
        finally:
            done.set()
        await settled(pilot)


async def test_without_colour_a_failure_is_bold_and_underlined(
    troubled_result: CheckResult, monkeypatch: pytest.MonkeyPatch
):
    monkeypatch.setenv("NO_COLOR", "1")
    app = HeadledgerApp(Path("riser"), check=answers_with(troubled_result))
    async with app.run_test(size=SMALL) as pilot:
        await settled(pilot)
        cell = app.screen.query_one(GaugeTable).get_row_at(0)[0]
        assert isinstance(cell, Text)
        style = cell.style
        assert not isinstance(style, str)
        assert style.bold
        assert style.underline
        assert "ansi-dark" not in app.available_themes


async def test_change_of_theme_keeps_rows_and_cursor(troubled_result: CheckResult):
    app = HeadledgerApp(Path("riser"), check=answers_with(troubled_result))
    async with app.run_test(size=SMALL) as pilot:
        await settled(pilot)
        await pilot.press("down")
        before = table_rows(app)
        dark = app.screen.query_one(GaugeTable).get_row_at(0)[0].style
        app.theme = "headledger-light"
        await pilot.pause()
        table = app.screen.query_one(GaugeTable)
        assert table_rows(app) == before
        assert table.cursor_row == 1
        assert table.get_row_at(0)[0].style != dark
        assert app.screen.query_one(GaugeDetail).gauge == table.gauge_at(1)


@pytest.mark.parametrize("theme", ["headledger-dark", "headledger-light"])
async def test_every_verdict_can_be_read_on_its_background(troubled_result: CheckResult, theme: str):
    """A contrast of 4.5 to 1 is what the Web Content Accessibility Guidelines 2.1 ask for (1.4.3, level AA)."""
    app = HeadledgerApp(Path("riser"), check=answers_with(troubled_result))
    async with app.run_test(size=SMALL) as pilot:
        await settled(pilot)
        app.theme = theme
        await pilot.pause()
        table = app.screen.query_one(GaugeTable)
        for row in range(table.row_count):
            style = table.get_row_at(row)[0].style
            assert isinstance(style, Style)
            assert style.color
            assert contrast(Color.from_rich_color(style.color), table.background_colors[1]) >= 4.5, row


async def test_picture_of_the_screen_fetches_nothing(sound_result: CheckResult):
    app = HeadledgerApp(Path("riser"), check=answers_with(sound_result))
    async with app.run_test(size=SMALL) as pilot:
        await settled(pilot)
        addresses = re.findall(r"https?://[^\s\"')]+", app.export_screenshot())
    assert set(addresses) == {"http://www.w3.org/2000/svg"}


async def test_hundreds_of_gauges_stay_in_order(sound_result: CheckResult):
    gauges = tuple(found_gauge(f"PT-{i:03}", "S1", Verdict.FAIL if i % 50 == 0 else Verdict.PASS) for i in range(300))
    app = HeadledgerApp(Path("riser"), check=answers_with(replace(sound_result, gauges=gauges)))
    async with app.run_test(size=SMALL) as pilot:
        await settled(pilot)
        rows = table_rows(app)
        assert [row[1] for row in rows[:6]] == ["PT-000", "PT-050", "PT-100", "PT-150", "PT-200", "PT-250"]
        assert len(rows) == 300
        await pilot.press("ctrl+end")
        await pilot.pause()
        assert app.screen.query_one(GaugeTable).cursor_row == 299
        assert "PT-299" in shown(app, "GaugeDetail")


async def wait_until(pilot: Pilot[None], holds: Callable[[], bool]) -> None:
    """Let the screen work until something holds; fails the test where it never does."""
    for _ in range(500):
        await pilot.pause(0.01)
        if holds():
            return
    raise AssertionError("it never came to hold")


@pytest.mark.parametrize("size", [SMALL, LARGE], ids=["80x24", "160x48"])
async def test_sight_screen_shows_picture_and_tables_and_leads_back(size: tuple[int, int]):
    app = HeadledgerApp(Path("riser"), check=answers_with(sample_result("riser-drift")))
    async with app.run_test(size=size) as pilot:
        await app.workers.wait_for_complete()
        await pilot.pause()
        await pilot.press("s")
        await pilot.pause()
        assert isinstance(app.screen, SightScreen)
        drawing = app.screen.query_one(PictureView).drawing
        assert drawing is not None
        assert {"PT-24", "PT-32"} <= {mark.label for mark in drawing.marks}
        titles = [str(title.content) for title in app.screen.query(".section-title").results(Static)]
        assert titles == [
            "Readings",
            "Gauges",
            "Pipe, meters and liquid",
            "What these readings cannot do",
            "One reading more",
        ]
        await pilot.press("escape")
        await pilot.pause()
        assert isinstance(app.screen, FindingsScreen)


async def test_result_without_a_sight_has_no_key_for_it(troubled_result: CheckResult):
    app = HeadledgerApp(Path("riser"), check=answers_with(troubled_result))
    async with app.run_test(size=SMALL) as pilot:
        await app.workers.wait_for_complete()
        await pilot.pause()
        await pilot.press("s")
        await pilot.pause()
        assert isinstance(app.screen, FindingsScreen)
