"""The sight drawn along the pipe: how small a trouble would be seen, and how small it could be placed, gauge by gauge and run by run."""

from __future__ import annotations

from statistics import median

from headledger.diagnosis.result import CauseKind, GaugeSight, Sight, TroubleSight
from headledger.plant.job import Job
from headledger.sheets.drawing import Band, Beads, Drawing, Line, Mark, Panel, Role, Stop
from headledger.sheets.grade_picture import VERDICT_ROLES
from headledger.sheets.marks import MARKS
from headledger.sheets.paths import Leg, Way, places_along

# The scale ends at this many times the middle of what is drawn: one blind spot must not flatten the rest.
_REACH = 4.0
_HEADROOM = 1.15
_FEWEST_HIGH = 1e-3


def sight_picture(job: Job, sight: Sight, way: Way) -> Drawing:
    """The smallest troubles along a way through the piping, as heads.

    Parameters
    ----------
    job : Job
    sight : Sight
    way : Way

    Returns
    -------
    Drawing
        Heights in the job's unit of length, from nothing up.
    """
    scale = 1.0 / job.display.length.factor
    to_head = scale / sight.head_weight_pa_m
    at = places_along(way)
    shifts = {one.place.gauge: one for one in sight.troubles if one.kind is CauseKind.ZERO_SHIFT}
    losses = {one.place.run: one for one in sight.troubles if one.kind is CauseKind.BLOCKAGE}
    pockets = [one for one in sight.troubles if one.kind is CauseKind.AIR_POCKET]
    stations = set(way.stations)
    gauges = [g for g in sight.gauges if job.gauge(g.tag).station in stations]
    sizes = [
        *(size * to_head for g in gauges for size in _sizes(shifts.get(g.tag))),
        *(size * to_head for leg in way.legs for size in _sizes(losses.get(leg.run.name))),
        *(size * scale for one in pockets for size in _sizes(one)),
    ]
    high = max(_FEWEST_HIGH, _HEADROOM * min(max(sizes, default=1.0), _REACH * median(sizes or [1.0])))
    lines, bands, beads = [], [], []
    for index, leg in enumerate(way.legs):
        left, right = at[index], at[index + 1]
        found = losses.get(leg.run.name)
        if found is not None:
            low, top = _heights(found, to_head, high)
            lines.append(Line(points=((left, low), (right, low)), role=Role.GRADE))
            if top > low:
                lines.append(Line(points=((left, top), (right, top)), role=Role.READING))
            bands.append(Band(points=((left, low, top), (right, low, top))))
        beads += [_pocket(leg, one, left, right, scale, high) for one in pockets if one.place.run == leg.run.name]
    marks = [_mark(job, one, shifts.get(one.tag), way, at, to_head, high) for one in gauges]
    stems = [
        Line(points=((mark.x, mark.y), (mark.x, _heights(shifts[one.tag], to_head, high)[1])), role=Role.READING)
        for mark, one in zip(marks, gauges, strict=True)
        if one.tag in shifts
    ]
    return Drawing(
        start=0.0,
        end=1.0,
        panels=(Panel(low=0.0, high=high, share=1.0, name=f"smallest trouble, {job.display.length.text}"),),
        bands=tuple(bands),
        lines=(*lines, *stems),
        beads=tuple(beads),
        marks=tuple(marks),
        stops=tuple(Stop(x=x, text=name) for x, name in zip(at, way.stations, strict=True)),
        caption="Smallest trouble: a loss seen and, above, placed; gauges; ○ trapped air",
    )


def _sizes(one: TroubleSight | None) -> list[float]:
    """What of a trouble's sight has a size, as pressure or length."""
    if one is None:
        return []
    return [size * (one.pa_per_size or 1.0) for size in (one.seen, one.placed) if size is not None]


def _heights(one: TroubleSight, factor: float, high: float) -> tuple[float, float]:
    """Where it is seen and where it is placed, held within the scale; the top of it where never."""
    times = factor * (one.pa_per_size or 1.0)
    low, top = (high if size is None else min(size * times, high) for size in (one.seen, one.placed))
    return low, max(low, top)


def _pocket(leg: Leg, one: TroubleSight, left: float, right: float, scale: float, high: float) -> Beads:
    """Trapped air where it would sit."""
    share = 0.12
    if one.place.distance_m is not None and leg.run.length_m > 0.0:
        share = min(max(one.place.distance_m / leg.run.length_m, 0.0), 1.0)
    x = left + (share if leg.forwards else 1.0 - share) * (right - left)
    low, top = _heights(one, scale, high)
    return Beads(points=((x, low), (x, top)) if top > low else ((x, low),), role=Role.POCKET)


def _mark(
    job: Job,
    one: GaugeSight,
    shift: TroubleSight | None,
    way: Way,
    at: tuple[float, ...],
    to_head: float,
    high: float,
) -> Mark:
    """A gauge at the smallest shift that would be seen; at the edge where none would."""
    x = at[way.stations.index(job.gauge(one.tag).station)]
    y = high if shift is None or shift.seen is None else shift.seen * to_head
    return Mark(
        x=x,
        y=min(y, high),
        sign=MARKS[one.verdict],
        label=one.tag,
        role=VERDICT_ROLES[one.verdict],
        beyond=int(y >= high),
    )
