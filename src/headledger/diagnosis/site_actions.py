"""Actions on site: how long each usually takes, how safe it is, and the caution that goes with it; and their results as text."""

from __future__ import annotations

import re
from dataclasses import dataclass
from enum import StrEnum

from headledger.diagnosis.result import Place
from headledger.errors import JobError, Problem, QuantityError
from headledger.plant.job import Job
from headledger.quantities import Dimension, PressureKind, nearest, parse_quantity


class ActionKind(StrEnum):
    """What can be done."""

    ZERO_CHECK = "zero-check"
    TEST_GAUGE = "test-gauge"
    SURVEY = "survey"
    VENT = "vent"
    OPEN_STRAINER = "open-strainer"
    STROKE_VALVE = "stroke-valve"
    CHECK_METER = "check-meter"
    CHECK_PUMP = "check-pump"
    STILL_SPELL = "still-spell"
    OTHER_FLOW = "other-flow"


@dataclass(frozen=True, slots=True, kw_only=True)
class Action:
    """One action at one place."""

    kind: ActionKind
    place: Place


@dataclass(frozen=True, slots=True, kw_only=True)
class ActionFacts:
    """What is usual of an action.

    Parameters
    ----------
    minutes : float
        With walking and putting back (common practice, no source). [min]
    risk : int
        0 is the safest: nothing is opened.
    is_look : bool
        Whether its outcome is yes or no.
    caution : str
    """

    minutes: float
    risk: int
    is_look: bool
    caution: str


_ISOLATE = "Isolate, vent and lock out by the site's own rules first; a reading of zero does not prove that a line is without pressure."

LOGGED = frozenset({ActionKind.STILL_SPELL, ActionKind.OTHER_FLOW})
"""Actions whose result is more of the log, and no answer."""

_OPERATORS = "Flow is changed, or stopped, by whoever runs the system, and slowly."

ACTIONS: dict[ActionKind, ActionFacts] = {
    ActionKind.STILL_SPELL: ActionFacts(minutes=20.0, risk=0, is_look=False, caution=_OPERATORS),
    ActionKind.OTHER_FLOW: ActionFacts(minutes=20.0, risk=0, is_look=False, caution=_OPERATORS),
    ActionKind.SURVEY: ActionFacts(
        minutes=15.0, risk=0, is_look=False, caution="Nothing is opened; mind heights and what stands in the way."
    ),
    ActionKind.CHECK_METER: ActionFacts(
        minutes=30.0,
        risk=0,
        is_look=True,
        caution="Leave the meter in the line; compare by a second meter, a volume or its own record.",
    ),
    ActionKind.STROKE_VALVE: ActionFacts(
        minutes=10.0,
        risk=1,
        is_look=True,
        caution="Ask whoever runs the system before a valve is moved; move it slowly.",
    ),
    ActionKind.CHECK_PUMP: ActionFacts(
        minutes=30.0,
        risk=1,
        is_look=True,
        caution="Lock out before a guard is lifted; rotation is looked at with the guard in place.",
    ),
    ActionKind.ZERO_CHECK: ActionFacts(minutes=10.0, risk=2, is_look=False, caution=_ISOLATE),
    ActionKind.TEST_GAUGE: ActionFacts(minutes=25.0, risk=2, is_look=False, caution=_ISOLATE),
    ActionKind.VENT: ActionFacts(
        minutes=20.0,
        risk=3,
        is_look=True,
        caution="Vent slowly and to a safe place: trapped air stores energy, and liquid follows it.",
    ),
    ActionKind.OPEN_STRAINER: ActionFacts(minutes=90.0, risk=4, is_look=True, caution=_ISOLATE),
}
"""Everything that is known of each action, once."""

_ANSWER = re.compile(r"^\s*(?P<action>[\w-]+)\s+(?P<place>.+?)\s*=\s*(?P<value>.+?)\s*$")
_YES_NO = {"yes": 1.0, "no": 0.0}


def parse_answer(text: str, job: Job) -> tuple[Action, float]:
    """An action and what it found, from text such as ``zero-check PT-7 = 0.01 bar`` or ``open-strainer STR-1 = yes``.

    Parameters
    ----------
    text : str
    job : Job

    Returns
    -------
    action : Action
    outcome : float
        1 or 0 for yes or no; else in SI.

    Raises
    ------
    JobError
        It says something else; names what would be right.
    """
    match = _ANSWER.match(text)
    if match is None:
        raise JobError(
            [_problem(text, "is no answer", "ACTION PLACE = VALUE UNIT, such as zero-check PT-7 = 0.01 bar")]
        )
    names = [kind.value for kind in ActionKind]
    if match["action"] not in names:
        near = nearest(match["action"], names)
        raise JobError([_problem(text, "names no action", near or ", ".join(names))])
    kind = ActionKind(match["action"])
    if kind in LOGGED:
        raise JobError(
            [_problem(text, "is no answer but more of the log", "the log with that spell in it, checked again")]
        )
    return Action(kind=kind, place=_place(text, match["place"], kind, job)), _outcome(text, match["value"], kind)


def _place(text: str, name: str, kind: ActionKind, job: Job) -> Place:
    tags, runs = [gauge.tag for gauge in job.gauges], [run.name for run in job.runs]
    at_gauge = kind in (ActionKind.ZERO_CHECK, ActionKind.TEST_GAUGE, ActionKind.SURVEY)
    if name in tags and (at_gauge or kind is ActionKind.VENT):
        return Place(gauge=name)
    if name in runs and not at_gauge:
        return Place(run=name)
    choices = tags if at_gauge else [*runs, *tags] if kind is ActionKind.VENT else runs
    raise JobError(
        [
            _problem(
                text,
                f"names no {'gauge' if at_gauge else 'run'} of the job",
                nearest(name, choices) or ", ".join(choices),
            )
        ]
    )


def _outcome(text: str, value: str, kind: ActionKind) -> float:
    if ACTIONS[kind].is_look:
        if value.casefold() not in _YES_NO:
            raise JobError(
                [_problem(text, "must be answered with yes or no", "yes where it was found, no where it was not")]
            )
        return _YES_NO[value.casefold()]
    dimension = Dimension.LENGTH if kind is ActionKind.SURVEY else Dimension.PRESSURE
    try:
        return parse_quantity(value, dimension, default_kind=PressureKind.DIFFERENCE)
    except QuantityError as error:
        raise JobError([Problem(f"answer {text!r}", error.fault, error.found, error.expected)]) from error


def _problem(text: str, fault: str, expected: str) -> Problem:
    return Problem(place=f"answer {text!r}", fault=fault, expected=expected)
