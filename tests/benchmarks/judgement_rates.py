"""How often the judgement is right: the sample systems with other hidden values and noise, sound and with their trouble.

    python -m tests.benchmarks.judgement_rates [SEEDS]

Readings come from `tests/make_samples.py`, whose physics is not the product's. Printed with 95 % intervals (Wilson).
"""

from __future__ import annotations

import sys
import tempfile
import time
from collections import Counter
from dataclasses import replace
from pathlib import Path

from headledger.diagnosis.check import check_folder
from headledger.diagnosis.result import CauseKind, CheckResult, Verdict
from tests.make_samples import SAMPLES, Sample, write

TRUTH: dict[str, tuple[tuple[CauseKind, ...], str]] = {
    "riser-drift": ((CauseKind.ZERO_SHIFT, CauseKind.WRONG_ELEVATION), "PT-28"),
    "cooling-strainer": ((CauseKind.BLOCKAGE,), "STR-1"),
    "hill-main-air": ((CauseKind.AIR_POCKET,), "M3"),
    "fire-main-units": ((CauseKind.WRONG_UNIT,), "PIT-903"),
}


def wilson(hits: int, of: int) -> str:
    """A share with its 95 % interval."""
    if of == 0:
        return "none"
    share, z = hits / of, 1.96
    middle = (share + z**2 / (2 * of)) / (1 + z**2 / of)
    half = z / (1 + z**2 / of) * (share * (1 - share) / of + z**2 / (4 * of**2)) ** 0.5
    return f"{hits} of {of} = {share:.3f} ({max(middle - half, 0.0):.3f} to {middle + half:.3f})"


def sound(sample: Sample) -> Sample:
    """The same system with nothing wrong."""
    return replace(sample, shift={}, logged_in={}, blocked={}, pocket={})


def judged(sample: Sample, folder: Path) -> CheckResult:
    """The result on one sample's readings."""
    write(sample, folder)
    return check_folder(folder / sample.name)


def is_alarm(result: CheckResult) -> bool:
    """Whether a check says that something is wrong."""
    accepted = any(cause.accepted for cause in result.causes)
    failed = any(gauge.verdict is Verdict.FAIL for gauge in result.gauges)
    return accepted or failed or result.clean_probability < 0.1


def main(seeds: int = 30) -> None:
    """Print the rates."""
    count: Counter[str] = Counter()
    start = time.perf_counter()
    with tempfile.TemporaryDirectory() as name:
        for seed in range(seeds):
            for make in SAMPLES:
                sample = replace(make(), seed=1000 + seed)
                clean = judged(sound(sample), Path(name))
                count["sound"] += 1
                count["false alarm"] += is_alarm(clean)
                count["good gauges"] += len(clean.gauges)
                count["failed"] += sum(g.verdict is Verdict.FAIL for g in clean.gauges)
                count["unresolved"] += sum(g.verdict is Verdict.UNRESOLVED for g in clean.gauges)
                if sample.name in TRUTH:
                    _weigh_trouble(judged(sample, Path(name)), sample.name, count)
    print(f"{seeds} seeds of {len(SAMPLES)} systems in {time.perf_counter() - start:.0f} s")
    print(f"false alarms on sound systems:       {wilson(count['false alarm'], count['sound'])}")
    print(f"good gauges failed:                  {wilson(count['failed'], count['good gauges'])}")
    print(f"good gauges left unresolved:         {wilson(count['unresolved'], count['good gauges'])}")
    print(f"troubles seen:                       {wilson(count['seen'], count['troubled'])}")
    print(f"first cause right, or its twin:      {wilson(count['first'], count['troubled'])}")
    print(f"size within its u95:                 {wilson(count['covered'], count['sized'])}")


def _weigh_trouble(result: CheckResult, name: str, count: Counter[str]) -> None:
    """Count what was said of a system with its trouble."""
    kinds, place = TRUTH[name]
    count["troubled"] += 1
    count["seen"] += is_alarm(result)
    first = result.causes[0] if result.causes else None
    count["first"] += first is not None and first.kind in kinds and place in (first.place.gauge, first.place.run)
    sizes = {"riser-drift": 0.16e5, "cooling-strainer": 11.0, "hill-main-air": 3.8}
    found = next((c for c in result.causes if c.kind is kinds[0] and place in (c.place.gauge, c.place.run)), None)
    if name in sizes and found is not None and found.size is not None and found.u95 is not None:
        count["sized"] += 1
        count["covered"] += abs(found.size - sizes[name]) <= found.u95


if __name__ == "__main__":
    main(int(sys.argv[1]) if len(sys.argv) > 1 else 30)
