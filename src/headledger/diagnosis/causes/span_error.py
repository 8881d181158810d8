"""A gauge whose error grows with its reading: a wrong slope, or a scale set to another of the preferred ranges."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from headledger.diagnosis.causes.base import Mark, View
from headledger.diagnosis.result import CauseKind, Place
from headledger.plant.gauges import Gauge
from headledger.statistics.sizes import SizePrior

LARGEST_RATIO_ERROR = 0.5
"""Largest error of a slope that is not another scale. [-]"""

SCALE_SHARE = 0.2
"""Part of the prior that goes to a scale of another preferred range. [-]"""

PREFERRED = (1.0, 1.6, 2.5, 4.0, 6.0)
"""Preferred ends of scale in a decade (EN 837-1, from memory)."""


def pivot_pa(gauge: Gauge) -> float:
    """Reading about which a slope turns: the low end of the range, zero where the range spans zero. [Pa]"""
    return 0.0 if gauge.range_low_pa < 0.0 < gauge.range_high_pa else gauge.range_low_pa


def other_scales(gauge: Gauge) -> tuple[float, ...]:
    """Ratios of a gauge's scale to the other preferred ranges within a decade, where its own range is a preferred one."""
    top = gauge.range_high_pa / gauge.unit.factor
    if top <= 0.0:
        return ()
    decade = 10.0 ** np.floor(np.log10(top) + 1e-9)
    if min(abs(top / decade - value) for value in PREFERRED) > 0.01:
        return ()
    ratios = [value * power * decade / top for value in PREFERRED for power in (0.1, 1.0, 10.0)]
    return tuple(float(r) for r in ratios if abs(r - 1.0) > 0.01 and 0.1 < r < 10.0)


def marks(view: View) -> list[Mark]:
    """One mark a gauge for a slope of any size, and one for every other preferred scale."""
    found = []
    perfect = view.perfect_pa()
    for index, gauge in enumerate(view.layout.job.gauges):
        rows, _ = view.linear.gauge_rows(index)
        if not rows.size:
            continue
        above: NDArray[np.float64] = perfect[rows] - pivot_pa(gauge)
        vector = view.gauge_vector(index, above)
        least = view.least_size(vector)
        place = Place(gauge=gauge.tag)
        scales = other_scales(gauge)
        if least < LARGEST_RATIO_ERROR:
            found.append(
                Mark(
                    kind=CauseKind.SPAN_ERROR,
                    place=place,
                    vector=vector,
                    prior=SizePrior(least=least, most=LARGEST_RATIO_ERROR),
                    share=1.0 - SCALE_SHARE if scales else 1.0,
                    own=(index,),
                    size_base=1.0,
                )
            )
        found += [_other_scale(view, index, gauge, ratio, SCALE_SHARE / len(scales)) for ratio in scales]
    return found


def _other_scale(view: View, index: int, gauge: Gauge, ratio: float, share: float) -> Mark:
    """The reading is `ratio` times what it should be, about the pivot: undone on the data itself, with its Jacobian."""
    rows, _ = view.linear.gauge_rows(index)
    logged = view.readings_pa()[rows] - pivot_pa(gauge)
    return Mark(
        kind=CauseKind.SPAN_ERROR,
        place=Place(gauge=gauge.tag),
        vector=view.gauge_vector(index, logged * (1.0 - 1.0 / ratio)),
        prior=SizePrior(least=1.0, most=1.0, negative=False),
        share=share,
        log_jacobian=-rows.size * float(np.log(ratio)),
        own=(index,),
        size_base=ratio,
        size_factor=0.0,
        noise_factor=ratio,
        form="other scale",
    )
