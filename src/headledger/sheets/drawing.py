"""A drawing in its own coordinates: what the terminal's cells and the paper's ink are both made from.

A drawing knows nothing of dots, points or colours. Everything on it has a role, and each renderer gives every role its look.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from enum import StrEnum
from itertools import pairwise

Point = tuple[float, float]


class Role(StrEnum):
    """What a line, an area or a word stands for."""

    GRADE = "grade"
    BAND = "band"
    PIPE = "pipe"
    GROUND = "ground"
    STEP = "step"
    POCKET = "pocket"
    READING = "reading"
    SPELL = "spell"
    CHOSEN_SPELL = "chosen-spell"
    NAME = "name"
    AXIS = "axis"
    FAIL = "fail"
    UNRESOLVED = "unresolved"
    UNCHECKED = "unchecked"
    PASS = "pass"


@dataclass(frozen=True, slots=True, kw_only=True)
class Panel:
    """One scale of height.

    Parameters
    ----------
    low, high : float
        Ends of the scale.
    share : float
        Of the drawing's height. [-]
    name : str
        What the scale measures, with its unit after a comma.
    """

    low: float
    high: float
    share: float
    name: str


@dataclass(frozen=True, slots=True, kw_only=True)
class Line:
    """A line through points; a vertical part is a step."""

    points: tuple[Point, ...]
    role: Role
    panel: int = 0


@dataclass(frozen=True, slots=True, kw_only=True)
class Band:
    """The area between two lines: at each of `points` from `low` to `high`."""

    points: tuple[tuple[float, float, float], ...]
    role: Role = Role.BAND
    panel: int = 0


@dataclass(frozen=True, slots=True, kw_only=True)
class Fill:
    """The area between a line and the foot of its panel."""

    points: tuple[Point, ...]
    role: Role
    panel: int = 0


@dataclass(frozen=True, slots=True, kw_only=True)
class Beads:
    """Circles strung along a line: gas in a pipe."""

    points: tuple[Point, ...]
    role: Role
    panel: int = 0


@dataclass(frozen=True, slots=True, kw_only=True)
class Shade:
    """A stretch of the drawing's whole height, with a word at its foot."""

    start: float
    end: float
    label: str
    role: Role = Role.SPELL


@dataclass(frozen=True, slots=True, kw_only=True)
class Mark:
    """A sign with a word beside it.

    Parameters
    ----------
    x, y : float
    sign, label : str
        One character, and what stands beside it.
    role : Role
    panel : int
    chosen : bool
        The one that is looked at: its word is never left out.
    beyond : int
        1 where its true place lies above the panel, −1 below: it stands at the edge, and `label` says where it is.
    """

    x: float
    y: float
    sign: str
    label: str
    role: Role
    panel: int = 0
    chosen: bool = False
    beyond: int = 0


@dataclass(frozen=True, slots=True, kw_only=True)
class Note:
    """Words that belong to a place."""

    x: float
    y: float
    text: str
    role: Role
    panel: int = 0


@dataclass(frozen=True, slots=True, kw_only=True)
class Stop:
    """A name under the foot of the drawing; where there is no room the ones with the smaller `rank` stay."""

    x: float
    text: str
    rank: int = 1


@dataclass(frozen=True, slots=True, kw_only=True)
class Drawing:
    """Everything on one picture.

    Parameters
    ----------
    start, end : float
        Ends of the horizontal scale.
    panels : tuple of Panel
        From the top; between two of them the scale is broken.
    fills, bands, lines, beads, marks, notes, stops, shades : tuple
        Drawn in the order shades, fills, bands, lines, beads, marks, notes.
    caption : str
        One sentence that says what is seen.
    """

    start: float
    end: float
    panels: tuple[Panel, ...]
    fills: tuple[Fill, ...] = ()
    bands: tuple[Band, ...] = ()
    lines: tuple[Line, ...] = ()
    beads: tuple[Beads, ...] = ()
    marks: tuple[Mark, ...] = ()
    notes: tuple[Note, ...] = ()
    stops: tuple[Stop, ...] = ()
    shades: tuple[Shade, ...] = ()
    caption: str = ""


def tick_step(extent: float, most: int) -> float:
    """The smallest step of 1, 2 or 5 times a power of ten that divides an extent into at most `most` parts."""
    if not math.isfinite(extent) or extent <= 0.0:
        return 1.0
    least = extent / max(most, 1)
    power = 10.0 ** math.floor(math.log10(least))
    return next(power * times for times in (1.0, 2.0, 5.0, 10.0) if power * times >= least * (1.0 - 1e-9))


def ticks(low: float, high: float, most: int) -> tuple[float, ...]:
    """Round values from `low` to `high`, at least one, and no more than `most` + 1 where a round step allows it."""
    while True:
        step = tick_step(high - low, most)
        first, last = math.ceil(low / step - 1e-9), math.floor(high / step + 1e-9)
        if first <= last:
            return tuple(count * step for count in range(first, last + 1))
        most += 1


def tick_labels(values: tuple[float, ...]) -> tuple[str, ...]:
    """The values with as many decimals as tell them apart."""
    step = min((b - a for a, b in pairwise(values)), default=1.0)
    decimals = max(0, -math.floor(math.log10(step) + 1e-9)) if step > 0.0 else 0
    return tuple(f"{value + 0.0:.{decimals}f}" for value in values)


def widened(low: float, high: float, *, least: float, margin: float = 0.06) -> tuple[float, float]:
    """A scale around values: at least `least` long, with a margin so that nothing sits on its edge."""
    middle, extent = (low + high) / 2.0, max(high - low, least)
    half = extent * (0.5 + margin)
    return middle - half, middle + half
