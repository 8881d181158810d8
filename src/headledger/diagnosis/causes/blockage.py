"""A run that loses more than it should, or less: a step in the grade line that grows with the square of flow."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from headledger.diagnosis.causes.base import Mark, View
from headledger.diagnosis.result import CauseKind, Place
from headledger.statistics.sizes import SizePrior

Array = NDArray[np.float64]

LARGEST_SPAN_SHARE = 1.0 / 3.0
"""Largest drop of a blockage at the greatest flow, as a share of the widest span of the job's gauges. [-]"""


def velocity_head_drops(view: View, run: int) -> list[Array]:
    """Head that a loss coefficient of 1 takes in a run, spell by spell, in the direction of its flow. [m]"""
    drops = []
    for state in view.linear.states:
        drop = np.zeros(view.layout.run_count)
        velocity = state.flow_m3_s[run] / view.layout.area_m2[run]
        drop[run] = velocity * abs(velocity) / (2.0 * view.layout.gravity_m_s2)
        drops.append(drop)
    return drops


def _greatest(view: View, run: int, drops: list[Array]) -> tuple[float, float]:
    """Pressure of one velocity head, and loss coefficient of the run as described, at the greatest flow. [Pa], [-]"""
    at = int(np.argmax([abs(drop[run]) for drop in drops]))
    state = view.linear.states[at]
    unit = abs(float(drops[at][run]))
    stated = abs(float(state.drop_m[run] - state.added_m[run])) / unit if unit > 0.0 else 0.0
    return unit * state.head_weight_pa_m, stated


def blockages(view: View) -> list[Mark]:
    """One mark a run with flow: a loss coefficient added."""
    spans = [gauge.span_pa for gauge in view.layout.job.gauges if not gauge.is_differential]
    largest_pa = LARGEST_SPAN_SHARE * max(spans or [gauge.span_pa for gauge in view.layout.job.gauges])
    found = []
    for run, noun in enumerate(view.layout.job.runs):
        drops = velocity_head_drops(view, run)
        vector = view.drop_vector(drops)
        least = view.least_size(vector)
        unit_pa, _ = _greatest(view, run, drops)
        if unit_pa > 0.0 and least * unit_pa < largest_pa:
            found.append(
                Mark(
                    kind=CauseKind.BLOCKAGE,
                    place=Place(run=noun.name),
                    vector=vector,
                    prior=SizePrior(least=least, most=largest_pa / unit_pa, negative=False),
                    drops_m=tuple(drops),
                )
            )
    return found


def low_losses(view: View) -> list[Mark]:
    """One mark a run that has a loss to miss: down to none at all."""
    found = []
    for run, noun in enumerate(view.layout.job.runs):
        if noun.is_pump:
            continue
        drops = velocity_head_drops(view, run)
        vector = -view.drop_vector(drops)
        least = view.least_size(vector)
        _, stated = _greatest(view, run, drops)
        if least < stated:
            found.append(
                Mark(
                    kind=CauseKind.LOW_LOSS,
                    place=Place(run=noun.name),
                    vector=vector,
                    prior=SizePrior(least=least, most=stated, negative=False),
                    size_factor=-1.0,
                    drops_m=tuple(-drop for drop in drops),
                )
            )
    return found
