"""A gauge whose values are against another reference than stated: off by the barometer, or by what a sealed case holds back."""

from __future__ import annotations

from headledger.diagnosis.causes.base import Mark, View
from headledger.diagnosis.result import CauseKind, Place
from headledger.statistics.sizes import SizePrior

SEALED_PA = 101_325.0
"""Pressure that a sealed case holds unless stated otherwise: the standard atmosphere. [Pa absolute]"""

SEALED_SHARE = 0.2
"""Part of the prior that goes to a sealed case; gauge taken for absolute is the common mistake (common practice). [-]"""


def marks(view: View) -> list[Mark]:
    """Up to two marks a gauge: the whole barometer, and the barometer less a sealed atmosphere, either sign."""
    found = []
    barometer, doubt = view.layout.barometer_pa, 2.0 * view.layout.job.site.barometer_sd_pa
    for index, gauge in enumerate(view.layout.job.gauges):
        if gauge.is_differential or not view.linear.gauge_rows(index)[0].size:
            continue
        vector = view.gauge_vector(index, 1.0)
        least = view.least_size(vector)
        sealed = abs(barometer - SEALED_PA)
        forms = [(form, size) for form, size in (("barometer", barometer), ("sealed", sealed)) if size - doubt > least]
        for form, size in forms:
            found.append(
                Mark(
                    kind=CauseKind.WRONG_REFERENCE,
                    place=Place(gauge=gauge.tag),
                    vector=vector,
                    prior=SizePrior(least=size - doubt, most=size + max(doubt, 1.0)),
                    share=1.0 if len(forms) == 1 else SEALED_SHARE if form == "sealed" else 1.0 - SEALED_SHARE,
                    own=(index,),
                    unit=gauge.unit.as_difference(),
                    form=form,
                )
            )
    return found
