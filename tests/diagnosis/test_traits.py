"""What the log says between and within the spells: noise, lag, late stamps, a leak; each made by hand on a whole log."""

from __future__ import annotations

import shutil
from datetime import UTC, datetime, timedelta
from pathlib import Path

import numpy as np
import pytest

from headledger.diagnosis.check import check_folder
from headledger.diagnosis.result import CauseFound, CauseKind, CheckResult, Verdict

GAUGES = ("PT-1", "PT-2", "PT-3", "PT-4", "PT-5")
STATIONS = ("A", "B", "C", "D", "E")
STEP_S, SPELL_S, RAMP_S = 2.0, 480.0, 40.0
FLOWS = (0.0, 36.0, 20.0, 44.0)


def levels(time_s: np.ndarray) -> np.ndarray:
    """Flow in m³/h at every moment: four spells, each eased into over 40 s."""
    spell = np.clip((time_s // SPELL_S).astype(int), 0, len(FLOWS) - 1)
    before = np.array(FLOWS)[np.maximum(spell - 1, 0)]
    part = np.clip((time_s - spell * SPELL_S) / RAMP_S, 0.0, 1.0)
    return np.asarray(before + part * (np.array(FLOWS)[spell] - before))


def readings(seed: int = 5) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    """Times, bars of five gauges on a level line, and the meter: 5 bar at the start, 0.1 bar lost in each run at 36 m³/h."""
    random = np.random.default_rng(seed)
    time_s = np.arange(0.0, SPELL_S * len(FLOWS), STEP_S)
    flow = levels(time_s)
    loss = 0.1 * (flow / 36.0) ** 2
    bars = 5.0 - loss[:, None] * np.arange(5) + 0.004 * random.standard_normal((time_s.size, 5))
    return time_s, bars, flow + 0.02 * random.standard_normal(time_s.size)


def write_job(
    folder: Path,
    *,
    exchange: str = "open",
    runs_with_meter: bool = True,
    logs: tuple[str, ...] = ("log.csv",),
    length_m: float = 0.0,
) -> Path:
    """A level line of five stations; each run loses 10 kPa at 36 m³/h, whatever its length, by a C at which pipe loses nothing."""
    folder.mkdir(exist_ok=True)
    names = ", ".join(f'"{name}"' for name in logs)
    (folder / "job.toml").write_text(
        f'[job]\ntitle = "line"\nstations = "stations.csv"\nruns = "runs.csv"\ngauges = "gauges.csv"\nlogs = [{names}]\n'
        '[liquid]\ntemperature = "15 degC"\n[site]\nbarometer = "101.3 kPa"\n'
    )
    ends = [exchange if name in "AE" else "closed" for name in STATIONS]
    rows = [f"{name},0,{end}" for name, end in zip(STATIONS, ends, strict=True)]
    (folder / "stations.csv").write_text("\n".join(["station,elevation [m],exchange", *rows]) + "\n")
    rows = [
        f"R{i + 1},{STATIONS[i]},{STATIONS[i + 1]},{length_m:g},1e9,100,10,36,{'FT-1,m3/h' if i == 0 and runs_with_meter else ','}"
        for i in range(4)
    ]
    head = "run,from,to,length [m],hazen-williams C,bore [mm],rated drop [kPa],rated flow [m3/h],flow column,flow unit"
    (folder / "runs.csv").write_text("\n".join([head, *rows]) + "\n")
    rows = [f"{tag},{at},barg,0,10,0.25 % span,1 % span,0.001" for tag, at in zip(GAUGES, STATIONS, strict=True)]
    head = "tag,station,unit,range low,range high,accuracy,tolerance,division"
    (folder / "gauges.csv").write_text("\n".join([head, *rows]) + "\n")
    return folder


def write_log(path: Path, time_s: np.ndarray, columns: dict[str, np.ndarray]) -> None:
    start = datetime(2026, 3, 2, 8, tzinfo=UTC)
    lines = ["time," + ",".join(columns)]
    for row, moment in enumerate(time_s):
        stamp = (start + timedelta(seconds=float(moment))).isoformat().replace("+00:00", "Z")
        lines.append(",".join([stamp, *(f"{values[row]:.3f}" for values in columns.values())]))
    path.write_text("\n".join(lines) + "\n")


def checked(
    folder: Path, time_s: np.ndarray, bars: np.ndarray, flow: np.ndarray, *, length_m: float = 0.0
) -> CheckResult:
    write_job(folder, length_m=length_m)
    write_log(folder / "log.csv", time_s, dict(zip(GAUGES, bars.T, strict=True)) | {"FT-1": flow})
    return check_folder(folder)


def first(result: CheckResult) -> CauseFound:
    return result.causes[0]


@pytest.mark.parametrize("seed", [5, 6, 7])
def test_sound_line_has_no_trait(tmp_path: Path, seed: int):
    result = checked(tmp_path / "job", *readings(seed))
    assert result.clean_probability > 0.5
    assert {gauge.verdict for gauge in result.gauges} == {Verdict.PASS}


def test_noisy_signal_is_found(tmp_path: Path):
    """PT-3 scatters by 0.04 bar where the others scatter by 0.004."""
    time_s, bars, flow = readings()
    bars[:, 2] += 0.04 * np.random.default_rng(1).standard_normal(time_s.size)
    found = first(checked(tmp_path / "job", time_s, bars, flow))
    assert (found.kind, found.place.gauge, found.accepted) == (CauseKind.NOISY, "PT-3", True)


@pytest.mark.parametrize("constant_s", [25.0, 60.0])
def test_slow_gauge_is_found_with_its_time_constant(tmp_path: Path, constant_s: float):
    """PT-5 follows by a first-order lag."""
    time_s, bars, flow = readings()
    keep = float(np.exp(-STEP_S / constant_s))
    for row in range(1, time_s.size):
        bars[row, 4] = keep * bars[row - 1, 4] + (1.0 - keep) * bars[row, 4]
    found = first(checked(tmp_path / "job", time_s, bars, flow))
    assert (found.kind, found.place.gauge, found.accepted) == (CauseKind.SLUGGISH, "PT-5", True)
    assert found.size == pytest.approx(constant_s, rel=0.25)


@pytest.mark.parametrize("late_s", [40.0, -30.0])
def test_late_log_is_found_and_set_right(tmp_path: Path, late_s: float):
    """The second log's clock is off; its two gauges still pass, since their readings are moved back before they are judged."""
    time_s, bars, flow = readings()
    folder = write_job(tmp_path / "job", logs=("log.csv", "late.csv"))
    write_log(folder / "log.csv", time_s, dict(zip(GAUGES[:3], bars.T[:3], strict=True)) | {"FT-1": flow})
    write_log(folder / "late.csv", time_s + late_s, dict(zip(GAUGES[3:], bars.T[3:], strict=True)))
    result = check_folder(folder)
    found = first(result)
    assert (found.kind, set(found.place.gauges), found.accepted) == (CauseKind.CLOCK_OFFSET, {"PT-4", "PT-5"}, True)
    assert found.size == pytest.approx(late_s, abs=4.0)
    assert {gauge.verdict for gauge in result.gauges} == {Verdict.PASS}


@pytest.mark.parametrize(("length_m", "raised"), [(0.0, {CauseKind.SLUGGISH}), (5000.0, set())])
def test_lag_of_a_gauge_is_a_trait_only_where_no_wave_takes_as_long(
    tmp_path: Path, length_m: float, raised: set[CauseKind]
):
    """PT-5 follows with 50 s; through 4 runs of 5 km a wave of 250 m/s takes 80 s, through a short line none."""
    time_s, bars, flow = readings()
    keep = float(np.exp(-STEP_S / 50.0))
    for row in range(1, time_s.size):
        bars[row, 4] = keep * bars[row - 1, 4] + (1.0 - keep) * bars[row, 4]
    result = checked(tmp_path / "job", time_s, bars, flow, length_m=length_m)
    assert {cause.kind for cause in result.causes if cause.probability > 0.05} == raised


@pytest.mark.parametrize("late_s", [40.0, -30.0])
def test_late_log_on_a_long_line_is_no_trait(tmp_path: Path, late_s: float):
    """What is a clock's fault on a short line may be a wave's way through 20 km, 80 s at 250 m/s."""
    time_s, bars, flow = readings()
    folder = write_job(tmp_path / "job", logs=("log.csv", "late.csv"), length_m=5000.0)
    write_log(folder / "log.csv", time_s, dict(zip(GAUGES[:3], bars.T[:3], strict=True)) | {"FT-1": flow})
    write_log(folder / "late.csv", time_s + late_s, dict(zip(GAUGES[3:], bars.T[3:], strict=True)))
    assert not [cause for cause in check_folder(folder).causes if cause.probability > 0.05]


def test_leak_of_a_shut_section_is_found_with_its_rate(tmp_path: Path):
    """All five gauges fall together by 0.12 bar an hour over 32 minutes at rest; the section has no way in or out."""
    time_s, bars, _ = readings()
    random = np.random.default_rng(3)
    still = 5.0 - 0.12 * time_s[:, None] / 3600.0 + 0.004 * random.standard_normal(bars.shape)
    folder = write_job(tmp_path / "job", exchange="closed", runs_with_meter=False)
    write_log(folder / "log.csv", time_s, dict(zip(GAUGES, still.T, strict=True)))
    (folder / "spells.csv").write_text("start,end,kind\n2026-03-02T08:00:00Z,2026-03-02T08:31:58Z,still\n")
    toml = folder / "job.toml"
    toml.write_text(toml.read_text().replace("[liquid]", 'spells = "spells.csv"\n[liquid]'))
    result = check_folder(folder)
    found = first(result)
    assert (found.kind, found.accepted) == (CauseKind.LEAK, True)
    assert found.size == pytest.approx(-0.12e5 / 3600.0, rel=0.1)
    assert {gauge.verdict for gauge in result.gauges} == {Verdict.PASS}


def test_line_with_a_way_out_that_falls_has_no_leak(tmp_path: Path):
    """The same fall where liquid may leave at both ends is what the line is for."""
    time_s, bars, _ = readings()
    still = 5.0 - 0.12 * time_s[:, None] / 3600.0 + 0.004 * np.random.default_rng(3).standard_normal(bars.shape)
    folder = write_job(tmp_path / "job", runs_with_meter=False)
    write_log(folder / "log.csv", time_s, dict(zip(GAUGES, still.T, strict=True)))
    assert not any(cause.kind is CauseKind.LEAK for cause in check_folder(folder).causes)
    shutil.rmtree(folder)


def test_drifting_gauge_does_not_cut_the_spells(tmp_path: Path):
    """PT-2 wanders off by 0.4 bar an hour; the spells are still the four that the flow has."""
    time_s, bars, flow = readings()
    bars[:, 1] += 0.4 * time_s / 3600.0
    result = checked(tmp_path / "job", time_s, bars, flow)
    assert len(result.spells) == len(FLOWS)
    found = first(result)
    assert (found.kind, found.place.gauge) == (CauseKind.DRIFT, "PT-2")
    assert found.size == pytest.approx(0.4e5 / 3600.0, rel=0.1)
    assert found.start_s is not None
