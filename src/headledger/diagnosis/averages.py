"""From a spell's stretch of the log to its means, taken over the time that the gauges share, with honest noise.

What all heads do together is no noise, nor is what the flow does to them: both move every gauge at once and cancel in what is compared.
What is left wanders slowly, so its effect on a mean comes from the scatter of long batches and not from the rows.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace
from itertools import pairwise

import numpy as np
from numpy.typing import NDArray

from headledger.diagnosis.layout import Layout
from headledger.diagnosis.means import SpellMeans
from headledger.diagnosis.readings import Timeline
from headledger.diagnosis.spells import Spell
from headledger.plant.job import SpellKind
from headledger.plant.runs import RunState
from headledger.plant.stations import StationKind
from headledger.statistics.series import batch_means

Array = NDArray[np.float64]

FEWEST_BATCHES, MOST_BATCHES = 4, 8
"""Batches of a spell whose scatter gives the noise of its mean: long enough to hold what wanders slowly."""

PIECES, MOST_ROWS, LEAST_PIECE_BLOCKS = 12, 300, 6
"""Pieces of time into which all spells together are cut, readings that they may make, and blocks that a piece holds at least."""

OPEN_SHARE = 0.5
"""A run is open in a spell where its column says so more often than not. [-]"""

DEFAULT_SAMPLE_NOISE_TOLERANCES = 0.05
"""Noise of a mean that rests on too few rows to show its own, in tolerances. [-]"""


def spell_pieces(
    layout: Layout, timeline: Timeline, spells: tuple[Spell, ...], *, most: int = PIECES
) -> tuple[SpellMeans, ...]:
    """What each spell says, cut into pieces of time, so that what changes within a spell can be seen.

    Parameters
    ----------
    layout : Layout
    timeline : Timeline
    spells : tuple of Spell
    most : int
        Pieces that all spells together are cut into; with 1, every spell stays whole.

    Returns
    -------
    tuple of SpellMeans
        Of the spells in which some gauge gave a reading, each in as many rows as it has pieces, all with its `id`.

    Notes
    -----
    A piece has the noise that makes the mean of all of a spell's pieces as sure as the spell's own mean: what wanders slowly counts in
    full, and the contrasts between pieces are not taken as surer than they are.
    """
    summaries = [_summary(layout, timeline, spell) for spell in spells]
    noise = _pooled_noise(layout, spells, summaries)
    kept = [k for k, summary in enumerate(summaries) if np.isfinite(summary.mean_pa).any()]
    lengths = [spells[k].last - spells[k].first for k in kept]
    counts = _piece_counts(lengths, gauges=layout.gauge_count, most=most)
    found: list[SpellMeans] = []
    for number, (k, count) in enumerate(zip(kept, counts, strict=True), start=1):
        if count == 1:
            found.append(_means(layout, timeline, spells[k], summaries[k], noise[k], number))
            continue
        wider = float(np.sqrt(count))
        bounds = np.linspace(spells[k].first, spells[k].last, count + 1).round().astype(int)
        for first, last in pairwise(bounds.tolist()):
            piece = replace(spells[k], first=first, last=last)
            summary = replace(_summary(layout, timeline, piece), flow_noise_m3_s=wider * summaries[k].flow_noise_m3_s)
            if np.isfinite(summary.mean_pa).any():
                means = _means(layout, timeline, piece, summary, wider * noise[k], number)
                start_s, end_s = timeline.start_s[first], timeline.start_s[last - 1] + timeline.width_s
                found.append(replace(means, start_s=float(start_s), end_s=float(end_s)))
    return tuple(found)


def _piece_counts(lengths: Sequence[int], *, gauges: int, most: int) -> list[int]:
    """Into how many pieces each spell is cut: all together about a dozen, fewer where many gauges make many rows."""
    wanted = int(np.clip(MOST_ROWS // max(gauges, 1), len(lengths), most)) if lengths else 0
    piece = max(sum(lengths) / max(wanted, 1), LEAST_PIECE_BLOCKS)
    return [max(1, round(length / piece)) for length in lengths]


@dataclass(frozen=True, slots=True, kw_only=True)
class _Summary:
    """Gauge means of one spell with the scatter of their batches, shape (gauges,); the flows' noise, shape (runs,)."""

    mean_pa: Array
    variance_pa2: Array
    freedom: Array
    flow_noise_m3_s: Array


def _summary(layout: Layout, timeline: Timeline, spell: Spell) -> _Summary:
    """Means taken over the time that the gauges share, with what all of them do together taken out of the scatter."""
    cut = slice(spell.first, spell.last)
    reading = timeline.reading_pa[cut]
    batches = int(np.clip((spell.last - spell.first) // 3, FEWEST_BATCHES, MOST_BATCHES))
    single = np.array([not gauge.is_differential for gauge in layout.job.gauges])
    common = common_motion(reading, single)
    rest = reading - np.where(single[None, :], common[:, None], 0.0)
    ok = np.isfinite(rest)
    with np.errstate(invalid="ignore", divide="ignore"):
        mean = np.where(ok.any(axis=0), np.where(ok, rest, 0.0).sum(axis=0) / ok.sum(axis=0), np.nan)
    usable = min(batches, spell.last - spell.first)
    scatter = batch_means(rest, usable) - mean if usable >= 2 else np.zeros((1, reading.shape[1]))
    flow = batch_means(timeline.flow_m3_s[cut], usable) if usable >= 2 else timeline.flow_m3_s[cut][:1]
    flowing = spell.kind is SpellKind.FLOWING and usable >= 5
    used = 1.0
    if flowing:
        scatter, used = _without_flow(scatter, flow)
    known = np.isfinite(scatter)
    freedom = np.maximum(known.sum(axis=0) - used, 0.0)
    squares = np.where(known, scatter, 0.0) ** 2
    with np.errstate(invalid="ignore", divide="ignore"):
        variance = np.where(freedom > 0, squares.sum(axis=0) / np.maximum(freedom, 1.0) / known.sum(axis=0), np.nan)
    return _Summary(
        mean_pa=mean,
        variance_pa2=variance,
        freedom=freedom,
        flow_noise_m3_s=_flow_noise(timeline, cut, flow, batch_means(rest, usable) if usable >= 5 else None),
    )


def common_motion(reading: Array, single: NDArray[np.bool_]) -> Array:
    """What all gauges do together, block by block, about its own mean over the spell. [Pa]"""
    if not single.any() or reading.shape[0] < 2:
        return np.zeros(reading.shape[0])
    ok = np.isfinite(reading[:, single])
    counts = ok.sum(axis=0)
    used = np.flatnonzero(single)[counts > 0]
    if not used.size:
        return np.zeros(reading.shape[0])
    values = reading[:, used]
    away = values - _mean(values)
    empty = ~np.isfinite(away).any(axis=1)
    away[empty] = 0.0
    middle = np.nanmedian(away, axis=1)
    return np.asarray(middle - middle[~empty].mean() if (~empty).any() else middle)


def _without_flow(scatter: Array, flow: Array) -> tuple[Array, float]:
    """Scatter with its part along the metered flows' fluctuation taken off (it is no noise: it moves flow and heads together)."""
    metered = np.isfinite(flow).all(axis=0)
    if not metered.any():
        return scatter, 1.0
    with np.errstate(invalid="ignore"):
        moves = flow[:, metered] - flow[:, metered].mean(axis=0)
    size = np.abs(moves).max(axis=0)
    if not (size > 0).any():
        return scatter, 1.0
    direction = moves[:, int(np.argmax(size))]
    direction = direction / np.sqrt(direction @ direction)
    filled = np.where(np.isfinite(scatter), scatter, 0.0)
    return scatter - np.outer(direction, direction @ filled), 2.0


def _flow_noise(timeline: Timeline, cut: slice, flow: Array, gauges: Array | None) -> Array:
    """Noise of the metered flows' means: the scatter of batches that the gauges do not share. [m³/s]"""
    rows = timeline.flow_count[cut].sum(axis=0)
    with np.errstate(invalid="ignore", divide="ignore"):
        within = np.nansum(timeline.flow_variance[cut] * timeline.flow_count[cut], axis=0) / np.maximum(rows, 1)
        white = np.sqrt(within / np.maximum(rows, 1))
    if flow.shape[0] < 5:
        return np.asarray(white)
    moves = flow - flow.mean(axis=0)
    if gauges is not None:
        shared = np.where(np.isfinite(gauges), gauges - _mean(gauges), 0.0)
        left, size, _ = np.linalg.svd(shared, full_matrices=False)
        if size.size and size[0] > 0.0:
            moves = moves - np.outer(left[:, 0], left[:, 0] @ np.where(np.isfinite(moves), moves, 0.0))
    batches = flow.shape[0]
    scatter = np.sqrt((moves**2).sum(axis=0) / (batches - 2) / batches)
    return np.asarray(scatter)


def _pooled_noise(layout: Layout, spells: tuple[Spell, ...], summaries: list[_Summary]) -> list[Array]:
    """Noise of every gauge's mean in every spell: scatter pooled over spells of one kind, widened for few degrees of freedom. [Pa]"""
    gauges = layout.job.gauges
    floor = np.array([gauge.division_pa / np.sqrt(12.0) for gauge in gauges])
    assumed = np.array(
        [
            DEFAULT_SAMPLE_NOISE_TOLERANCES
            * gauge.tolerance.at(gauge.range_high_pa, gauge.range_low_pa, gauge.range_high_pa)
            for gauge in gauges
        ]
    )
    pooled = []
    for spell in spells:
        alike = [s for other, s in zip(spells, summaries, strict=True) if other.kind is spell.kind]
        freedom = sum(np.where(np.isfinite(s.variance_pa2), s.freedom, 0.0) for s in alike)
        total = sum(np.nan_to_num(s.variance_pa2) * s.freedom for s in alike)
        with np.errstate(invalid="ignore", divide="ignore"):
            variance = np.where(freedom > 0, total / np.maximum(freedom, 1.0), assumed**2)
        # a variance from few degrees of freedom is as likely too small: Student's t has the variance ν/(ν−2)
        widening = np.where(freedom > 2.5, freedom / np.maximum(freedom - 2.0, 0.5), 5.0)
        pooled.append(np.sqrt(np.maximum(variance * widening, np.maximum(floor, 1e-3) ** 2)))
    return pooled


def _means(
    layout: Layout, timeline: Timeline, spell: Spell, summary: _Summary, noise_pa: Array, number: int
) -> SpellMeans:
    """The means of one spell."""
    job, cut = layout.job, slice(spell.first, spell.last)
    still = spell.kind is SpellKind.STILL
    flow = np.full(layout.run_count, np.nan) if still else _mean(timeline.flow_m3_s[cut])
    flow_noise = np.where(np.isfinite(summary.flow_noise_m3_s), summary.flow_noise_m3_s, 0.0)
    relative = np.array([run.flow_doubt.relative_fraction for run in job.runs])
    absolute = np.array([run.flow_doubt.absolute for run in job.runs])
    for stated in spell.stated.flows if spell.stated else ():
        run = layout.run_index[stated.run]
        flow[run], flow_noise[run] = stated.flow_m3_s, 0.0
        relative[run], absolute[run] = stated.doubt.relative_fraction, stated.doubt.absolute
    level, level_sd = _surfaces(layout, timeline, cut)
    temperature = float(_mean(timeline.temperature_k[cut][:, None])[0])
    barometer = float(_mean(timeline.barometer_pa[cut][:, None])[0])
    return SpellMeans(
        id=number,
        kind=spell.kind,
        start_s=spell.stated.start_s if spell.stated else float(timeline.start_s[spell.first]),
        end_s=spell.stated.end_s if spell.stated else float(timeline.start_s[spell.last - 1] + timeline.width_s),
        samples=int(timeline.samples[cut].sum()),
        reading_pa=summary.mean_pa,
        noise_pa=noise_pa,
        flow_m3_s=flow,
        flow_noise_m3_s=flow_noise,
        flow_relative_sd=relative,
        flow_absolute_sd_m3_s=absolute,
        level_m=level,
        level_sd_m=level_sd,
        temperature_k=temperature if np.isfinite(temperature) else job.liquid.temperature_k,
        speed_ratio=_speeds(layout, timeline, cut, still),
        is_open=_states(layout, timeline, cut),
        is_unsure=_unsure(layout, timeline, cut),
        run_temperature_k=_run_temperatures(layout, timeline, cut),
        barometer_pa=barometer if np.isfinite(barometer) else None,
    )


def _mean(values: Array) -> Array:
    """Means of columns, nan where there is nothing."""
    ok = np.isfinite(values)
    with np.errstate(invalid="ignore", divide="ignore"):
        return np.asarray(np.where(ok.any(axis=0), np.where(ok, values, 0.0).sum(axis=0) / ok.sum(axis=0), np.nan))


def _surfaces(layout: Layout, timeline: Timeline, cut: slice) -> tuple[Array, Array]:
    """Levels of surfaces, measured or stated, with their standard uncertainties. [m]"""
    stations = layout.job.stations
    level = np.full(len(stations), np.nan)
    deviation = np.full(len(stations), np.nan)
    measured = _mean(timeline.level_m[cut])
    for index, station in enumerate(stations):
        if station.kind is StationKind.SURFACE:
            level[index] = measured[index] if np.isfinite(measured[index]) else station.elevation_m
            deviation[index] = max(station.elevation_sd_m, 1e-4)
    return level, deviation


def _speeds(layout: Layout, timeline: Timeline, cut: slice, still: bool) -> Array:
    """Relative speeds of pumps; a pump without a speed column runs at its curve's speed unless nothing flows. [-]"""
    measured = _mean(timeline.speed_ratio[cut])
    pump = np.array([run.is_pump for run in layout.job.runs])
    assumed = np.where(pump, 0.0 if still else 1.0, 0.0)
    return np.asarray(np.where(pump & np.isfinite(measured), measured, assumed))


def _unsure(layout: Layout, timeline: Timeline, cut: slice) -> tuple[bool, ...]:
    """Runs whose state a log column should give, and does not in this spell."""
    known = np.asarray(np.any(np.isfinite(timeline.open_fraction[cut]), axis=0))
    return tuple(run.state is RunState.COLUMN and not known[index] for index, run in enumerate(layout.job.runs))


def _run_temperatures(layout: Layout, timeline: Timeline, cut: slice) -> Array | None:
    """Temperatures of runs that have one of their own, logged or stated; None where no run has. [K]"""
    stated = np.array([np.nan if run.temperature_k is None else run.temperature_k for run in layout.job.runs])
    measured = _mean(timeline.run_temperature_k[cut])
    own = np.where(np.isfinite(measured), measured, stated)
    return own if np.isfinite(own).any() else None


def _states(layout: Layout, timeline: Timeline, cut: slice) -> tuple[bool, ...]:
    """Which runs are open in a spell."""
    measured = _mean(timeline.open_fraction[cut])
    states = []
    for index, run in enumerate(layout.job.runs):
        if run.state is RunState.COLUMN and np.isfinite(measured[index]):
            states.append(bool(measured[index] > OPEN_SHARE))
        else:
            states.append(run.state is not RunState.CLOSED)
    return tuple(states)
