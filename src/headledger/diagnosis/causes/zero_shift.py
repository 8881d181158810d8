"""A gauge that reads off by the same pressure at every flow."""

from __future__ import annotations

from headledger.diagnosis.causes.base import Mark, View
from headledger.diagnosis.result import CauseKind, Place
from headledger.statistics.sizes import SizePrior


def marks(view: View) -> list[Mark]:
    """One mark a gauge: a pressure, up to its span either way."""
    found = []
    for index, gauge in enumerate(view.layout.job.gauges):
        vector = view.gauge_vector(index, 1.0)
        least = view.least_size(vector)
        if least < gauge.span_pa:
            found.append(
                Mark(
                    kind=CauseKind.ZERO_SHIFT,
                    place=Place(gauge=gauge.tag),
                    vector=vector,
                    prior=SizePrior(least=least, most=gauge.span_pa),
                    own=(index,),
                    unit=gauge.unit.as_difference(),
                )
            )
    return found
