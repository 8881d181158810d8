"""What the means of spells do not show: a signal that is noisy, slow or stamped late, and a shut section that slowly loses its liquid.

Each is held against the log between and within the spells, which the balance of the spells does not use; so each has its own odds, and
they multiply with those of all other explanations.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace

import numpy as np
from numpy.typing import NDArray
from scipy.special import gammaln

from headledger.diagnosis.averages import common_motion
from headledger.diagnosis.lags import late_logs, slow_gauges
from headledger.diagnosis.layout import Layout
from headledger.diagnosis.readings import Timeline
from headledger.diagnosis.result import CauseKind, Place
from headledger.diagnosis.spells import Spell
from headledger.diagnosis.trait import FEWEST_SAMPLES, Trait
from headledger.plant.digest import Digest
from headledger.plant.job import SpellKind
from headledger.statistics.sizes import log_sum

Array = NDArray[np.float64]

FEWEST_GAUGES = 3
"""Gauges below which none is called noisy: it has no others to be noisier than."""

NOISE_SPREAD = 0.15
"""Standard deviation of the common logarithm of like instruments' noise, in spans: all but a few within a factor of two (no source)."""

NOISY_RANGE = (0.4, 3.0)
"""Common logarithm of how much noisier than its like a noisy signal is, from and to, evenly between. [-]"""

JUMPS_A_SPELL = 1
"""As many of a signal's steps in a spell, the widest of all, say nothing of its noise: one jump is none. [-]"""

NOISE_THAT_MATTERS = 0.2
"""Noise of a single reading below this part of the tolerance is no trouble. [-]"""

BEYOND_DOUBT = 9.0
"""An offset with at least this log density for it is undone before the rest is judged. [nat]"""

LEAK_TOLERANCES = 0.3
"""The smallest fall over the time at rest that matters, in the tightest tolerance. [-]"""

FASTEST_LEAK_PA_S = 1e6 / 3600.0
"""Fastest fall weighed: 10 bar an hour. [Pa/s]"""

LEAK_STEPS = 12
"""Stretches of a still spell whose increments tell how the common head wanders."""


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
    steps = [np.zeros((0, len(gauges)))]
    for spell in spells:
        reading = timeline.reading_pa[spell.first : spell.last]
        rest = reading - np.where(single[None, :], common_motion(reading, single)[:, None], 0.0)
        steps.append(np.diff(rest, axis=0))
    noise, counts = _scatter(np.concatenate(steps), JUMPS_A_SPELL * len(spells))
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


def _scatter(steps: Array, jumps: int) -> tuple[Array, Array]:
    """Noise of each column from its successive differences, and how many there are; so many of the widest are left out."""
    squares = np.sort(np.where(np.isfinite(steps), steps**2, np.inf), axis=0)
    counts = np.isfinite(steps).sum(axis=0)
    kept = np.maximum(counts - jumps, counts // 2)
    squares[np.arange(squares.shape[0])[:, None] >= kept[None, :]] = 0.0
    return np.sqrt(squares.sum(axis=0) / np.maximum(kept, 1.0) / 2.0), counts


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


def undone_traits(traits: Sequence[Trait]) -> tuple[Trait, ...]:
    """Offsets of clocks that are beyond doubt, and so undone before the rest is judged."""
    return tuple(one for one in traits if one.kind is CauseKind.CLOCK_OFFSET and one.log_ratio > BEYOND_DOUBT)


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
    late = {timeline.gauge_files[trait.own[0]]: trait.size for trait in undone_traits(traits)}
    return tuple(_moved(digest, late.get(digest.file, 0.0)) for digest in digests) if late else None


def _moved(digest: Digest, late_s: float) -> Digest:
    """A log with its stamps moved back, by whole blocks."""
    blocks = round(late_s / digest.width_s)
    if not blocks:
        return digest
    shift = blocks * digest.width_s
    return replace(digest, index=digest.index - blocks, first_s=digest.first_s - shift, last_s=digest.last_s - shift)
