"""Explanations that change the model itself: readings that say nothing any more, and valves that are shut against the drawing.

Every explanation accounts for the same numbers. A spoilt reading is not deleted: its row gets a noise so wide that it weighs nothing, and
the cause's mark carries the log of the density that the reading has once it is spoilt, less that of the wide noise.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray
from scipy.special import log_ndtr

from headledger.diagnosis.causes.base import Mark
from headledger.diagnosis.estimate import Linear, Model
from headledger.diagnosis.layout import liquid_at
from headledger.diagnosis.means import SpellMeans
from headledger.diagnosis.result import CauseKind, Place
from headledger.plant.gauges import Gauge
from headledger.statistics.sizes import SizePrior, log_sum

Array = NDArray[np.float64]

VARIANT_KINDS = (
    CauseKind.FROZEN,
    CauseKind.AT_LIMIT,
    CauseKind.EQUALISED,
    CauseKind.CLOSED_OFF,
    CauseKind.VAPOUR,
)

WIDE_SPANS = 100.0
"""Noise of a spoilt reading, in spans of its gauge: its row weighs nothing."""

STUCK_TOLERANCES = (0.02, 0.3)
"""How far a stuck reading wanders, in tolerances: not at all (a stuck pointer or output), or slowly (its own valve shut)."""

VAPOUR_MARGIN_PA, VAPOUR_HEAD_SD_M = 2_000.0, 0.05
"""A station is taken as filled with vapour up to this far above vapour pressure, and its head is then known this well. [Pa], [m]"""

LIMIT_SHARE = 0.003
"""A mean within this part of the span of an end of the range is at it. [-]"""


@dataclass(frozen=True, slots=True, kw_only=True)
class Variant:
    """One changed model.

    Parameters
    ----------
    mark : Mark
        Kind and place of the cause; of no effect on the rows, with the log density that the change brings.
    model : Model
    gain : float
        Log evidence against the unchanged model as far as it is known without solving anew; nan where it is not. [nat]
    """

    mark: Mark
    model: Model
    gain: float


def spoilt_variants(linear: Linear, residual: Array) -> list[Variant]:
    """Frozen gauges from each moment on, and gauges at the end of their range.

    Parameters
    ----------
    linear : Linear
    residual : ndarray, shape (rows,)
        White residuals of the explanation that they are held against.

    Returns
    -------
    list of Variant
        At most one a gauge and kind: the likeliest.
    """
    precision = linear.white.operator.T @ linear.white.operator
    pull = linear.white.operator.T @ residual
    found = []
    for index, gauge in enumerate(linear.model.layout.job.gauges):
        rows, pieces = linear.gauge_rows(index)
        if not rows.size:
            continue
        readings = np.array([linear.model.spells[k].reading_pa[index] for k in pieces])
        noise = linear.noise_pa(index)
        best: Variant | None = None
        moments = range(rows.size - 1)
        for first in moments:
            density = stuck_log_density(gauge, readings[first:], noise[first:])
            one = _spoilt(
                linear, index, CauseKind.FROZEN, (rows, pieces), slice(first, None), density, 1.0 / len(moments)
            )
            one = replace(one, gain=one.gain - _log_given_rest(precision, pull, rows[first:]) + density)
            if best is None or one.gain > best.gain:
                best = one
        found += [best] if best else []
        if gauge.is_differential:
            density = zero_log_density(gauge, readings, noise)
            every = slice(0, None)
            one = _spoilt(linear, index, CauseKind.EQUALISED, (rows, pieces), every, density, 1.0)
            found.append(replace(one, gain=density - _log_given_rest(precision, pull, rows)))
        at = np.flatnonzero(_at_limit(gauge, readings))
        if at.size:
            density = limit_log_density(gauge, readings[at], noise[at])
            density += _log_beyond(gauge, readings[at], precision, pull, rows[at])
            one = _spoilt(linear, index, CauseKind.AT_LIMIT, (rows, pieces), at, density, 1.0)
            found.append(replace(one, gain=density - _log_given_rest(precision, pull, rows[at])))
    return found


def _log_given_rest(precision: Array, pull: Array, rows: NDArray[np.int64]) -> float:
    """Log density of some rows given all others, where `pull` is the precision times the residuals."""
    block = precision[np.ix_(rows, rows)]
    _, logarithm = np.linalg.slogdet(block)
    square = float(pull[rows] @ np.linalg.solve(block, pull[rows]))
    return 0.5 * (float(logarithm) - square - rows.size * float(np.log(2.0 * np.pi)))


def _log_beyond(gauge: Gauge, readings_pa: Array, precision: Array, pull: Array, rows: NDArray[np.int64]) -> float:
    """Log of the probability that what the readings should be lies beyond the end of the range at which they stand, as all else has it."""
    covariance = np.linalg.inv(precision[np.ix_(rows, rows)])
    should_pa = readings_pa - covariance @ pull[rows]
    margin = LIMIT_SHARE * gauge.span_pa
    high = readings_pa > (gauge.range_low_pa + gauge.range_high_pa) / 2.0
    beyond = np.where(high, should_pa - gauge.range_high_pa, gauge.range_low_pa - should_pa) + margin
    return float(np.min(log_ndtr(beyond / np.sqrt(np.diag(covariance)))))


def stuck_log_density(gauge: Gauge, readings_pa: Array, noise_pa: Array) -> float:
    """Log density of readings that stay at one value, uniform over the range beforehand, give or take noise and a slow wander."""
    tolerance = gauge.tolerance_at(float(np.median(readings_pa)))
    parts = []
    for wander in STUCK_TOLERANCES:
        deviation = np.hypot(noise_pa, wander * tolerance)
        weight = deviation**-2.0
        middle = float(weight @ readings_pa / weight.sum())
        square = float(weight @ (readings_pa - middle) ** 2)
        others = readings_pa.size - 1
        parts.append(-0.5 * (square + others * np.log(2.0 * np.pi) + np.log(weight.sum())) - np.log(deviation).sum())
    return float(log_sum(np.array(parts)) - np.log(len(parts)) - np.log(gauge.span_pa))


def zero_log_density(gauge: Gauge, readings_pa: Array, noise_pa: Array) -> float:
    """Log density of readings about zero, as far as the gauge's own zero may be off: both sides see one pressure."""
    limit = gauge.accuracy.at(0.0, gauge.range_low_pa, gauge.range_high_pa)
    return _shared_log_density(readings_pa, np.maximum(noise_pa, 1.0), limit / np.sqrt(3.0))


def _at_limit(gauge: Gauge, readings_pa: Array) -> NDArray[np.bool_]:
    """Which readings stand at an end of the range."""
    margin = LIMIT_SHARE * gauge.span_pa
    return np.asarray((readings_pa > gauge.range_high_pa - margin) | (readings_pa < gauge.range_low_pa + margin))


def limit_log_density(gauge: Gauge, readings_pa: Array, noise_pa: Array) -> float:
    """Log density of readings at an end of the range, give or take where exactly the output stops."""
    high = readings_pa > (gauge.range_low_pa + gauge.range_high_pa) / 2.0
    away = readings_pa - np.where(high, gauge.range_high_pa, gauge.range_low_pa)
    return _shared_log_density(away, np.maximum(noise_pa, 1.0), LIMIT_SHARE * gauge.span_pa)


def _shared_log_density(away_pa: Array, noise_pa: Array, shared_sd_pa: float) -> float:
    """Log density of values that share one offset, normal about nothing, besides their own noise."""
    weight = noise_pa**-2.0
    whole = float(weight.sum()) + shared_sd_pa**-2.0
    square = float(weight @ away_pa**2) - float(weight @ away_pa) ** 2 / whole
    logarithms = away_pa.size * np.log(2.0 * np.pi) + 2.0 * np.log(noise_pa).sum() + np.log(shared_sd_pa**2 * whole)
    return float(-0.5 * (square + logarithms))


def _spoilt(
    linear: Linear,
    index: int,
    kind: CauseKind,
    rows: tuple[NDArray[np.int64], NDArray[np.int64]],
    which: slice | NDArray[np.int64],
    log_density: float,
    share: float,
) -> Variant:
    """The model with some readings of one gauge spoilt."""
    gauge = linear.model.layout.job.gauges[index]
    wide = WIDE_SPANS * gauge.span_pa
    spoilt = {int(piece) for piece in rows[1][which]}

    def blinded(number: int, spell: SpellMeans) -> SpellMeans:
        if number not in spoilt:
            return spell
        noise = spell.noise_pa.copy()
        noise[index] = wide
        return replace(spell, noise_pa=noise)

    model = Model(linear.model.layout, [blinded(k, spell) for k, spell in enumerate(linear.model.spells)])
    starts = [linear.model.spells[k].start_s for k in sorted(spoilt)]
    mark = Mark(
        kind=kind,
        place=Place(gauge=gauge.tag),
        vector=np.zeros(linear.row_count),
        prior=SizePrior(least=1.0, most=1.0, negative=False),
        share=share,
        log_jacobian=log_density + 0.5 * len(spoilt) * float(np.log(2.0 * np.pi * wide**2)),
        own=(index,),
        spoils=True,
        start_s=starts[0] if kind is CauseKind.FROZEN else None,
    )
    return Variant(mark=mark, model=model, gain=0.0)


def closed_variants(model: Model) -> list[Variant]:
    """Runs that are shut against the drawing, one variant each: where that cuts off a gauge, or leaves a loop with one way less.

    Parameters
    ----------
    model : Model

    Returns
    -------
    list of Variant
        Their gain is not known yet.
    """
    layout = model.layout
    tapped = {layout.station_index[gauge.station] for gauge in layout.job.gauges}
    found = []
    for run, noun in enumerate(layout.job.runs):
        if not all(spell.is_open[run] for spell in model.spells):
            continue
        shut = [replace(spell, is_open=_without(spell.is_open, run)) for spell in model.spells]
        before, after = layout.graph(model.spells[0].is_open), layout.graph(shut[0].is_open)
        if after.parts > before.parts and not _parts_gauges(after.part, tapped):
            continue
        mark = Mark(
            kind=CauseKind.CLOSED_OFF,
            place=Place(run=noun.name),
            vector=np.zeros(0),
            prior=SizePrior(least=1.0, most=1.0, negative=False),
        )
        found.append(Variant(mark=mark, model=Model(layout, shut), gain=float("nan")))
    return found


def vapour_variants(linear: Linear) -> list[Variant]:
    """The column parted by vapour: stations whose pressure would lie at or below vapour pressure stand at it, and tie nothing.

    Parameters
    ----------
    linear : Linear

    Returns
    -------
    list of Variant
        None or one, at the place where the pressure would be the lowest.
    """
    model, layout = linear.model, linear.model.layout
    height = layout.station_elevation_m
    changed: list[SpellMeans] = []
    lowest: tuple[float, int] = (np.inf, -1)
    for index, spell in enumerate(model.spells):
        state = linear.states[index]
        vapour_pa = float(liquid_at(layout.job.liquid, spell.temperature_k).vapour_pressure_pa)
        computed = layout.barometer_pa + state.head_weight_pa_m * (state.head_m - height)
        said = said_pressure_pa(linear, index)
        parted = np.minimum(computed, said) < vapour_pa + VAPOUR_MARGIN_PA
        if not np.isfinite(vapour_pa) or not parted.any() or parted.all():
            changed.append(spell)
            continue
        lowest = min(lowest, (float(np.min(computed)), int(np.argmin(computed))))
        level = np.where(parted, height + (vapour_pa - layout.barometer_pa) / state.head_weight_pa_m, spell.level_m)
        unsure = tuple(bool(parted[start] or parted[end]) for start, end in layout.ends)
        changed.append(
            replace(
                spell,
                level_m=level,
                level_sd_m=np.where(parted, VAPOUR_HEAD_SD_M, spell.level_sd_m),
                is_unsure=tuple(
                    a or b for a, b in zip(unsure, spell.is_unsure or (False,) * layout.run_count, strict=True)
                ),
            )
        )
    if lowest[1] < 0:
        return []
    mark = Mark(
        kind=CauseKind.VAPOUR,
        place=Place(station=layout.job.stations[lowest[1]].name),
        vector=np.zeros(0),
        prior=SizePrior(least=1.0, most=1.0, negative=False),
    )
    return [Variant(mark=mark, model=Model(layout, changed), gain=float("nan"))]


def said_pressure_pa(linear: Linear, index: int) -> Array:
    """Lowest absolute pressure at each station that a gauge there says, infinite where none does. [Pa]"""
    layout, spell, state = linear.model.layout, linear.model.spells[index], linear.states[index]
    said = np.full(len(layout.job.stations), np.inf)
    for gauge, noun in enumerate(layout.job.gauges):
        if noun.is_differential or not np.isfinite(spell.reading_pa[gauge]):
            continue
        at = layout.station_index[noun.station]
        head = (
            spell.reading_pa[gauge] - layout.taps.constant_pa[gauge] - state.weather_pa[gauge]
        ) / state.head_weight_pa_m + layout.taps.column_m[gauge]
        pressure = layout.barometer_pa + state.head_weight_pa_m * (head - layout.station_elevation_m[at])
        said[at] = min(said[at], float(pressure))
    return said


def _without(is_open: Sequence[bool], run: int) -> tuple[bool, ...]:
    return tuple(opened and index != run for index, opened in enumerate(is_open))


def _parts_gauges(part: NDArray[np.int64], tapped: set[int]) -> bool:
    """Whether gauges stand in more than one part."""
    return len({int(part[station]) for station in tapped}) > 1
