"""A pump that lifts more or less than its curve, in proportion at every flow: speed, rotation, impeller, air at the suction."""

from __future__ import annotations

import numpy as np

from headledger.diagnosis.causes.base import Mark, View
from headledger.diagnosis.result import CauseKind, Place
from headledger.physics.losses import pump_head
from headledger.statistics.sizes import SizePrior

LARGEST_RATIO_ERROR = 0.95
"""A pump lifts at least something, and hardly twice its curve. [-]"""


def marks(view: View) -> list[Mark]:
    """One mark a pump with a curve: the ratio of its lift to that of the curve."""
    found = []
    for run, polynomial in view.layout.pumps.items():
        drops = []
        for state, spell in zip(view.linear.states, view.model.spells, strict=True):
            drop = np.zeros(view.layout.run_count)
            lift, _ = pump_head(polynomial, float(state.flow_m3_s[run]), float(spell.speed_ratio[run]))
            drop[run] = -lift
            drops.append(drop)
        vector = view.drop_vector(drops)
        least = view.least_size(vector)
        if least < LARGEST_RATIO_ERROR:
            found.append(
                Mark(
                    kind=CauseKind.PUMP_LIFT,
                    place=Place(run=view.layout.job.runs[run].name),
                    vector=vector,
                    prior=SizePrior(least=least, most=LARGEST_RATIO_ERROR),
                    size_base=1.0,
                    drops_m=tuple(drops),
                )
            )
    return found
