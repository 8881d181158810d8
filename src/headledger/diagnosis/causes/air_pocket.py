"""Air trapped on a descending run: a step in the grade line of its own height, nearly the same at every flow."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from headledger.diagnosis.causes.base import Mark, View
from headledger.diagnosis.descents import descents
from headledger.diagnosis.result import CauseKind, Place
from headledger.statistics.sizes import SizePrior

Array = NDArray[np.float64]


def marks(view: View) -> list[Mark]:
    """Marks of every descent with the flow: gas that keeps its height or shrinks with pressure, there when still or not."""
    found = []
    for run, noun in enumerate(view.layout.job.runs):
        for descent in descents(view.layout, run, _direction(view, run)):
            place = Place(run=noun.name, distance_m=descent.distance_m if noun.name in view.layout.levelled else None)
            found += _forms(view, run, place, descent.fall_m)
    return found


def _forms(view: View, run: int, place: Place, descent_m: float) -> list[Mark]:
    """The forms of a pocket on one descent."""
    found = []
    still_known = any(spell.is_still for spell in view.model.spells)
    forms = [(shrinks, still) for shrinks in (False, True) for still in ((False, True) if still_known else (False,))]
    for shrinks, still in forms:
        steps = _steps(view, run, shrinks=shrinks, still=still)
        vector = view.drop_vector(steps)
        least = view.least_size(vector)
        if least < descent_m:
            found.append(
                Mark(
                    kind=CauseKind.AIR_POCKET,
                    place=place,
                    vector=vector,
                    prior=SizePrior(least=least, most=descent_m, negative=False),
                    share=1.0 / len(forms),
                    unit=view.layout.job.display.length,
                    drops_m=tuple(steps),
                    form=" ".join((["shrinks"] if shrinks else []) + (["still"] if still else [])),
                )
            )
    return found


def _direction(view: View, run: int) -> float:
    """Direction of a run's flow over all spells: 1, −1, or 0 where it has none."""
    return float(np.sign(sum(state.flow_m3_s[run] for state in view.linear.states)))


def _steps(view: View, run: int, *, shrinks: bool, still: bool) -> list[Array]:
    """Head that a pocket of 1 m (at the spell of highest pressure) takes in each spell. [m]"""
    start, _ = view.layout.ends[run]
    direction = _direction(view, run)
    absolute = np.array(
        [
            max(
                view.layout.barometer_pa
                + state.head_weight_pa_m * (state.head_m[start] - view.layout.station_elevation_m[start]),
                0.1 * view.layout.barometer_pa,
            )
            for state in view.linear.states
        ]
    )
    heights = absolute.max() / absolute if shrinks else np.ones(absolute.size)
    steps = []
    for height, state, spell in zip(heights, view.linear.states, view.model.spells, strict=True):
        step = np.zeros(view.layout.run_count)
        sign = direction if spell.is_still and still else float(np.sign(state.flow_m3_s[run]))
        step[run] = height * sign if not spell.is_still or still else 0.0
        steps.append(step)
    return steps
