"""Whether probabilities mean what they say: of causes called 90 %, how many are true.

    python -m tests.benchmarks.reliability [SEEDS] [WORKERS]

Sound systems, and systems with one trouble whose size is drawn log-uniformly from hardly visible to plain. Readings come from
`tests/make_samples.py`, whose physics is not the product's. Every stated probability of at least 0.05 is one entry, true where kind and
place are those of the trouble; the calibration error is the mean distance of share and statement, weighted by entries.
"""

from __future__ import annotations

import sys
import tempfile
from concurrent.futures import ProcessPoolExecutor
from dataclasses import replace
from itertools import pairwise
from pathlib import Path
from random import Random

from headledger.diagnosis.check import check_folder
from headledger.diagnosis.result import CauseKind, CheckResult
from tests.benchmarks.judgement_rates import is_alarm, sound, wilson
from tests.make_samples import SAMPLES, Sample, write

EDGES = (0.05, 0.1, 0.25, 0.5, 0.75, 0.9, 0.97, 1.0)
LEAST_STATED = 0.05

Truth = tuple[CauseKind, str] | None
Entry = tuple[float, bool]


def drawn(sample: Sample, seed: int) -> tuple[Sample, Truth]:
    """A sound system, or one with a trouble of random kind, place and size.

    Zero shifts run from 0.1 to 3 % of range, added loss coefficients from 0.3 to 20, air pockets from 0.1 to 5 m.
    """
    rng = Random(seed)
    system = replace(sound(sample), seed=20_000 + seed)
    kind = rng.choice((None, CauseKind.ZERO_SHIFT, CauseKind.BLOCKAGE, CauseKind.AIR_POCKET))
    if kind is None:
        return system, None
    if kind is CauseKind.ZERO_SHIFT:
        dial = rng.choice(system.dials)
        size = rng.choice((-1, 1)) * dial.high * 0.001 * 30 ** rng.random()
        return replace(system, shift={dial.tag: size}), (kind, dial.tag)
    pipe = rng.choice(system.pipes).name
    if kind is CauseKind.BLOCKAGE:
        return replace(system, blocked={pipe: 0.3 * 66 ** rng.random()}), (kind, pipe)
    return replace(system, pocket={pipe: 0.1 * 50 ** rng.random()}), (kind, pipe)


def entries(result: CheckResult, truth: Truth) -> list[Entry]:
    """Every probability stated of a cause, or of nothing, with whether it is so."""
    stated = [
        (
            cause.probability,
            truth is not None and cause.kind is truth[0] and truth[1] in (cause.place.gauge, cause.place.run),
        )
        for cause in result.causes
    ]
    stated.append((result.clean_probability, truth is None))
    return [(probability, true) for probability, true in stated if probability >= LEAST_STATED]


def one(seed: int) -> tuple[Truth, bool, list[Entry]]:
    """One drawn job, judged."""
    sample, truth = drawn(SAMPLES[seed % len(SAMPLES)](), seed)
    with tempfile.TemporaryDirectory() as name:
        write(sample, Path(name))
        result = check_folder(Path(name) / sample.name)
    return truth, is_alarm(result), entries(result, truth)


def calibration_error(found: list[Entry]) -> float:
    """The mean distance of what is stated and what is so, weighted by entries."""
    distance = 0.0
    for low, high in pairwise(EDGES):
        inside = _between(found, low, high)
        distance += abs(sum(p - true for p, true in inside))
    return distance / len(found)


def _between(found: list[Entry], low: float, high: float) -> list[Entry]:
    return [(p, true) for p, true in found if low <= p < high or (high == EDGES[-1] == p)]


def main(seeds: int = 200, workers: int = 1) -> None:
    """Print the reliability table."""
    with ProcessPoolExecutor(workers) as pool:
        jobs = list(pool.map(one, range(seeds), chunksize=4))
    found = [entry for _, _, told in jobs for entry in told]
    quiet = [alarm for truth, alarm, _ in jobs if truth is None]
    print(f"{seeds} jobs, {len(found)} probabilities stated")
    print(f"false alarms on sound systems: {wilson(sum(quiet), len(quiet))}")
    print("stated            mean stated   true")
    for low, high in pairwise(EDGES):
        inside = _between(found, low, high)
        mean = sum(p for p, _ in inside) / len(inside) if inside else 0.0
        print(
            f"{low:4.2f} to {high:4.2f}      {mean:6.3f}        {wilson(sum(true for _, true in inside), len(inside))}"
        )
    print(f"calibration error: {calibration_error(found):.3f}")


if __name__ == "__main__":
    main(*(int(word) for word in sys.argv[1:3]))
