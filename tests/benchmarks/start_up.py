"""Start-up: a whole check of each sample in a cold process, as a multiple of importing numpy and pandas; help against a bare Python.

python tests/benchmarks/start_up.py [ROUNDS]
"""

from __future__ import annotations

import statistics
import subprocess
import sys
import time
from pathlib import Path

SAMPLES = Path(__file__).parent.parent.parent / "sample_logs"
COMMAND = [sys.executable, "-m", "headledger"]


def seconds(command: list[str]) -> float:
    """Wall time of one run."""
    start = time.perf_counter()
    subprocess.run(command, stdout=subprocess.DEVNULL, stderr=subprocess.DEVNULL, check=False)
    return time.perf_counter() - start


def main(rounds: int = 5) -> None:
    """Print the ratios, every command once a round."""
    commands = {
        "python -c pass": [sys.executable, "-c", "pass"],
        "import numpy, pandas": [sys.executable, "-c", "import numpy, pandas"],
        "headledger --help": [*COMMAND, "--help"],
        **{f"check {folder.name}": [*COMMAND, "check", str(folder)] for folder in sorted(SAMPLES.iterdir())},
    }
    times: dict[str, list[float]] = {name: [] for name in commands}
    for _ in range(rounds):
        for name, command in commands.items():
            times[name].append(seconds(command))
    middle = {name: statistics.median(values) for name, values in times.items()}
    bare, imports = middle["python -c pass"], middle["import numpy, pandas"]
    for name, value in middle.items():
        against = f"{value / bare:5.1f} × pass" if "check" not in name else f"{value / imports:5.2f} × numpy and pandas"
        print(f"{name:28s} {1000 * value:7.0f} ms   {against}")


if __name__ == "__main__":
    main(int(sys.argv[1]) if len(sys.argv) > 1 else 5)
