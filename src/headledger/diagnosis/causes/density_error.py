"""A liquid heavier or lighter than stated: all gauges off in proportion to elevation."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
from numpy.typing import NDArray

from headledger.diagnosis.causes.base import Mark, View
from headledger.diagnosis.result import CauseKind, Place
from headledger.diagnosis.state import evaluate
from headledger.statistics.sizes import SizePrior

LARGEST_RATIO_ERROR = 0.2
"""From hot water to strong brine. [-]"""

STEP = 1e-4
"""Half-width of the central difference. [-]"""


def marks(view: View) -> list[Mark]:
    """One mark for the whole job: true over stated."""
    at = view.linear.applied.density_ratio
    sides = []
    for sign in (-1.0, 1.0):
        applied = replace(view.linear.applied, density_ratio=at + sign * STEP)
        sides.append(
            [
                evaluate(view.layout, spell, state.point, applied=applied)
                for spell, state in zip(view.model.spells, view.linear.states, strict=True)
            ]
        )
    vector: NDArray[np.float64] = np.zeros(view.linear.row_count)
    for place, less, more in zip(view.linear.rows, *sides, strict=True):
        drop = (more.drop_m - less.drop_m) / (2.0 * STEP)
        reading = (more.reading_pa - less.reading_pa)[place.gauges] / (2.0 * STEP)
        parts = [reading, np.zeros(place.meters.size), -less.graph.path[place.levels] @ drop]
        if place.loops:
            parts.append(less.graph.loop @ drop)
        vector[place.start : place.start + place.count] = np.concatenate(parts)
    # a head that moves with the density is no mark: what counts is what no set of heads can follow
    least = view.least_size(_without_heads(view, vector))
    if not least < LARGEST_RATIO_ERROR:
        return []
    return [
        Mark(
            kind=CauseKind.DENSITY_ERROR,
            place=Place(),
            vector=vector,
            prior=SizePrior(least=least, most=LARGEST_RATIO_ERROR),
            size_base=1.0,
        )
    ]


def _without_heads(view: View, vector: NDArray[np.float64]) -> NDArray[np.float64]:
    """A mark on the gauges' rows less its middle in every spell, which an unknown head would take up."""
    rest = np.zeros_like(vector)
    for place in view.linear.rows:
        cut = slice(place.start, place.start + place.gauges.size)
        if place.gauges.size:
            rest[cut] = vector[cut] - np.median(vector[cut])
    return rest
