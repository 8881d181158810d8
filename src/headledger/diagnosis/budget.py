"""The uncertainty budget: every uncertain input of the model once, and how the rows of a spell depend on it."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from enum import StrEnum
from math import sqrt

import numpy as np
from numpy.typing import NDArray

from headledger.diagnosis.layout import Layout, liquid_at, still_liquid_k
from headledger.diagnosis.means import SpellMeans
from headledger.diagnosis.state import Applied, LiquidShift, State, evaluate
from headledger.plant.gauges import Gauge

Array = NDArray[np.float64]

RECTANGULAR = 1.0 / sqrt(3.0)
"""Standard deviation of a limit of error of 1 (JCGM 100:2008, 4.3.7)."""

OFFSET_SHARE, SLOPE_SHARE = 0.8, 0.2
"""How a limit on the span divides between one offset and one slope of a gauge's fixed calibration curve."""

REFERENCE_AMBIENT_K = 293.15
"""Temperature at which a dial gauge's class holds: 20 °C (EN 837-1, from memory)."""


class InputKind(StrEnum):
    """What an uncertain input is about."""

    OFFSET = "offset"
    SLOPE = "slope"
    READING = "reading"
    WARMTH = "instrument temperature"
    ELEVATION = "elevation"
    LOSS = "loss"
    METER = "meter"
    DENSITY = "density"
    TEMPERATURE = "liquid temperature"
    BAROMETER = "barometer"
    AMBIENT = "leg temperature"
    CUT_OFF = "head of a cut-off section"


OWN_CALIBRATION = (InputKind.OFFSET, InputKind.SLOPE, InputKind.READING, InputKind.WARMTH)
"""Inputs that a gauge's own class vouches for."""


@dataclass(frozen=True, slots=True, kw_only=True)
class UncertainInput:
    """One uncertain input, known beforehand with mean 0 and this standard deviation.

    Parameters
    ----------
    kind : InputKind
    owner : str
        Serial or tag of a gauge, run, or the owner of an elevation; empty for the whole job.
    sd : float
        Standard uncertainty: of the stated limit for calibration inputs [-], else in SI or as a fraction.
    """

    kind: InputKind
    owner: str
    sd: float


def instrument_of(gauge: Gauge) -> str:
    """What identifies the instrument: its serial, or its tag where no serial is given."""
    return gauge.serial or gauge.tag


def uncertain_inputs(layout: Layout) -> tuple[UncertainInput, ...]:
    """Every uncertain input of a job, once.

    Parameters
    ----------
    layout : Layout

    Returns
    -------
    tuple of UncertainInput
    """
    job = layout.job
    found: dict[tuple[InputKind, str], float] = {}
    for gauge in job.gauges:
        for kind, sd in _calibration_inputs(gauge, job.site.ambient_k is not None):
            found[kind, instrument_of(gauge)] = sd
    for doubt in layout.elevation_doubts:
        if doubt.sd_m > 0.0:
            found[InputKind.ELEVATION, doubt.owner] = doubt.sd_m
    for run in job.runs:
        if run.loss_sd_fraction > 0.0:
            found[InputKind.LOSS, run.name] = run.loss_sd_fraction
        found[InputKind.METER, run.name] = 1.0
    found[InputKind.DENSITY, ""] = job.liquid.density_sd_fraction
    found[InputKind.TEMPERATURE, ""] = job.liquid.temperature_sd_k
    for run in job.runs:
        if run.temperature_k is not None or run.temperature_column:
            found[InputKind.TEMPERATURE, run.name] = job.liquid.temperature_sd_k
    found[InputKind.BAROMETER, ""] = job.site.barometer_sd_pa
    if job.site.ambient_k is not None:
        found[InputKind.AMBIENT, ""] = job.site.ambient_sd_k
    return tuple(UncertainInput(kind=kind, owner=owner, sd=sd) for (kind, owner), sd in found.items() if sd > 0.0)


def _calibration_inputs(gauge: Gauge, warmth_known: bool) -> list[tuple[InputKind, float]]:
    """Kinds and standard deviations of one gauge's calibration curve, in units of its limits."""
    if gauge.calibration_sd_pa is not None:
        inputs = [(InputKind.OFFSET, 1.0)]
    else:
        inputs = [(InputKind.OFFSET, RECTANGULAR), (InputKind.SLOPE, RECTANGULAR)]
        if gauge.accuracy.reading_fraction > 0.0:
            inputs.append((InputKind.READING, RECTANGULAR))
    if warmth_known and gauge.temperature_effect_per_k:
        inputs.append((InputKind.WARMTH, RECTANGULAR))
    return inputs


def calibration_marks(layout: Layout, inputs: Sequence[UncertainInput], reading_pa: Array) -> Array:
    """How a unit of each calibration input moves the gauges' readings.

    Parameters
    ----------
    layout : Layout
    inputs : sequence of UncertainInput
    reading_pa : ndarray, shape (gauges,)
        Perfect readings at which the curve is taken. [Pa]

    Returns
    -------
    ndarray, shape (gauges, inputs)
        [Pa]
    """
    marks = np.zeros((layout.gauge_count, len(inputs)))
    for column, item in enumerate(inputs):
        if item.kind not in OWN_CALIBRATION:
            continue
        for row, gauge in enumerate(layout.job.gauges):
            if instrument_of(gauge) == item.owner:
                marks[row, column] = _calibration_mark(layout, gauge, item.kind, float(reading_pa[row]))
    return marks


def _calibration_mark(layout: Layout, gauge: Gauge, kind: InputKind, reading_pa: float) -> float:
    """Pressure by which a unit of one calibration input moves one gauge at a reading. [Pa]"""
    low, high = gauge.range_low_pa, gauge.range_high_pa
    limit = gauge.accuracy.at(reading_pa, low, high) - gauge.accuracy.reading_fraction * abs(reading_pa)
    if kind is InputKind.OFFSET:
        return gauge.calibration_sd_pa if gauge.calibration_sd_pa is not None else OFFSET_SHARE * limit
    if kind is InputKind.SLOPE:
        return SLOPE_SHARE * limit * (2.0 * (reading_pa - low) / (high - low) - 1.0)
    if kind is InputKind.READING:
        return gauge.accuracy.reading_fraction * abs(reading_pa)
    ambient_k = layout.job.site.ambient_k or REFERENCE_AMBIENT_K
    away_k = abs(ambient_k - REFERENCE_AMBIENT_K) + 2.0 * layout.job.site.ambient_sd_k
    return (gauge.temperature_effect_per_k or 0.0) * gauge.span_pa * away_k


def input_marks(
    layout: Layout,
    inputs: Sequence[UncertainInput],
    spell: SpellMeans,
    state: State,
    applied: Applied | None,
) -> tuple[Array, Array, Array]:
    """How one standard deviation of each input moves a spell's readings, its flows and the drops of its runs.

    Parameters
    ----------
    layout, inputs, spell, state, applied
        `state` is `evaluate` at the point of linearisation with `applied`.

    Returns
    -------
    readings : ndarray, shape (gauges, inputs)
        [Pa]
    flows : ndarray, shape (runs, inputs)
        Change of the flow that a meter stands for; its effect on readings is not in `readings`. [m³/s]
    drops : ndarray, shape (runs, inputs)
        Change of head lost; its effect on readings is in `readings`. [m]
    """
    scale = np.array([item.sd for item in inputs])
    readings = calibration_marks(layout, inputs, state.reading_pa) * scale
    flows = np.zeros((layout.run_count, len(inputs)))
    drops = np.zeros((layout.run_count, len(inputs)))
    from_drop = state.reading_from_drop(layout)
    doubts = {doubt.owner: doubt for doubt in layout.elevation_doubts}
    for column, item in enumerate(inputs):
        if item.kind is InputKind.ELEVATION:
            doubt = doubts[item.owner]
            readings[:, column] = item.sd * (doubt.constant_pa_m - state.head_weight_pa_m * doubt.liquid)
        elif item.kind is InputKind.LOSS:
            run = layout.run_index[item.owner]
            drops[run, column] = item.sd * state.drop_m[run]
            readings[:, column] = from_drop[:, run] * drops[run, column]
        elif item.kind is InputKind.METER:
            run = layout.run_index[item.owner]
            if not spell.is_still and np.isfinite(spell.flow_m3_s[run]):
                relative = spell.flow_relative_sd[run] * spell.flow_m3_s[run]
                flows[run, column] = relative + spell.flow_absolute_sd_m3_s[run]
        elif item.kind is InputKind.BAROMETER:
            readings[:, column] = item.sd * layout.follows_barometer
        elif item.kind is InputKind.AMBIENT:
            readings[:, column] = item.sd * _ambient_mark(layout)
        elif item.kind in (InputKind.DENSITY, InputKind.TEMPERATURE):
            readings[:, column], drops[:, column] = _liquid_mark(layout, spell, state, applied, item)
    return readings, flows, drops


def _ambient_mark(layout: Layout) -> Array:
    """Derivative of the readings with the ambient temperature, by the density of stagnant legs. [Pa/K]"""
    ambient = layout.job.site.ambient_k
    if ambient is None:
        return np.zeros(layout.gauge_count)
    sides_k = [still_liquid_k(layout.job.liquid, ambient + side) for side in (-1.0, 1.0)]
    density = [float(liquid_at(layout.job.liquid, side_k).density_kg_m3) for side_k in sides_k]
    # a leg below its freezing point does not grow heavier
    slope = (density[1] - density[0]) / 2.0
    own = layout.ambient_leg_density_kg_m3
    marks = np.zeros(layout.gauge_count)
    for row, gauge in enumerate(layout.job.gauges):
        corrected = gauge.corrected_to_tap or gauge.corrected_to_m is not None
        if not corrected and layout.leg_density_kg_m3(gauge) == own and gauge.elevation_m is not None:
            tap_m = layout.job.station(gauge.station).elevation_m
            marks[row] = slope * layout.gravity_m_s2 * (tap_m - gauge.elevation_m)
    return marks


def _liquid_mark(
    layout: Layout, spell: SpellMeans, state: State, applied: Applied | None, item: UncertainInput
) -> tuple[Array, Array]:
    """Change of readings and drops for one standard deviation of density or of a temperature, by a central difference."""
    sides = (-0.5, 0.5)
    if item.kind is InputKind.DENSITY:
        shifts = [LiquidShift(density_ratio=1.0 + side * item.sd) for side in sides]
        whole = 1.0
    else:
        run = layout.run_index[item.owner] if item.owner else -1
        around_k = _temperature_k(spell, run)
        # at the freezing point one side stops there: the slope found over what is left holds for the whole step
        moves = [still_liquid_k(layout.job.liquid, around_k + side * item.sd) - around_k for side in sides]
        shifts = [LiquidShift(temperature_k=k) if run < 0 else LiquidShift(run_k=((run, k),)) for k in moves]
        whole = item.sd / (moves[1] - moves[0])
    low, high = (evaluate(layout, spell, state.point, applied=applied, shift=shift) for shift in shifts)
    drops = (high.drop_m + high.column_m) - (low.drop_m + low.column_m)
    return whole * (high.reading_pa - low.reading_pa), whole * drops


def _temperature_k(spell: SpellMeans, run: int) -> float:
    """Temperature of the job's liquid, or of a run's own; the job's where the run has none in this spell. [K]"""
    own = np.nan if spell.run_temperature_k is None or run < 0 else float(spell.run_temperature_k[run])
    return own if np.isfinite(own) else spell.temperature_k
