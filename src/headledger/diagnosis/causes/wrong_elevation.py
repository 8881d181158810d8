"""A gauge that hangs at another elevation than stated: a column of liquid, the same at every flow."""

from __future__ import annotations

import numpy as np

from headledger.diagnosis.causes.base import Mark, View
from headledger.diagnosis.layout import Layout
from headledger.diagnosis.result import CauseKind, Place
from headledger.statistics.sizes import SizePrior

LARGEST_M = 30.0
"""Largest error of an elevation: some storeys, or another datum. [m]"""


def column_pa_m(layout: Layout, gauge: int, head_weight_pa_m: float) -> float:
    """What a gauge reads too high for each metre that its elevation is stated too high. [Pa/m]"""
    noun = layout.job.gauges[gauge]
    if noun.is_differential:
        return 0.0
    doubts = [d for d in layout.elevation_doubts if d.liquid[gauge] or d.constant_pa_m[gauge]]
    own = [d for d in doubts if d.owner == f"gauge {noun.tag}"] or doubts
    if not own:
        return head_weight_pa_m
    return float(head_weight_pa_m * own[0].liquid[gauge] - own[0].constant_pa_m[gauge])


def marks(view: View) -> list[Mark]:
    """One mark a gauge: metres, stated too high positive."""
    found = []
    for index, gauge in enumerate(view.layout.job.gauges):
        _, spells = view.linear.gauge_rows(index)
        weights = [column_pa_m(view.layout, index, view.linear.states[s].head_weight_pa_m) for s in spells]
        if not weights or not any(weights):
            continue
        vector = view.gauge_vector(index, np.array(weights))
        least = view.least_size(vector)
        if least < LARGEST_M:
            found.append(
                Mark(
                    kind=CauseKind.WRONG_ELEVATION,
                    place=Place(gauge=gauge.tag),
                    vector=vector,
                    prior=SizePrior(least=least, most=LARGEST_M),
                    own=(index,),
                    unit=view.layout.job.display.length,
                )
            )
    return found
