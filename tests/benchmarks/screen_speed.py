"""How soon the screen is there, and how soon it answers a key: ratios to what the same machine needs for bare textual.

Run with ``python -m tests.benchmarks.screen_speed [JOB]``.
"""

from __future__ import annotations

import asyncio
import os
import shutil
import statistics
import subprocess
import sys
import tempfile
import time
from pathlib import Path
from typing import Any

SAMPLES = Path(__file__).parents[2] / "sample_logs"
ROUNDS = 7

# Run in a process of its own: says when the first frame stood and when the judged screen did, since the process was started.
_OPEN = """
import asyncio, os, sys, time
from pathlib import Path
from typing import Any
from headledger.tui.app import HeadledgerApp
started = float(os.environ["STARTED"])
app = HeadledgerApp(Path(sys.argv[1]))
async def go():
    async with app.run_test(size=(80, 24)) as pilot:
        first = time.time() - started
        await app.workers.wait_for_complete()
        await pilot.pause()
        print(first, time.time() - started)
asyncio.run(go())
"""


def seconds_of(*arguments: str) -> float:
    """Wall time of a process."""
    start = time.perf_counter()
    subprocess.run([sys.executable, *arguments], check=True)
    return time.perf_counter() - start


def opening(folder: Path) -> tuple[float, float]:
    """Seconds to the first frame and to the judged screen."""
    env = os.environ | {"STARTED": repr(time.time()), "TEXTUAL_ANIMATIONS": "none"}
    done = subprocess.run(
        [sys.executable, "-c", _OPEN, str(folder)], env=env, capture_output=True, text=True, check=True
    )
    first, judged = map(float, done.stdout.split())
    return first, judged


def job_of_forty_gauges(folder: Path) -> Path:
    """The sound sample's line, forty stations long with a gauge at each; its log repeats the sample's columns."""
    source = SAMPLES / "hill-main-air"
    target = folder / "forty"
    shutil.copytree(source, target)
    heights = [12.0 + 26.0 * (i % 20) / 20.0 for i in range(40)]
    rows = [f"S{i},{heights[i]},{'open' if i in (0, 39) else 'closed'}" for i in range(40)]
    (target / "stations.csv").write_text("\n".join(["station,elevation [m],exchange", *rows]) + "\n")
    runs = [f"R{i},S{i},S{i + 1},60,154.1,0.1,1,{'FT-1,L/s' if i == 0 else ','}" for i in range(39)]
    head = "run,from,to,length [m],bore [mm],roughness [mm],fittings K,flow column,flow unit"
    (target / "runs.csv").write_text("\n".join([head, *runs]) + "\n")
    gauges = [f"PT-{i:02d},S{i},barg,0,10,0.25 % span,1 % span,0.001" for i in range(40)]
    head = "tag,station,unit,range low,range high,accuracy,tolerance,division"
    (target / "gauges.csv").write_text("\n".join([head, *gauges]) + "\n")
    (target / "log.csv").write_text(log_of_forty(heights))
    return target


def log_of_forty(heights: list[float]) -> str:
    """Three spells of three minutes at 0, 8 and 14 L/s, a row every three seconds; losses go with the square of flow."""
    lines = ["time," + ",".join(f"PT-{i:02d}" for i in range(40)) + ",FT-1"]
    for row in range(180):
        flow = (0.0, 8.0, 14.0)[row // 60]
        wiggle = 0.001 * ((7 * row) % 5 - 2)
        values = [
            f"{(62.0 - 0.0012 * 60 / 12 * i * flow**2 / 14 - heights[i]) * 0.0980 + wiggle:.3f}" for i in range(40)
        ]
        clock = f"2026-05-18T07:{30 + row * 3 // 60:02d}:{row * 3 % 60:02d}Z"
        lines.append(",".join([clock, *values, f"{flow:.2f}"]))
    return "\n".join(lines) + "\n"


async def key_times(folder: Path, size: tuple[int, int]) -> list[float]:
    """Seconds from a key to the last frame that it brings, for arrows in all directions and the page of a gauge."""
    from headledger.tui.app import HeadledgerApp

    drawn = [0.0]

    app = HeadledgerApp(folder)
    show: Any = app._display

    def watched(screen: Any, renderable: Any) -> None:
        show(screen, renderable)
        drawn[0] = time.perf_counter()

    app._display = watched  # type: ignore[method-assign]
    times = []
    async with app.run_test(size=size) as pilot:
        await app.workers.wait_for_complete()
        await pilot.pause()
        for key in ("right", "down", "right", "down", "left", "up", "down", "enter", "n", "right", "escape") * 8:
            start = time.perf_counter()
            await pilot.press(key)
            await pilot.pause()
            assert drawn[0] > start, key
            times.append(drawn[0] - start)
    return times


def main() -> None:
    """Print the figures."""
    folder = SAMPLES / (sys.argv[1] if len(sys.argv) > 1 else "riser-drift")
    bare, first, judged = [], [], []
    for _ in range(ROUNDS):
        bare.append(seconds_of("-c", "import textual"))
        painted, done = opening(folder)
        first.append(painted)
        judged.append(done)
    unit = statistics.median(bare)
    print(f"import textual: {1e3 * unit:.0f} ms")
    print(
        f"first frame: {statistics.median(first) / unit:.2f} times that; judged screen of {folder.name}: "
        f"{statistics.median(judged) / unit:.2f} times"
    )
    with tempfile.TemporaryDirectory() as place:
        forty = job_of_forty_gauges(Path(place))
        for size in ((80, 24), (160, 48)):
            times = asyncio.run(key_times(forty, size))
            print(
                f"40 gauges, {size[0]} x {size[1]}: key to drawn screen {1e3 * statistics.median(times):.0f} ms in the "
                f"median, {1e3 * max(times):.0f} ms at worst, of {len(times)} keys"
            )


if __name__ == "__main__":
    main()
