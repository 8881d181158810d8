"""What to do next on site: candidate actions, what each would settle, and how the judgement moves once its result is known.

The value of an action is the information, in bits, between its outcome and the work that has to be done. Explanations that call for the
same work count as one: whether a gauge is off by an offset or by a slope, it is the same gauge that is adjusted.
"""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Sequence
from itertools import combinations

import numpy as np
from numpy.typing import NDArray

from headledger.diagnosis.estimate import Model
from headledger.diagnosis.findings import Finding
from headledger.diagnosis.more_spells import foresee, further_spell, joint_bits
from headledger.diagnosis.result import CauseKind, NextCheck, Place
from headledger.diagnosis.search import Explanation, Posterior
from headledger.diagnosis.site_actions import ACTIONS, Action, ActionKind
from headledger.diagnosis.wording import action_sentence, spell_sentence

Array = NDArray[np.float64]

LEAST_BITS = 0.05
"""An action that settles less is not worth naming. [bit]"""

MOST_CHECKS, MOST_PAIRS = 6, 2

FLOW_FACTORS = (0.5, 1.5)
"""Further flows that are thought of, as parts of the greatest. [-]"""

MOST_FORESEEN = 12
"""So many explanations, the likeliest, are asked what a further spell would read."""

WORTH_CHECKING = 0.02
"""Findings less probable than this call for no action. [-]"""

WEIGHT_COUNTED = 0.995
"""Explanations that together hold this much are asked what an action would show. [-]"""

RELIABILITY = 0.95
"""How often a look or a stroke tells what is there (no source). [-]"""

SURVEY_SD_M = 0.02
"""How well an elevation is surveyed anew. [m]"""

TEST_GAUGE_SHARE = 0.1
"""Standard uncertainty of a test gauge, and of reading a zero, in tolerances of the gauge under test. [-]"""

GRID = 600

_ADJUST = frozenset(
    {
        CauseKind.ZERO_SHIFT,
        CauseKind.SPAN_ERROR,
        CauseKind.DRIFT,
        CauseKind.STEP,
        CauseKind.FROZEN,
        CauseKind.AT_LIMIT,
    }
)
_SETTINGS = frozenset({CauseKind.WRONG_UNIT, CauseKind.WRONG_REFERENCE, CauseKind.SWAPPED, CauseKind.ROOT})
# What acts on a reading at the instrument itself, so that a test gauge beside it shows it.
_AT_THE_INSTRUMENT = _ADJUST | _SETTINGS


def work_of(kind: CauseKind, place: Place) -> tuple[str, Place]:
    """The work that a cause calls for, and where."""
    if kind in _ADJUST:
        return "adjust", place
    if kind in _SETTINGS:
        return "settings", place
    return kind.value, place


def candidates(model: Model, findings: Sequence[Finding]) -> tuple[Action, ...]:
    """Actions that the findings call for, each once.

    Parameters
    ----------
    model : Model
    findings : sequence of Finding

    Returns
    -------
    tuple of Action
    """
    found: dict[Action, None] = {}
    for finding in findings:
        if finding.probability < WORTH_CHECKING:
            continue
        for kind in _actions_for(model, finding):
            found[Action(kind=kind, place=_place_for(kind, finding.place))] = None
    return tuple(found)


def _actions_for(model: Model, finding: Finding) -> tuple[ActionKind, ...]:
    """Kinds of action that look at a finding."""
    kind, place = finding.kind, finding.place
    if kind in _ADJUST | {
        CauseKind.WRONG_REFERENCE,
        CauseKind.WRONG_ELEVATION,
        CauseKind.LEG_GAS,
        CauseKind.WRONG_UNIT,
    }:
        more = {CauseKind.WRONG_ELEVATION: (ActionKind.SURVEY,), CauseKind.LEG_GAS: (ActionKind.VENT,)}.get(kind, ())
        return (ActionKind.ZERO_CHECK, ActionKind.TEST_GAUGE, *more) if place.gauge else ()
    if kind in (CauseKind.BLOCKAGE, CauseKind.LOW_LOSS, CauseKind.CLOSED_OFF):
        item = model.layout.job.run(place.run).item.casefold()
        strainer = any(word in item for word in ("strainer", "filter", "screen"))
        return (
            (ActionKind.OPEN_STRAINER,) if strainer and kind is not CauseKind.CLOSED_OFF else (ActionKind.STROKE_VALVE,)
        )
    single = {
        CauseKind.AIR_POCKET: ActionKind.VENT,
        CauseKind.FLOW_METER_ERROR: ActionKind.CHECK_METER,
        CauseKind.PUMP_LIFT: ActionKind.CHECK_PUMP,
    }
    return (single[kind],) if kind in single else ()


def _place_for(kind: ActionKind, place: Place) -> Place:
    """Where an action is done: a pocket is vented at its run, wherever along it."""
    return Place(gauge=place.gauge) if place.gauge else Place(run=place.run)


def next_checks(model: Model, posterior: Posterior, findings: Sequence[Finding]) -> tuple[NextCheck, ...]:
    """Actions worth their time, the most information a minute first, the safest first where equal.

    Parameters
    ----------
    model : Model
    posterior : Posterior
    findings : sequence of Finding

    Returns
    -------
    tuple of NextCheck
    """
    counted = _counted(posterior)
    found = []
    for action in candidates(model, findings):
        bits, separates = _value(model, counted, action)
        if bits >= LEAST_BITS:
            facts = ACTIONS[action.kind]
            found.append(
                NextCheck(
                    action=action.kind.value,
                    place=action.place,
                    gain_bits=bits,
                    minutes=facts.minutes,
                    separates=separates,
                    says=action_sentence(action.kind, action.place, separates),
                    caution=facts.caution,
                )
            )
    found += _spells_worth_logging(model, posterior, counted)
    order = {kind.value: facts.risk for kind, facts in ACTIONS.items()}
    found.sort(key=lambda check: (-round(check.gain_bits / check.minutes, 3), order[check.action], check.minutes))
    return tuple(found[:MOST_CHECKS])


def _counted(posterior: Posterior) -> list[tuple[float, Explanation]]:
    """The leading explanations with probabilities that sum to 1."""
    kept: list[tuple[float, Explanation]] = []
    weight = 0.0
    for explanation in posterior.explanations:
        kept.append((explanation.probability, explanation))
        weight += explanation.probability
        if weight > WEIGHT_COUNTED:
            break
    return [(probability / weight, explanation) for probability, explanation in kept]


def _classes(counted: Sequence[tuple[float, Explanation]]) -> list[list[tuple[float, Explanation]]]:
    """Explanations that call for the same work, together."""
    classes: dict[frozenset[tuple[str, Place]], list[tuple[float, Explanation]]] = defaultdict(list)
    for probability, explanation in counted:
        classes[frozenset(work_of(kind, place) for kind, place in explanation.keys)].append((probability, explanation))
    return list(classes.values())


def _spells_worth_logging(
    model: Model, posterior: Posterior, counted: Sequence[tuple[float, Explanation]]
) -> list[NextCheck]:
    """Further spells that would settle something: at rest where none was, at less and at more flow."""
    likely = sorted(counted, key=lambda pair: -pair[0])[:MOST_FORESEEN]
    classes = _classes(likely)
    if len(classes) < 2:
        return []
    at_rest = any(spell.is_still for spell in model.spells)
    found = []
    for factor in FLOW_FACTORS if at_rest else (0.0, *FLOW_FACTORS):
        more = further_spell(model, posterior, factor)
        if more is None:
            continue
        foreseen = dict(zip((id(e) for _, e in likely), foresee(posterior, [e for _, e in likely], *more), strict=True))
        whole = sum(p for p, _ in likely)
        weighed = [
            (
                sum(p for p, _ in members) / whole,
                [(p / sum(q for q, _ in members), foreseen[id(e)]) for p, e in members],
            )
            for members in classes
        ]
        bits, overlap = joint_bits(weighed)
        if bits >= LEAST_BITS:
            names = [_name(members[0][1], None) for members in classes]
            pairs = _apart(names, np.array([weight for weight, _ in weighed]), overlap)
            kind = ActionKind.OTHER_FLOW if factor else ActionKind.STILL_SPELL
            found.append(
                NextCheck(
                    action=kind.value,
                    place=Place(),
                    gain_bits=bits,
                    minutes=ACTIONS[kind].minutes,
                    separates=pairs,
                    says=spell_sentence(factor, pairs),
                    caution=ACTIONS[kind].caution,
                )
            )
    return sorted(found, key=lambda check: -check.gain_bits)[:1]


def _value(
    model: Model, counted: Sequence[tuple[float, Explanation]], action: Action
) -> tuple[float, tuple[tuple[str, str], ...]]:
    """Bits between the work to be done and the outcome, and which kinds of cause the outcome tells apart."""
    weights, densities, names = [], [], []
    grid = _outcomes(model, counted, action)
    for members in _classes(counted):
        share = sum(probability for probability, _ in members)
        weights.append(share)
        densities.append(np.sum([p * outcome_density(model, e, action, grid) for p, e in members], axis=0) / share)
        names.append(_name(members[0][1], action))
    weight = np.array(weights)
    step = 1.0 if grid.size == 2 else float(grid[1] - grid[0])
    density: Array = np.vstack(densities)
    density = density / np.maximum(density.sum(axis=1, keepdims=True) * step, 1e-300)
    mixed = weight @ density
    bits = float((weight[:, None] * density * _log2_ratio(density, mixed)).sum() * step)
    return bits, _told_apart(names, weight, density * step)


def _log2_ratio(density: Array, mixed: Array) -> Array:
    """Log to the base 2 of density over mixture, 0 where there is none."""
    with np.errstate(divide="ignore", invalid="ignore"):
        return np.where(density > 1e-300, np.log2(density / np.maximum(mixed, 1e-300)), 0.0)


def _name(explanation: Explanation, action: Action | None) -> str:
    """The kind of cause in an explanation that an action looks at, or that nothing is wrong there."""
    here = [
        kind
        for kind, place in explanation.keys
        if action is not None and action.place in (Place(gauge=place.gauge), Place(run=place.run))
    ]
    elsewhere = sorted(explanation.keys, key=lambda key: key[0].value)
    return here[0].value if here else elsewhere[0][0].value if elsewhere else "none"


def _told_apart(names: Sequence[str], weights: Array, shares: Array) -> tuple[tuple[str, str], ...]:
    """Pairs of kinds whose outcomes overlap by less than half, the weightiest first."""
    overlap = np.minimum(shares[:, None, :], shares[None, :, :]).sum(axis=2)
    return _apart(names, weights, overlap)


def _apart(names: Sequence[str], weights: Array, overlap: Array) -> tuple[tuple[str, str], ...]:
    """The same from how far the outcomes of every two classes overlap, shape (classes, classes)."""
    order = [int(k) for k in np.argsort(-weights)[:5] if weights[k] >= WORTH_CHECKING]
    pairs: dict[frozenset[str], tuple[str, str]] = {}
    for first, second in combinations(order, 2):
        if overlap[first, second] < 0.5 and names[first] != names[second]:
            pairs.setdefault(frozenset((names[first], names[second])), (names[first], names[second]))
    return tuple(pairs.values())[:MOST_PAIRS]


def _outcomes(model: Model, counted: Sequence[tuple[float, Explanation]], action: Action) -> Array:
    """Outcomes over which the information is summed: no and yes, or a grid of values."""
    if ACTIONS[action.kind].is_look:
        return np.array([0.0, 1.0])
    moments = [_moments(model, explanation, action) for _, explanation in counted]
    low = min(mean - 5.0 * sd for mean, sd in moments)
    high = max(mean + 5.0 * sd for mean, sd in moments)
    finest = min(sd for _, sd in moments)
    return np.linspace(low, high, int(np.clip((high - low) / (0.3 * finest), GRID, 20 * GRID)))


def outcome_density(model: Model, explanation: Explanation, action: Action, outcomes: Array) -> Array:
    """Probability or density of outcomes of an action under an explanation.

    Parameters
    ----------
    model : Model
    explanation : Explanation
    action : Action
    outcomes : ndarray
        1 and 0 for yes and no; else in SI.

    Returns
    -------
    ndarray, of the shape of `outcomes`
    """
    if ACTIONS[action.kind].is_look:
        there = any(_is_seen(kind, place, action) for kind, place in explanation.keys)
        yes = RELIABILITY if there else 1.0 - RELIABILITY
        return np.where(outcomes > 0.5, yes, 1.0 - yes)
    mean, deviation = _moments(model, explanation, action)
    return np.asarray(np.exp(-0.5 * ((outcomes - mean) / deviation) ** 2) / (deviation * np.sqrt(2.0 * np.pi)))


_SEEN: dict[ActionKind, frozenset[CauseKind]] = {
    ActionKind.VENT: frozenset({CauseKind.AIR_POCKET, CauseKind.LEG_GAS}),
    ActionKind.OPEN_STRAINER: frozenset({CauseKind.BLOCKAGE, CauseKind.LOW_LOSS}),
    ActionKind.STROKE_VALVE: frozenset({CauseKind.BLOCKAGE, CauseKind.LOW_LOSS, CauseKind.CLOSED_OFF}),
    ActionKind.CHECK_METER: frozenset({CauseKind.FLOW_METER_ERROR}),
    ActionKind.CHECK_PUMP: frozenset({CauseKind.PUMP_LIFT}),
}


def _is_seen(kind: CauseKind, place: Place, action: Action) -> bool:
    """Whether a look finds a cause."""
    same = place.gauge == action.place.gauge and place.run == action.place.run
    return same and kind in _SEEN[action.kind]


def _moments(model: Model, explanation: Explanation, action: Action) -> tuple[float, float]:
    """Mean and standard deviation of what an action measures under an explanation, in SI."""
    gauge = model.layout.gauge_index[action.place.gauge]
    noun = model.layout.job.gauges[gauge]
    frame = explanation.frame
    rows, pieces = frame.linear.gauge_rows(gauge)
    if action.kind is ActionKind.SURVEY:
        mean, variance = 0.0, SURVEY_SD_M**2 + noun.elevation_sd_m**2
        for index in explanation.chosen:
            mark = frame.marks[index]
            if mark.kind is CauseKind.WRONG_ELEVATION and gauge in mark.own:
                size = frame.size(explanation.chosen, index)
                mean += mark.reported(size.mean)
                variance += (mark.size_factor * size.sd) ** 2
        return mean, float(np.sqrt(variance))
    tolerance = noun.tolerance_at((noun.range_low_pa + noun.range_high_pa) / 2.0)
    own = noun.accuracy.at(noun.range_low_pa, noun.range_low_pa, noun.range_high_pa) / np.sqrt(3.0)
    mean, variance = 0.0, own**2 + (TEST_GAUGE_SHARE * tolerance) ** 2 + noun.division_pa**2 / 12.0
    for index in explanation.chosen:
        mark = frame.marks[index]
        if gauge not in mark.own or not rows.size:
            continue
        if mark.spoils:
            mean, variance = _stuck(model, gauge, pieces, action), (0.5 * tolerance) ** 2
        elif _shows(mark.kind, action):
            size = frame.size(explanation.chosen, index)
            mean += float(mark.vector[rows[-1]]) * size.mean
            variance += (float(mark.vector[rows[-1]]) * size.sd) ** 2
    return mean, float(np.sqrt(variance))


def _stuck(model: Model, gauge: int, pieces: NDArray[np.int64], action: Action) -> float:
    """What a stuck gauge still says: its last reading against a pressure of nothing; beside a test gauge, off by some of its span."""
    noun = model.layout.job.gauges[gauge]
    if action.kind is ActionKind.ZERO_CHECK:
        return float(model.spells[int(pieces[-1])].reading_pa[gauge])
    return 0.1 * noun.span_pa


def _shows(kind: CauseKind, action: Action) -> bool:
    """Whether what is measured shows a cause: a vented instrument shows what is off at nothing, a test gauge all that is its own."""
    if action.kind is ActionKind.ZERO_CHECK:
        return kind in (CauseKind.ZERO_SHIFT, CauseKind.DRIFT, CauseKind.STEP, CauseKind.WRONG_REFERENCE)
    return kind in _AT_THE_INSTRUMENT
