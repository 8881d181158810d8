"""What the gauges around a gauge say of it, block by block: the main motions of the others, and what they leave of its own."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from headledger.diagnosis.layout import Layout
from headledger.diagnosis.readings import Timeline
from headledger.diagnosis.spells import Spell

Array = NDArray[np.float64]

FEWEST_SAMPLES = 30
"""Blocks in which own and others are known, without which nothing is said."""

MISFIT_SHARE = 0.05
"""How far a sound gauge may part from what the others predict while flows change, in its own usual motion. [-]"""

AFTER_CHANGE_S = 120.0
"""How long after a change a lag may still show. [s]"""

MOTIONS = 6
"""Independent motions of the other gauges from which one gauge's own is predicted."""


@dataclass(frozen=True, slots=True)
class Told:
    """What some gauges did, and the others: times, readings, motions, where flows change, and what a sound gauge may leave unexplained."""

    time_s: Array
    own: Array
    motions: Array
    near: NDArray[np.bool_]
    floor: Array


def own_and_others(
    layout: Layout, timeline: Timeline, spells: Sequence[Spell], own: Sequence[int], others: Sequence[int]
) -> Told | None:
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
    return Told(time_s, readings, left[:, :count] * size[:count], near, floor)


def _near_changes(timeline: Timeline, spells: Sequence[Spell]) -> NDArray[np.bool_]:
    """Blocks in which flows change, and those soon after: only there does a lag show, and a slow wander elsewhere is none."""
    near = np.ones(timeline.start_s.size, dtype=bool)
    after = int(np.ceil(AFTER_CHANGE_S / timeline.width_s))
    for spell in spells:
        near[spell.first + after : spell.last] = False
    return near


def left_over(told: Told, motions: Array, rows: NDArray[np.bool_] | slice = slice(None)) -> Array:
    """What the motions leave unexplained in some blocks, fitted to those. [Pa]"""
    design = np.column_stack([np.ones(motions.shape[0]), motions])[rows]
    own = told.own[rows]
    return np.asarray(own - design @ np.linalg.lstsq(design, own, rcond=None)[0])
