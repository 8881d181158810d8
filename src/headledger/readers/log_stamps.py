"""Stamps of a log as seconds since 1970-01-01 UTC.

A column holds few layouts of stamp: with every digit made a 0 they are found by comparing bytes, each layout is
understood once, and its digits are then read for all rows together.
"""

from __future__ import annotations

import re
from collections.abc import Callable, Iterator
from dataclasses import dataclass, field
from datetime import UTC, datetime, timedelta, tzinfo
from enum import StrEnum

import numpy as np
from numpy.typing import NDArray

Text = NDArray[np.bytes_]
Array = NDArray[np.float64]
Digits = NDArray[np.int64]

_DATE = (
    r"(?:(?P<Y>\d{4})(?P<s>[-/.])(?P<m>\d{1,2})(?P=s)(?P<d>\d{1,2})"
    r"|(?P<cY>\d{4})(?P<cm>\d{2})(?P<cd>\d{2})"
    r"|(?P<a>\d{1,2})(?P<t>[-/.])(?P<b>\d{1,2})(?P=t)(?P<yY>\d{4}|\d{2})"
    r"|(?P<nd>\d{1,2})[-/. ]?(?P<name>[A-Za-z]{3,9})\.?[-/. ]?(?P<nY>\d{4}|\d{2})"
    r"|(?P<uname>[A-Za-z]{3,9})\.? +(?P<ud>\d{1,2}),? +(?P<uY>\d{4}))"
)
_CLOCK = (
    r"(?:(?P<H>\d{1,2}):(?P<M>\d{2})(?::(?P<S>\d{2})(?:[.,:](?P<f>\d{1,9}))?)?"
    r"|(?P<cH>\d{2})(?P<cM>\d{2})(?:(?P<cS>\d{2})(?:[.,](?P<cf>\d{1,9}))?)?)"
    r"(?:\s*(?P<half>[AaPp])\.?[Mm]\.?)?"
)
_ZONE = r"\s*(?:(?P<z>Z|z|UTC|GMT)|(?P<sign>[+-])(?P<zh>\d{2}):?(?P<zm>\d{2})?)?"
_STAMP = re.compile(rf"\s*{_DATE}(?:(?:[T_ ]\s*|,\s*){_CLOCK}{_ZONE})?\s*")
_TIME_ONLY = re.compile(rf"\s*{_CLOCK}{_ZONE}\s*")
_MONTHS = ("jan", "feb", "mar", "apr", "may", "jun", "jul", "aug", "sep", "oct", "nov", "dec")
_DIRECTIVES = {
    "Y": r"(?P<Y>\d{4})",
    "y": r"(?P<Y>\d{2})",
    "m": r"(?P<m>\d{1,2})",
    "d": r"(?P<d>\d{1,2})",
    "b": r"(?P<name>[A-Za-z]{3,9})\.?",
    "B": r"(?P<name>[A-Za-z]{3,9})",
    "H": r"(?P<H>\d{1,2})",
    "I": r"(?P<H>\d{1,2})",
    "M": r"(?P<M>\d{1,2})",
    "S": r"(?P<S>\d{1,2})",
    "f": r"(?P<f>\d{1,9})",
    "p": r"(?P<half>[AaPp])\.?[Mm]\.?",
    "z": r"(?:(?P<z>Z)|(?P<sign>[+-])(?P<zh>\d{2}):?(?P<zm>\d{2})?)",
    "Z": r"(?P<z>Z|UTC|GMT)",
    "a": r"[A-Za-z]{2,9}",
    "A": r"[A-Za-z]{2,9}",
    "%": "%",
}


class StampKind(StrEnum):
    """What the cells of a column say of time."""

    STAMP = "date and time"
    DATE = "date"
    CLOCK = "time of day"
    EPOCH_S = "seconds since 1970"
    EPOCH_MS = "milliseconds since 1970"


def format_pattern(stated: str) -> re.Pattern[str]:
    """The pattern of a stated format such as ``%d.%m.%Y %H:%M:%S``.

    Raises
    ------
    ValueError
        A directive that is not known.
    """
    pattern, position = r"\s*", 0
    for match in re.finditer(r"%(.?)", stated):
        if match[1] not in _DIRECTIVES:
            raise ValueError(match[0])
        pattern += re.escape(stated[position : match.start()]) + _DIRECTIVES[match[1]]
        position = match.end()
    return re.compile(pattern + re.escape(stated[position:]) + r"\s*")


def layouts(cells: Text) -> Iterator[tuple[str, NDArray[np.intp] | slice, NDArray[np.uint8]]]:
    """Each layout among some cells, the rows that have it, and their bytes as a matrix."""
    width = max(cells.dtype.itemsize, 1)
    matrix = np.ascontiguousarray(cells).view(np.uint8).reshape(cells.size, width)
    masked = np.where((matrix >= 48) & (matrix <= 57), np.uint8(48), matrix)
    if (masked == masked[:1]).all():
        yield _layout_text(masked[0]), slice(None), matrix
        return
    kinds, inverse = np.unique(masked.reshape(-1).view(f"S{width}"), return_inverse=True)
    for number, kind in enumerate(kinds):
        rows = np.flatnonzero(inverse == number)
        yield _layout_text(np.frombuffer(bytes(kind), dtype=np.uint8)), rows, matrix[rows]


def _layout_text(masked: NDArray[np.uint8]) -> str:
    """A layout as text, without the padding."""
    return masked.tobytes().rstrip(b"\0").decode("latin-1")


def stamp_kind(cells: Text) -> StampKind | None:
    """What most of a column's cells that are not blank say of time; None where that is nothing."""
    votes: dict[StampKind, int] = {}
    total = 0
    for text, _, matrix in layouts(cells) if cells.size else ():
        if not text.strip():
            continue
        rows = len(matrix)
        total += rows
        kind = _layout_kind(text, matrix)
        if kind is not None:
            votes[kind] = votes.get(kind, 0) + rows
    best = max(votes, key=lambda kind: votes[kind], default=None)
    return best if best is not None and votes[best] >= 0.6 * total else None


def _layout_kind(text: str, matrix: NDArray[np.uint8]) -> StampKind | None:
    """What one layout says of time, the first of its rows standing for all."""
    plain = text.strip()
    if re.fullmatch(r"-?\d{9,13}(?:[.,]\d*)?", plain) and not re.fullmatch(r"\d{8}", plain):
        first = matrix[0].tobytes().rstrip(b"\0").decode("latin-1").replace(",", ".")
        value = float(first)
        if 1e8 <= value < 1e11:
            return StampKind.EPOCH_S
        return StampKind.EPOCH_MS if 1e11 <= value < 1e14 else None
    match = _STAMP.fullmatch(plain)
    if match and (spans := _spans(match)):
        if plain.isdigit() and not 19000000 <= int(matrix[0].tobytes().rstrip(b"\0")) < 21000000:
            return None
        return StampKind.STAMP if "H" in spans else StampKind.DATE
    if ":" in plain and _TIME_ONLY.fullmatch(plain):
        return StampKind.CLOCK
    return None


_SAME = {"cY": "Y", "yY": "Y", "nY": "Y", "uY": "Y", "cm": "m", "cd": "d", "nd": "d", "ud": "d", "uname": "name"} | {
    "cH": "H",
    "cM": "M",
    "cS": "S",
    "cf": "f",
}


def _spans(match: re.Match[str]) -> dict[str, tuple[int, int]]:
    """Where each part of a stamp stands in its layout, by its plain name; empty where a word is no month."""
    spans = {_SAME.get(name, name): match.span(name) for name, text in match.groupdict().items() if text is not None}
    if "name" in spans and match.string[slice(*spans["name"])][:3].lower() not in _MONTHS:
        return {}
    return spans


@dataclass(slots=True)
class DayOrder:
    """What the cells seen so far say of dates such as 03/04/2026: which of the two numbers is the day."""

    first_above_12: bool = False
    second_above_12: bool = False
    differ: bool = False
    seen: bool = False
    example: str = ""

    def look(self, cells: Text) -> None:
        """Take some cells into account."""
        for text, _, matrix in layouts(cells) if cells.size else ():
            match = _STAMP.fullmatch(text)
            if not match or match["a"] is None or match["t"] == ".":
                continue
            self.seen = True
            first, second = _number(matrix, match.span("a")), _number(matrix, match.span("b"))
            self.first_above_12 |= bool((first > 12).any())
            self.second_above_12 |= bool((second > 12).any())
            unlike = np.flatnonzero(first != second)
            self.differ |= unlike.size > 0
            if unlike.size and not self.example:
                self.example = matrix[unlike[0]].tobytes().rstrip(b"\0").decode("latin-1").strip()

    @property
    def day_first(self) -> bool | None:
        """Whether the day stands first; None where the cells do not say."""
        if self.first_above_12 != self.second_above_12:
            return self.first_above_12
        return None

    @property
    def is_open(self) -> bool:
        """Whether a reading of the dates needs an answer that the cells do not give."""
        return self.differ and self.day_first is None


def _number(matrix: NDArray[np.uint8], span: tuple[int, int]) -> Digits:
    """The number that stands in some columns of digits."""
    value = np.zeros(len(matrix), dtype=np.int64)
    for column in range(*span):
        value = value * 10 + (matrix[:, column].astype(np.int64) - 48)
    return value


@dataclass(slots=True)
class LocalClock:
    """Turns a zone's local seconds into UTC; in an hour that is repeated, a step back of half an hour tells the second.

    Parameters
    ----------
    zone : tzinfo
    """

    zone: tzinfo
    _last_s: float = field(default=-np.inf)
    _second_time: bool = False

    def to_utc(self, local_s: Array) -> Array:
        """Seconds since 1970-01-01 UTC of local seconds in file order. [s]"""
        if self.zone is UTC or local_s.size == 0:
            return local_s
        quarters, inverse = np.unique(np.floor(local_s / 900.0), return_inverse=True)
        offsets = np.array([self._offsets_s(quarter * 900.0) for quarter in quarters])
        early, late = offsets[inverse, 0], offsets[inverse, 1]
        again = self._told_again(local_s, early > late)
        offset_s: Array = np.where(again, late, early)
        return local_s - offset_s

    def _offsets_s(self, local_s: float) -> tuple[float, float]:
        """Offset from UTC of a local time, and where it is repeated, the second time. [s]"""
        local = datetime(1970, 1, 1) + timedelta(seconds=local_s)
        pair = [(self.zone.utcoffset(local.replace(fold=fold)) or timedelta(0)).total_seconds() for fold in (0, 1)]
        return pair[0], pair[1]

    def _told_again(self, local_s: Array, repeated: NDArray[np.bool_]) -> NDArray[np.bool_]:
        """Rows of a repeated hour that belong to its second pass."""
        again = np.zeros(local_s.size, dtype=bool)
        if repeated.any():
            back = np.diff(local_s, prepend=self._last_s) <= -1800.0
            second = self._second_time
            for row in np.flatnonzero(repeated):
                second = bool(back[row]) or (second and (row == 0 or bool(repeated[row - 1])))
                again[row] = second
        self._last_s, self._second_time = float(local_s[-1]), bool(again[-1])
        return again


@dataclass(slots=True)
class StampReader:
    """Reads the stamps of one log.

    Parameters
    ----------
    kind : StampKind
    clock : LocalClock
        For stamps without an offset.
    day_first : bool
        Of dates such as 03/04/2026; a dotted date always has the day first.
    pattern : re.Pattern or None
        Of a stated format.
    """

    kind: StampKind
    clock: LocalClock
    day_first: bool = True
    pattern: re.Pattern[str] | None = None

    def seconds(self, cells: Text) -> Array:
        """Seconds since 1970-01-01 UTC of cells in file order, nan where unreadable. [s]"""
        if self.kind in (StampKind.EPOCH_S, StampKind.EPOCH_MS) and self.pattern is None:
            return _floats(cells) * (1.0 if self.kind is StampKind.EPOCH_S else 1e-3)
        seconds = np.full(cells.size, np.nan)
        local = np.zeros(cells.size, dtype=bool)
        for text, rows, matrix in layouts(cells) if cells.size else ():
            match = (self.pattern or _STAMP).fullmatch(text)
            spans = _spans(match) if match else {}
            if spans:
                seconds[rows] = self._read(text, spans, matrix)
                local[rows] = "z" not in spans and "sign" not in spans
        local &= ~np.isnan(seconds)
        seconds[local] = self.clock.to_utc(seconds[local])
        return seconds

    def _read(self, text: str, spans: dict[str, tuple[int, int]], matrix: NDArray[np.uint8]) -> Array:
        """Seconds of rows of one layout, by their own offset if they carry one, nan where there is no such time. [s]"""

        def part(name: str) -> Digits:
            return _number(matrix, spans[name]) if name in spans else np.zeros(len(matrix), dtype=np.int64)

        year, month, day = self._calendar(text, spans, part)
        hour, minute, second = part("H"), part("M"), part("S")
        good = (month >= 1) & (month <= 12) & (day >= 1) & (hour <= 23) & (minute <= 59) & (second <= 59)
        good &= day <= _days_of_month(year, np.clip(month, 1, 12))
        if "half" in spans:
            good &= (hour >= 1) & (hour <= 12)
            after_noon = text[spans["half"][0]] in "Pp"
            hour = hour % 12 + (12 if after_noon else 0)
        seconds = (_days(year, month, day) * 86400 + hour * 3600 + minute * 60 + second).astype(np.float64)
        if "f" in spans:
            seconds += part("f") / 10.0 ** (spans["f"][1] - spans["f"][0])
        if "sign" in spans:
            ahead = 1.0 if text[spans["sign"][0]] == "+" else -1.0
            seconds -= ahead * (part("zh") * 3600 + part("zm") * 60)
        return np.where(good, seconds, np.nan)

    def _calendar(
        self, text: str, spans: dict[str, tuple[int, int]], part: Callable[[str], Digits]
    ) -> tuple[Digits, Digits, Digits]:
        """Year, month and day of rows of one layout."""
        year = part("Y")
        if "Y" in spans and spans["Y"][1] - spans["Y"][0] == 2:
            year = year + 2000
        if "name" in spans:
            month = _MONTHS.index(text[slice(*spans["name"])][:3].lower()) + 1
            return year, np.full_like(year, month), part("d")
        if "a" in spans:
            day_first = self.day_first or text[slice(*spans["t"])] == "."
            return (year, part("b"), part("a")) if day_first else (year, part("a"), part("b"))
        return year, part("m"), part("d")


def _days(year: Digits, month: Digits, day: Digits) -> Digits:
    """Days since 1970-01-01 of dates in the Gregorian calendar, counted in years that begin in March."""
    year = year - (month <= 2)
    era = year // 400
    of_era = year - era * 400
    of_year = (153 * ((month + 9) % 12) + 2) // 5 + day - 1
    days: Digits = era * 146097 + of_era * 365 + of_era // 4 - of_era // 100 + of_year - 719468
    return days


def _days_of_month(year: Digits, month: Digits) -> Digits:
    """Length of a month."""
    leap = (year % 4 == 0) & ((year % 100 != 0) | (year % 400 == 0))
    length: Digits = np.array([31, 28, 31, 30, 31, 30, 31, 31, 30, 31, 30, 31])[month - 1] + (leap & (month == 2))
    return length


def _floats(cells: Text) -> Array:
    """Numbers of cells, nan where there is none."""
    try:
        return cells.astype(np.float64)
    except ValueError:
        return np.array([_float(bytes(cell)) for cell in cells], dtype=np.float64)


def _float(cell: bytes) -> float:
    """A number, nan where there is none."""
    if not re.fullmatch(rb"\s*[+-]?\d+(?:[.,]\d*)?(?:[eE][+-]?\d+)?\s*", cell):
        return np.nan
    return float(cell.replace(b",", b"."))
