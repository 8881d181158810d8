"""A gauge whose logged values are in another unit than stated: off by a known conversion ratio."""

from __future__ import annotations

import numpy as np

from headledger.diagnosis.causes.base import Mark, View
from headledger.diagnosis.result import CauseKind, Place
from headledger.quantities import PRESSURE_FACTORS
from headledger.statistics.sizes import SizePrior

SMALLEST_RATIO_ERROR = 0.015
"""Units closer to one another than this cannot be told by any gauge of this trade (bar and kgf/cm² differ by 2 %). [-]"""


def unit_ratios(factor: float) -> dict[str, float]:
    """Logged over true for a column that is in another unit than the one stated, by the name of that other unit.

    Parameters
    ----------
    factor : float
        Pascals per stated unit. [Pa]
    """
    ratios = {name: factor / other for name, other in PRESSURE_FACTORS.items()}
    return {name: ratio for name, ratio in ratios.items() if abs(ratio - 1.0) > SMALLEST_RATIO_ERROR}


def marks(view: View) -> list[Mark]:
    """One mark a gauge and unit: the logged values are divided by the ratio, with the Jacobian of that."""
    found = []
    readings = view.readings_pa()
    for index, gauge in enumerate(view.layout.job.gauges):
        rows, _ = view.linear.gauge_rows(index)
        if not rows.size:
            continue
        ratios = unit_ratios(gauge.unit.factor)
        for name, ratio in ratios.items():
            found.append(
                Mark(
                    kind=CauseKind.WRONG_UNIT,
                    place=Place(gauge=gauge.tag),
                    vector=view.gauge_vector(index, readings[rows] * (1.0 - 1.0 / ratio)),
                    prior=SizePrior(least=1.0, most=1.0, negative=False),
                    share=1.0 / len(ratios),
                    log_jacobian=-rows.size * float(np.log(ratio)),
                    own=(index,),
                    size_base=ratio,
                    size_factor=0.0,
                    noise_factor=ratio,
                    form=name,
                )
            )
    return found
