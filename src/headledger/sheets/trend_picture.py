"""The picture of one gauge over time: what it read, what it should have read with the band, and the spells shaded."""

from __future__ import annotations

from collections.abc import Iterator
from datetime import datetime, tzinfo
from itertools import pairwise
from zoneinfo import ZoneInfo

import numpy as np
from numpy.typing import NDArray

from headledger.diagnosis.result import CheckResult, GaugeFound, Trend
from headledger.sheets.drawing import Band, Drawing, Line, Note, Panel, Point, Role, Shade, Stop, widened

# A gap longer than this many usual steps parts the line.
_GAP_STEPS = 4.0
# The names of the spells stand above the readings.
_HEAD_ROOM = 0.2
# Points kept of a long log: the least and the greatest of each of half as many stretches.
_MOST_POINTS = 1200
_CLOCK_STEPS_S = (10, 30, 60, 120, 300, 600, 900, 1800, 3600, 7200, 14400, 21600, 43200, 86400, 172800, 604800)
_MOST_STOPS = 8


def trend_picture(result: CheckResult, gauge: GaugeFound, *, spell_id: int = 0) -> Drawing | None:
    """One gauge over the whole log.

    Parameters
    ----------
    result : CheckResult
    gauge : GaugeFound
        Of the result.
    spell_id : int
        The spell that is looked at; 0 for none.

    Returns
    -------
    Drawing or None
        In the gauge's own unit; None where it never gave a reading.
    """
    trend = result.trend
    if trend is None:
        return None
    column = [one.tag for one in result.gauges].index(gauge.tag)
    values = trend.reading_pa[:, column] / gauge.unit.factor
    known = np.isfinite(values)
    if not known.any():
        return None
    start, end = float(trend.start_s[0]), float(trend.start_s[-1]) + trend.width_s
    expected, bands = _expected(result, gauge)
    heights = [
        float(values[known].min()),
        float(values[known].max()),
        *(y for line in expected for _, y in line.points),
    ]
    low, high = widened(min(heights), max(heights), least=4.0 * gauge.tolerance_pa / gauge.unit.factor)
    high += _HEAD_ROOM * (high - low)
    readings = tuple(Line(points=piece, role=Role.READING) for piece in _pieces(trend, values))
    zone = ZoneInfo(result.job.timezone)
    return Drawing(
        start=start,
        end=end,
        panels=(Panel(low=low, high=high, share=1.0, name=f"{gauge.tag}, {gauge.unit.text}"),),
        shades=tuple(
            Shade(
                start=spell.start_s,
                end=spell.end_s,
                label=f"{spell.id} {spell.kind.value}",
                role=Role.CHOSEN_SPELL if spell.id == spell_id else Role.SPELL,
            )
            for spell in result.spells
        ),
        bands=tuple(bands),
        notes=tuple(_names(readings, expected)),
        lines=(*readings, *expected),
        stops=tuple(_clock_stops(start, end, zone)),
        caption=f"{gauge.tag}: reading and expected over {_span_words(end - start)}, times in {result.job.timezone}",
    )


def _expected(result: CheckResult, gauge: GaugeFound) -> tuple[list[Line], list[Band]]:
    """What the gauge should have read in each spell, with its band."""
    factor = gauge.unit.factor
    times = {spell.id: (spell.start_s, spell.end_s) for spell in result.spells}
    lines, bands = [], []
    for said in gauge.spells:
        if said.expected_pa is None or said.u95_pa is None:
            continue
        y, doubt = said.expected_pa / factor, said.u95_pa / factor
        lines.append(Line(points=tuple((x, y) for x in times[said.id]), role=Role.GRADE))
        bands.append(Band(points=tuple((x, y - doubt, y + doubt) for x in times[said.id])))
    return lines, bands


def _names(readings: tuple[Line, ...], expected: list[Line]) -> Iterator[Note]:
    """Which line is which, in words."""
    if expected:
        (start, y), (end, _) = expected[0].points
        yield Note(x=(start + end) / 2.0, y=y, text="expected", role=Role.GRADE)
        inside = [point for line in readings for point in line.points if start <= point[0] <= end]
        if inside:
            yield Note(x=(start + end) / 2.0, y=inside[len(inside) // 2][1], text="reading", role=Role.READING)


def _pieces(trend: Trend, values: NDArray[np.float64]) -> Iterator[tuple[Point, ...]]:
    """The readings without a gap, thinned so that no peak is lost."""
    known = np.isfinite(values)
    times, values = trend.start_s[known] + trend.width_s / 2.0, values[known]
    usual = float(np.median(np.diff(times))) if times.size > 1 else trend.width_s
    cuts = np.flatnonzero(np.diff(times) > _GAP_STEPS * usual) + 1
    most = max(4, _MOST_POINTS // (cuts.size + 1))
    for part_times, part in zip(np.split(times, cuts), np.split(values, cuts), strict=True):
        yield _thinned(part_times, part, most)


def _thinned(times: NDArray[np.float64], values: NDArray[np.float64], most: int) -> tuple[Point, ...]:
    """At most `most` points of a line, with the least and the greatest of every stretch among them."""
    if times.size <= most:
        return tuple(zip(times.tolist(), values.tolist(), strict=True))
    edges = np.linspace(0, times.size, most // 2 + 1).astype(int)
    keep: set[int] = set()
    for first, last in pairwise(edges.tolist()):
        stretch = values[first:last]
        keep |= {first + int(np.argmin(stretch)), first + int(np.argmax(stretch))}
    order = sorted(keep)
    return tuple(zip(times[order].tolist(), values[order].tolist(), strict=True))


def _clock_stops(start_s: float, end_s: float, zone: tzinfo) -> Iterator[Stop]:
    """Round times of day under the picture; a new day is named."""
    extent = end_s - start_s
    step = next((s for s in _CLOCK_STEPS_S if extent / s <= _MOST_STOPS), _CLOCK_STEPS_S[-1])
    while extent / step > _MOST_STOPS:
        step *= 2
    shift = datetime.fromtimestamp(start_s, zone).utcoffset()
    offset = shift.total_seconds() if shift else 0.0
    time_s = -((-(start_s + offset)) // step) * step - offset
    day = ""
    while time_s <= end_s:
        at = datetime.fromtimestamp(time_s, zone)
        clock = f"{at:%H:%M:%S}" if step < 60 else f"{at:%H:%M}"
        today = f"{at:%d %b}"
        text = today if step >= 86400 else f"{today} {clock}" if day and today != day else clock
        day = today
        yield Stop(x=time_s, text=text, rank=1)
        time_s += step


def _span_words(extent_s: float) -> str:
    """How long a log is, in words."""
    for unit_s, word in ((86400.0, "days"), (3600.0, "hours"), (60.0, "minutes")):
        if extent_s >= 2.0 * unit_s:
            return f"{extent_s / unit_s:.0f} {word}"
    return f"{extent_s:.0f} seconds"
