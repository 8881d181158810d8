"""A gauge whose error jumps once: knocked, re-zeroed, or its output shifted."""

from __future__ import annotations

import numpy as np

from headledger.diagnosis.causes.base import Mark, View
from headledger.diagnosis.result import CauseKind, Place
from headledger.statistics.sizes import SizePrior


def marks(view: View) -> list[Mark]:
    """One mark a gauge and moment between two pieces of time: a pressure, up to its span either way."""
    found = []
    for index, gauge in enumerate(view.layout.job.gauges):
        rows, pieces = view.linear.gauge_rows(index)
        if rows.size < 2:
            continue
        starts = np.array([view.model.spells[k].start_s for k in pieces])
        for begin in starts[1:]:
            vector = view.gauge_vector(index, (starts >= begin).astype(float))
            least = view.least_size(vector)
            if least < gauge.span_pa:
                found.append(
                    Mark(
                        kind=CauseKind.STEP,
                        place=Place(gauge=gauge.tag),
                        vector=vector,
                        prior=SizePrior(least=least, most=gauge.span_pa),
                        share=1.0 / (starts.size - 1),
                        own=(index,),
                        unit=gauge.unit.as_difference(),
                        start_s=float(begin),
                        form=f"at {begin:.0f}",
                    )
                )
    return found
