"""The screen that says why: which finding it opens with, what its keys do, and that every number is told in words."""

from __future__ import annotations

from pathlib import Path
from typing import Any

import pytest
from textual.pilot import Pilot
from textual.widgets import Static

from headledger.diagnosis.result import CheckResult
from headledger.tui.app import HeadledgerApp
from headledger.tui.screens.findings import FindingsScreen
from headledger.tui.screens.gauge import GaugeScreen
from headledger.tui.screens.why import WhyScreen

SMALL, LARGE = (80, 24), (160, 48)


def app_with(result: CheckResult) -> HeadledgerApp:
    def check(folder: Path, **_: Any) -> CheckResult:
        return result

    return HeadledgerApp(Path("riser"), check=check)


async def pressed(pilot: Pilot[None], *keys: str) -> None:
    await pilot.app.workers.wait_for_complete()
    await pilot.pause()
    await pilot.press(*keys)
    await pilot.pause()


def shown(app: HeadledgerApp, selector: str) -> list[str]:
    return [line.rstrip() for line in str(app.screen.query_one(selector, Static).render()).splitlines()]


@pytest.mark.parametrize("size", [SMALL, LARGE])
async def test_key_y_shows_what_the_finding_of_the_chosen_gauge_rests_on(
    troubled_result: CheckResult, size: tuple[int, int]
):
    app = app_with(troubled_result)
    async with app.run_test(size=size) as pilot:
        await pressed(pilot, "y")
        assert isinstance(app.screen, WhyScreen)
        lines = shown(app, "#behind")
        assert lines[:3] == [
            "Finding 1 of 2",
            "96 %  zero-shift at PT-3 (accepted)",
            "PT-3 reads 0.21 bar high at every flow.",
        ]
        assert "- The readings favour it 32 to 1 over a wrong elevation at PT-3." in lines
        assert "Misfit 208 → 11 over 18 readings (sum of squares, in standard deviations)." in lines
        rows = [" ".join(line.split()) for line in lines if "PT-" in line and line.endswith("bar")]
        assert rows == [
            "PT-2 1 -0.070 0.030 ▲ off -0.002 0.030 ✓ fits bar",
            "▸ PT-3 1 +0.210 0.030 ▲ off 0.000 0.030 ✓ fits bar",
            "▸ PT-3 2 +0.205 0.030 ▲ off – – – spoilt bar",
            "PT-4 2 -0.035 0.030 ▲ off +0.040 0.030 ▲ off bar",
        ]
        assert lines[-1] == "2 readings fit with no cause and with it."
        assert app.screen.query_one("#why").region.width == size[0]


async def test_finding_of_another_gauge_comes_first_for_that_gauge(troubled_result: CheckResult):
    """PT-4 leans on the blockage, the second finding."""
    app = app_with(troubled_result)
    async with app.run_test(size=SMALL) as pilot:
        await pressed(pilot, "down", "enter", "y")
        assert shown(app, "#behind")[0] == "Finding 2 of 2"
        assert shown(app, "#budget")[0] == "Uncertainty of PT-4"
        await pressed(pilot, "escape")
        assert isinstance(app.screen, GaugeScreen)


async def test_keys_step_through_the_findings_and_back(troubled_result: CheckResult):
    app = app_with(troubled_result)
    async with app.run_test(size=SMALL) as pilot:
        await pressed(pilot, "y", "n")
        assert shown(app, "#behind")[1] == "55 %  blockage at run R2"
        await pressed(pilot, "n")
        assert shown(app, "#behind")[0] == "Finding 1 of 2"
        await pressed(pilot, "p")
        assert shown(app, "#behind")[0] == "Finding 2 of 2"
        await pressed(pilot, "y")
        assert isinstance(app.screen, FindingsScreen)


async def test_uncertainty_is_told_by_bars_with_their_percent_and_brackets_as_written(troubled_result: CheckResult):
    app = app_with(troubled_result)
    async with app.run_test(size=LARGE) as pilot:
        await pressed(pilot, "y")
        budget = shown(app, "#budget")
        assert budget[2] == "Error +0.210 ± 0.030 bar (k = 2), tolerance ± 0.060 bar."
        assert [" ".join(line.split()) for line in budget[4:]] == [
            f"61 % {'█' * 16} class of PT-1",
            f"38 % {'█' * 10} elevation of S4 [survey]",
            "under 1 % █ the rest",
        ]


async def test_sound_job_has_no_finding_to_tell_of_but_an_uncertainty(sound_result: CheckResult):
    app = app_with(sound_result)
    async with app.run_test(size=SMALL) as pilot:
        await pressed(pilot, "y")
        assert shown(app, "#behind") == ["No finding has weight: there is nothing to hold the readings against."]
        assert app.screen.check_action("finding", (1,)) is False
        await pressed(pilot, "n")
        assert shown(app, "#budget")[0] == "Uncertainty of PT-1"


async def test_gauge_without_a_reading_has_no_uncertainty(troubled_result: CheckResult):
    app = app_with(troubled_result)
    async with app.run_test(size=SMALL) as pilot:
        await pressed(pilot, "down", "down", "y")
        assert shown(app, "#budget") == ["Uncertainty of PT-5", "PT-5 at S4   – unchecked", "It gave no reading."]
