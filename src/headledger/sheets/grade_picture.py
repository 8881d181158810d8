"""The picture of the trade: the line drawn out along the pipe, with what it should hold and what the gauges said.

One function from a result to a drawing; screen and paper show the same one.
"""

from __future__ import annotations

from collections.abc import Iterable, Iterator, Sequence
from dataclasses import dataclass
from itertools import pairwise
from statistics import median

from headledger.diagnosis.result import CauseKind, CheckResult, GaugeFound, RunGrade, SpellFound, Verdict
from headledger.diagnosis.wording import kind_words
from headledger.plant.job import LevelPoint, SpellKind
from headledger.sheets.columns import flow_words
from headledger.sheets.drawing import Band, Beads, Drawing, Fill, Line, Mark, Note, Panel, Point, Role, Stop, widened
from headledger.sheets.marks import MARKS, by_trouble
from headledger.sheets.numbers import decimals_for, fixed
from headledger.sheets.paths import Leg, Way, places_along, way_past

VERDICT_ROLES = {
    Verdict.FAIL: Role.FAIL,
    Verdict.UNRESOLVED: Role.UNRESOLVED,
    Verdict.UNCHECKED: Role.UNCHECKED,
    Verdict.PASS: Role.PASS,
}

# A head doubted more than this is not known; no line is drawn for it. [m]
_UNKNOWN_M = 15.0
# Where grade line and gauges would fill less than this share of one scale, the scale is broken between them and the pipe.
_BREAK_BELOW = 0.45
_GRADE_SHARE = 0.7
# A mark further off the line than its whole extent stands at the edge.
_REACH = 1.0
_POCKET_BEADS = 7


@dataclass(frozen=True, slots=True)
class _Frame:
    """What does not change from spell to spell: where things stand along the way, and the scales."""

    result: CheckResult
    way: Way
    at: tuple[float, ...]
    scale: float
    unit: str
    panels: tuple[Panel, ...]

    @property
    def pipe_panel(self) -> int:
        """The panel that holds the pipe."""
        return len(self.panels) - 1

    def x_of(self, station: str) -> float:
        """Where a station stands along the way."""
        return self.at[self.way.stations.index(station)]


def grade_picture(result: CheckResult, way: Way, spell: SpellFound, *, chosen: str = "") -> Drawing:
    """The grade line of one spell along a way through the piping.

    Parameters
    ----------
    result : CheckResult
    way : Way
    spell : SpellFound
        Of the result.
    chosen : str
        Tag of the gauge that is looked at.

    Returns
    -------
    Drawing
        Heights in the job's unit of length above its datum; its scales are the same for every spell.
    """
    frame = _frame(result, way)
    grades = {grade.run: grade for grade in spell.grade}
    lines, bands, notes, items, beads = [], [], [], [], []
    for piece in _pieces(frame, grades):
        lines.append(Line(points=tuple((x, y) for x, y, _ in piece), role=Role.GRADE))
        bands.append(Band(points=tuple((x, y - u, y + u) for x, y, u in piece)))
    for index, leg in enumerate(way.legs):
        grade = grades.get(leg.run.name)
        if grade is None:
            continue
        left, right = frame.at[index], frame.at[index + 1]
        if not grade.is_open:
            notes.append(_pipe_note(frame, (left + right) / 2.0, "shut"))
        elif _unknown(grade):
            notes.append(_pipe_note(frame, (left + right) / 2.0, "head not determined"))
        else:
            steps, words = _steps(frame, _run_line(frame, leg, grade, left, right))
            lines += steps
            notes += words
        if leg.run.item:
            items.append(_pipe_note(frame, (left + right) / 2.0, leg.run.item))
        beads += _pockets(frame, leg, grade, left, right)
    marks = tuple(_marks(frame, spell, chosen))
    ground = _ground(frame)
    pipe = _pipe(frame)
    return Drawing(
        start=0.0,
        end=1.0,
        panels=frame.panels,
        fills=(Fill(points=pipe, role=Role.PIPE, panel=frame.pipe_panel),),
        bands=tuple(bands),
        lines=(
            *((Line(points=ground, role=Role.GROUND, panel=frame.pipe_panel),) if ground else ()),
            Line(points=pipe, role=Role.PIPE, panel=frame.pipe_panel),
            *lines,
            *_stems(frame, spell),
        ),
        beads=tuple(beads),
        marks=marks,
        notes=(*notes, *items),
        stops=tuple(_stops(frame, chosen)),
        caption=_caption(frame, spell),
    )


def best_way(result: CheckResult, ways: Sequence[Way]) -> int:
    """Index of the way to look at first: past the place of the leading cause, else past the worst gauge, else the first."""
    station_of = {gauge.tag: gauge.station for gauge in result.gauges}
    for cause in result.causes[:1]:
        tag = cause.place.gauge or next(iter(cause.place.gauges), "")
        past = way_past(ways, station=cause.place.station or station_of.get(tag, ""), run=cause.place.run)
        if past is not None:
            return past
    worst = by_trouble(result.gauges)[:1]
    return next((past for g in worst if (past := way_past(ways, station=g.station)) is not None), 0)


def tells_most(result: CheckResult) -> int:
    """Index of the spell to look at first: the one with the greatest flow, where losses show."""
    flows = [max((abs(flow.flow_m3_s) for flow in spell.flows), default=0.0) for spell in result.spells]
    return flows.index(max(flows)) if flows else 0


def _frame(result: CheckResult, way: Way) -> _Frame:
    at = places_along(way)
    unit = result.job.display.length
    scale = 1.0 / unit.factor
    bare = _Frame(result=result, way=way, at=at, scale=scale, unit=unit.text, panels=())
    heights = [y for _, y in (*_pipe(bare), *_ground(bare))]
    low, high = _grade_range(bare)
    pipe_low, pipe_high = widened(min(heights), max(heights), least=0.5 * scale)
    foot, top = min(low, pipe_low), max(high, pipe_high)
    name = f"head, {unit.text}"
    panels: tuple[Panel, ...]
    if pipe_high < low and high - low < _BREAK_BELOW * (top - foot):
        panels = (
            Panel(low=low, high=high, share=_GRADE_SHARE, name=name),
            Panel(low=pipe_low, high=pipe_high, share=1.0 - _GRADE_SHARE, name=f"pipe, {unit.text}"),
        )
    else:
        panels = (Panel(low=foot, high=top, share=1.0, name=name),)
    return _Frame(result=result, way=way, at=at, scale=scale, unit=unit.text, panels=panels)


def _grade_range(frame: _Frame) -> tuple[float, float]:
    """Scale of the heads: of the grade lines of all spells, and of those marks that are not far off them."""
    names = {leg.run.name for leg in frame.way.legs}
    heads = [
        value
        for spell in frame.result.spells
        for grade in spell.grade
        if grade.run in names and grade.is_open and not _unknown(grade)
        for value in (
            grade.start_m - grade.start_u95_m,
            grade.start_m + grade.start_u95_m,
            grade.end_m - grade.end_u95_m,
            grade.end_m + grade.end_u95_m,
        )
    ]
    said = [spell.head_m for gauge in _gauges_on(frame) for spell in gauge.spells if spell.head_m is not None]
    if not heads:
        heads = said or [0.0]
    low, high = min(heads), max(heads)
    least = max(0.5, 6.0 * median(_tolerances_m(frame) or [0.1]))
    reach = _REACH * max(high - low, least)
    near = [head for head in said if low - reach <= head <= high + reach]
    return widened(min([low, *near]) * frame.scale, max([high, *near]) * frame.scale, least=least * frame.scale)


def _tolerances_m(frame: _Frame) -> list[float]:
    """Tolerances of the gauges on the way as heads of water: only a measure of what is worth seeing."""
    return [gauge.tolerance_pa / 9.8e3 for gauge in _gauges_on(frame)]


def _gauges_on(frame: _Frame) -> tuple[GaugeFound, ...]:
    stations = set(frame.way.stations)
    return tuple(gauge for gauge in frame.result.gauges if gauge.station in stations)


def _unknown(grade: RunGrade) -> bool:
    return max(grade.start_u95_m, grade.end_u95_m) > _UNKNOWN_M


def _pieces(frame: _Frame, grades: dict[str, RunGrade]) -> Iterator[list[tuple[float, float, float]]]:
    """Unbroken stretches of the grade line: place, head, u95."""
    piece: list[tuple[float, float, float]] = []
    for index, leg in enumerate(frame.way.legs):
        grade = grades.get(leg.run.name)
        if grade is None or not grade.is_open or _unknown(grade):
            if piece:
                yield piece
            piece = []
            continue
        piece += _run_line(frame, leg, grade, frame.at[index], frame.at[index + 1]).points
    if piece:
        yield piece


@dataclass(frozen=True, slots=True)
class _RunLine:
    """The grade line of one run from left to right, and which of its falls are whose."""

    points: tuple[tuple[float, float, float], ...]
    steps: tuple[tuple[int, Point, Point], ...]


def _run_line(frame: _Frame, leg: Leg, grade: RunGrade, left: float, right: float) -> _RunLine:
    """The grade line of one run, with its steps where they sit."""
    first, last = (grade.start_m, grade.end_m) if leg.forwards else (grade.end_m, grade.start_m)
    doubts = (grade.start_u95_m, grade.end_u95_m) if leg.forwards else (grade.end_u95_m, grade.start_u95_m)
    sign = 1.0 if leg.forwards else -1.0
    falls = [(_step_share(frame, leg, step.cause), sign * step.drop_m, step.cause) for step in grade.steps]
    if leg.run.length_m == 0.0:
        # what has no length takes its head at one place
        falls.append((0.5, first - last - sum(drop for _, drop, _ in falls), -1))
    falls.sort(key=lambda fall: (fall[0], fall[2]))
    even = first - last - sum(drop for _, drop, _ in falls)

    def point(share: float, taken: float) -> tuple[float, float, float]:
        return (
            left + share * (right - left),
            (first - even * share - taken) * frame.scale,
            (doubts[0] + share * (doubts[1] - doubts[0])) * frame.scale,
        )

    points, steps, taken = [point(0.0, 0.0)], [], 0.0
    for share, drop, cause in falls:
        before, after = point(share, taken), point(share, taken + drop)
        points += [before, after]
        taken += drop
        if cause >= 0:
            steps.append((cause, before[:2], after[:2]))
    points.append(point(1.0, taken))
    return _RunLine(points=tuple(points), steps=tuple(steps))


def _step_share(frame: _Frame, leg: Leg, cause: int) -> float:
    """How far along a run, in the sense of the way, a cause's step is drawn: a pocket below the high end, all else at the middle."""
    found = frame.result.causes[cause]
    if found.kind is not CauseKind.AIR_POCKET:
        return 0.5
    if found.place.distance_m is not None and leg.run.length_m > 0.0:
        share = min(max(found.place.distance_m / leg.run.length_m, 0.0), 1.0)
        return share if leg.forwards else 1.0 - share
    return 0.12 if _falls(frame, leg) else 0.88


def _falls(frame: _Frame, leg: Leg) -> bool:
    job = frame.result.job
    return job.station(leg.first).elevation_m >= job.station(leg.last).elevation_m


def _steps(frame: _Frame, line: _RunLine) -> tuple[list[Line], list[Note]]:
    """The steps that causes make, each drawn over the line with its word."""
    lines, notes = [], []
    for number, before, after in line.steps:
        cause = frame.result.causes[number]
        drop = before[1] - after[1]
        lines.append(Line(points=(before, after), role=Role.STEP))
        word = kind_words(cause.kind).removeprefix("a ").removeprefix("trapped ")
        size = fixed(abs(drop), decimals_for(0.1 * abs(drop)))
        text = f"{word}{'' if cause.accepted else '?'} {size} {frame.unit}"
        notes.append(Note(x=before[0], y=(before[1] + after[1]) / 2.0, text=text, role=Role.STEP))
    return lines, notes


def _pockets(frame: _Frame, leg: Leg, grade: RunGrade, left: float, right: float) -> list[Beads]:
    """Gas where it sits: from its high point down the pipe, over the height it has in this spell."""
    found = []
    for step in grade.steps:
        cause = frame.result.causes[step.cause]
        if cause.kind is not CauseKind.AIR_POCKET:
            continue
        profile = [point for point in _pipe(frame) if left - 1e-9 <= point[0] <= right + 1e-9]
        if cause.place.distance_m is None:
            top = max(range(len(profile)), key=lambda k: profile[k][1])
        else:
            x = left + _step_share(frame, leg, step.cause) * (right - left)
            top = min(range(len(profile)), key=lambda k: abs(profile[k][0] - x))
        down = profile[top:] if step.drop_m * (1.0 if leg.forwards else -1.0) > 0.0 else profile[top::-1]
        beads = _downwards(down, abs(step.drop_m) * frame.scale)
        found.append(Beads(points=beads, role=Role.POCKET, panel=frame.pipe_panel))
    return found


def _downwards(profile: Sequence[Point], depth: float) -> tuple[Point, ...]:
    """Points along a falling line, from its first point down to a depth below it or to its foot."""
    foot = [profile[0]]
    for before, after in pairwise(profile):
        if after[1] >= before[1]:
            break
        if profile[0][1] - after[1] >= depth:
            share = (depth - (profile[0][1] - before[1])) / (before[1] - after[1])
            foot.append((before[0] + share * (after[0] - before[0]), profile[0][1] - depth))
            break
        foot.append(after)
    strung = [
        (a[0] + k / _POCKET_BEADS * (b[0] - a[0]), a[1] + k / _POCKET_BEADS * (b[1] - a[1]))
        for a, b in pairwise(foot)
        for k in range(_POCKET_BEADS)
    ]
    return (*strung, foot[-1])


def _levels(frame: _Frame, leg: Leg, left: float, right: float) -> list[tuple[float, LevelPoint]]:
    """Levelled points of one run from left to right."""
    points = [p for p in frame.result.job.levels if p.run == leg.run.name and leg.run.length_m > 0.0]
    placed = []
    for point in points:
        share = min(max(point.distance_m / leg.run.length_m, 0.0), 1.0)
        placed.append((left + (share if leg.forwards else 1.0 - share) * (right - left), point))
    return sorted(placed, key=lambda item: item[0])


def _pipe(frame: _Frame) -> tuple[Point, ...]:
    """Elevation of the pipe along the way; of a surface, where the way ends at one."""
    job = frame.result.job
    points: list[Point] = [(frame.at[0], job.station(frame.way.stations[0]).elevation_m * frame.scale)]
    for index, leg in enumerate(frame.way.legs):
        inner = _levels(frame, leg, frame.at[index], frame.at[index + 1])
        points += [(x, level.elevation_m * frame.scale) for x, level in inner]
        points.append((frame.at[index + 1], job.station(leg.last).elevation_m * frame.scale))
    return tuple(points)


def _ground(frame: _Frame) -> tuple[Point, ...]:
    """Ground along the way, where levels give it."""
    points: list[Point] = []
    for index, leg in enumerate(frame.way.legs):
        inner = _levels(frame, leg, frame.at[index], frame.at[index + 1])
        points += [(x, level.ground_m * frame.scale) for x, level in inner if level.ground_m is not None]
    return tuple(points)


def _pipe_note(frame: _Frame, x: float, text: str) -> Note:
    """Words beside the pipe."""
    before, after = next(((a, b) for a, b in pairwise(_pipe(frame)) if a[0] <= x <= b[0]), ((x, 0.0), (x, 0.0)))
    share = (x - before[0]) / (after[0] - before[0]) if after[0] > before[0] else 0.0
    return Note(x=x, y=before[1] + share * (after[1] - before[1]), text=text, role=Role.NAME, panel=frame.pipe_panel)


def _marks(frame: _Frame, spell: SpellFound, chosen: str) -> Iterator[Mark]:
    """Every gauge on the way at its own head."""
    panel = frame.panels[0]
    for gauge in _by_weight(_gauges_on(frame), chosen):
        said = next((s for s in gauge.spells if s.id == spell.id), None)
        if said is None or said.head_m is None:
            continue
        y = said.head_m * frame.scale
        beyond = (y > panel.high) - (y < panel.low)
        off = "" if not beyond else f" at {y:.0f} {frame.unit}"
        yield Mark(
            x=frame.x_of(gauge.station),
            y=min(max(y, panel.low), panel.high),
            sign=MARKS[gauge.verdict],
            label=f"{gauge.tag}{off}",
            role=VERDICT_ROLES[gauge.verdict],
            chosen=gauge.tag == chosen,
            beyond=int(beyond),
        )


def _by_weight(gauges: Iterable[GaugeFound], chosen: str) -> list[GaugeFound]:
    """The chosen gauge first, then the worst news: what has to keep its word where there is little room."""
    return sorted(by_trouble(gauges), key=lambda gauge: gauge.tag != chosen)


def _stems(frame: _Frame, spell: SpellFound) -> Iterator[Line]:
    """From each mark to where it should stand, for gauges that are in trouble."""
    panel = frame.panels[0]
    for gauge in _gauges_on(frame):
        said = next((s for s in gauge.spells if s.id == spell.id), None)
        if said is None or said.head_m is None or said.expected_head_m is None:
            continue
        if gauge.verdict in (Verdict.FAIL, Verdict.UNRESOLVED):
            x = frame.x_of(gauge.station)
            ends = [min(max(y * frame.scale, panel.low), panel.high) for y in (said.head_m, said.expected_head_m)]
            yield Line(points=((x, ends[0]), (x, ends[1])), role=VERDICT_ROLES[gauge.verdict])


def _stops(frame: _Frame, chosen: str) -> Iterator[Stop]:
    """Names of the stations; the ends of the way and those of gauges in trouble stay longest."""
    station_of = {gauge.tag: gauge.station for gauge in frame.result.gauges}
    bad = {g.station for g in frame.result.gauges if g.verdict in (Verdict.FAIL, Verdict.UNRESOLVED)}
    names = frame.way.stations
    for x, name in zip(frame.at, names, strict=True):
        rank = 0 if name == station_of.get(chosen) else 1 if name in bad else 2 if name in (names[0], names[-1]) else 3
        yield Stop(x=x, text=name, rank=rank)


def _caption(frame: _Frame, spell: SpellFound) -> str:
    """Which spell, its flow along the way, and how sure the line is."""
    runs = [leg.run.name for leg in frame.way.legs]
    found = {flow.run: flow for flow in spell.flows}
    words = list(dict.fromkeys(flow_words(found[run], frame.result.job.display.flow) for run in runs if run in found))
    unit = frame.result.job.display.flow.text
    flow = f", {', then '.join(word.removesuffix(unit).strip() for word in words)} {unit}" if words else ""
    if spell.kind is SpellKind.STILL:
        flow = ""
    doubts = [max(g.start_u95_m, g.end_u95_m) * frame.scale for g in spell.grade if g.run in runs and not _unknown(g)]
    sure = f"; grade line ± {fixed(max(doubts), decimals_for(max(doubts)))} {frame.unit}" if doubts else ""
    return f"Spell {spell.id} of {len(frame.result.spells)}, {spell.kind.value}{flow}{sure}"
