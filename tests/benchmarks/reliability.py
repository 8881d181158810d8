"""Whether probabilities mean what they say: of causes called 90 %, how many are true.

    python -m tests.benchmarks.reliability [SEEDS] [WORKERS]

Sound systems, and systems with one trouble whose size is drawn log-uniformly from half of what matters to plain. Readings come from
`tests/make_samples.py`, whose physics is not the product's. Every stated probability of at least 0.05 is one entry, true where kind and
place are those of the trouble or of its twin; the calibration error is the mean distance of share and statement, weighted by entries.
"""

from __future__ import annotations

import sys
import tempfile
from concurrent.futures import ProcessPoolExecutor
from dataclasses import dataclass, replace
from itertools import pairwise
from pathlib import Path
from random import Random

from headledger.diagnosis.check import check_folder
from headledger.diagnosis.result import CauseFound, CauseKind, CheckResult, Verdict
from tests.benchmarks.judgement_rates import is_alarm, sound, wilson
from tests.make_samples import PRESSURE, SAMPLES, Sample, write

EDGES = (0.05, 0.1, 0.25, 0.5, 0.75, 0.9, 0.97, 1.0)
LEAST_STATED = 0.05
LEAST_POCKET_M = 0.3
WATER_PA_M = 9_800.0
NO_CAUSE = 0.5  # share of sound jobs

Truth = tuple[CauseKind, str] | None
Entry = tuple[float, bool]
Named = tuple[str, str]

# At one gauge, with liquid of one density, these add the same to every reading: no data of a log tell them apart.
TWINS = frozenset({CauseKind.ZERO_SHIFT, CauseKind.WRONG_ELEVATION, CauseKind.LEG_GAS})


def drawn(sample: Sample, seed: int) -> tuple[Sample, Truth]:
    """A sound system, or one with a trouble of random kind, place and size.

    Zero shifts run from half a tolerance to five (0.5 to 5 % of range), wrong elevations from 1 to 10 m, added loss coefficients from 3
    to 60, air pockets, where a pipe falls, from 0.3 m to its fall.
    """
    rng = Random(seed)
    system = replace(sound(sample), seed=20_000 + seed)
    if rng.random() < NO_CAUSE:
        return system, None
    kind = rng.choice((CauseKind.ZERO_SHIFT, CauseKind.WRONG_ELEVATION, CauseKind.BLOCKAGE, CauseKind.AIR_POCKET))
    if kind is CauseKind.ZERO_SHIFT:
        dial = rng.choice(system.dials)
        size = rng.choice((-1, 1)) * dial.high * 0.005 * 10 ** rng.random()
        return replace(system, shift={dial.tag: size}), (kind, dial.tag)
    if kind is CauseKind.WRONG_ELEVATION:
        dial = rng.choice(system.dials)
        size = rng.choice((-1, 1)) * WATER_PA_M * 10 ** rng.random() / PRESSURE[dial.unit[:-1]]
        return replace(system, shift={dial.tag: size}), (kind, dial.tag)
    heights = {name: height for name, height, *_ in system.stations}
    falls = {pipe.name: heights[pipe.start] - heights[pipe.end] for pipe in system.pipes}
    falling = [name for name, fall in falls.items() if fall > LEAST_POCKET_M]
    if kind is CauseKind.AIR_POCKET and falling:
        pipe = rng.choice(falling)
        size = LEAST_POCKET_M * (falls[pipe] / LEAST_POCKET_M) ** rng.random()
        return replace(system, pocket={pipe: size}), (kind, pipe)
    pipe = rng.choice(system.pipes).name
    return replace(system, blocked={pipe: 3.0 * 20 ** rng.random()}), (CauseKind.BLOCKAGE, pipe)


def entries(result: CheckResult, truth: Truth) -> list[Entry]:
    """Every probability stated of a cause with its twins, or of nothing, with whether it is so."""
    stated: dict[Named, float] = {}
    for cause in result.causes:
        named = _named(cause.kind, cause.place.gauge or cause.place.run)
        stated[named] = stated.get(named, 0.0) + cause.probability
    told = [(min(share, 1.0), truth is not None and named == _named(*truth)) for named, share in stated.items()]
    told.append((result.clean_probability, truth is None))
    return [(probability, true) for probability, true in told if probability >= LEAST_STATED]


def _named(kind: CauseKind, place: str) -> Named:
    return ("level" if kind in TWINS else kind.value, place)


@dataclass(frozen=True, kw_only=True)
class Judged:
    """What was said of one drawn job, against its truth."""

    truth: Truth
    alarm: bool
    first_right: bool
    good: tuple[Verdict, ...]  # verdicts of gauges without trouble
    bad: tuple[Verdict, ...]  # verdicts of gauges whose trouble exceeds their tolerance
    entries: list[Entry]


def one(seed: int) -> Judged:
    """One drawn job, judged."""
    sample, truth = drawn(SAMPLES[seed % len(SAMPLES)](), seed)
    with tempfile.TemporaryDirectory() as name:
        write(sample, Path(name))
        result = check_folder(Path(name) / sample.name)
    first = result.causes[0] if result.causes else None
    return Judged(
        truth=truth,
        alarm=is_alarm(result),
        first_right=truth is not None and first is not None and _same(first, truth),
        good=tuple(g.verdict for g in result.gauges if g.tag not in sample.shift),
        bad=tuple(
            g.verdict for g in result.gauges if abs(sample.shift.get(g.tag, 0.0)) > 1.1 * tolerance(sample, g.tag)
        ),
        entries=entries(result, truth),
    )


def tolerance(sample: Sample, tag: str) -> float:
    """A gauge's tolerance in its unit; the samples state it as a share of span."""
    dial = next(dial for dial in sample.dials if dial.tag == tag)
    return float(dial.tolerance.split()[0]) / 100.0 * dial.high


def _same(cause: CauseFound, truth: tuple[CauseKind, str]) -> bool:
    return _named(cause.kind, cause.place.gauge or cause.place.run) == _named(*truth)


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
    found = [entry for job in jobs for entry in job.entries]
    quiet = [job.alarm for job in jobs if job.truth is None]
    troubled = [job for job in jobs if job.truth is not None]
    raised = [job for job in troubled if job.alarm]
    good = [verdict for job in jobs for verdict in job.good]
    bad = [verdict for job in jobs for verdict in job.bad]
    print(f"{seeds} jobs, {len(found)} probabilities stated")
    print(f"false alarms on sound systems:       {wilson(sum(quiet), len(quiet))}")
    print(f"troubles raised, faint ones and all: {wilson(len(raised), len(troubled))}")
    print(f"first cause right where raised:      {wilson(sum(job.first_right for job in raised), len(raised))}")
    print(f"good gauges failed:                  {wilson(good.count(Verdict.FAIL), len(good))}")
    print(f"good gauges unresolved:              {wilson(good.count(Verdict.UNRESOLVED), len(good))}")
    print(f"gauges over 1.1 tolerances passed:   {wilson(bad.count(Verdict.PASS), len(bad))}")
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
