"""What the means of spells do not show: a signal that is noisy, slow or stamped late, and a shut section that slowly loses its liquid.

Each is held against the log between and within the spells, which the balance of the spells does not use; so each has its own odds, and
they multiply with those of all other explanations.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray
from scipy.special import gammaln

from headledger.diagnosis.averages import common_motion
from headledger.diagnosis.layout import Layout
from headledger.diagnosis.readings import Timeline
from headledger.diagnosis.result import CauseKind, Place
from headledger.diagnosis.spells import Spell
from headledger.physics.waves import travel_s
from headledger.plant.digest import Digest
from headledger.plant.job import SpellKind
from headledger.statistics.lag import lagged
from headledger.statistics.sizes import log_sum

Array = NDArray[np.float64]

TRAIT_KINDS = (CauseKind.NOISY, CauseKind.SLUGGISH, CauseKind.CLOCK_OFFSET, CauseKind.LEAK)

NOISE_SPREAD = 0.15
"""Standard deviation of the common logarithm of like instruments' noise, in spans: all but a few within a factor of two (no source)."""

NOISY_RANGE = (0.4, 3.0)
"""Common logarithm of how much noisier than its like a noisy signal is, from and to, evenly between. [-]"""

NOISE_THAT_MATTERS = 0.2
"""Noise of a single reading below this part of the tolerance is no trouble. [-]"""

BEYOND_DOUBT = 9.0
"""An offset with at least this log density for it is undone before the rest is judged. [nat]"""

FEWEST_SAMPLES, FEWEST_GAUGES = 30, 3

LONGEST_LAG_S, LAG_STEPS = 600.0, 24
"""Longest lag and offset looked for, and how many between. [s]"""

BLUR_BLOCKS = 3.0
"""A lag of so many blocks is none: two blocks blur it. [-]"""

TRAVEL_STEPS = 8
"""Delays tried up to the longest that a change may take through the pipe."""

SETTLED_SHARE = 0.25
"""Longest lag that is looked for, as a part of the usual spell. [-]"""

MISFIT_SHARE = 0.05
"""How far a sound gauge may part from what the others predict while flows change, in its own usual motion. [-]"""

PER_CHANGE = 6.0
"""A change of flow tells of a gauge's lag as much as so many independent readings. [-]"""

AFTER_CHANGE_S = 120.0
"""How long after a change a lag may still show. [s]"""

MOTIONS = 6
"""Independent motions of the other gauges from which one gauge's own is predicted."""

LEAK_TOLERANCES = 0.3
"""The smallest fall over the time at rest that matters, in the tightest tolerance. [-]"""

FASTEST_LEAK_PA_S = 1e6 / 3600.0
"""Fastest fall weighed: 10 bar an hour. [Pa/s]"""

LEAK_STEPS = 12
"""Stretches of a still spell whose increments tell how the common head wanders."""


@dataclass(frozen=True, slots=True, kw_only=True)
class Trait:
    """One such cause with its odds.

    Parameters
    ----------
    kind : CauseKind
    place : Place
    own : tuple of int
        Gauges that it belongs to.
    log_ratio : float
        Log of the density of the data with it over that without. [nat]
    size, sd : float
        In SI; 0 where the kind has no size.
    places : int
        At how many places its kind may sit.
    """

    kind: CauseKind
    place: Place
    own: tuple[int, ...]
    log_ratio: float
    size: float
    sd: float
    places: int


def find_traits(layout: Layout, timeline: Timeline, spells: Sequence[Spell]) -> tuple[Trait, ...]:
    """Every trait that the log has something to say of.

    Parameters
    ----------
    layout : Layout
    timeline : Timeline
    spells : sequence of Spell

    Returns
    -------
    tuple of Trait
    """
    return (
        *noisy_gauges(layout, timeline, spells),
        *slow_gauges(layout, timeline, spells),
        *late_logs(layout, timeline, spells),
        *leaks(layout, timeline, spells),
    )


def noisy_gauges(layout: Layout, timeline: Timeline, spells: Sequence[Spell]) -> list[Trait]:
    """Gauges whose readings scatter far more than those of their like, with what all heads do together taken out."""
    gauges = layout.job.gauges
    single = np.array([not gauge.is_differential for gauge in gauges])
    squares, counts = np.zeros(len(gauges)), np.zeros(len(gauges))
    for spell in spells:
        reading = timeline.reading_pa[spell.first : spell.last]
        rest = reading - np.where(single[None, :], common_motion(reading, single)[:, None], 0.0)
        steps = np.diff(rest, axis=0)
        known = np.isfinite(steps)
        squares += np.where(known, steps, 0.0).__pow__(2).sum(axis=0)
        counts += known.sum(axis=0)
    with np.errstate(invalid="ignore", divide="ignore"):
        noise = np.sqrt(squares / np.maximum(counts, 1.0) / 2.0)
    usable = (counts >= FEWEST_SAMPLES) & (noise > 0.0)
    if usable.sum() < FEWEST_GAUGES:
        return []
    span = np.array([gauge.span_pa for gauge in gauges])
    logs = np.log10(np.where(usable, noise / span, 1.0))
    found = []
    for index in np.flatnonzero(usable):
        others = logs[usable & (np.arange(len(gauges)) != index)]
        spread = max(NOISE_SPREAD, float(np.median(np.abs(others - np.median(others)))) / 0.6745)
        more = float(logs[index] - np.median(others))
        tolerance = gauges[index].tolerance_at(gauges[index].range_high_pa)
        if not NOISY_RANGE[0] < more < NOISY_RANGE[1] or noise[index] < NOISE_THAT_MATTERS * tolerance:
            continue
        usual = -0.5 * (more / spread) ** 2 - np.log(spread * np.sqrt(2.0 * np.pi))
        found.append(
            Trait(
                kind=CauseKind.NOISY,
                place=Place(gauge=gauges[index].tag),
                own=(int(index),),
                log_ratio=float(-np.log(NOISY_RANGE[1] - NOISY_RANGE[0]) - usual),
                size=0.0,
                sd=0.0,
                places=len(gauges),
            )
        )
    return found


@dataclass(frozen=True, slots=True)
class _Told:
    """What some gauges did, and the others: times, readings, motions, where flows change, and what a sound gauge may leave unexplained."""

    time_s: Array
    own: Array
    motions: Array
    near: NDArray[np.bool_]
    floor: Array


def slow_gauges(layout: Layout, timeline: Timeline, spells: Sequence[Spell]) -> list[Trait]:
    """Gauges that follow what the others do by a first-order lag."""
    found = []
    longest_s = _longest_lag_s(timeline, spells)
    for index, gauge in enumerate(layout.job.gauges):
        lags = _grid(_allowed_s(layout, timeline) + gauge.damping_s, longest_s)
        others = [k for k in range(layout.gauge_count) if k != index]
        told = _own_and_others(layout, timeline, spells, (index,), others)
        if told is None or not lags.size:
            continue
        tried = [lagged(told.time_s, told.motions, float(lag)) for lag in lags]
        errors = np.array([_unexplained(told, motions) for motions in tried])
        degrees = _degrees(told, tried[int(np.argmin(errors))], spells)
        fit = _Fit(_sound_error(layout, timeline, told, gauge.damping_s), errors, lags, degrees)
        if fit.log_ratio > 0.0:
            found.append(_timed(CauseKind.SLUGGISH, Place(gauge=gauge.tag), (index,), fit, len(layout.job.gauges)))
    return found


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
        told = _own_and_others(layout, timeline, spells, own, elsewhere)
        if file == main or told is None or not steps.size:
            continue
        none = _sound_error(layout, timeline, told)
        fit = _offset_fit(timeline, spells, told, np.concatenate([-steps[::-1], steps]), none)
        if fit.log_ratio > 0.0:
            tags = tuple(layout.job.gauges[k].tag for k in own)
            place = Place(gauge=tags[0]) if len(tags) == 1 else Place(gauges=tags)
            found.append(_timed(CauseKind.CLOCK_OFFSET, place, own, fit, len(files) - 1))
    return found


def _offset_fit(timeline: Timeline, spells: Sequence[Spell], told: _Told, offsets: Array, none: float) -> _Fit:
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
    """How much better lags explain what a gauge did than none does: unexplained squares, and how many readings they are worth."""

    none: float
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


def _sound_error(layout: Layout, timeline: Timeline, told: _Told, damping_s: float = 0.0) -> float:
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


def _near_changes(timeline: Timeline, spells: Sequence[Spell]) -> NDArray[np.bool_]:
    """Blocks in which flows change, and those soon after: only there does a lag show, and a slow wander elsewhere is none."""
    near = np.ones(timeline.start_s.size, dtype=bool)
    after = int(np.ceil(AFTER_CHANGE_S / timeline.width_s))
    for spell in spells:
        near[spell.first + after : spell.last] = False
    return near


def _grid(least_s: float, longest_s: float) -> Array:
    """Lags from the least that counts to the longest, evenly in their logarithm. [s]"""
    return np.geomspace(least_s, longest_s, LAG_STEPS) if least_s < longest_s else np.zeros(0)


def _own_and_others(
    layout: Layout, timeline: Timeline, spells: Sequence[Spell], own: Sequence[int], others: Sequence[int]
) -> _Told | None:
    """Readings of some gauges and the main motions of the others, where all are known."""
    reading = timeline.reading_pa
    kept = [k for k in others if np.isfinite(reading[:, k]).mean() > 0.5]
    used = [k for k in own if np.isfinite(reading[:, k]).mean() > 0.5]
    if len(kept) < 2 or not used:
        return None
    known = np.isfinite(reading[:, kept]).all(axis=1) & np.isfinite(reading[:, used]).all(axis=1)
    if known.sum() < FEWEST_SAMPLES:
        return None
    time_s = timeline.start_s[known]
    near = _near_changes(timeline, spells)[known]
    if near.sum() < FEWEST_SAMPLES:
        return None
    scale = np.array([layout.job.gauges[k].tolerance_at(layout.job.gauges[k].range_high_pa) for k in kept])
    away = reading[known][:, kept] / scale
    away = away - away.mean(axis=0)
    left, size, _ = np.linalg.svd(away, full_matrices=False)
    count = min(MOTIONS, len(kept))
    readings = reading[known][:, used]
    floor = near.sum() * (MISFIT_SHARE * readings.std(axis=0)) ** 2
    return _Told(time_s, readings, left[:, :count] * size[:count], near, floor)


def _shifted(time_s: Array, motions: Array, offset_s: float) -> Array:
    """Motions as stamps that are late by an offset would show them."""
    return np.column_stack([np.interp(time_s - offset_s, time_s, motion) for motion in motions.T])


def _unexplained(told: _Told, motions: Array) -> float:
    """Squares that the motions leave unexplained, with what a sound gauge may leave; of several gauges the geometric mean."""
    rest = _rest(told, motions)
    return float(np.exp(np.log((rest**2).sum(axis=0) + told.floor + 1e-12).mean()))


def _rest(told: _Told, motions: Array) -> Array:
    """What the motions leave unexplained where flows change."""
    design = np.column_stack([np.ones(motions.shape[0]), motions])[told.near]
    own = told.own[told.near]
    return np.asarray(own - design @ np.linalg.lstsq(design, own, rcond=None)[0])


def _degrees(told: _Told, motions: Array, spells: Sequence[Spell]) -> float:
    """How many independent readings the rest is worth: neighbours that wander together count less, and a change of flow tells so much."""
    rest = _rest(told, motions)
    total = 0.0
    for column in rest.T:
        alike = float(np.clip((column[1:] @ column[:-1]) / max(float(column @ column), 1e-300), 0.0, 0.98))
        total += column.size * (1.0 - alike) / (1.0 + alike)
    return float(min(total, PER_CHANGE * max(len(spells) - 1, 1) * rest.shape[1]))


def leaks(layout: Layout, timeline: Timeline, spells: Sequence[Spell]) -> list[Trait]:
    """A shut section that slowly loses pressure at rest: one common fall, against what its own increments say of its wandering."""
    still = [spell for spell in spells if spell.kind is SpellKind.STILL]
    if not still or any(layout.exchanges):
        return []
    single = np.array([not gauge.is_differential for gauge in layout.job.gauges])
    slopes, deviations, freedoms, lasting = [], [], [], 0.0
    for spell in still:
        common = common_motion(timeline.reading_pa[spell.first : spell.last], single)
        time_s = timeline.start_s[spell.first : spell.last]
        bounds = np.linspace(0, common.size, min(LEAK_STEPS, common.size // 3) + 1).round().astype(int)
        if bounds.size < 5:
            continue
        means = np.add.reduceat(common, bounds[:-1]) / np.diff(bounds)
        times = np.add.reduceat(time_s, bounds[:-1]) / np.diff(bounds)
        extent, steps = float(times[-1] - times[0]), np.diff(means)
        lasting += extent
        slopes.append(float(means[-1] - means[0]) / extent)
        deviations.append(max(float(steps.std(ddof=1)) * np.sqrt(steps.size) / extent, 1e-9))
        freedoms.append(steps.size - 1.0)
    if not slopes:
        return []
    tightest = min(gauge.tolerance_at(gauge.range_high_pa) for gauge in layout.job.gauges)
    least = LEAK_TOLERANCES * tightest / lasting
    if least >= FASTEST_LEAK_PA_S:
        return []
    rates = -np.geomspace(least, FASTEST_LEAK_PA_S, 400)
    densities = sum(
        _student(rates, slope, deviation, freedom) - _student(np.zeros(1), slope, deviation, freedom)
        for slope, deviation, freedom in zip(slopes, deviations, freedoms, strict=True)
    )
    assert isinstance(densities, np.ndarray)
    weights = np.exp(densities - densities.max())
    weights /= weights.sum()
    mean = float(weights @ rates)
    return [
        Trait(
            kind=CauseKind.LEAK,
            place=Place(),
            own=(),
            log_ratio=float(log_sum(densities) - np.log(rates.size)),
            size=mean,
            sd=float(np.sqrt(weights @ (rates - mean) ** 2)),
            places=1,
        )
    ]


def _student(centre: Array, value: float, deviation: float, freedom: float) -> Array:
    """Log density of Student's t about a centre."""
    away = (value - centre) / deviation
    norm = (
        float(gammaln((freedom + 1.0) / 2.0) - gammaln(freedom / 2.0))
        - 0.5 * np.log(freedom * np.pi)
        - np.log(deviation)
    )
    return np.asarray(norm - 0.5 * (freedom + 1.0) * np.log1p(away**2 / freedom))


def undone(digests: Sequence[Digest], traits: Sequence[Trait], timeline: Timeline) -> tuple[Digest, ...] | None:
    """The logs with stamps that are late beyond doubt set right; None where none is.

    Parameters
    ----------
    digests : sequence of Digest
    traits : sequence of Trait
    timeline : Timeline
        From which the traits were found.

    Returns
    -------
    tuple of Digest or None
    """
    late = {
        timeline.gauge_files[trait.own[0]]: trait.size
        for trait in traits
        if trait.kind is CauseKind.CLOCK_OFFSET and trait.log_ratio > BEYOND_DOUBT
    }
    return tuple(_moved(digest, late.get(digest.file, 0.0)) for digest in digests) if late else None


def _moved(digest: Digest, late_s: float) -> Digest:
    """A log with its stamps moved back, by whole blocks."""
    blocks = round(late_s / digest.width_s)
    if not blocks:
        return digest
    shift = blocks * digest.width_s
    return replace(digest, index=digest.index - blocks, first_s=digest.first_s - shift, last_s=digest.last_s - shift)
