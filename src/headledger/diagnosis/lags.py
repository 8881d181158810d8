"""A gauge that follows late, or a log whose clock is off: what a gauge did is held against the motions of the others.

A change takes its time through the pipe; what a wave's way explains is neither.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from headledger.diagnosis.layout import Layout
from headledger.diagnosis.neighbours import Told, left_over, own_and_others
from headledger.diagnosis.readings import Timeline
from headledger.diagnosis.result import CauseKind, Place
from headledger.diagnosis.spells import Spell
from headledger.diagnosis.trait import Trait
from headledger.physics.waves import travel_s
from headledger.statistics.lag import lagged
from headledger.statistics.sizes import log_sum

Array = NDArray[np.float64]

LONGEST_LAG_S, LAG_STEPS = 600.0, 24
"""Longest lag and offset looked for, and how many between. [s]"""

BLUR_BLOCKS = 3.0
"""A lag of so many blocks is none: two blocks blur it. [-]"""

TRAVEL_STEPS = 8
"""Delays tried up to the longest that a change may take through the pipe."""

SETTLED_SHARE = 0.25
"""Longest lag that is looked for, as a part of the usual spell. [-]"""

SMOOTHING_BLURS = 1.4
"""Widest smoothing of the others that is held against a lag, in the shortest lag that counts: wider, it would follow nothing. [-]"""

LOOKS_SLOW = 3.0
"""Log density for a lag from which it is undone before the rest is judged. [nat]"""

PER_CHANGE = 6.0
"""A change of flow tells of a gauge's lag as much as so many independent readings. [-]"""


def slow_gauges(layout: Layout, timeline: Timeline, spells: Sequence[Spell]) -> list[Trait]:
    """Gauges that follow what the others do by a first-order lag."""
    found = []
    longest_s = _longest_lag_s(timeline, spells)
    for index, gauge in enumerate(layout.job.gauges):
        lags = _grid(_allowed_s(layout, timeline) + gauge.damping_s, longest_s)
        others = [k for k in range(layout.gauge_count) if k != index]
        told = own_and_others(layout, timeline, spells, (index,), others)
        if told is None or not lags.size:
            continue
        tried = [lagged(told.time_s, told.motions, float(lag)) for lag in lags]
        errors = np.array([_unexplained(told, motions) for motions in tried])
        degrees = _degrees(told, tried[int(np.argmin(errors))], spells)
        # a lag smooths the others' noise away as well as it delays: what smoothing alone explains is none
        sound = _sound_error(layout, timeline, told, gauge.damping_s)
        if errors.min() < sound:
            best = min(float(lags[int(np.argmin(errors))]), SMOOTHING_BLURS * float(lags[0]))
            sound = min(sound, _unexplained(told, _smoothed(told.time_s, told.motions, best)))
        fit = _Fit(sound, errors, lags, degrees)
        if fit.log_ratio > 0.0:
            found.append(_timed(CauseKind.SLUGGISH, Place(gauge=gauge.tag), (index,), fit, len(layout.job.gauges)))
    return found


def unlagged(timeline: Timeline, traits: Sequence[Trait]) -> Timeline:
    """The log with the lag of gauges that look slow undone, so that what is left of the state before moves no mean.

    Parameters
    ----------
    timeline : Timeline
    traits : sequence of Trait

    Returns
    -------
    Timeline

    Notes
    -----
    ``x = y + τ dy/dt``, with the change from the block before to the one after; over a stretch these changes sum to that between its
    ends, so that its mean gains little noise.
    """
    slow = [one for one in traits if one.kind is CauseKind.SLUGGISH and one.log_ratio > LOOKS_SLOW]
    if not slow:
        return timeline
    reading, time_s = timeline.reading_pa.copy(), timeline.start_s
    for trait in slow:
        own = timeline.reading_pa[:, trait.own[0]]
        rate = (own[2:] - own[:-2]) / (time_s[2:] - time_s[:-2])
        reading[1:-1, trait.own[0]] += trait.size * np.where(np.isfinite(rate), rate, 0.0)
    return replace(timeline, reading_pa=reading)


def late_logs(layout: Layout, timeline: Timeline, spells: Sequence[Spell]) -> list[Trait]:
    """Logs whose stamps lead or lag those of the log with the most gauges."""
    files = [file for file in dict.fromkeys(timeline.gauge_files) if file]
    if len(files) < 2:
        return []
    main = max(files, key=lambda file: sum(one == file for one in timeline.gauge_files))
    steps = _grid(_allowed_s(layout, timeline), LONGEST_LAG_S)
    found = []
    for file in files:
        own = tuple(k for k, one in enumerate(timeline.gauge_files) if one == file)
        elsewhere = [k for k, one in enumerate(timeline.gauge_files) if one != file]
        told = own_and_others(layout, timeline, spells, own, elsewhere)
        if file == main or told is None or not steps.size:
            continue
        none = _sound_error(layout, timeline, told)
        fit = _offset_fit(timeline, spells, told, np.concatenate([-steps[::-1], steps]), none)
        if fit.log_ratio > 0.0:
            tags = tuple(layout.job.gauges[k].tag for k in own)
            place = Place(gauge=tags[0]) if len(tags) == 1 else Place(gauges=tags)
            found.append(_timed(CauseKind.CLOCK_OFFSET, place, own, fit, len(files) - 1))
    return found


def _offset_fit(timeline: Timeline, spells: Sequence[Spell], told: Told, offsets: Array, none: float) -> _Fit:
    """How offsets of the stamps explain what the gauges of a log did, looked at finely about the best."""

    def error(offset_s: float) -> float:
        return _unexplained(told, _shifted(told.time_s, told.motions, offset_s))

    errors = np.array([error(float(offset)) for offset in offsets])
    best = float(offsets[int(np.argmin(errors))])
    fine = best + np.linspace(-1.0, 1.0, 41) * max(0.3 * abs(best), timeline.width_s)
    fine = fine[np.abs(fine) >= np.abs(offsets).min()]
    fine_errors = np.array([error(float(offset)) for offset in fine])
    best = float(fine[int(np.argmin(fine_errors))])
    degrees = _degrees(told, _shifted(told.time_s, told.motions, best), spells)
    return _Fit(none, np.concatenate([errors, fine_errors]), np.concatenate([offsets, fine]), degrees)


@dataclass(frozen=True, slots=True)
class _Fit:
    """How much better lags explain what a gauge did than none does: unexplained squares, of none beside each lag, and how many readings
    they are worth.
    """

    none: float | Array
    errors: Array
    lags: Array
    degrees: float

    @property
    def log_ratio(self) -> float:
        """Log density with a lag, even over those tried, over that without. [nat]"""
        gains = 0.5 * self.degrees * (np.log(self.none) - np.log(self.errors))
        return float(log_sum(gains) - np.log(gains.size))

    @property
    def moments(self) -> tuple[float, float]:
        """Mean and standard deviation of the lag. [s]"""
        weights = np.exp(0.5 * self.degrees * (np.log(self.errors.min()) - np.log(self.errors)))
        weights /= weights.sum()
        mean = float(weights @ self.lags)
        return mean, float(np.sqrt(weights @ (self.lags - mean) ** 2))


def _timed(kind: CauseKind, place: Place, own: tuple[int, ...], fit: _Fit, places: int) -> Trait:
    mean, deviation = fit.moments
    # between two lags tried none was looked at
    step = float(np.median(np.diff(np.sort(fit.lags)))) if fit.lags.size > 1 else 0.0
    return Trait(
        kind=kind,
        place=place,
        own=own,
        log_ratio=fit.log_ratio,
        size=mean,
        sd=max(deviation, 0.1 * abs(mean), min(step, 0.2 * abs(mean)) / np.sqrt(12.0)),
        places=places,
    )


def _allowed_s(layout: Layout, timeline: Timeline) -> float:
    """A lag that is none: what a change takes to travel through all the pipe, and what two blocks blur. [s]"""
    return max(_travel_s(layout), BLUR_BLOCKS * timeline.width_s)


def _travel_s(layout: Layout) -> float:
    """What a change takes to travel through all the pipe by the slowest wave. [s]"""
    return travel_s(sum(run.length_m for run in layout.job.runs))


def _sound_error(layout: Layout, timeline: Timeline, told: Told, damping_s: float = 0.0) -> float:
    """Squares that sound gauges leave unexplained: at their damping, or as best they may where changes take their time to travel.

    A wave comes later or earlier than at the others, and a long line fills slowly: both a delay and a lag may be the pipe's own.
    """
    damped = lagged(told.time_s, told.motions, damping_s)
    tried = [damped]
    if _travel_s(layout) > BLUR_BLOCKS * timeline.width_s:
        allowed = _travel_s(layout) * np.linspace(0.0, 1.0, TRAVEL_STEPS + 1)[1:]
        tried += [_shifted(told.time_s, damped, float(way * delay)) for delay in allowed for way in (1.0, -1.0)]
        tried += [lagged(told.time_s, told.motions, damping_s + float(delay)) for delay in allowed]
    return min(_unexplained(told, motions) for motions in tried)


def _longest_lag_s(timeline: Timeline, spells: Sequence[Spell]) -> float:
    """A lag after which a gauge would not come to rest within a spell looks like a drift, and is left to that. [s]"""
    lengths = [(spell.last - spell.first) * timeline.width_s for spell in spells]
    return min(LONGEST_LAG_S, SETTLED_SHARE * float(np.median(lengths))) if lengths else 0.0


def _grid(least_s: float, longest_s: float) -> Array:
    """Lags from the least that counts to the longest, evenly in their logarithm. [s]"""
    return np.geomspace(least_s, longest_s, LAG_STEPS) if least_s < longest_s else np.zeros(0)


def _smoothed(time_s: Array, motions: Array, lag_s: float) -> Array:
    """Motions smoothed as a lag smooths them, forwards and backwards in time, so that nothing is delayed."""
    backwards = lagged(-time_s[::-1], motions[::-1], lag_s)[::-1]
    return np.asarray((lagged(time_s, motions, lag_s) + backwards) / 2.0)


def _shifted(time_s: Array, motions: Array, offset_s: float) -> Array:
    """Motions as stamps that are late by an offset would show them."""
    return np.column_stack([np.interp(time_s - offset_s, time_s, motion) for motion in motions.T])


def _unexplained(told: Told, motions: Array) -> float:
    """Squares that the motions leave unexplained, with what a sound gauge may leave; of several gauges the geometric mean."""
    rest = left_over(told, motions, told.near)
    return float(np.exp(np.log((rest**2).sum(axis=0) + told.floor + 1e-12).mean()))


def _degrees(told: Told, motions: Array, spells: Sequence[Spell]) -> float:
    """How many independent readings the rest is worth: neighbours that wander together count less, and a change of flow tells so much."""
    rest = left_over(told, motions, told.near)
    total = 0.0
    for column in rest.T:
        alike = float(np.clip((column[1:] @ column[:-1]) / max(float(column @ column), 1e-300), 0.0, 0.98))
        total += column.size * (1.0 - alike) / (1.0 + alike)
    return float(min(total, PER_CHANGE * max(len(spells) - 1, 1) * rest.shape[1]))
