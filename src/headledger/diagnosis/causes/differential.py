"""What a differential gauge can do besides: its lines crossed, or a square root too many or too few."""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np
from numpy.typing import NDArray

from headledger.diagnosis.causes.base import Mark, View
from headledger.diagnosis.result import CauseKind, Place
from headledger.plant.gauges import Gauge
from headledger.statistics.sizes import SizePrior

Array = NDArray[np.float64]

CUT_OFF_FRACTION = 0.05
"""Below this fraction of span a rooted signal is cut off to nothing (common practice, no source): there a root changes no density. [-]"""


def crossed_lines(view: View) -> list[Mark]:
    """One mark a differential gauge: it reads what it should with the other sign, undone on the data itself."""
    found = []
    for index, gauge, readings in _differential(view):
        found.append(_undone(view, index, gauge, CauseKind.CROSSED_LINES, readings, -readings, 0.0, 1.0))
    return found


def roots(view: View) -> list[Mark]:
    """Two marks a differential gauge: its log holds the square root of the fraction of span, or lacks a root that was taken back."""
    found = []
    for index, gauge, readings in _differential(view):
        share = np.clip((readings - gauge.range_low_pa) / gauge.span_pa, 0.0, None)
        seen = np.where(share > CUT_OFF_FRACTION, share, np.nan)
        # a root too many is undone by the square, a root too few by the root
        for undone, log_slope in (
            (share**2, float(np.nansum(np.log(2.0 * seen)))),
            (np.sqrt(share), float(-np.nansum(np.log(2.0 * np.sqrt(seen))))),
        ):
            right = gauge.range_low_pa + gauge.span_pa * undone
            found.append(_undone(view, index, gauge, CauseKind.ROOT, readings, right, log_slope, 0.5))
    return found


def _differential(view: View) -> Iterator[tuple[int, Gauge, Array]]:
    """Differential gauges with their readings."""
    said = view.readings_pa()
    for index, gauge in enumerate(view.layout.job.gauges):
        rows, _ = view.linear.gauge_rows(index)
        if gauge.is_differential and rows.size:
            yield index, gauge, said[rows]


def _undone(
    view: View,
    index: int,
    gauge: Gauge,
    kind: CauseKind,
    readings: Array,
    right: Array,
    log_jacobian: float,
    share: float,
) -> Mark:
    """A mark that puts the readings right; what it adds is what they are off by."""
    return Mark(
        kind=kind,
        place=Place(gauge=gauge.tag),
        vector=view.gauge_vector(index, readings - right),
        prior=SizePrior(least=1.0, most=1.0, negative=False),
        share=share,
        log_jacobian=log_jacobian,
        own=(index,),
        form=f"{kind.value} {share:g} {log_jacobian:.3g}",
    )
