"""Screens as pictures, small and large: what asserts on words cannot see."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path
from typing import Any

import pytest
from textual.pilot import Pilot

from headledger.diagnosis.result import CheckResult
from headledger.tui.app import HeadledgerApp

SIZES = pytest.mark.parametrize("size", [(80, 24), (160, 48)], ids=["80x24", "160x48"])


def presses(*keys: str) -> Callable[[Pilot[None]], Any]:
    async def finish(pilot: Pilot[None]) -> None:
        await pilot.app.workers.wait_for_complete()
        await pilot.pause()
        await pilot.press(*keys)
        await pilot.pause()

    return finish


def app_with(result: CheckResult) -> HeadledgerApp:
    def check(folder: Path, **_: Any) -> CheckResult:
        return result

    return HeadledgerApp(Path("riser"), check=check)


@SIZES
def test_findings_screen_looks_as_it_did(
    troubled_result: CheckResult, snap_compare: Callable[..., bool], size: tuple[int, int]
):
    assert snap_compare(app_with(troubled_result), run_before=presses(), terminal_size=size)


@SIZES
def test_gauge_page_looks_as_it_did(
    troubled_result: CheckResult, snap_compare: Callable[..., bool], size: tuple[int, int]
):
    assert snap_compare(app_with(troubled_result), run_before=presses("enter"), terminal_size=size)


@SIZES
def test_why_screen_looks_as_it_did(
    troubled_result: CheckResult, snap_compare: Callable[..., bool], size: tuple[int, int]
):
    assert snap_compare(app_with(troubled_result), run_before=presses("y"), terminal_size=size)


def test_findings_in_place_of_the_picture_look_as_they_did(
    troubled_result: CheckResult, snap_compare: Callable[..., bool]
):
    assert snap_compare(app_with(troubled_result), run_before=presses("f"), terminal_size=(80, 24))
