"""The digest of a large wide log beside chunked pandas on the same file: time, memory, second opening.

    python -m tests.benchmarks.digest_speed [ROWS] [COLUMNS] [FOLDER]

Writes the log (500,000 rows of 42 readings and a stamp, 177 MB, by default) where it is not there yet, into FOLDER or the system's
folder for temporary files. Each figure is of a process of its own; ratios are to chunked ``pandas.read_csv`` (C engine, stamps parsed).
"""

from __future__ import annotations

import subprocess
import sys
import tempfile
from pathlib import Path

import numpy as np

PANDAS = """
import pandas as pd
rows = 0
for chunk in pd.read_csv({path!r}, engine="c", chunksize=50_000, parse_dates=["time"]):
    rows += len(chunk)
"""
DIGEST = """
from pathlib import Path
from headledger.plant.job import LogSettings
from headledger.readers.logs import read_log
if __name__ == "__main__":
    read_log(Path({path!r}), name="log.csv", settings=LogSettings(), timezone="UTC")
"""
MEASURED = """
import resource, time
begin = time.perf_counter()
{body}
if __name__ == "__main__":
    own = resource.getrusage(resource.RUSAGE_SELF).ru_maxrss, resource.getrusage(resource.RUSAGE_CHILDREN).ru_maxrss
    print(time.perf_counter() - begin, max(own) / 1024.0)
"""


def make_log(path: Path, rows: int, columns: int) -> None:
    """A wide log of a reading a second: values with noise, written once."""
    rng = np.random.default_rng(1)
    stamps = np.datetime64("2026-03-01T00:00:00") + np.arange(rows).astype("timedelta64[s]")
    part = path.with_suffix(".part")
    with part.open("w", encoding="ascii", newline="") as file:
        file.write("time," + ",".join(f"PT-{n}" for n in range(1, columns)) + "\n")
        for start in range(0, rows, 20_000):
            block = stamps[start : start + 20_000]
            values = 3.0 + 0.01 * np.arange(columns - 1) + 0.02 * rng.standard_normal((block.size, columns - 1))
            text = np.char.mod("%.6f", values)
            file.writelines(
                f"{stamp}," + ",".join(row) + "\n" for stamp, row in zip(block.astype(str), text, strict=True)
            )
    part.replace(path)


def measure(body: str) -> tuple[float, float]:
    """Seconds and the largest memory of a process, in a process of its own. [s], [MB]"""
    with tempfile.NamedTemporaryFile("w", suffix=".py", delete=False) as script:
        script.write(MEASURED.format(body=body))
    try:
        done = subprocess.run([sys.executable, script.name], capture_output=True, text=True, check=True)
    finally:
        Path(script.name).unlink()
    seconds, memory = done.stdout.split()[-2:]
    return float(seconds), float(memory)


def main(rows: int = 500_000, columns: int = 43, folder: str = "") -> None:
    """Print times as ratios to chunked pandas, and memory."""
    path = Path(folder or tempfile.gettempdir()) / f"headledger-log-{rows}x{columns}.csv"
    if not path.exists():
        make_log(path, rows, columns)
    print(f"{rows} rows of {columns} columns, {path.stat().st_size / 1e6:.0f} MB")
    measure(PANDAS.format(path=str(path)))  # warms the file
    beside, memory = measure(PANDAS.format(path=str(path)))
    print(f"chunked pandas            {beside:6.2f} s  1.00      {memory:4.0f} MB")
    for processes in (1, 2):
        seconds, memory = measure(DIGEST.format(path=str(path), processes=processes))
        print(
            f"digest, {processes} process{'es' if processes > 1 else '  '}       {seconds:6.2f} s  {seconds / beside:4.2f}      {memory:4.0f} MB a process"
        )


if __name__ == "__main__":
    words = sys.argv[1:]
    main(*(int(word) for word in words[:2]), *words[2:3])
