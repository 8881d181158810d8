"""What readings could show, as words and rows: the one source of text and screen."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Iterable
from dataclasses import dataclass

from headledger.diagnosis.result import Alike, CauseKind, GaugeSight, Sight, TroubleSight, Verdict
from headledger.diagnosis.wording import sight_size, twins_sentence
from headledger.plant.job import Job
from headledger.sheets.headline import place_label
from headledger.sheets.marks import MARKS
from headledger.sheets.numbers import decimals_for, fixed

Rows = tuple[tuple[str, ...], ...]

GAUGES_HEAD = ("Gauge", "Could pass", "± U", "Tol.", "Unit", "Seen", "Placed", "Looks like")
TROUBLES_HEAD = ("Trouble", "Where", "Seen", "Placed", "Looks like")
READ_AS = (
    "Seen: the smallest that would raise an alarm. Placed: the smallest that could be told from trouble elsewhere. "
    "A gauge's are of a zero shift, in its unit; a loss is what it takes at its greatest flow."
)

_WORDS = {Verdict.PASS: "yes", Verdict.UNRESOLVED: "no", Verdict.UNCHECKED: "unchecked", Verdict.FAIL: "no"}
# Of one gauge a zero shift stands for the rest, of one run a blockage.
_STANDING_FOR_OTHERS = frozenset(
    {CauseKind.SPAN_ERROR, CauseKind.WRONG_ELEVATION, CauseKind.LEG_GAS, CauseKind.LOW_LOSS, CauseKind.ZERO_SHIFT}
)
_TWIN = 0.9999


@dataclass(frozen=True, slots=True, kw_only=True)
class SightWords:
    """Everything that is said of a sight.

    Parameters
    ----------
    states : str
        What it rests on, one line.
    gauges, troubles : tuple of tuple of str
        Under `GAUGES_HEAD` and `TROUBLES_HEAD`.
    cannot : tuple of str
        Gauges that cannot pass or be checked, and what readings alone do not tell apart, a sentence each.
    further : tuple of str
        What one reading more would bring, the best first.
    assumed : tuple of str
    """

    states: str
    gauges: Rows
    troubles: Rows
    cannot: tuple[str, ...]
    further: tuple[str, ...]
    assumed: tuple[str, ...]


def sight_words(job: Job, sight: Sight) -> SightWords:
    """The words and rows of a sight."""
    shifts = {one.place.gauge: one for one in sight.troubles if one.kind is CauseKind.ZERO_SHIFT}
    return SightWords(
        states="; ".join(sight.states),
        gauges=tuple(_gauge_row(one, shifts.get(one.tag)) for one in sight.gauges),
        troubles=tuple(_trouble_row(job, one) for one in sight.troubles if one.kind not in _STANDING_FOR_OTHERS),
        cannot=(*(one.says for one in sight.gauges if one.verdict is not Verdict.PASS), *_twins(sight)),
        further=tuple(more.says for more in sight.further),
        assumed=sight.assumed,
    )


def _gauge_row(one: GaugeSight, shift: TroubleSight | None) -> tuple[str, ...]:
    factor = one.unit.factor
    doubt, tolerance = one.u95_pa / factor, one.tolerance_pa / factor
    return (
        one.tag,
        f"{MARKS[one.verdict]} {_WORDS[one.verdict]}",
        "–" if one.verdict is Verdict.UNCHECKED else fixed(doubt, decimals_for(doubt)),
        fixed(tolerance, decimals_for(tolerance)),
        one.unit.as_difference().text,
        *(_smallest(shift, factor)),
        _looks_like(shift),
    )


def _smallest(shift: TroubleSight | None, factor: float) -> tuple[str, str]:
    """Smallest shift seen and placed, in the gauge's unit."""
    if shift is None:
        return "–", "–"
    sizes = [None if size is None else size / factor for size in (shift.seen, shift.placed)]
    return tuple("never" if size is None else fixed(size, decimals_for(size)) for size in sizes)  # type: ignore[return-value]


def _trouble_row(job: Job, one: TroubleSight) -> tuple[str, ...]:
    return (
        one.kind.value,
        place_label(one.place),
        sight_size(job, one, one.seen),
        sight_size(job, one, one.placed),
        _looks_like(one),
    )


def _looks_like(one: TroubleSight | None) -> str:
    """The cause elsewhere that it looks most like."""
    apart = _elsewhere(one)
    return f"{apart[0].kind.value} at {place_label(apart[0].place)}".replace(" at the whole job", "") if apart else "–"


def _elsewhere(one: TroubleSight | None) -> list[Alike]:
    return [] if one is None else [alike for alike in one.alike if alike.elsewhere]


def _twins(sight: Sight) -> Iterable[str]:
    """Which causes at one gauge no reading tells apart, a sentence for each set of kinds."""
    tags: dict[tuple[CauseKind, ...], list[str]] = defaultdict(list)
    for one in sight.troubles:
        if one.kind is not CauseKind.ZERO_SHIFT or one.seen is None:
            continue
        same = [a.kind for a in one.alike if not a.elsewhere and a.correlation > _TWIN]
        if same:
            tags[(one.kind, *sorted(same, key=lambda kind: kind.value))].append(one.place.gauge)
    every = len(sight.gauges)
    return tuple(twins_sentence(found, kinds, every=len(found) == every) for kinds, found in tags.items())
