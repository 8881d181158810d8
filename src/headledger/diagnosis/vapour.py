"""Where the computed pressure lies below the liquid's vapour pressure: a column cannot stand there as the balance takes it to."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from scipy.special import ndtr

from headledger.diagnosis.causes.base import Mark
from headledger.diagnosis.estimate import Model
from headledger.diagnosis.findings import Finding
from headledger.diagnosis.frame import Frame
from headledger.diagnosis.grade import StationHeads, station_heads
from headledger.diagnosis.layout import liquid_at
from headledger.diagnosis.result import CauseKind, Place
from headledger.diagnosis.search import Posterior
from headledger.diagnosis.variants import VAPOUR_MARGIN_PA, said_pressure_pa
from headledger.diagnosis.wording import vapour_statement
from headledger.statistics.sizes import SizePrior

WORTH_TELLING = 0.02
"""Places less probably below vapour pressure than this are not named. [-]"""

MOST_EXPLANATIONS = 6
"""As many explanations are looked at; further ones hold too little to matter."""

LEAST_SD_PA = 100.0
"""Floor of a computed pressure's standard deviation. [Pa]"""


@dataclass(frozen=True, slots=True, kw_only=True)
class VapourFound:
    """One place below vapour pressure, in the spell where it is furthest below.

    Parameters
    ----------
    place : Place
        A station, or a point along a run.
    probability : float
        Under the leading explanation. [-]
    pressure_pa, vapour_pressure_pa : float
        Absolute. [Pa]
    spell : int
        Index.
    """

    place: Place
    probability: float
    pressure_pa: float
    vapour_pressure_pa: float
    spell: int


def vapour_findings(model: Model, posterior: Posterior) -> tuple[Finding, ...]:
    """Findings of places below vapour pressure, the most probable first.

    Parameters
    ----------
    model : Model
    posterior : Posterior

    Returns
    -------
    tuple of Finding
        Their probabilities averaged over the leading explanations.
    """
    probability: dict[Place, float] = {}
    told: dict[Place, VapourFound] = {}
    weight = 0.0
    for explanation in posterior.explanations[:MOST_EXPLANATIONS]:
        weight += explanation.probability
        if any(kind is CauseKind.VAPOUR for kind, _ in explanation.keys):
            continue
        for found in vapour_places(model, explanation.frame, explanation.chosen):
            probability[found.place] = probability.get(found.place, 0.0) + explanation.probability * found.probability
            told.setdefault(found.place, found)
    leading = posterior.leading
    rows = leading.frame.linear.row_count
    findings = []
    for place, found in told.items():
        mark = Mark(kind=CauseKind.VAPOUR, place=place, vector=np.zeros(rows), prior=SizePrior(least=0.0, most=0.0))
        findings.append(
            Finding(
                kind=CauseKind.VAPOUR,
                place=place,
                probability=min(probability[place] / weight, 1.0),
                rivals=(),
                explanation=leading,
                mark=mark,
                size=0.0,
                sd=0.0,
                statement=vapour_statement(
                    model,
                    place,
                    found.spell,
                    pressure_pa=found.pressure_pa,
                    vapour_pressure_pa=found.vapour_pressure_pa,
                ),
            )
        )
    known = {
        place for explanation in posterior.explanations for kind, place in explanation.keys if kind is CauseKind.VAPOUR
    }
    new = [f for f in findings if f.probability >= WORTH_TELLING and f.place not in known]
    return tuple(sorted(new, key=lambda f: -f.probability))


def vapour_places(model: Model, frame: Frame, chosen: tuple[int, ...]) -> tuple[VapourFound, ...]:
    """Where the absolute pressure is computed to lie below the vapour pressure under one explanation, the most probable first.

    Parameters
    ----------
    model : Model
    frame : Frame
    chosen : tuple of int
        The explanation's marks.

    Returns
    -------
    tuple of VapourFound
        One for each stretch of pipe that is below, at its worst point.
    """
    worst: dict[Place, VapourFound] = {}
    model = frame.linear.model
    for index, spell in enumerate(model.spells):
        vapour_pa = float(liquid_at(model.layout.job.liquid, spell.temperature_k).vapour_pressure_pa)
        if not np.isfinite(vapour_pa):
            continue
        heads = station_heads(model, frame, chosen, index)
        said = said_pressure_pa(frame.linear, index)
        for found in _in_spell(model, frame, index, heads, vapour_pa):
            at = model.layout.station_index.get(found.place.station)
            # where a gauge itself reads below vapour pressure there is no vapour: it would read that pressure, and no less
            if at is not None and said[at] < vapour_pa - VAPOUR_MARGIN_PA:
                continue
            if found.place not in worst or worst[found.place].probability < found.probability:
                worst[found.place] = found
    ordered = sorted(worst.values(), key=lambda found: (-found.probability, found.pressure_pa))
    return tuple(found for found in ordered if found.probability >= WORTH_TELLING)


def _in_spell(model: Model, frame: Frame, index: int, heads: StationHeads, vapour_pa: float) -> list[VapourFound]:
    """The worst point of every run in one spell; of runs that meet in it, once."""
    layout, state = model.layout, frame.linear.states[index]
    found: dict[Place, VapourFound] = {}
    for run, noun in enumerate(layout.job.runs):
        if not model.spells[index].is_open[run]:
            continue
        start, end = layout.ends[run]
        velocity_m = float(state.velocity_pa[run]) / state.head_weight_pa_m
        distance, height = layout.profiles[run]
        share = distance / noun.length_m if noun.length_m > 0.0 else np.linspace(0.0, 1.0, distance.size)
        grade = (1.0 - share) * heads.head_m[start] + share * heads.head_m[end] - velocity_m
        pressure = layout.barometer_pa + state.head_weight_pa_m * (grade - height)
        deviation = _deviation_pa(model, heads, state.head_weight_pa_m, start, end)
        at = int(np.argmin(pressure))
        names = {0: layout.job.stations[start].name, distance.size - 1: layout.job.stations[end].name}
        place = Place(station=names[at]) if at in names else Place(run=noun.name, distance_m=float(distance[at]))
        one = VapourFound(
            place=place,
            probability=float(ndtr((vapour_pa - pressure[at]) / deviation)),
            pressure_pa=float(pressure[at]),
            vapour_pressure_pa=vapour_pa,
            spell=index,
        )
        if place not in found or found[place].pressure_pa > one.pressure_pa:
            found[place] = one
    return _apart(model, list(found.values()))


def _deviation_pa(model: Model, heads: StationHeads, weight_pa_m: float, start: int, end: int) -> float:
    """Standard deviation of the computed pressure along a run. [Pa]"""
    stations = model.layout.job.stations
    height_m = max(stations[start].elevation_sd_m, stations[end].elevation_sd_m)
    head_m = float(max(heads.sd_m[start], heads.sd_m[end]))
    squares = (weight_pa_m * head_m) ** 2 + (weight_pa_m * height_m) ** 2 + model.layout.job.site.barometer_sd_pa**2
    return max(float(np.sqrt(squares)), LEAST_SD_PA)


def _apart(model: Model, found: list[VapourFound]) -> list[VapourFound]:
    """Of places at neighbouring stations that are all below, the lowest alone: they are one stretch."""
    below = {f.place.station: f for f in found if f.place.station and f.probability > 0.5}
    kept = []
    for one in found:
        neighbours = [
            below[other]
            for run in model.layout.job.runs
            if one.place.station in (run.start, run.end)
            for other in (run.start, run.end)
            if other != one.place.station and other in below
        ]
        if not any(other.pressure_pa < one.pressure_pa for other in neighbours):
            kept.append(one)
    return kept
