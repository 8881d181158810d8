"""A gauge that wanders off, from some moment on, at a steady rate."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from headledger.diagnosis.causes.base import Mark, View
from headledger.diagnosis.result import CauseKind, Place
from headledger.statistics.sizes import SizePrior

Array = NDArray[np.float64]


def marks(view: View) -> list[Mark]:
    """One mark a gauge and moment at which it may begin: a rate, up to its span over the time that is left."""
    found = []
    for index, gauge in enumerate(view.layout.job.gauges):
        _, pieces = view.linear.gauge_rows(index)
        starts = np.array([view.model.spells[k].start_s for k in pieces])
        ends = np.array([view.model.spells[k].end_s for k in pieces])
        forms = starts[:-1] if starts.size > 2 else starts[:0]
        for begin in forms:
            elapsed = _mean_elapsed(starts, ends, float(begin))
            vector = view.gauge_vector(index, elapsed)
            least, most = view.least_size(vector), gauge.span_pa / float(elapsed.max())
            if least < most:
                found.append(
                    Mark(
                        kind=CauseKind.DRIFT,
                        place=Place(gauge=gauge.tag),
                        vector=vector,
                        prior=SizePrior(least=least, most=most),
                        share=1.0 / forms.size,
                        own=(index,),
                        unit=gauge.unit.as_difference(),
                        start_s=float(begin),
                        form=f"from {begin:.0f}",
                    )
                )
    return found


def _mean_elapsed(starts: Array, ends: Array, begin: float) -> Array:
    """Mean over each piece of the time since the beginning, nothing before it. [s]"""
    low, high = np.maximum(starts - begin, 0.0), np.maximum(ends - begin, 0.0)
    return np.asarray((high**2 - low**2) / (2.0 * (ends - starts)))
