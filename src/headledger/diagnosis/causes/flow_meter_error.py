"""A flow meter that reads off in proportion: all losses wrong with the square of it."""

from __future__ import annotations

import numpy as np

from headledger.diagnosis.causes.base import Mark, View
from headledger.diagnosis.result import CauseKind, Place
from headledger.statistics.sizes import SizePrior

LARGEST_RATIO_ERROR = 0.5
"""A wrong factor, unit of scale or a meter half full. [-]"""


def marks(view: View) -> list[Mark]:
    """One mark a meter: read over true, less 1."""
    found = []
    for run, noun in enumerate(view.layout.job.runs):
        if not any(not spell.is_still and np.isfinite(spell.flow_m3_s[run]) for spell in view.model.spells):
            continue
        vector = _vector(view, run)
        least = view.least_size(vector)
        if least < LARGEST_RATIO_ERROR:
            found.append(
                Mark(
                    kind=CauseKind.FLOW_METER_ERROR,
                    place=Place(run=noun.name),
                    vector=vector,
                    prior=SizePrior(least=least, most=LARGEST_RATIO_ERROR),
                    size_base=1.0,
                )
            )
    return found


def _vector(view: View, run: int) -> np.ndarray:
    """Change of the data per unit of the meter's error: a meter that sets a flow reads over it, one that is checked shows it."""
    ratio = view.linear.applied.meter_ratio.get(run, 1.0)
    changes = []
    direct = np.zeros(view.linear.row_count)
    for spell, state, place in zip(view.model.spells, view.linear.states, view.linear.rows, strict=True):
        change = np.zeros(state.point.flow_m3_s.size)
        if change.size and np.isfinite(spell.flow_m3_s[run]):
            column = np.flatnonzero(state.graph.basis == run)
            if column.size:
                change[column[0]] = -spell.flow_m3_s[run] / ratio**2
            checked = np.flatnonzero(place.meters == run)
            if checked.size:
                direct[place.start + place.gauges.size + checked[0]] = state.flow_m3_s[run]
        changes.append(change)
    return view.flow_vector(changes) + direct
