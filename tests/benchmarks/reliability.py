"""How often the judgement is right, on jobs of our own making, and whether its probabilities mean what they say.

    python -m tests.benchmarks.reliability [JOBS] [WORKERS] [CAUSES] [KINDS]

CAUSES is how many troubles a job has: 0, 1, 2 or 3; ``mixed`` (by default) draws a third sound jobs, plain and awkward, and the rest with
one. KINDS names kinds with commas between. Systems, troubles and readings are drawn in `tests/benchmarks/simulator`, whose physics is
not the product's; sizes run from about half a tolerance, so that the faintest cannot be seen by anybody. Every share has its 95 %
interval (Wilson). λ is the length of the truth's white mark in the tool's own model: what a test that knew kind and place would see.
"""

from __future__ import annotations

import sys
import tempfile
import time
from collections import Counter
from concurrent.futures import ProcessPoolExecutor
from dataclasses import dataclass
from functools import partial
from itertools import pairwise
from pathlib import Path

import numpy as np

from headledger.diagnosis import check as check_module
from headledger.diagnosis import search as search_module
from headledger.diagnosis.check import check_folder
from headledger.diagnosis.result import CauseFound, CauseKind, CheckResult, Verdict
from headledger.diagnosis.search import Posterior
from headledger.plant.digest import Digest
from headledger.plant.job import Job
from tests.benchmarks.simulator.readings import Faults, write_job
from tests.benchmarks.simulator.systems import drawn_system
from tests.benchmarks.simulator.troubles import TROUBLES, Truth

EDGES = (0.05, 0.1, 0.25, 0.5, 0.75, 0.9, 0.97, 1.0)
LENGTHS = (0.0, 3.0, 4.5, 6.0, 9.0, np.inf)
LEAST_STATED, SURE, IN_SET, FOUND = 0.05, 0.8, 0.95, 0.5
# At one gauge these add the same to every reading while the liquid keeps its weight: no log tells them apart.
TWINS = frozenset({CauseKind.ZERO_SHIFT, CauseKind.WRONG_ELEVATION, CauseKind.LEG_GAS, CauseKind.WRONG_REFERENCE})

Named = tuple[str, str]


def wilson(hits: int, of: int) -> str:
    """A share with its 95 % interval."""
    if of == 0:
        return "none"
    share, z = hits / of, 1.96
    middle = (share + z**2 / (2 * of)) / (1 + z**2 / of)
    half = z / (1 + z**2 / of) * (share * (1 - share) / of + z**2 / (4 * of**2)) ** 0.5
    return f"{hits} of {of} = {share:.3f} ({max(middle - half, 0.0):.3f} to {middle + half:.3f})"


def is_alarm(result: CheckResult) -> bool:
    """Whether a check says that something is wrong."""
    accepted = any(cause.accepted for cause in result.causes)
    failed = any(gauge.verdict is Verdict.FAIL for gauge in result.gauges)
    return accepted or failed or result.clean_probability < 0.1


def named(kind: CauseKind, place: str, *, twins: bool = True) -> Named:
    """A cause by kind and place, twins under one name."""
    # of two logs, which of them is late is a matter of words
    return ("level" if twins and kind in TWINS else kind.value, "" if kind is CauseKind.CLOCK_OFFSET else place)


def place_of(cause: CauseFound) -> str:
    """Where a cause sits, in one word."""
    return cause.place.gauge or " ".join(cause.place.gauges) or cause.place.run or cause.place.station


@dataclass(frozen=True, kw_only=True)
class Judged:
    """What was said of one drawn job, against its truth."""

    seed: int
    truths: tuple[Truth, ...]
    awkward: bool
    alarm: bool
    probability: tuple[float, ...]  # of each truth, twins together
    first_right: bool
    first_sure: bool
    first_exact: bool
    in_set: bool
    size_inside: bool | None
    length: float
    good: tuple[Verdict, ...]
    bad: tuple[Verdict, ...]
    entries: tuple[tuple[float, bool], ...]
    seconds: float
    whole_seconds: float


def one(seed: int, causes: str, kinds: tuple[CauseKind, ...]) -> Judged:
    """One drawn job, judged."""
    rng = np.random.default_rng(50_000 + seed)
    number = int(causes) if causes != "mixed" else int(rng.random() > 1 / 3)
    awkward = number == 0 and bool(rng.random() < 0.5)
    while True:
        system, faults = drawn_system(rng, awkward=awkward), Faults()
        truths: list[Truth] = []
        for _ in range(number):
            kind = kinds[int(rng.integers(len(kinds)))]
            places = {tag for truth in truths for tag in (truth.place, *truth.gauges)}
            put = TROUBLES[kind](system, faults, rng)
            if put is None or put[1].place in places or places & set(put[1].gauges):
                break
            system = put[0]
            truths.append(put[1])
        if len(truths) == number:
            break
    seen: dict[str, float] = {}
    with tempfile.TemporaryDirectory() as name:
        folder = Path(name)
        write_job(system, faults, rng, folder)
        begin = time.perf_counter()
        length, result = _checked(folder, truths, seen)
        whole = time.perf_counter() - begin
    off = _off_gauges(truths)
    return Judged(
        seed=seed,
        truths=tuple(truths),
        awkward=awkward,
        alarm=is_alarm(result),
        probability=tuple(_probability(result, truth) for truth in truths),
        **_first(result, truths),
        in_set=_in_set(result, truths),
        size_inside=_size_inside(result, truths),
        length=length,
        good=tuple(g.verdict for g in result.gauges if g.tag not in off),
        bad=tuple(
            g.verdict for g in result.gauges if off.get(g.tag) is not None and _is_bad(off[g.tag], g.tolerance_pa)
        ),
        entries=_entries(result, truths),
        seconds=seen["judging"],
        whole_seconds=whole,
    )


def _checked(folder: Path, truths: list[Truth], seen: dict[str, float]) -> tuple[float, CheckResult]:
    """The check of a folder, with the time of the judgement alone and the length of a single truth's mark."""
    held: list[Posterior] = []
    search, judge = search_module.search, check_module.check_job

    def watched(*given: object, **more: object) -> Posterior:
        held.append(search(*given, **more))  # type: ignore[arg-type]
        return held[-1]

    def timed(job: Job, digests: tuple[Digest, ...], **more: object) -> CheckResult:
        begin = time.perf_counter()
        result = judge(job, digests, **more)  # type: ignore[arg-type]
        seen["judging"] = time.perf_counter() - begin
        return result

    check_module.search, check_module.check_job = watched, timed  # type: ignore[attr-defined,assignment]
    try:
        result = check_folder(folder)
    finally:
        check_module.search, check_module.check_job = search, judge  # type: ignore[attr-defined]
    return (_length(held[0], truths[0]) if len(truths) == 1 else float("nan")), result


def _length(posterior: Posterior, truth: Truth) -> float:
    """Length of the truth's white mark, where its mark is straight and it has a size."""
    frame = posterior.frame
    for index, mark in enumerate(frame.marks):
        place = mark.place.gauge or mark.place.run
        same = mark.kind is truth.kind and place == truth.place and mark.form == truth.form
        if same and truth.size is not None and not mark.prior.is_point:
            unit = 1.0 if mark.unit is None else mark.unit.factor
            size = (truth.size * unit - mark.size_base) / mark.size_factor
            if mark.kind in (CauseKind.DRIFT, CauseKind.STEP):
                return float("nan")
            return abs(size) * float(np.sqrt(frame.gram[index, index]))
    return float("nan")


def _off_gauges(truths: list[Truth]) -> dict[str, float | None]:
    """Gauges that are off by themselves: by how much in Pa, None where that is not one number."""
    off: dict[str, float | None] = {}
    for truth in truths:
        level = truth.kind in (CauseKind.ZERO_SHIFT, CauseKind.LEG_GAS, CauseKind.WRONG_REFERENCE)
        for tag in truth.gauges:
            if truth.kind is CauseKind.WRONG_ELEVATION and truth.size is not None:
                off[tag] = 9_800.0 * truth.size
            else:
                off[tag] = 1e5 * truth.size if level and truth.size is not None else None
    return off


def _is_bad(off_pa: float | None, tolerance_pa: float) -> bool:
    return off_pa is not None and abs(off_pa) > 1.5 * tolerance_pa


def _probability(result: CheckResult, truth: Truth) -> float:
    wanted = named(truth.kind, truth.place)
    return min(1.0, sum(c.probability for c in result.causes if named(c.kind, place_of(c)) == wanted))


def _first(result: CheckResult, truths: list[Truth]) -> dict[str, bool]:
    first = result.causes[0] if result.causes else None
    if first is None or not truths:
        return {"first_right": False, "first_sure": False, "first_exact": False}
    right = named(first.kind, place_of(first)) in {named(t.kind, t.place) for t in truths}
    exact = (first.kind, place_of(first)) in {(t.kind, t.place) for t in truths}
    weight = sum(
        c.probability for c in result.causes if named(c.kind, place_of(c)) == named(first.kind, place_of(first))
    )
    return {"first_right": right, "first_sure": weight >= SURE, "first_exact": exact}


def _stated(result: CheckResult) -> dict[Named, float]:
    """Probability of every cause with its twins, and of nothing."""
    stated: dict[Named, float] = {}
    for cause in result.causes:
        key = named(cause.kind, place_of(cause))
        stated[key] = min(1.0, stated.get(key, 0.0) + cause.probability)
    stated["none", ""] = result.clean_probability
    return stated


def _in_set(result: CheckResult, truths: list[Truth]) -> bool:
    """Whether the truths are among the causes, nothing among them, that are listed until what is left is below 5 %."""
    wanted = {named(t.kind, t.place) for t in truths} or {("none", "")}
    stated = _stated(result)
    whole, listed, weight = sum(stated.values()), set(), 0.0
    for key in sorted(stated, key=lambda key: -stated[key]):
        if weight >= IN_SET * whole:
            break
        listed.add(key)
        weight += stated[key]
    return wanted <= listed


def _size_inside(result: CheckResult, truths: list[Truth]) -> bool | None:
    """Whether the true size lies within size ± u95, where the first cause is the truth itself."""
    if len(truths) != 1 or truths[0].size is None or not result.causes:
        return None
    first, truth = result.causes[0], truths[0]
    if (
        (first.kind, place_of(first)) != (truth.kind, truth.place)
        or first.size is None
        or first.u95 is None
        or truth.size is None
    ):
        return None
    if first.kind in (CauseKind.WRONG_UNIT, CauseKind.WRONG_REFERENCE, CauseKind.CLOCK_OFFSET, CauseKind.SLUGGISH):
        return None
    unit = 1.0 if first.unit is None else first.unit.factor
    per_hour = 3600.0 if first.kind is CauseKind.DRIFT else 1.0
    return bool(abs(truth.size - first.size * per_hour / unit) <= first.u95 * per_hour / unit)


def _entries(result: CheckResult, truths: list[Truth]) -> tuple[tuple[float, bool], ...]:
    """Every stated probability of at least 0.05, with whether it is so."""
    wanted = {named(t.kind, t.place) for t in truths} or {("none", "")}
    return tuple((p, key in wanted) for key, p in _stated(result).items() if p >= LEAST_STATED)


def calibration_error(found: list[tuple[float, bool]]) -> float:
    """The mean distance of what is stated and what is so, weighted by entries."""
    bins = (_between(found, low, high) for low, high in pairwise(EDGES))
    return sum(abs(sum(p - true for p, true in inside)) for inside in bins) / max(len(found), 1)


def _between(found: list[tuple[float, bool]], low: float, high: float) -> list[tuple[float, bool]]:
    return [(p, true) for p, true in found if low <= p < high or (high == EDGES[-1] == p)]


def main(jobs: int = 200, workers: int = 1, causes: str = "mixed", kinds: str = "") -> None:
    """Print every rate."""
    chosen = tuple(CauseKind(kind) for kind in kinds.split(",")) if kinds else tuple(TROUBLES)
    with ProcessPoolExecutor(workers) as pool:
        judged = list(pool.map(partial(one, causes=causes, kinds=chosen), range(jobs), chunksize=4))
    report(judged)


def report(judged: list[Judged]) -> None:
    """Print the rates of some judged jobs."""
    sound = [job for job in judged if not job.truths]
    troubled = [job for job in judged if job.truths]
    for what, some in (
        ("clean", [j for j in sound if not j.awkward]),
        ("awkward but clean", [j for j in sound if j.awkward]),
    ):
        print(f"false alarms, {what + ':':20s} {wilson(sum(j.alarm for j in some), len(some))}")
    good = [verdict for job in judged for verdict in job.good]
    bad = [verdict for job in judged for verdict in job.bad]
    print(f"good gauges failed:                {wilson(good.count(Verdict.FAIL), len(good))}")
    print(f"good gauges unresolved:            {wilson(good.count(Verdict.UNRESOLVED), len(good))}")
    print(f"gauges over 1.5 tolerances passed: {wilson(bad.count(Verdict.PASS), len(bad))}")
    raised = [job for job in troubled if job.alarm]
    print(f"troubles raised, faint ones too:   {wilson(len(raised), len(troubled))}")
    single = [job for job in troubled if len(job.truths) == 1]
    for low, high in pairwise(LENGTHS):
        some = [job for job in single if low <= job.length < high]
        print(f"    λ {low:3.1f} to {high:4.1f}:                 {wilson(sum(job.alarm for job in some), len(some))}")
    print(f"first cause right where raised:    {wilson(sum(job.first_right for job in raised), len(raised))}")
    print(f"    without counting twins as one: {wilson(sum(job.first_exact for job in raised), len(raised))}")
    sure = [job for job in troubled if job.first_sure]
    print(f"first cause right where sure:      {wilson(sum(job.first_right for job in sure), len(sure))}")
    print(f"truth in the 95 % set:             {wilson(sum(job.in_set for job in judged), len(judged))}")
    sized = [job.size_inside for job in judged if job.size_inside is not None]
    print(f"sizes within their u95:            {wilson(sum(sized), len(sized))}")
    several = [job for job in troubled if len(job.truths) > 1]
    if several:
        each = [p >= FOUND for job in several for p in job.probability]
        print(
            f"all causes of several found:       {wilson(sum(min(job.probability) >= FOUND for job in several), len(several))}"
        )
        print(f"each of them found:                {wilson(sum(each), len(each))}")
    entries = [entry for job in judged for entry in job.entries]
    print("stated            mean stated   true")
    for low, high in pairwise(EDGES):
        inside = _between(entries, low, high)
        mean = sum(p for p, _ in inside) / len(inside) if inside else 0.0
        print(
            f"{low:4.2f} to {high:4.2f}      {mean:6.3f}        {wilson(sum(true for _, true in inside), len(inside))}"
        )
    print(f"calibration error: {calibration_error(entries):.3f} over {len(entries)} probabilities")
    times, whole = np.array([j.seconds for j in judged]), np.array([j.whole_seconds for j in judged])
    slowest = judged[int(np.argmax(times))].seed
    print(f"judgement: median {np.median(times):.2f} s, worst {times.max():.2f} s (seed {slowest})")
    print(f"with reading:     {np.median(whole):.2f} s, worst {whole.max():.2f} s")
    _by_kind(single)


def _by_kind(single: list[Judged]) -> None:
    """Print what becomes of every kind, and the seeds of what was raised and called something else."""
    count: Counter[tuple[str, str]] = Counter()
    wrong: dict[str, list[int]] = {}
    for job in single:
        kind = job.truths[0].kind.value
        count[kind, "drawn"] += 1
        count[kind, "raised"] += job.alarm
        count[kind, "right"] += job.first_right and job.alarm
        count[kind, "in set"] += job.in_set
        if not job.first_right and (job.alarm or job.length > LENGTHS[-2]):
            wrong.setdefault(kind, []).append(job.seed)
    print("kind                drawn  raised  right  in set  seeds of what was misnamed, or missed though plain")
    for kind in sorted({kind for kind, _ in count}):
        numbers = "".join(f"{count[kind, what]:8d}" for what in ("drawn", "raised", "right", "in set"))
        print(f"{kind:16s}{numbers}  {' '.join(map(str, wrong.get(kind, [])[:12]))}")


if __name__ == "__main__":
    given = sys.argv[1:]
    defaults = ["200", "1", "mixed", ""]
    jobs_word, workers_word, causes_word, kinds_word = [*given, *defaults[len(given) :]]
    main(int(jobs_word), int(workers_word), causes_word, kinds_word)
