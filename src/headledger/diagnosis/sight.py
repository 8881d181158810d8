"""Sight: the smallest trouble that a set of readings would show, the smallest that could be placed and named, and what would sharpen it.

With ``u`` the white mark of a unit of some trouble, a size is seen where ``size |u|`` reaches 6, and told from another cause where the
same holds of the part of ``u`` that is not along that cause's mark: ``size |u| √(1 − ρ²)``. What is said here of a plan is said with
the very model that later judges its readings.
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from headledger.diagnosis.causes.base import Mark, View
from headledger.diagnosis.causes.blockage import velocity_head_drops
from headledger.diagnosis.estimate import Linear, Model
from headledger.diagnosis.frame import Frame, all_marks, loss_bends, make_frame
from headledger.diagnosis.layout import Layout
from headledger.diagnosis.means import SpellMeans
from headledger.diagnosis.planned import perfect, plan_states, planned_noise_pa, scaled, stilled, with_loss
from headledger.diagnosis.result import (
    Alike,
    CauseKind,
    FurtherReading,
    GaugeSight,
    PlanResult,
    Sight,
    TroubleSight,
    Verdict,
)
from headledger.diagnosis.search import Explanation, Posterior
from headledger.diagnosis.state import Point
from headledger.diagnosis.verdicts import judge_gauge
from headledger.diagnosis.wording import (
    further_sentence,
    gauge_sight_sentence,
    state_words,
    trouble_sight_sentence,
)
from headledger.plant.gauges import Gauge
from headledger.plant.job import Job, SpellKind, StatedSpell
from headledger.plant.stations import StationKind

Array = NDArray[np.float64]

SEEN = 6.0
"""Length of a trouble's white mark at which an alarm is as good as sure. [-]"""

CONFUSING = 0.5
"""Correlation of two marks below which one is hardly taken for the other. [-]"""

APART = 1e-4
"""Below this, what is left of a mark beside another is nothing: ``1 − ρ²``. [-]"""

MOST_ALIKE = 3

SHARPENING = 1.05
"""A reading more that makes the smallest trouble smaller by less than this is not worth naming. [-]"""

MOST_FURTHER = 4

FLOW_FACTORS = (0.5, 1.5)
"""Further flow states that are tried, as parts of the greatest. [-]"""

CORRECTIONS, SOLVES = 3, 3

AT_GAUGES = (CauseKind.ZERO_SHIFT, CauseKind.SPAN_ERROR, CauseKind.WRONG_ELEVATION, CauseKind.LEG_GAS)
IN_RUNS = (CauseKind.BLOCKAGE, CauseKind.LOW_LOSS, CauseKind.AIR_POCKET, CauseKind.PUMP_LIFT)
ELSEWHERE = (CauseKind.FLOW_METER_ERROR, CauseKind.DENSITY_ERROR)
SIGHT_KINDS = frozenset((*AT_GAUGES, *IN_RUNS, *ELSEWHERE))
"""Kinds of trouble that have a smallest size and need no moment."""


@dataclass(frozen=True, slots=True, kw_only=True)
class _Seen:
    """One look at what readings could show."""

    layout: Layout
    spells: tuple[SpellMeans, ...]
    points: tuple[Point, ...]
    model: Model
    frame: Frame

    @property
    def linear(self) -> Linear:
        """The linearised model."""
        return self.frame.linear


def plan_job(job: Job, states: Sequence[StatedSpell] = ()) -> PlanResult:
    """What the readings of a visit could show, before there are any.

    Parameters
    ----------
    job : Job
    states : sequence of StatedSpell
        Flow states of the visit; by default those of its spells.csv, else still and two flows.

    Returns
    -------
    PlanResult
    """
    layout = Layout(job)
    planned = plan_states(layout, states)
    return PlanResult(job=job, sight=_sight(_look(layout, planned.spells, planned.points), planned.assumed))


def sight_of(model: Model, points: Sequence[Point]) -> Sight:
    """What the readings at hand could have shown.

    Parameters
    ----------
    model : Model
    points : sequence of Point
        Of its spells.

    Returns
    -------
    Sight
    """
    whole, at = [], []
    for number in dict.fromkeys(spell.id for spell in model.spells):
        pieces = [k for k, spell in enumerate(model.spells) if spell.id == number]
        middle = pieces[len(pieces) // 2]
        whole.append(perfect(model.layout, _whole([model.spells[k] for k in pieces]), points[middle]))
        at.append(points[middle])
    return _sight(_look(model.layout, whole, at), ())


def _whole(pieces: Sequence[SpellMeans]) -> SpellMeans:
    """The pieces of one spell as one: which gauges gave something in it, and how well its mean is known."""
    readings = np.array([piece.reading_pa for piece in pieces])
    heard = np.isfinite(readings)
    count = np.maximum(heard.sum(axis=0), 1)
    noise = np.where(heard, [piece.noise_pa for piece in pieces], 0.0)
    flow_noise = np.array([piece.flow_noise_m3_s for piece in pieces])
    return replace(
        pieces[len(pieces) // 2],
        reading_pa=np.where(heard.any(axis=0), np.where(heard, readings, 0.0).sum(axis=0) / count, np.nan),
        noise_pa=np.sqrt((noise**2).sum(axis=0)) / count + np.where(heard.any(axis=0), 0.0, 1.0),
        flow_noise_m3_s=np.sqrt((flow_noise**2).sum(axis=0)) / len(pieces),
    )


def _look(layout: Layout, spells: Sequence[SpellMeans], points: Sequence[Point]) -> _Seen:
    """The frame of every trouble that has a smallest size, on perfect readings."""
    model = Model(layout, spells)
    linear = model.linearise(points)
    marks = [mark for mark in all_marks(View(model, linear), SIGHT_KINDS) if not mark.prior.is_point]
    return _Seen(
        layout=layout, spells=tuple(spells), points=tuple(points), model=model, frame=make_frame(linear, marks)
    )


def _sight(seen: _Seen, assumed: Sequence[str]) -> Sight:
    troubles, gauges = _troubles(seen, solve=True), _gauges(seen)
    return Sight(
        head_weight_pa_m=seen.linear.states[0].head_weight_pa_m,
        states=_states(seen),
        troubles=troubles,
        gauges=gauges,
        further=_further(seen, _troubles(seen, solve=False), gauges),
        assumed=tuple(assumed),
    )


def _states(seen: _Seen) -> tuple[str, ...]:
    """The flow states, a phrase each, pieces of one spell once."""
    words: dict[int, str] = {}
    for spell, state in zip(seen.spells, seen.linear.states, strict=True):
        flows = [
            (run.name, float(state.flow_m3_s[index]))
            for index, run in enumerate(seen.layout.job.runs)
            if np.isfinite(spell.flow_m3_s[index])
        ]
        words.setdefault(spell.id, state_words(seen.layout.job, spell.kind, flows))
    return tuple(words.values())


def _troubles(seen: _Seen, *, solve: bool) -> tuple[TroubleSight, ...]:
    """Every trouble once, at its likest form, gauges first."""
    found: dict[tuple[CauseKind, object], TroubleSight] = {}
    order = {kind: number for number, kind in enumerate((*AT_GAUGES, *IN_RUNS, *ELSEWHERE))}
    for index, mark in enumerate(seen.frame.marks):
        one = _trouble(seen, index, solve=solve)
        before = found.get(mark.key)
        # of several forms the one that is hardest to see
        if before is None or _reach(one) > _reach(before):
            found[mark.key] = one
    return tuple(sorted(found.values(), key=lambda one: order[one.kind]))


def _reach(one: TroubleSight) -> float:
    return float("inf") if one.seen is None else one.seen


def _trouble(seen: _Seen, index: int, *, solve: bool) -> TroubleSight:
    """The sight of one mark."""
    frame = seen.frame
    mark = frame.marks[index]
    length = float(np.sqrt(frame.gram[index, index]))
    smallest = SEEN / length
    if solve and mark.kind is CauseKind.BLOCKAGE and loss_bends(seen.linear):
        smallest = _solved_size(seen, mark, smallest)
    likeness = _likeness(frame, index, smallest)
    here = np.array([_same_place(mark, other) for other in frame.marks])
    flow, pa_per_size = _loss_unit(seen, mark)
    found = TroubleSight(
        kind=mark.kind,
        place=mark.place,
        unit=mark.unit,
        seen=_within(mark, smallest),
        placed=_within(mark, _apart(smallest, likeness[~here])),
        named=_within(mark, _apart(smallest, likeness)),
        matters=mark.prior.least * abs(mark.size_factor),
        pa_per_size=pa_per_size,
        flow_m3_s=flow,
        alike=_alike(frame, likeness, here),
    )
    return replace(found, says=trouble_sight_sentence(seen.layout.job, found))


def _within(mark: Mark, size: float) -> float | None:
    """A size as it is spoken of; None beyond what is physical."""
    return abs(mark.size_factor) * size if size <= mark.prior.most else None


def _apart(smallest: float, likeness: Array) -> float:
    """The smallest size that could be told from causes of some likeness."""
    left = 1.0 - float(np.max(likeness, initial=0.0)) ** 2
    return smallest / float(np.sqrt(left)) if left > APART else float("inf")


def _likeness(frame: Frame, index: int, size: float) -> Array:
    """How far every other mark, at a sign and size that it may have, looks like a size of this one; 0 to 1, 0 for itself."""
    length = np.sqrt(np.diag(frame.gram))
    correlation = frame.gram[index] / (length[index] * length)
    own = frame.marks[index]
    likeness = np.zeros(len(frame.marks))
    for number, other in enumerate(frame.marks):
        if other.key == own.key:
            continue
        signs = [one * two for one in _signs(own) for two in _signs(other)]
        alike = max(sign * float(correlation[number]) for sign in signs)
        needed = alike * length[index] * size / length[number]
        if alike > 0.0 and needed <= other.prior.most:
            likeness[number] = min(alike, 1.0)
    return likeness


def _signs(mark: Mark) -> tuple[float, ...]:
    return tuple(sign for sign, allowed in ((1.0, mark.prior.positive), (-1.0, mark.prior.negative)) if allowed)


def _same_place(mark: Mark, other: Mark) -> bool:
    """Whether one would be sent to the same place by either."""
    if mark.own or other.own:
        return bool(set(mark.own) & set(other.own))
    return mark.place.run == other.place.run and mark.place.station == other.place.station


def _alike(frame: Frame, likeness: Array, here: NDArray[np.bool_]) -> tuple[Alike, ...]:
    """What a trouble would be confused with: elsewhere first, then at its own place, each cause once."""
    found: dict[tuple[CauseKind, object], Alike] = {}
    for number in sorted(range(likeness.size), key=lambda k: -float(likeness[k])):
        mark = frame.marks[number]
        if likeness[number] >= CONFUSING and mark.key not in found:
            found[mark.key] = Alike(
                kind=mark.kind,
                place=mark.place,
                correlation=float(likeness[number]),
                elsewhere=not here[number],
            )
    apart = [alike for alike in found.values() if alike.elsewhere]
    own = [alike for alike in found.values() if not alike.elsewhere]
    return (*apart[:MOST_ALIKE], *own[:MOST_ALIKE])


def _loss_unit(seen: _Seen, mark: Mark) -> tuple[float | None, float | None]:
    """Greatest flow of a loss's run and the pressure that a coefficient of 1 takes there. [m³/s], [Pa]"""
    if mark.kind not in (CauseKind.BLOCKAGE, CauseKind.LOW_LOSS):
        return None, None
    run = seen.layout.run_index[mark.place.run]
    drops = velocity_head_drops(View(seen.model, seen.linear), run)
    at = int(np.argmax([abs(drop[run]) for drop in drops]))
    state = seen.linear.states[at]
    return abs(float(state.flow_m3_s[run])), abs(float(drops[at][run])) * state.head_weight_pa_m


def _solved_size(seen: _Seen, mark: Mark, smallest: float) -> float:
    """The smallest loss that would be seen where it moves the flows: the length of its mark is near proportional to its size, so that
    a few corrections of the straight guess reach it, each solved anew.
    """
    run = seen.layout.run_index[mark.place.run]
    size = min(smallest, mark.prior.most)
    for _ in range(CORRECTIONS):
        length = _solved_length(seen, run, size)
        if length <= 0.0 or (length < SEEN and size >= mark.prior.most):
            return float("inf")
        size = min(size * SEEN / length, mark.prior.most)
    return size


def _solved_length(seen: _Seen, run: int, size: float) -> float:
    """How far the sound system lies from the readings of one with a loss more, its flows solved. [-]"""
    spells = [
        with_loss(seen.layout, spell, point, run, size) for spell, point in zip(seen.spells, seen.points, strict=True)
    ]
    model, points = Model(seen.layout, spells), seen.points
    for _ in range(SOLVES):
        linear = model.linearise(points)
        points = model.moved(linear, np.zeros(linear.row_count))
    return float(np.linalg.norm(model.linearise(points).white.residual))


def _gauges(seen: _Seen) -> tuple[GaugeSight, ...]:
    """Whether each gauge could pass if nothing were wrong."""
    bare = seen.frame.only([])
    nothing = Explanation(chosen=(), frame=bare, log_weight=0.0, probability=1.0)
    posterior = Posterior(explanations=(nothing,), frame=bare)
    found = []
    for index, noun in enumerate(seen.layout.job.gauges):
        judged = judge_gauge(seen.model, posterior, index)
        heard = any(np.isfinite(spell.reading_pa[index]) for spell in seen.spells)
        one = GaugeSight(
            tag=noun.tag,
            unit=noun.unit,
            verdict=judged.verdict,
            u95_pa=judged.u95_pa,
            tolerance_pa=judged.tolerance_pa,
            says="",
        )
        because = judged.unchecked_because if heard else ", since it gives no reading"
        found.append(replace(one, says=gauge_sight_sentence(one, because)))
    return tuple(found)


def _further(seen: _Seen, troubles: Sequence[TroubleSight], gauges: Sequence[GaugeSight]) -> tuple[FurtherReading, ...]:
    """The readings more that would sharpen the sight most."""
    passing = {one.tag for one in gauges if one.verdict is Verdict.PASS}
    found = []
    for more, extended in _candidates(seen):
        ratio = _sharper(troubles, _troubles(extended, solve=False))
        could = tuple(g.tag for g in _gauges(extended) if g.verdict is Verdict.PASS and g.tag not in passing)
        could = tuple(tag for tag in could if tag in seen.layout.gauge_index)
        if ratio >= SHARPENING or could:
            one = replace(more, sharper_ratio=ratio, could_pass=could)
            found.append(replace(one, says=further_sentence(seen.layout.job, one)))
    found.sort(key=lambda one: -(np.log(one.sharper_ratio) + len(one.could_pass) / max(len(gauges), 1)))
    return tuple(found[:MOST_FURTHER])


def _sharper(before: Sequence[TroubleSight], after: Sequence[TroubleSight]) -> float:
    """Geometric mean of how much smaller the smallest trouble is that could be placed, over troubles that both know."""
    sizes = {(one.kind, one.place): _placed_or_most(one) for one in after}
    logs = [
        np.log(_placed_or_most(one) / sizes[one.kind, one.place]) for one in before if (one.kind, one.place) in sizes
    ]
    return float(np.exp(np.mean(logs))) if logs else 1.0


def _placed_or_most(one: TroubleSight) -> float:
    """The smallest size that could be placed, in what matters of it; a hundredfold where none could, never below what matters."""
    largest = 100.0
    ratio = largest if one.placed is None else one.placed / one.matters
    return float(np.clip(ratio, 1.0, largest))


def _candidates(seen: _Seen) -> Iterator[tuple[FurtherReading, _Seen]]:
    """One reading more each: a gauge at a station that has none, a flow state that is missing."""
    job = seen.layout.job
    tapped = {name for gauge in job.gauges for name in (gauge.station, gauge.low_station)}
    for station in job.stations:
        if station.name not in tapped and station.kind is not StationKind.SURFACE:
            yield FurtherReading(station=station.name, sharper_ratio=1.0), _with_gauge(seen, station.name)
    number = max((spell.id for spell in seen.spells), default=0) + 1
    if not any(spell.is_still for spell in seen.spells):
        spell, point = stilled(seen.layout, number)
        yield FurtherReading(kind=SpellKind.STILL, sharper_ratio=1.0), _with_state(seen, spell, point)
    moving = [k for k, spell in enumerate(seen.spells) if not spell.is_still]
    if moving:
        top = max(moving, key=lambda k: float(np.max(np.abs(seen.linear.states[k].flow_m3_s), initial=0.0)))
        for factor in FLOW_FACTORS:
            spell, point = scaled(seen.layout, seen.spells[top], seen.points[top], factor, number)
            more = FurtherReading(kind=SpellKind.FLOWING, flow_factor=factor, sharper_ratio=1.0)
            yield more, _with_state(seen, spell, point)


def _with_state(seen: _Seen, spell: SpellMeans, point: Point) -> _Seen:
    """The look with a flow state more; gauges silent so far stay so."""
    silent = ~np.any([np.isfinite(one.reading_pa) for one in seen.spells], axis=0)
    heard = replace(spell, reading_pa=np.where(silent, np.nan, spell.reading_pa))
    return _look(seen.layout, (*seen.spells, heard), (*seen.points, point))


def _with_gauge(seen: _Seen, station: str) -> _Seen:
    """The look with a gauge more, as good as the job's best, at a station."""
    job = seen.layout.job
    noun = job.station(station)
    run = next(
        (r.name for r in job.runs if r.end == station), next((r.name for r in job.runs if r.start == station), "")
    )
    like = min((g for g in job.gauges if not g.is_differential), key=_limit_pa, default=None)
    if like is None:
        return seen
    gauge = replace(
        like, tag=f"at {station}", station=station, run=run, elevation_m=None, corrected_to_m=None, serial="",
        corrected_to_tap=False, elevation_sd_m=noun.elevation_sd_m, sealed_pa=None, calibration_sd_pa=None,
    )  # fmt: skip
    layout = Layout(replace(job, gauges=(*job.gauges, gauge)))
    noise_pa = float(planned_noise_pa(layout)[-1])
    spells = [
        perfect(
            layout,
            replace(
                spell,
                reading_pa=np.append(spell.reading_pa, 0.0),
                noise_pa=np.append(spell.noise_pa, noise_pa),
            ),
            point,
        )
        for spell, point in zip(seen.spells, seen.points, strict=True)
    ]
    return _look(layout, spells, seen.points)


def _limit_pa(gauge: Gauge) -> float:
    """Limit of error of a gauge in the middle of its range. [Pa]"""
    middle = (gauge.range_low_pa + gauge.range_high_pa) / 2.0
    return gauge.accuracy.at(middle, gauge.range_low_pa, gauge.range_high_pa)
