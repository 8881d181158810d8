"""A logged barometer: an absolute gauge moves with the weather, a vented one does not, and neither is to blame."""

from __future__ import annotations

from pathlib import Path

import pytest

from headledger.diagnosis.check import check_folder
from headledger.diagnosis.result import CheckResult, Verdict

JOB = """\
format = 1
[job]
title = "weather"
stations = "stations.csv"
runs = "runs.csv"
gauges = "gauges.csv"
logs = ["log.csv"]
spells = "spells.csv"
[site]
barometer = { column = "BARO", unit = "hPa" }
"""
GAUGES = """\
tag,station,unit,range low,range high,accuracy,tolerance
PA,A,bara,0,4,0.1 % span,0.25 % span
PB,B,barg,0,4,0.1 % span,0.25 % span
PC,C,barg,0,4,0.1 % span,0.25 % span
"""
GAUGE_PRESSURE_BAR = 1.5
BAROMETERS_HPA = (975.0, 1010.0)


def weather_job(folder: Path, *, logged: bool) -> CheckResult:
    """Three gauges on one level at rest under 1.5 bar, through a change of weather of 35 hPa; the absolute one reads it besides."""
    (folder / "job.toml").write_text(JOB, encoding="utf-8")
    (folder / "gauges.csv").write_text(GAUGES, encoding="utf-8")
    (folder / "stations.csv").write_text("station,elevation [m]\nA,0\nB,0\nC,0\n", encoding="utf-8")
    (folder / "runs.csv").write_text("run,from,to,bore [mm]\nR1,A,B,100\nR2,B,C,100\n", encoding="utf-8")
    spells = ["start,end,kind"]
    rows = ["time,PA,PB,PC" + (",BARO" if logged else "")]
    for hour, barometer_hpa in zip((8, 14), BAROMETERS_HPA, strict=True):
        spells.append(f"2026-05-01T{hour:02d}:00:00Z,2026-05-01T{hour:02d}:20:00Z,still")
        for minute in range(20):
            ripple = 0.0004 * (-1) ** minute
            absolute = GAUGE_PRESSURE_BAR + barometer_hpa / 1000.0 + ripple
            said = f"2026-05-01T{hour:02d}:{minute:02d}:00Z,{absolute:.5f},{GAUGE_PRESSURE_BAR - ripple:.5f},{GAUGE_PRESSURE_BAR:.5f}"
            rows.append(said + (f",{barometer_hpa:.1f}" if logged else ""))
    (folder / "spells.csv").write_text("\n".join(spells) + "\n", encoding="utf-8")
    (folder / "log.csv").write_text("\n".join(rows) + "\n", encoding="utf-8")
    return check_folder(folder)


def test_absolute_gauge_is_expected_to_follow_the_logged_barometer(tmp_path: Path):
    result = weather_job(tmp_path, logged=True)
    absolute = result.gauges[0]
    expected = [spell.expected_pa for spell in absolute.spells]
    by_hand = [(GAUGE_PRESSURE_BAR + hpa / 1000.0) * 1e5 for hpa in BAROMETERS_HPA]
    assert expected == pytest.approx(by_hand, abs=150.0)
    assert [gauge.verdict for gauge in result.gauges] == [Verdict.PASS] * 3
    assert any("logged as BARO, 99.25 kPa on average" in remark for remark in result.remarks)


def test_barometer_whose_column_is_missing_is_doubted_as_the_weather(tmp_path: Path):
    """1013.25 hPa stands in for 975 and 1010: ±20 hPa (k = 2) of doubt, far more than the tolerance of 10 hPa."""
    result = weather_job(tmp_path, logged=False)
    assert result.gauges[0].verdict is not Verdict.PASS
    assert any("no log has a column 'BARO'; the standard atmosphere stands in" in remark for remark in result.remarks)
