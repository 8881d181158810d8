"""Every sentence about a finding, once: screen, text, result file and sheet say it in these words."""

from __future__ import annotations

import math
from collections.abc import Iterable, Sequence
from dataclasses import replace
from datetime import datetime
from typing import TYPE_CHECKING
from zoneinfo import ZoneInfo

from headledger.diagnosis.descents import sweep_of
from headledger.diagnosis.result import (
    BudgetShare,
    CauseKind,
    FurtherReading,
    GaugeSight,
    Place,
    TroubleSight,
    Verdict,
)
from headledger.plant.job import Job, SpellKind
from headledger.quantities import format_quantity as amount

if TYPE_CHECKING:  # the screen words things before anything heavy is loaded
    from headledger.diagnosis.budget import InputKind
    from headledger.diagnosis.estimate import Model
    from headledger.diagnosis.findings import Finding
    from headledger.diagnosis.layout import Layout
    from headledger.diagnosis.verdicts import Judged
    from headledger.plant.gauges import Gauge

SECONDS_PER_HOUR = 3600.0

COMPARABLE = 0.25
"""A rival with at least this part of a cause's own probability is named in its sentence. [-]"""

VERDICT_WORDS = {
    Verdict.PASS: "its own error is inside the tolerance",
    Verdict.FAIL: "its own error is outside the tolerance",
    Verdict.UNRESOLVED: "the data cannot tell whether its own error is inside the tolerance",
    Verdict.UNCHECKED: "nothing else in the data determines the pressure at this gauge",
}

KIND_WORDS = {
    CauseKind.ZERO_SHIFT: "a zero shift",
    CauseKind.SPAN_ERROR: "a span error",
    CauseKind.DRIFT: "a drift",
    CauseKind.STEP: "a step",
    CauseKind.FROZEN: "a stuck reading",
    CauseKind.SLUGGISH: "a slow response",
    CauseKind.NOISY: "a noisy signal",
    CauseKind.AT_LIMIT: "a reading at the end of its range",
    CauseKind.WRONG_UNIT: "a wrong unit",
    CauseKind.WRONG_REFERENCE: "a wrong pressure reference",
    CauseKind.WRONG_ELEVATION: "a wrong elevation",
    CauseKind.LEG_GAS: "gas in the leg",
    CauseKind.SWAPPED: "swapped tags",
    CauseKind.CLOCK_OFFSET: "a clock offset",
    CauseKind.CROSSED_LINES: "crossed lines",
    CauseKind.EQUALISED: "an open equalising valve",
    CauseKind.ROOT: "a square root too many or too few",
    CauseKind.BLOCKAGE: "a blockage",
    CauseKind.LOW_LOSS: "less loss than described",
    CauseKind.AIR_POCKET: "a trapped air pocket",
    CauseKind.CLOSED_OFF: "a closed valve",
    CauseKind.VAPOUR: "vapour",
    CauseKind.FLOW_METER_ERROR: "a flow meter error",
    CauseKind.PUMP_LIFT: "a pump lift off its curve",
    CauseKind.DENSITY_ERROR: "a wrong density",
    CauseKind.LEAK: "a leak",
}


def percent(probability: float) -> str:
    """A probability as it is spoken of, never as certain."""
    if probability > 0.99:
        return "over 99 %"
    return "under 1 %" if probability < 0.01 else f"{100.0 * probability:.0f} %"


def place_words(place: Place) -> str:
    """A place in words."""
    if place.gauges:
        return " and ".join(place.gauges)
    if place.run and place.distance_m is not None:
        return f"{place.run}, {place.distance_m:.0f} m along"
    return place.gauge or place.run or place.station or "the whole job"


def clock(model: Model, time_s: float) -> str:
    """Time of day in the job's own zone."""
    return _time_of_day(ZoneInfo(model.layout.job.timezone), time_s)


def _start(model: Model, finding: Finding) -> str:
    """When a finding begins, and how well that is known."""
    minutes = 2.0 * finding.start_sd_s / 60.0
    return f"{clock(model, finding.mark.start_s or 0.0)} (± {max(minutes, 1.0):.0f} min)"


def kind_words(kind: CauseKind) -> str:
    """A kind of cause in words, with its article."""
    return KIND_WORDS[kind]


def cause_sentence(model: Model, finding: Finding) -> str:
    """A finding in words: what, where, how much, and what else it may be."""
    return (finding.statement or _statement(model, finding)) + _rival_clause(finding)


def action_sentence(kind: str, place: Place, separates: Sequence[tuple[str, str]]) -> str:
    """An action on site in words, and what it would tell apart."""
    words = {
        "zero-check": "Isolate and vent {at}, and read its zero",
        "test-gauge": "Put a test gauge beside {at} and compare",
        "survey": "Survey the elevation of {at} anew",
        "vent": "Vent {at} and see whether gas comes",
        "open-strainer": "Open {at} and look",
        "stroke-valve": "See whether a valve in {at} is part closed, or something is lodged in it",
        "check-meter": "Compare the flow meter of {at} with a second measurement",
        "check-pump": "Look at the pump at {at}: rotation, speed, suction",
    }[kind]
    return f"{words.format(at=place_words(place))}{_tells(separates)}."


def spell_sentence(flow_factor: float, separates: Sequence[tuple[str, str]]) -> str:
    """A further spell in words, and what it would tell apart."""
    what = f"at {flow_factor:g} times the greatest flow so far" if flow_factor else "at rest"
    return f"Log a spell {what}{_tells(separates)}."


def _tells(separates: Sequence[tuple[str, str]]) -> str:
    """What is told apart, after a colon."""
    pairs = [f"{_plain_kind(first)} from {_plain_kind(second)}" for first, second in separates]
    return f": it tells {', and '.join(pairs)}" if pairs else ""


def _plain_kind(name: str) -> str:
    """A kind of cause in words; nothing wrong is a kind here."""
    return "nothing wrong" if name == "none" else kind_words(CauseKind(name))


SCATTER = "readings' scatter"
NOTHING_MEASURES = "heads and flows that nothing measures"
THE_REST = "the rest"
_IN_A_RUN = frozenset({CauseKind.BLOCKAGE, CauseKind.LOW_LOSS, CauseKind.AIR_POCKET, CauseKind.LEAK})


def class_words(tags: Sequence[str], *, own: bool) -> str:
    """The stated class of a gauge, or of one instrument that serves several tags, as a source of doubt."""
    return f"class of {' and '.join(tags)}" + (" itself" if own else "")


def source_words(kind: InputKind, owner: str) -> str:
    """An uncertain input of the job as a source of doubt; calibrations have `class_words`."""
    name = owner.removeprefix("station ").removeprefix("gauge ")
    words = {"liquid temperature": "temperature", "leg temperature": "temperature of the legs"}.get(
        kind.value, kind.value
    )
    return f"{words} of {name}" if name else words


def size_words(kind: CauseKind, place: Place) -> str:
    """The size of a cause as a source of doubt."""
    if kind is CauseKind.LOW_LOSS:
        return f"size of the loss missing in {place_words(place)}"
    words = kind_words(kind).removeprefix("a ").removeprefix("an ")
    if place == Place():
        return f"size of the {words}"
    return f"size of the {words} {'in' if kind in _IN_A_RUN else 'at'} {place_words(place)}"


def budget_sentence(tag: str, budget: Sequence[BudgetShare]) -> str:
    """Where a gauge's uncertainty comes from, in one sentence; empty where nothing is known of it."""
    if not budget:
        return ""
    parts = ", ".join(f"{share.what} {percent(share.percent / 100.0)}" for share in budget)
    return f"{tag}: its uncertainty comes, by share of the variance, from {parts}."


MOST_ODDS = 1000.0
"""Odds are not told beyond this: the model itself is not known better. [-]"""

EVEN_ODDS = 1.5
"""Odds nearer to even than this are none. [-]"""


def odds_words(nats: float) -> str:
    """Odds of a logarithm, the larger side first."""
    odds = math.exp(min(abs(nats), 2.0 * math.log(MOST_ODDS)))
    if odds > MOST_ODDS:
        return f"more than {MOST_ODDS:.0f} to 1"
    return f"{odds:.0f} to 1" if odds >= 9.95 else f"{odds:.2g} to 1"


def against_sentence(kind: CauseKind | None, place: Place, evidence_nats: float, prior_nats: float, beside: str) -> str:
    """What readings say, and what was to be expected beforehand, between a finding and something in its stead.

    Parameters
    ----------
    kind : CauseKind or None
        None for nothing in its stead.
    place : Place
    evidence_nats, prior_nats : float
        Of the finding less that of the other. [nat]
    beside : str
        What else is then present, where nothing stands in its stead; empty where nothing is.
    """
    other = f"{kind_words(kind)} at {place_words(place)}" if kind else beside + " alone" if beside else "nothing wrong"
    other = other.replace(" at the whole job", "")
    even = math.log(EVEN_ODDS)
    if abs(evidence_nats) < even:
        if abs(prior_nats) < even:
            return f"The readings do not tell it from {other}, and beforehand neither was likelier."
        side = "for" if prior_nats > 0.0 else "against"
        decides = f"only what was likelier beforehand decides, {odds_words(prior_nats)} {side} it"
        return f"The readings do not tell it from {other}: {decides}."
    usual = f"the {'likelier' if prior_nats > 0.0 else 'less likely'}, {odds_words(prior_nats)}"
    beforehand = "" if abs(prior_nats) < even else f"; beforehand it was {usual}"
    odds = odds_words(evidence_nats)
    favoured = f"it {odds} over {other}" if evidence_nats > 0.0 else f"{other} over it, {odds}"
    return f"The readings favour {favoured}{beforehand}."


def misfit_sentence(before: float, after: float, count: int, beside: str) -> str:
    """How much better the readings fit with a finding, and with what else its explanation holds."""
    given = f" with it and {beside}" if beside else ""
    return f"Misfit {before:.0f} → {after:.0f} over {count} readings{given} (sum of squares, in standard deviations)."


def beside_words(causes: Iterable[tuple[CauseKind, Place]]) -> str:
    """Causes that stand beside one in an explanation, always in one order; empty where there is none."""
    words = sorted(f"{kind_words(kind)} at {place_words(place)}" for kind, place in causes)
    return " and ".join(words).replace(" at the whole job", "")


def trait_statement(model: Model, kind: CauseKind, place: Place, size: float) -> str:
    """What the log says between and within its spells, in words."""
    at = place_words(place)
    if kind is CauseKind.NOISY:
        return (
            f"{at} scatters far more than the gauges around it: look at its wiring, its damping and its impulse line."
        )
    if kind is CauseKind.SLUGGISH:
        return (
            f"{at} follows every change late, with a time constant of about {size:.0f} s: a plugged line, or heavy damping; "
            "what that left in its readings was taken off before the rest was judged."
        )
    if kind is CauseKind.CLOCK_OFFSET:
        way = "late" if size > 0.0 else "early"
        verb = "is" if place.gauge else "are"
        return f"The log of {at} {verb} stamped {abs(size):.0f} s {way} against the others; it was set right before the rest was judged."
    rate = amount(abs(size) * SECONDS_PER_HOUR, model.layout.job.display.pressure)
    return f"At rest the pressure falls everywhere alike, by {rate} an hour: liquid leaves the section, or it cools."


def vapour_statement(model: Model, place: Place, spell: int, *, pressure_pa: float, vapour_pressure_pa: float) -> str:
    """A place whose computed pressure lies below vapour pressure, in words."""
    unit = model.layout.job.display.pressure
    at = place_words(place)
    found, limit = (f"{pa / unit.factor:.3g} {unit.text}" for pa in (pressure_pa, vapour_pressure_pa))
    return (
        f"{at}: in spell {model.spells[spell].id} the absolute pressure comes out at {found}, below the liquid's vapour pressure of "
        f"{limit}: the column cannot stand there; vapour or drawn-in air is to be expected."
    )


def _rival_clause(finding: Finding) -> str:
    """The rivals of comparable weight, in words."""
    near = [r for r in finding.rivals if r.probability >= COMPARABLE * finding.probability][:3]
    if not near:
        return ""
    named = [f"{kind_words(r.kind)} at {place_words(r.place)} ({percent(r.probability)})" for r in near]
    named = [text.replace(" at the whole job", "") for text in named]
    return f" Or it is {' or '.join(named)}: these readings cannot tell which."


def _statement(model: Model, finding: Finding) -> str:
    """The finding itself."""
    at = place_words(finding.place)
    size = finding.mark.reported(finding.size)
    unit = finding.mark.unit
    direction = "high" if size > 0.0 else "low"
    if finding.kind is CauseKind.ZERO_SHIFT and unit:
        return f"{at} reads {amount(abs(size), unit)} {direction} at every flow."
    if finding.kind is CauseKind.SPAN_ERROR:
        if finding.mark.form:
            return f"{at} reads {size:.3g} times what it should, as if scaled to another range than its own."
        return f"{at} reads {size:.4g} times what it should: its error grows with its reading."
    if finding.kind is CauseKind.WRONG_UNIT:
        noun = model.layout.job.gauge(finding.place.gauge)
        return f"{at} looks logged in {finding.mark.form} where {noun.unit.text} is stated: {size:.4g} times the true value."
    if finding.kind is CauseKind.WRONG_REFERENCE and unit:
        words = "by about the barometer" if finding.mark.form == "barometer" else "by what a sealed case holds back"
        return f"{at} reads {amount(abs(size), unit)} {direction}, {words}: gauge and absolute pressure are mixed up."
    if finding.kind is CauseKind.WRONG_ELEVATION and unit:
        side = "too high" if size > 0.0 else "too low"
        return f"{at}: its elevation is stated {amount(abs(size), unit)} {side}; it reads a column of liquid {direction} at every flow."
    if finding.kind is CauseKind.LEG_GAS and unit:
        return f"{at} reads {amount(abs(size), unit)} {direction} at every flow: gas stands in its leg."
    if finding.kind is CauseKind.DRIFT and unit and finding.mark.start_s is not None:
        way = "up" if size > 0.0 else "down"
        rate = amount(abs(size) * SECONDS_PER_HOUR, unit)
        return f"{at} drifts {way} by {rate} an hour from about {_start(model, finding)} on."
    if finding.kind is CauseKind.STEP and unit and finding.mark.start_s is not None:
        return f"{at} jumps to {amount(abs(size), unit)} {direction} at about {_start(model, finding)} and stays there."
    if finding.kind is CauseKind.FROZEN:
        since = "" if finding.mark.start_s is None else f" from about {_start(model, finding)} on"
        return f"{at} does not follow what happens around it{since}: stuck, or its own valve is shut."
    if finding.kind is CauseKind.PUMP_LIFT:
        return f"The pump at {at} lifts {size:.3g} times what its curve says: look at speed, rotation, impeller and suction."
    if finding.kind in SIZELESS:
        return SIZELESS[finding.kind].format(at=at)
    return _pipe_statement(model, finding, at, size)


SIZELESS: dict[CauseKind, str] = {
    CauseKind.AT_LIMIT: "{at} stands at the end of its range: what it should read lies beyond, and it says no more than that.",
    CauseKind.CROSSED_LINES: "{at} reads with the wrong sign: its high and low lines look crossed.",
    CauseKind.EQUALISED: "{at} reads next to nothing at every flow: its equalising valve looks open.",
    CauseKind.ROOT: "{at} reads as if a square root were taken once too often, or once too little.",
    CauseKind.VAPOUR: (
        "{at}: the column is parted by vapour there: the pressure would have to fall to the liquid's vapour pressure or below."
    ),
    CauseKind.CLOSED_OFF: "{at} looks shut: what lies behind it keeps its own head and does not follow the rest.",
    CauseKind.SWAPPED: "{at} look exchanged: each logs what the other should read.",
}
"""What is said of causes whose size says nothing more, at a place."""


def _pipe_statement(model: Model, finding: Finding, at: str, size: float) -> str:
    """A finding in the pipe, the meter or the liquid."""
    if finding.kind in (CauseKind.BLOCKAGE, CauseKind.LOW_LOSS):
        return _loss_statement(model, finding, at, size)
    if finding.kind is CauseKind.AIR_POCKET and finding.mark.unit:
        still = ", at rest too" if "still" in finding.mark.form else ""
        height = amount(size, finding.mark.unit)
        swept = _sweep_clause(model, finding)
        return f"{at} drops the grade line by {height} at every flow{still}: air is trapped on its descent.{swept}"
    if finding.kind is CauseKind.DENSITY_ERROR:
        heavier = "heavier" if size > 1.0 else "lighter"
        return f"The liquid is {100.0 * abs(size - 1.0):.2g} % {heavier} than stated (temperature or concentration)."
    if finding.kind is CauseKind.FLOW_METER_ERROR:
        return f"The flow meter of {at} reads {size:.3g} times the true flow: all losses are off with its square."
    return f"{at}: {kind_words(finding.kind)}."


def _sweep_clause(model: Model, finding: Finding) -> str:
    """Whether the greatest flow would sweep a pocket out, beside the range of what authors say of its slope."""
    sweep = sweep_of(model.layout, finding)
    if sweep is None:
        return ""
    length = model.layout.job.display.length
    unit = replace(length, text=f"{length.text}/s")
    at, lowest, highest = (amount(v, unit, digits=2) for v in (sweep.velocity_m_s, sweep.lowest_m_s, sweep.highest_m_s))
    what = "may move"
    if sweep.velocity_m_s < sweep.lowest_m_s:
        what = "stays"
    elif sweep.velocity_m_s > sweep.highest_m_s:
        what = "should be swept out"
    between = lowest.removesuffix(f" {unit.text}")
    return f" At {at} it {what}: authors put clearing between {between} and {highest} on that slope."


def _loss_statement(model: Model, finding: Finding, at: str, size: float) -> str:
    """A run's loss found and expected, at its greatest flow."""
    run = model.layout.run_index[finding.place.run]
    states = finding.frame.linear.states
    state = max(states, key=lambda s: abs(float(s.flow_m3_s[run])))
    velocity = float(state.flow_m3_s[run]) / model.layout.area_m2[run]
    unit_pa = state.head_weight_pa_m * velocity**2 / (2.0 * model.layout.gravity_m_s2)
    expected_pa = abs(float(state.drop_m[run] - state.added_m[run])) * state.head_weight_pa_m
    found_pa = expected_pa + size * unit_pa
    units = model.layout.job.display
    item = model.layout.job.runs[run].item
    named = f"{at} ({item})" if item else at
    more = "more" if size > 0.0 else "less"
    return (
        f"{named} loses {amount(abs(size) * unit_pa, units.pressure)} {more} than described at "
        f"{amount(abs(float(state.flow_m3_s[run])), units.flow)}: {amount(found_pa, units.pressure)} found, "
        f"{amount(expected_pa, units.pressure)} expected."
    )


def verdict_sentence(gauge: Gauge, judged: Judged, causes: Sequence[Finding], given: Sequence[Finding]) -> str:
    """Why a gauge has its verdict, and what that leans on."""
    if not math.isfinite(judged.outside_probability):
        return f"{gauge.tag} gave no reading in any spell."
    unit = gauge.unit.as_difference()
    words = VERDICT_WORDS[judged.verdict]
    error, doubt = (amount(pa, unit, resolution=judged.u95_pa) for pa in (judged.error_pa, judged.u95_pa))
    numbers = (
        f"error {error} ± {doubt} (k = 2), tolerance ± {amount(judged.tolerance_pa, unit)}, "
        f"{percent(judged.outside_probability)} likely outside"
    )
    if judged.verdict is Verdict.UNCHECKED:
        return f"{gauge.tag}: {words}{judged.unchecked_because}."
    likely = [f for f in causes if f.accepted] or list(causes[:1] if causes and causes[0].probability >= 0.2 else [])
    because = f"; most likely {kind_words(likely[0].kind)}" if likely and judged.verdict is not Verdict.PASS else ""
    leans = ""
    if given:
        leans = ", given " + " and ".join(f"{kind_words(f.kind)} at {place_words(f.place)}" for f in given)
        leans = leans.replace(" at the whole job", "")
    return f"{gauge.tag}: {words}{leans}{because}: {numbers}."


def history_statement(layout: Layout, leaves_at_s: float | None, by: str | None, spike_s: float | None) -> str:
    """What control charts of a gauge show, in words."""
    name = "Control charts of its difference from its neighbours"
    zone = ZoneInfo(layout.job.timezone)
    alone = "" if spike_s is None else f" (but for a stretch that stands alone at {_time_of_day(zone, spike_s)})"
    if leaves_at_s is None or by is None:
        return f"{name}: in limits over the whole log{alone}."
    return f"{name}: they leave their limits at {_time_of_day(zone, leaves_at_s)} ({by.upper()}){alone}."


def _time_of_day(zone: ZoneInfo, time_s: float) -> str:
    """Time of day in a zone, to the minute."""
    return f"{datetime.fromtimestamp(time_s, zone):%H:%M}"


def unexplained_sentence(misfit: float, rows: int) -> str:
    """That even the likeliest explanation leaves more than chance would."""
    return (
        f"Even the likeliest explanation leaves the readings {math.sqrt(misfit / rows):.1f} times further off than their doubts allow: "
        "something is there that is not among the causes weighed, or a doubt is stated too small."
    )


def state_words(job: Job, kind: SpellKind, flows: Sequence[tuple[str, float]]) -> str:
    """A flow state in words; flows in m³/s, by run."""
    if kind is SpellKind.STILL:
        return "still"
    named = ", ".join(f"{run} {amount(flow_m3_s, job.display.flow)}" for run, flow_m3_s in flows)
    return named or "flowing, no flow known"


def sight_size(job: Job, trouble: TroubleSight, size: float | None) -> str:
    """A size of a trouble as it is spoken of: a pressure or length, a loss as the pressure it takes, a ratio as a percentage off."""
    if size is None:
        return "never"
    if trouble.pa_per_size is not None:
        return amount(size * trouble.pa_per_size, job.display.pressure, digits=2)
    if trouble.unit is not None:
        return amount(size, trouble.unit.as_difference(), digits=2)
    return f"{100.0 * size:.2g} %"


def trouble_sight_sentence(job: Job, trouble: TroubleSight) -> str:
    """The smallest trouble of a kind at a place that would be seen, placed and named, and what it looks like."""
    at = place_words(trouble.place)
    what = (
        f"{_capital(kind_words(trouble.kind))}, {at}" if at != "the whole job" else _capital(kind_words(trouble.kind))
    )
    flow = f" at {amount(trouble.flow_m3_s, job.display.flow)}" if trouble.flow_m3_s else ""
    if trouble.seen is None:
        return f"{what}: not seen at any size that is physical."
    parts = [f"seen from {sight_size(job, trouble, trouble.seen)}{flow}"]
    same = [a for a in trouble.alike if not a.elsewhere and trouble.named is None]
    apart = [a for a in trouble.alike if a.elsewhere]
    if trouble.placed is None:
        parts.append("at no size told from trouble elsewhere")
    elif trouble.placed > 1.05 * trouble.seen:
        parts.append(f"told from trouble elsewhere from {sight_size(job, trouble, trouble.placed)}")
    if apart:
        parts.append(
            f"looks like {kind_words(apart[0].kind)} at {place_words(apart[0].place)}".replace(" at the whole job", "")
        )
    if same:
        parts.append(f"readings alone do not tell it from {kind_words(same[0].kind)}")
    return f"{what}: {'; '.join(parts)}."


def gauge_sight_sentence(sight: GaugeSight, because: str) -> str:
    """Whether a faultless gauge could pass, and what keeps it from it."""
    if sight.verdict is Verdict.UNCHECKED:
        return f"{sight.tag}: {VERDICT_WORDS[Verdict.UNCHECKED]}{because}."
    unit = sight.unit.as_difference()
    doubt, limit = amount(sight.u95_pa, unit, digits=2), amount(sight.tolerance_pa, unit, digits=2)
    if sight.verdict is Verdict.PASS:
        return f"{sight.tag} can pass: ± {doubt} (k = 2) against a tolerance of ± {limit}."
    return f"{sight.tag} cannot pass, however good it is: ± {doubt} (k = 2) is too much for its tolerance of ± {limit}."


def further_sentence(job: Job, more: FurtherReading) -> str:
    """What one reading more would bring."""
    if more.station:
        what = f"A gauge at {more.station}, as good as the job's best,"
    elif more.kind is SpellKind.STILL:
        what = "A still spell"
    else:
        what = f"A spell at {more.flow_factor:g} times the greatest flow"
    sharper = f" places troubles {more.sharper_ratio:.2g} times smaller" if more.sharper_ratio >= 1.05 else ""
    passing = f" lets {', '.join(more.could_pass)} pass" if more.could_pass else ""
    return f"{what}{sharper}{' and' if sharper and passing else ''}{passing}."


def twins_sentence(tags: Sequence[str], kinds: Sequence[CauseKind], *, every: bool) -> str:
    """Which causes at the same gauge readings alone do not tell apart, and what does."""
    names = [kind_words(kind) for kind in kinds]
    where = "every gauge" if every else ", ".join(tags)
    does = "a zero check, a survey or a look for gas" if CauseKind.LEG_GAS in kinds else "a zero check or a survey"
    listed = f"{', '.join(names[:-1])} and {names[-1]}"
    return f"At {where} readings alone do not tell {listed} apart; {does} does."


def _capital(text: str) -> str:
    """The text with a capital letter first."""
    return text[:1].upper() + text[1:]
