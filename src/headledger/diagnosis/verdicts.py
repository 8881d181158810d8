"""Verdicts: each gauge's own error held against its tolerance, averaged over explanations."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from headledger.diagnosis.estimate import FREE_VELOCITY_M_S, Model
from headledger.diagnosis.means import SpellMeans
from headledger.diagnosis.own_error import own_error
from headledger.diagnosis.result import Verdict
from headledger.diagnosis.search import Posterior
from headledger.plant.job import CheckSettings, DecisionRule

Array = NDArray[np.float64]

UNCHECKED_SHARE = 0.8
"""Part of the widened prior's standard deviation beyond which nothing else in the data determines a gauge. [-]"""

UNKNOWN_FLOW_SHARE = 0.3
"""A flow doubted by more than this part of what any unmetered flow is doubted by is not determined. [-]"""

SUSPECTED = 0.2
"""A gauge with a cause of its own at least this probable is never merely unchecked. [-]"""

WEIGHT_JUDGED = 0.99
"""Verdicts are averaged over the leading explanations that together hold this much; the rest cannot move one by more. [-]"""


@dataclass(frozen=True, slots=True, kw_only=True)
class Judged:
    """What is concluded on one gauge.

    Parameters
    ----------
    verdict : Verdict
    outside_probability : float
        Averaged over explanations. [-]
    error_pa, u95_pa, tolerance_pa : float
        Under the leading explanation, in the spell where the error is most probably outside. [Pa]
    unchecked_because : str
        What leaves the pressure there open, as the end of a sentence; empty where the gauge is checked.
    spell : int
        Index of that spell in the model; −1 where the gauge gave no reading.
    """

    verdict: Verdict
    outside_probability: float
    error_pa: float
    u95_pa: float
    tolerance_pa: float
    unchecked_because: str = ""
    spell: int = -1


def judge_gauge(model: Model, posterior: Posterior, gauge: int) -> Judged:
    """The verdict on one gauge.

    Parameters
    ----------
    model : Model
    posterior : Posterior
    gauge : int

    Returns
    -------
    Judged
    """
    settings = model.layout.job.check
    noun = model.layout.job.gauges[gauge]
    leading = own_error(model, posterior.leading, gauge)
    if leading is None:
        return Judged(
            verdict=Verdict.UNCHECKED,
            outside_probability=float("nan"),
            error_pa=float("nan"),
            u95_pa=float("nan"),
            tolerance_pa=noun.tolerance_at((noun.range_low_pa + noun.range_high_pa) / 2.0),
        )
    worst = int(np.argmax(leading.outside_by_spell + 1e-9 * np.abs(leading.mean_pa)))
    _, spells = posterior.leading.frame.linear.gauge_rows(gauge)
    state = posterior.leading.frame.linear.states[int(spells[worst])]
    outside = outside_probability(model, posterior, gauge)
    # where a cause of its own stands beside one in the pipe, the two explain the readings alike: that is no want of readings
    suspected = own_cause_probability(posterior, gauge) >= SUSPECTED
    unchecked = bool(leading.left_fraction[worst] > UNCHECKED_SHARE) and not suspected
    return Judged(
        verdict=decide(outside, unchecked=unchecked, settings=settings),
        outside_probability=outside,
        error_pa=float(leading.mean_pa[worst]),
        u95_pa=2.0 * float(leading.sd_pa[worst]),
        tolerance_pa=noun.tolerance_at(float(state.reading_pa[gauge])),
        unchecked_because=why_unchecked(model, posterior, gauge, int(spells[worst])) if unchecked else "",
        spell=int(spells[worst]),
    )


def why_unchecked(model: Model, posterior: Posterior, gauge: int, index: int) -> str:
    """What leaves the pressure at a gauge open in a spell, as the end of a sentence."""
    layout, linear = model.layout, posterior.leading.frame.linear
    spell, state = linear.model.spells[index], linear.states[index]
    station = layout.station_index[layout.job.gauges[gauge].station]
    part = state.graph.part
    others = [
        other
        for other in np.flatnonzero(np.isfinite(spell.reading_pa))
        if other != gauge and part[layout.station_index[layout.job.gauges[int(other)].station]] == part[station]
    ]
    levels = [s for s in np.flatnonzero(np.isfinite(spell.level_m)) if part[s] == part[station]]
    if not others and not levels:
        return ", since no other gauge and no surface shares a known head with it"
    deviation = _flow_sd_without(model, posterior, gauge, index)
    open_flows = [
        run.name
        for number, run in enumerate(layout.job.runs)
        if deviation[number] > UNKNOWN_FLOW_SHARE * FREE_VELOCITY_M_S * layout.area_m2[number]
    ]
    if open_flows:
        return f", since the flow in {', '.join(open_flows[:3])} is not determined"
    return ""


def _flow_sd_without(model: Model, posterior: Posterior, gauge: int, index: int) -> Array:
    """Standard deviation of every run's flow in a spell, from everything but one gauge. [m³/s]"""
    linear = posterior.leading.frame.linear

    def silent(spell: SpellMeans) -> SpellMeans:
        readings = spell.reading_pa.copy()
        readings[gauge] = np.nan
        return replace(spell, reading_pa=readings)

    rest = Model(model.layout, [silent(spell) for spell in linear.model.spells])
    without = rest.linearise([state.point for state in linear.states], applied=linear.applied)
    return rest.flow_sd_m3_s(without, index)


def own_cause_probability(posterior: Posterior, gauge: int) -> float:
    """Probability that some cause of a gauge's own is present. [-]"""
    return sum(e.probability for e in posterior.explanations if any(gauge in e.frame.marks[i].own for i in e.chosen))


def outside_probability(model: Model, posterior: Posterior, gauge: int) -> float:
    """Probability that a gauge's own error exceeds its tolerance in some spell, averaged over explanations. [-]"""
    total, weight = 0.0, 0.0
    for explanation in posterior.explanations:
        if weight > WEIGHT_JUDGED:
            break
        error = own_error(model, explanation, gauge)
        if error is not None:
            total += explanation.probability * error.outside_probability
            weight += explanation.probability
    return min(total / weight, 1.0) if weight else float("nan")


def decide(outside: float, *, unchecked: bool, settings: CheckSettings) -> Verdict:
    """The word for a probability of being outside, by the job's rule; `unchecked` outranks `pass`.

    Parameters
    ----------
    outside : float
        [-]
    unchecked : bool
    settings : CheckSettings

    Returns
    -------
    Verdict
    """
    limit = settings.confidence_fraction if settings.decision is DecisionRule.GUARDED else 0.5
    if outside >= limit:
        return Verdict.FAIL
    if unchecked:
        return Verdict.UNCHECKED
    return Verdict.PASS if outside <= 1.0 - limit else Verdict.UNRESOLVED
