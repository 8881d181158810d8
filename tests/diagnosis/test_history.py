"""Control charts of a gauge against its neighbours: quiet where it keeps still, and out of their limits where it does not."""

from __future__ import annotations

from datetime import UTC, datetime
from pathlib import Path

import numpy as np
import pytest

from headledger.diagnosis.check import check_folder
from headledger.diagnosis.history import _first_leaving, _scatter
from headledger.diagnosis.result import CheckResult, GaugeHistory

from .test_traits import GAUGES, SPELL_S, checked, readings, write_job, write_log

START_S = datetime(2026, 3, 2, 8, tzinfo=UTC).timestamp()


def history(result: CheckResult, tag: str) -> GaugeHistory:
    return next(one for one in result.histories if one.tag == tag)


def test_charts_of_steady_gauges_hold(tmp_path: Path):
    result = checked(tmp_path / "job", *readings())
    assert [one.tag for one in result.histories] == list(GAUGES)
    assert all(one.holds and one.leaves_at_s is None and one.by is None for one in result.histories)
    assert history(result, "PT-1").says.endswith("in limits over the whole log.")


def test_charts_of_a_gauge_that_steps_within_a_spell_leave_their_limits_soon_after_and_no_other_gauge_does(
    tmp_path: Path,
):
    """PT-3 rises by 0.05 bar, twelve times its noise, 200 s into the third spell; that spell has 280 s left."""
    time_s, bars, flow = readings()
    step_s = 2.0 * SPELL_S + 200.0
    bars[time_s >= step_s, 2] += 0.05
    result = checked(tmp_path / "job", time_s, bars, flow)
    found = history(result, "PT-3")
    assert not found.holds
    assert found.leaves_at_s is not None
    assert START_S + step_s - 60.0 <= found.leaves_at_s <= START_S + 3.0 * SPELL_S
    clock = f"{datetime.fromtimestamp(found.leaves_at_s, UTC):%H:%M}"
    assert found.says.endswith(f"they leave their limits at {clock} ({found.by.upper() if found.by else ''}).")
    assert [one.tag for one in result.histories if not one.holds] == ["PT-3"]


def test_charts_of_a_drifting_gauge_leave_their_limits(tmp_path: Path):
    """PT-2 drifts by 0.4 bar an hour all along: 0.05 bar a spell, of which each spell shows its own part."""
    time_s, bars, flow = readings()
    bars[:, 1] += 0.4 * time_s / 3600.0
    assert not history(checked(tmp_path / "job", time_s, bars, flow), "PT-2").holds


def test_stretch_that_stands_alone_is_named_and_left_out(tmp_path: Path):
    """PT-4 reads 0.3 bar low for 50 s while somebody looks at it."""
    time_s, bars, flow = readings()
    away_s = 3.0 * SPELL_S + 250.0
    bars[(time_s >= away_s) & (time_s < away_s + 50.0), 3] -= 0.3
    found = history(checked(tmp_path / "job", time_s, bars, flow), "PT-4")
    assert found.holds
    assert found.spike_s == pytest.approx(START_S + away_s, abs=60.0)
    assert "but for a stretch that stands alone at 08:2" in found.says


def test_charts_of_independent_stretches_leave_their_limits_as_seldom_as_designed():
    """1000 drawn logs of four spells of eight stretches: each of two charts at most 0.5 %, so 1 %, which 20 of them would exceed."""
    random = np.random.default_rng(8)
    times = [np.arange(8.0) + 8.0 * k for k in range(4)]
    left = 0
    for _ in range(1000):
        means = list(random.normal(size=(4, 8)) + 50.0 * random.normal(size=(4, 1)))
        left += _first_leaving(means, times, _scatter(means, 0.0))[0] is not None
    assert left < 20


def test_line_of_a_stretched_gauge_has_its_span_and_zero(tmp_path: Path):
    """PT-5 reads 1.05 of the true gauge pressure and 0.1 bar more, over 4.4 to 5 bar; its neighbours know that to a few per cent."""
    time_s, bars, flow = readings()
    bars[:, 4] = 1.05 * bars[:, 4] + 0.1
    found = history(checked(tmp_path / "job", time_s, bars, flow), "PT-5")
    assert found.span_ratio is not None
    assert found.span_sd_ratio is not None
    assert found.zero_pa is not None
    assert found.zero_sd_pa is not None
    assert found.span_ratio == pytest.approx(1.05, abs=2.0 * found.span_sd_ratio)
    assert found.zero_pa == pytest.approx(0.1e5, abs=2.0 * found.zero_sd_pa)
    assert found.span_sd_ratio < 0.1


def test_gauge_without_neighbours_has_no_history(tmp_path: Path):
    """Two gauges logged: each has one neighbour alone, and one motion says nothing of another."""
    time_s, bars, flow = readings()
    folder = write_job(tmp_path / "job")
    write_log(folder / "log.csv", time_s, dict(zip(GAUGES[:2], bars.T[:2], strict=True)) | {"FT-1": flow})
    assert check_folder(folder).histories == ()
