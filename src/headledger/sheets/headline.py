"""The five questions that a reader brings, answered from a result: what text report and screen put first."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import dataclass

from headledger.diagnosis.result import CauseFound, CauseKind, CheckResult, NextCheck, Place, Rival, Verdict
from headledger.diagnosis.wording import COMPARABLE, kind_words
from headledger.sheets.numbers import percent
from headledger.sheets.outcome import CLEAN_FLOOR, Outcome, outcome_of

# A cause with its rivals leads where together they are more likely than not.
_TOLD_FROM, _MOST_TOLD = 0.05, 8
_LEADING_WEIGHT = 0.5
_MOST_CHECKS_TOLD = 2
# One side is named alone where it holds this share of a cause and its rivals.
_ONE_SIDE = 0.9

_SIDES: dict[str, frozenset[CauseKind]] = {
    "the pipe": frozenset(
        {
            CauseKind.BLOCKAGE,
            CauseKind.LOW_LOSS,
            CauseKind.AIR_POCKET,
            CauseKind.CLOSED_OFF,
            CauseKind.VAPOUR,
            CauseKind.LEAK,
        }
    ),
    "the flow meter": frozenset({CauseKind.FLOW_METER_ERROR}),
    "the pump": frozenset({CauseKind.PUMP_LIFT}),
    "the liquid": frozenset({CauseKind.DENSITY_ERROR}),
    "a clock": frozenset({CauseKind.CLOCK_OFFSET}),
}


@dataclass(frozen=True, slots=True, kw_only=True)
class Answer:
    """One question and its answer, a line or several."""

    question: str
    lines: tuple[str, ...]


def headline(result: CheckResult) -> tuple[Answer, ...]:
    """What is wrong, where, gauge or pipe, how sure, what next; questions that do not arise are left out."""
    leaders = leading_causes(result.causes)
    trouble = outcome_of(result) is Outcome.TROUBLE
    answers = [Answer(question="Anything wrong?", lines=(_anything_wrong(result),))]
    if trouble:
        answers.append(Answer(question="Where?", lines=_where(result, leaders)))
    if trouble and leaders:
        answers.append(Answer(question="Gauge or pipe?", lines=_gauge_or_pipe(leaders)))
    sure = (_how_sure(result, leaders), *((result.unexplained,) if result.unexplained else ()))
    answers.append(Answer(question="How sure?", lines=sure))
    answers.append(Answer(question="What next?", lines=_what_next(result, leaders)))
    return tuple(answers)


def leading_causes(causes: Sequence[CauseFound]) -> tuple[CauseFound, ...]:
    """The causes that answer the question: each likely with its rivals, and none the rival of one before it."""
    leaders: list[CauseFound] = []
    spoken_for: set[tuple[CauseKind, Place]] = set()
    for cause in causes:
        weight = cause.probability + sum(rival.probability for rival in cause.rivals)
        if (cause.kind, cause.place) in spoken_for or not (cause.accepted or weight >= _LEADING_WEIGHT):
            continue
        told = {(leader.kind, leader.place) for leader in leaders}
        if not cause.accepted and any((rival.kind, rival.place) in told for rival in cause.rivals):
            continue
        leaders.append(cause)
        spoken_for.update((rival.kind, rival.place) for rival in cause.rivals)
    return tuple(leaders)


def place_label(place: Place) -> str:
    """A place in words: a gauge, two gauges, a run, a station, or the whole job."""
    if place.gauges:
        return _listed(place.gauges)
    if place.run:
        along = "" if place.distance_m is None else f", {place.distance_m:.0f} m along"
        return f"run {place.run}{along}"
    if place.station:
        return f"station {place.station}"
    return place.gauge or "the whole job"


def cause_label(cause: CauseFound | Rival) -> str:
    """Kind and place of a cause, for example ``zero-shift at PT-3``."""
    return f"{cause.kind.value} at {place_label(cause.place)}"


def told_causes(causes: Iterable[CauseFound]) -> tuple[tuple[CauseFound, ...], str]:
    """The causes worth telling, and a line that counts the rest; what is improbable would bury what matters."""
    causes = tuple(causes)
    told = tuple(cause for cause in causes if cause.probability >= _TOLD_FROM)[:_MOST_TOLD]
    left = [cause.probability for cause in causes if cause not in told]
    if not left:
        return told, ""
    return told, f"{len(left)} more, none above {percent(max(left))}; the result file (--json) lists them."


def check_worth(check: NextCheck) -> str:
    """What a check on site settles, how long it takes, and its caution."""
    return f"{check.gain_bits:.2f} bit, about {check.minutes:.0f} min. {check.caution}"


def _anything_wrong(result: CheckResult) -> str:
    outcome = outcome_of(result)
    counts = _counts(result)
    if outcome is Outcome.SOUND:
        return f"No. {counts}"
    if outcome is Outcome.NOTHING_CHECKED:
        return f"Nothing could be checked. {counts}"
    verdicts = {gauge.verdict for gauge in result.gauges}
    if not verdicts & {Verdict.FAIL, Verdict.UNRESOLVED}:
        return f"Yes, although {counts[0].lower()}{counts[1:]}"
    certain = (
        Verdict.FAIL in verdicts
        or result.clean_probability < CLEAN_FLOOR
        or any(cause.accepted for cause in result.causes)
    )
    return f"{'Yes' if certain else 'Perhaps'}. {counts}"


def _counts(result: CheckResult) -> str:
    words = {
        Verdict.FAIL: ("fails", "fail"),
        Verdict.UNRESOLVED: ("is unresolved", "are unresolved"),
        Verdict.UNCHECKED: ("is unchecked", "are unchecked"),
        Verdict.PASS: ("passes", "pass"),
    }
    parts = []
    for verdict, (one, many) in words.items():
        number = sum(gauge.verdict is verdict for gauge in result.gauges)
        if number:
            parts.append(f"{number} {one if number == 1 else many}")
    total = len(result.gauges)
    if total > 1 and len(parts) == 1:
        return f"All {parts[0].replace(' ', ' gauges ', 1)}."
    return f"Of {total} {'gauge' if total == 1 else 'gauges'} {_listed(parts)}."


def _where(result: CheckResult, leaders: Sequence[CauseFound]) -> tuple[str, ...]:
    if leaders:
        return tuple(cause.says or cause_label(cause) for cause in leaders)
    tags = [gauge.tag for gauge in result.gauges if gauge.verdict in (Verdict.FAIL, Verdict.UNRESOLVED)]
    return (f"{_listed(tags)}; no cause stands out." if tags else "Not to be said; no cause stands out.",)


def _gauge_or_pipe(leaders: Sequence[CauseFound]) -> tuple[str, ...]:
    lines = []
    for cause in leaders:
        sides = _sides(cause)
        lines.append(f"{_opening(cause.place)}: {sides}" if len(leaders) > 1 else _capital(sides))
    return tuple(lines)


def _sides(cause: CauseFound) -> str:
    weights: dict[str, float] = {_side(cause.kind): cause.probability}
    for rival in cause.rivals:
        side = _side(rival.kind)
        weights[side] = weights.get(side, 0.0) + rival.probability
    total = sum(weights.values())
    ranked = sorted(weights, key=lambda side: -weights[side])
    if total <= 0.0 or weights[ranked[0]] >= _ONE_SIDE * total:
        return f"{ranked[0]}."
    # Rivals overlap a little, so that the weights of one side can add up to more than one.
    return "not told apart: " + ", ".join(f"{side} {percent(min(1.0, weights[side]))}" for side in ranked) + "."


def _side(kind: CauseKind) -> str:
    return next((side for side, kinds in _SIDES.items() if kind in kinds), "the gauge")


def _how_sure(result: CheckResult, leaders: Sequence[CauseFound]) -> str:
    clean = f"that nothing is wrong {percent(result.clean_probability)}"
    found = [_with_rival(cause) for cause in leaders]
    return _capital("; ".join([*found, clean])) + "."


def _with_rival(cause: CauseFound) -> str:
    """A cause with its probability, and what it may be instead where that is nearly as probable."""
    text = f"{cause_label(cause)} {percent(cause.probability)}"
    near = [rival for rival in cause.rivals if rival.probability >= COMPARABLE * cause.probability][:1]
    for rival in near:
        label = rival.kind.value if rival.place == cause.place else cause_label(rival)
        text += f", or {label} {percent(rival.probability)}"
    return text


def _what_next(result: CheckResult, leaders: Sequence[CauseFound]) -> tuple[str, ...]:
    lines = [_next_of(cause) for cause in leaders if cause.accepted]
    lines += [f"{check.says} (about {check.minutes:.0f} min)" for check in result.next_checks[:_MOST_CHECKS_TOLD]]
    if not result.next_checks:
        lines += [_next_of(cause) for cause in leaders if not cause.accepted]
    if not leaders and outcome_of(result) is Outcome.TROUBLE:
        lines.append("Readings at another flow, or with the liquid at rest, to narrow it down.")
    unchecked = [gauge.tag for gauge in result.gauges if gauge.verdict is Verdict.UNCHECKED]
    if unchecked:
        lines.append(f"To check {_listed(unchecked)}: readings that determine the pressure there.")
    return tuple(lines) or ("Nothing; the gauges can be believed.",)


def _next_of(cause: CauseFound) -> str:
    if cause.accepted or not cause.rivals:
        return f"At {place_label(cause.place)}: see to {kind_words(cause.kind)}, then log and check again."
    near = [rival for rival in cause.rivals if rival.probability >= COMPARABLE * cause.probability] or cause.rivals[:1]
    kinds = [kind_words(cause.kind), *(kind_words(rival.kind) for rival in near)]
    names = list(dict.fromkeys(kinds))
    if len(names) == 1:
        places = [place_label(place) for place in (cause.place, *(rival.place for rival in near))]
        return f"Find out on site where it is, {names[0]}: {_listed(places, last='or')}."
    return f"Find out on site whether it is {_listed(names, last='or')}."


def _listed(names: Iterable[str], *, last: str = "and") -> str:
    *front, tail = names
    return f"{', '.join(front)} {last} {tail}" if front else tail


def _opening(place: Place) -> str:
    """A place as a sentence opens with it; a tag keeps its own spelling."""
    return place_label(place) if place.gauge or place.gauges else _capital(place_label(place))


def _capital(sentence: str) -> str:
    return sentence[0].upper() + sentence[1:]
