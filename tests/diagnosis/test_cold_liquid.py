"""A liquid near the end of its table, and a temperature sensor that says what no liquid can be."""

from __future__ import annotations

import shutil
from pathlib import Path

import pytest

from headledger.diagnosis.check import check_folder
from headledger.diagnosis.result import Verdict

SAMPLE = Path(__file__).parents[2] / "sample_logs" / "branched-sound"


def changed_sample(folder: Path, *changes: tuple[str, str]) -> Path:
    """A copy of the sound sample with words of its job.toml replaced."""
    copy = folder / "job"
    shutil.copytree(SAMPLE, copy)
    settings = copy / "job.toml"
    text = settings.read_text(encoding="utf-8")
    for old, new in changes:
        assert old in text
        text = text.replace(old, new)
    settings.write_text(text, encoding="utf-8")
    return copy


@pytest.mark.parametrize(
    ("temperature", "doubt", "ambient"),
    [("2 degC", "±10 K", ""), ("0 degC", "±1 K", ""), ("14 degC", "±1 K", "-6 degC")],
)
def test_check_near_freezing_keeps_to_the_liquid(tmp_path: Path, temperature: str, doubt: str, ambient: str) -> None:
    """A doubt or an instrument below the freezing point is no reason to refuse a job: water stays water to 0 °C.

    The densities of water at 0 and 14 °C differ by 0.06 % (IAPWS-95 tables), far inside the gauges' 1 %.
    """
    site = f'\nambient = "{ambient}"' if ambient else ""
    folder = changed_sample(
        tmp_path,
        ('temperature = "14 degC"', f'temperature = "{temperature}"'),
        ('"±1 K"', f'"{doubt}"'),
        ('barometer = "100.6 kPa"', f'barometer = "100.6 kPa"{site}'),
    )
    result = check_folder(folder)
    assert {gauge.verdict for gauge in result.gauges} == {Verdict.PASS}


def test_check_leaves_a_strayed_temperature_sensor_aside(tmp_path: Path) -> None:
    folder = changed_sample(
        tmp_path,
        ('temperature = "14 degC"', 'temperature = { column = "TT-9", unit = "degC" }'),
    )
    log = folder / "log.csv"
    lines = log.read_text(encoding="utf-8").splitlines()
    readings = ["TT-9", *("14.1" if row % 2 else "-40" for row in range(len(lines) - 1))]
    log.write_text("".join(f"{line},{value}\n" for line, value in zip(lines, readings, strict=True)), encoding="utf-8")
    result = check_folder(folder)
    assert {gauge.verdict for gauge in result.gauges} == {Verdict.PASS}
    assert any("logged temperature lie outside" in remark for remark in result.remarks)
