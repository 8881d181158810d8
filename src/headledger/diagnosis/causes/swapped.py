"""Two gauges whose tags, wires or columns are exchanged: each logs what the other should."""

from __future__ import annotations

from itertools import combinations

import numpy as np

from headledger.diagnosis.causes.base import Mark, View
from headledger.diagnosis.result import CauseKind, Place
from headledger.statistics.sizes import SizePrior


def marks(view: View) -> list[Mark]:
    """One mark a pair that reads apart: the logged numbers are put back under their own tags, each in its own unit."""
    found = []
    gauges = view.layout.job.gauges
    readings = view.readings_pa()
    single = [index for index, gauge in enumerate(gauges) if not gauge.is_differential]
    for first, second in combinations(single, 2):
        rows = [view.linear.gauge_rows(index) for index in (first, second)]
        both = np.intersect1d(rows[0][1], rows[1][1])
        if not both.size:
            continue
        here, there = (at[np.isin(spells, both)] for at, spells in rows)
        ratio = gauges[first].unit.factor / gauges[second].unit.factor
        vector = np.zeros(view.linear.row_count)
        vector[here] = readings[here] - readings[there] * ratio
        vector[there] = readings[there] - readings[here] / ratio
        if view.least_size(vector) < 1.0:
            found.append(
                Mark(
                    kind=CauseKind.SWAPPED,
                    place=Place(gauges=(gauges[first].tag, gauges[second].tag)),
                    vector=vector,
                    prior=SizePrior(least=1.0, most=1.0, negative=False),
                    own=(first, second),
                )
            )
    return found
