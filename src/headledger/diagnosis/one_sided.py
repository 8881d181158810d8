"""Drops whose sign is known beforehand: a loss that is free never lifts, and a check valve at rest never holds back its own side.

Such a drop is left open when the model is linearised. Here an explanation pays for putting it on the wrong side.
"""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from scipy.special import log_ndtr

from headledger.diagnosis.estimate import Model
from headledger.diagnosis.frame import Frame
from headledger.diagnosis.grade import StationHeads, station_heads
from headledger.diagnosis.state import spell_ties
from headledger.plant.runs import LossKind

LEAST_DROP_SD_M = 0.02
"""Floor of a drop's standard deviation, so that a drop of nothing is never on the wrong side. [m]"""


def sign_log_weight(model: Model, frame: Frame, chosen: Sequence[int]) -> float:
    """Log of how much more probable the known signs are under an explanation than they were beforehand.

    Parameters
    ----------
    model : Model
    frame : Frame
    chosen : sequence of int

    Returns
    -------
    float
        0 where no drop has a known sign. [nat]

    Notes
    -----
    A drop normal about ``d`` with deviation ``s`` has the right sign with probability ``Φ(d/s)``; beforehand, broad about nothing, with ½.
    """
    runs = [
        i
        for i, run in enumerate(model.layout.job.runs)
        if run.loss is LossKind.FREE or run.is_check_valve or run.lifts_unknown
    ]
    if not runs:
        return 0.0
    total = 0.0
    model = frame.linear.model
    for index, spell in enumerate(model.spells):
        heads: StationHeads | None = None
        ties = spell_ties(model.layout, spell)
        for run in runs:
            direction = _direction(model, frame, index, run)
            if ties[run] or not spell.is_open[run] or direction == 0.0:
                continue
            heads = heads or station_heads(model, frame, chosen, index)
            start, end = model.layout.ends[run]
            drop = direction * float(heads.head_m[start] - heads.head_m[end])
            variance = (
                heads.covariance_m2[start, start]
                + heads.covariance_m2[end, end]
                - 2.0 * heads.covariance_m2[start, end]
            )
            deviation = float(np.sqrt(max(variance, LEAST_DROP_SD_M**2)))
            total += float(log_ndtr(drop / deviation)) - float(np.log(0.5))
    return total


def _direction(model: Model, frame: Frame, index: int, run: int) -> float:
    """1 where the head falls from the run's start to its end, −1 where it rises, 0 where its sign is not known."""
    noun = model.layout.job.runs[run]
    if model.spells[index].is_still:
        return -1.0 if noun.is_check_valve else 0.0
    flow = float(np.sign(frame.linear.states[index].flow_m3_s[run]))
    return -flow if noun.lifts_unknown else flow
