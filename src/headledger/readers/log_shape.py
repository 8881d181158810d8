"""The shape of a log, found by looking at its start: delimiter, decimal mark, header, units, what each column is."""

from __future__ import annotations

import csv
import re
from collections import Counter
from collections.abc import Sequence
from dataclasses import dataclass, field

import numpy as np

from headledger.errors import JobError, Problem
from headledger.plant.job import LogSettings
from headledger.quantities import nearest, split_header
from headledger.readers.log_files import LogFile, text_of
from headledger.readers.log_stamps import StampKind, stamp_kind

DELIMITERS = (";", "\t", "|", ",")
MOST_LINES = 240
"""As many lines of a log are looked at."""
EMPTY_WORDS = ("", "nan", "null")
"""What stands for no value, in lower case."""

_STAMP_WORDS = re.compile(r"time|date|stamp|zeit|datum|heure|fecha|hora|epoch|^ts$|^t$", re.IGNORECASE)
_TAG_WORDS = re.compile(
    r"^(tag|tag ?_?name|point|point ?_?(name|id)|name|signal|channel|sensor|variable|item|series|messstelle|kanal)$",
    re.IGNORECASE,
)
_VALUE_WORDS = re.compile(r"^(value|val|reading|wert|messwert|valeur|valor|pv|vqt value)$", re.IGNORECASE)
_QUALITY_WORDS = re.compile(r"^(quality|qual|qc|status|opc ?quality)$", re.IGNORECASE)
_UNIT_WORDS = re.compile(r"^(unit|units|uom|eu|eng ?units?|einheit)$", re.IGNORECASE)
_QUALITY_OF = re.compile(r"^(?P<tag>.+?)[ ._-](?:quality|qual|status|q)$", re.IGNORECASE)
_UNIT = re.compile(
    r"(?:[kMhm]?Pa|m?bar|psi|ksi|psf|psid|at|atm|torr|[mc]?mHg|inHg|(?:[cm]?m|in|ft)(?:H2O|WC|WG|WS|CE|Hg)|kgf?/cm[2²])"
    r"(?:[\s_-]*(?:\(?(?:g|a|d|abs|gauge|diff)\)?))?"
    r"|(?:m3|m³|m\^3|l|gal|kg|t|ft3|cf|usg|us gal)\s*/\s*(?:h|hr|s|min|d)|[ul]?s?gpm|lpm|lps|m3h|cfm|mgd"
    r"|°?\s*[CFK]|deg\s*[CFK]|%|‰|percent|mA|A|m?V|kW|W|Hz|rpm|1/min|[cmk]?m|in|ft|k?g|m?s|min|h|m/s|kg/m[3³]|-|–|bool",
    re.IGNORECASE,
)
_PLAIN = re.compile(r"[+-]?\d+")
_COMMA = re.compile(r"[+-]?\d*,\d+(?:[eE][+-]?\d+)?")
_POINT = re.compile(r"[+-]?\d*\.\d+(?:[eE][+-]?\d+)?")
_COMMA_GROUPS = re.compile(r"[+-]?\d{1,3}(?:,\d{3})+(?:\.\d+)?")
_POINT_GROUPS = re.compile(r"[+-]?\d{1,3}(?:\.\d{3})+(?:,\d+)?")
_EXPONENT = re.compile(r"[+-]?\d+[eE][+-]?\d+")


@dataclass(frozen=True, slots=True, kw_only=True)
class LogShape:
    """What each field of a line is. Positions count fields from 0, lines from 1.

    Parameters
    ----------
    delimiter, decimal, thousands : str
        `thousands` is empty where numbers are not grouped.
    header_line, first_line : int
        Lines of the header and of the first row.
    width : int
        Fields of a row.
    needed : int
        Fields up to the last that has a name; a shorter row is incomplete.
    stamp : tuple of int
        One field, or one of the date and one of the time of day.
    stamp_kind : StampKind
    values : tuple of int
        Fields that hold values: one a column of a wide log, the one of a long log.
    columns, units : tuple of str
        Of the fields in `values`; empty for a long log, whose tags name its columns.
    unnamed : tuple of bool
        Of the fields in `values`: whether the header is blank there.
    quality : dict of int to int
        Field that holds the quality of a field in `values`.
    tag, unit : int or None
        Of a long log.
    """

    delimiter: str
    decimal: str
    header_line: int
    first_line: int
    width: int
    needed: int
    stamp: tuple[int, ...]
    stamp_kind: StampKind
    values: tuple[int, ...]
    columns: tuple[str, ...] = ()
    units: tuple[str, ...] = ()
    unnamed: tuple[bool, ...] = ()
    thousands: str = ""
    quality: dict[int, int] = field(default_factory=dict)
    tag: int | None = None
    unit: int | None = None

    @property
    def is_long(self) -> bool:
        """Whether each row holds one value and the tag that it belongs to."""
        return self.tag is not None


@dataclass(slots=True)
class _Look:
    """The start of a log while its shape is being found: physical lines that are not blank, split into cells."""

    name: str
    settings: LogSettings
    delimiter: str
    numbers: list[int]
    rows: list[list[str]]

    def fail(self, fault: str, found: str = "", expected: str = "", *, place: str = "") -> JobError:
        """The error of a log that cannot be read."""
        return JobError([Problem(place or self.name, fault, found, expected)])


def split_line(line: str, delimiter: str) -> list[str]:
    """Cells of one line; a carriage return within it says nothing."""
    line = line.replace("\r", "")
    if '"' not in line or len(line) > csv.field_size_limit():
        return line.split(delimiter)
    return next(csv.reader([line], delimiter=delimiter), [])


def find_shape(file: LogFile, settings: LogSettings) -> LogShape:
    """The shape of a log.

    Parameters
    ----------
    file : LogFile
    settings : LogSettings
        What the job states goes before what is found.

    Returns
    -------
    LogShape

    Raises
    ------
    JobError
        No header, no rows, no stamp, or a stated column that is not there.
    """
    lines = [(number, text_of(line)) for number, line in enumerate(file.sample().split(b"\n")[:MOST_LINES], 1)]
    lines = [(number, line) for number, line in lines if line.strip()]
    if not lines:
        raise JobError([Problem(file.name, "the log is empty", "blank lines", "a header row and rows of readings")])
    delimiter = settings.delimiter or _find_delimiter([line for _, line in lines])
    rows = [split_line(line, delimiter) for _, line in lines]
    look = _Look(file.name, settings, delimiter, [number for number, _ in lines], rows)
    return _shape_of(look)


def _find_delimiter(lines: Sequence[str]) -> str:
    """The delimiter that cuts the later lines into one number of fields."""
    later = lines[len(lines) // 2 :]
    for share in (0.9, 0.5):
        for delimiter in DELIMITERS:
            fields, number = Counter(len(split_line(line, delimiter)) for line in later).most_common(1)[0]
            if fields > 1 and number >= share * len(later):
                return delimiter
    return ","


def _shape_of(look: _Look) -> LogShape:
    """The shape, from the rows looked at."""
    width = Counter(len(row) for row in look.rows[len(look.rows) // 2 :]).most_common(1)[0][0]
    kinds = _stamp_kinds(look, width)
    header_at, units_at, first_at = _find_header(look, width, kinds)
    header = [cell.strip().strip('"') for cell in look.rows[header_at]]
    while len(header) > width and not header[-1]:
        header.pop()
    width = max(width, len(header))
    header += [""] * (width - len(header))
    below = look.rows[units_at] if units_at is not None else []
    names, units = _names_and_units(header, below, width)
    body = [row for row in look.rows[first_at:] if len(row) == width]
    stamp, kind = _find_stamp(look, names, kinds)
    others = [position for position in range(width) if position not in stamp]
    tag, value = _find_long(look, names, body, others)
    unit = quality = None
    if tag is not None and value is not None:
        unit = _first(names, others, _UNIT_WORDS)
        quality = _named(look, names, look.settings.quality_column, "quality_column", _QUALITY_WORDS, others)
        qualities = {value: quality} if quality is not None else {}
        values = [value]
    else:
        qualities = _wide_qualities(look, names, body, others)
        values = [position for position in others if position not in qualities.values()]
    if not values:
        raise look.fail("the log holds no column of values", ", ".join(filter(None, names)), "a column a gauge")
    decimal, thousands = _find_marks(look, [[row[position] for position in values] for row in body])
    named = [position for position, name in enumerate(names) if name]
    return LogShape(
        delimiter=look.delimiter,
        decimal=look.settings.decimal or decimal,
        thousands=look.settings.thousands if look.settings.thousands is not None else thousands,
        header_line=look.numbers[header_at],
        first_line=look.numbers[first_at] if first_at < len(look.numbers) else look.numbers[-1] + 1,
        width=width,
        needed=max(named, default=width - 1) + 1,
        stamp=stamp,
        stamp_kind=kind,
        values=tuple(values),
        columns=() if tag is not None else _once_each([names[at] or f"column {at + 1}" for at in values]),
        units=() if tag is not None else tuple(units[at] for at in values),
        unnamed=() if tag is not None else tuple(not names[at] for at in values),
        quality=qualities,
        tag=tag,
        unit=unit,
    )


def _stamp_kinds(look: _Look, width: int) -> dict[int, StampKind]:
    """What each field says of time, by the later rows."""
    rows = [row for row in look.rows[len(look.rows) // 2 :] if len(row) == width]
    kinds = {}
    for position in range(width if rows else 0):
        kind = stamp_kind(np.array([row[position].strip().encode() for row in rows], dtype=np.bytes_))
        if kind is not None:
            kinds[position] = kind
    return kinds


def _find_header(look: _Look, width: int, kinds: dict[int, StampKind]) -> tuple[int, int | None, int]:
    """Places of header, units row and first row among the rows looked at."""
    settings = look.settings
    if settings.header_line is not None or settings.stamp:
        header = _stated_header(look)
        units = _at_line(look, settings.units_line, "units_line") if settings.units_line is not None else None
        if units is None and header + 1 < len(look.rows) and _is_units_row(look.rows[header + 1]):
            units = header + 1
        first = max(header, units if units is not None else header) + 1
        if first >= len(look.rows):
            raise look.fail("the log holds a header but no rows", "", "a row of readings a line")
        return header, units, first
    first = _find_first(look, width, kinds)
    above = []
    for at in range(first - 1, max(first - 5, -1), -1):
        if not width - 1 <= len(look.rows[at]) <= width + 1 or len(look.rows[at]) < 2:
            break
        above.append(at)
    units = _at_line(look, settings.units_line, "units_line") if settings.units_line is not None else None
    if units is None:
        units = next((at for at in above[:-1] if _is_units_row(look.rows[at])), None)
    headers = [at for at in above if at != units and _is_full(look.rows[at])]
    if not headers:
        raise look.fail(
            "no header was found above the first row",
            f"line {look.numbers[first]} is the first row",
            "a line with the names of the columns, or its number in [log] header_line",
        )
    hinted = [at for at in headers if any(_STAMP_WORDS.search(cell) for cell in look.rows[at])]
    return (hinted or headers)[0], units, first


def _stated_header(look: _Look) -> int:
    """Place of the header whose line, or whose names of the stamp columns, the job states."""
    if look.settings.header_line is not None:
        return _at_line(look, look.settings.header_line, "header_line")
    wanted = {name.strip().casefold() for name in look.settings.stamp or ()}
    for at, row in enumerate(look.rows):
        if wanted <= {split_header(cell.strip().strip('"'))[0].casefold() for cell in row}:
            return at
    raise look.fail(
        "no line holds the stamp columns that were stated",
        ", ".join(look.settings.stamp or ()),
        "the names as the header writes them",
        place="job.toml, [log] stamp",
    )


def _at_line(look: _Look, line: int, key: str) -> int:
    """Place of a stated line among the rows looked at."""
    if line not in look.numbers:
        expected = f"a line of {look.name} that is not blank, within its first {look.numbers[-1]}"
        raise look.fail("there is no such line", str(line), expected, place=f"job.toml, [log] {key}")
    return look.numbers.index(line)


def _find_first(look: _Look, width: int, kinds: dict[int, StampKind]) -> int:
    """Place of the first row that has a stamp where the later rows have theirs."""
    timed = {at: kind for at, kind in kinds.items() if kind is not StampKind.CLOCK}
    for at, row in enumerate(look.rows):
        if len(row) >= max(2, width - 1) and any(
            position < len(row) and stamp_kind(np.array([row[position].strip().encode()], dtype=np.bytes_)) is kind
            for position, kind in timed.items()
        ):
            return at
    full = [row for row in look.rows if len(row) == width and width > 1]
    if len(full) <= 1 or all(_is_units_row(row) for row in full[1:]):
        raise look.fail("the log holds a header but no rows", "", "a row of readings a line")
    raise _no_stamp(look, full[0])


def _no_stamp(look: _Look, names: Sequence[str]) -> JobError:
    """The error of a log without a stamp."""
    found = "columns " + ", ".join(cell.strip() for cell in names[:8] if cell.strip())
    return look.fail("no stamp column was found", found, "a column of dates and times, or its name in [log] stamp")


def _is_full(row: Sequence[str]) -> bool:
    """Whether most cells hold text, as those of a header do."""
    return 2 * sum(bool(cell.strip()) for cell in row) > len(row)


def _is_units_row(row: Sequence[str]) -> bool:
    """Whether a row names units."""
    cells = [cell.strip().strip('"') for cell in row if cell.strip()]
    units = sum(is_unit(cell) or (cell.startswith("[") and cell.endswith("]")) for cell in cells)
    return bool(cells) and 2 * units >= len(cells) and any(cell not in ("-", "–") for cell in cells)


def is_unit(text: str) -> bool:
    """Whether a text looks like a unit of something that a log may hold."""
    return _UNIT.fullmatch(text.strip().removeprefix("[").removesuffix("]").strip()) is not None


def _names_and_units(header: Sequence[str], below: Sequence[str], width: int) -> tuple[list[str], list[str]]:
    """Bare names, and units from the header or the row below it."""
    names, units = [], []
    for position in range(width):
        name, unit = split_header(header[position])
        bracketed = re.fullmatch(r"(?P<name>.+?)\s*\((?P<unit>[^()]*(?:\([^()]*\))?)\)", name)
        if unit is None and bracketed and is_unit(bracketed["unit"]):
            name, unit = bracketed["name"], bracketed["unit"].strip()
        if not unit and position < len(below):
            unit = below[position].strip().strip('"').removeprefix("[").removesuffix("]").strip()
        names.append(name.strip())
        units.append("" if unit in (None, "-", "–") else str(unit))
    return names, units


def _once_each(names: Sequence[str]) -> tuple[str, ...]:
    """Names in which a repeated one carries its number."""
    seen: Counter[str] = Counter()
    unlike = []
    for name in names:
        seen[name] += 1
        unlike.append(name if seen[name] == 1 else f"{name} ({seen[name]})")
    return tuple(unlike)


def _find_stamp(look: _Look, names: Sequence[str], kinds: dict[int, StampKind]) -> tuple[tuple[int, ...], StampKind]:
    """Fields of the stamp and what they say."""
    if look.settings.stamp:
        stated = tuple(_position(look, names, name, "stamp") for name in look.settings.stamp)
        kind = kinds.get(stated[0], StampKind.STAMP)
        return stated, StampKind.STAMP if len(stated) > 1 or look.settings.stamp_format else kind
    by_kind: dict[StampKind, list[int]] = {}
    for position, kind in kinds.items():
        by_kind.setdefault(kind, []).append(position)
    for kind in (StampKind.STAMP, StampKind.DATE, StampKind.EPOCH_S, StampKind.EPOCH_MS):
        places = by_kind.get(kind, [])
        hinted = [position for position in places if _STAMP_WORDS.search(names[position])]
        if kind in (StampKind.EPOCH_S, StampKind.EPOCH_MS):
            places = [position for position in places if position == 0]
        if not (hinted or places):
            continue
        first = (hinted or places)[0]
        if kind is StampKind.DATE and StampKind.CLOCK in by_kind:
            return (first, by_kind[StampKind.CLOCK][0]), StampKind.STAMP
        return (first,), kind
    raise _no_stamp(look, names)


def _position(look: _Look, names: Sequence[str], name: str, key: str) -> int:
    """Field of a column that the job states."""
    folded = [each.casefold() for each in names]
    bare = split_header(name)[0].casefold()
    if bare in folded:
        return folded.index(bare)
    close = nearest(name, [each for each in names if each])
    expected = f"the name {close}" if close else "one of " + ", ".join(filter(None, names))
    raise look.fail(f"no such column in {look.name}", name, expected, place=f"job.toml, [log] {key}")


def _first(names: Sequence[str], places: Sequence[int], words: re.Pattern[str]) -> int | None:
    """The first of some fields whose name is one of some words."""
    return next((position for position in places if words.match(names[position])), None)


def _named(
    look: _Look, names: Sequence[str], stated: str | None, key: str, words: re.Pattern[str], places: Sequence[int]
) -> int | None:
    """Field of a column that is stated, or else known by its name."""
    if stated is not None:
        return _position(look, names, stated, key)
    return _first(names, places, words)


def _is_numeric(cell: str) -> bool:
    """Whether a cell holds a number in any spelling."""
    return any(pattern.fullmatch(cell.strip()) for pattern in _NUMBERS)


_NUMBERS = (_PLAIN, _COMMA, _POINT, _COMMA_GROUPS, _POINT_GROUPS, _EXPONENT)


def _text_share(body: Sequence[Sequence[str]], position: int) -> float:
    """Fraction of a field's cells that hold text. [-]"""
    cells = [row[position].strip() for row in body]
    held = [cell for cell in cells if cell.lower() not in EMPTY_WORDS]
    return sum(not _is_numeric(cell) for cell in held) / len(held) if held else 0.0


def _find_long(
    look: _Look, names: Sequence[str], body: Sequence[Sequence[str]], places: Sequence[int]
) -> tuple[int | None, int | None]:
    """Fields of tag and value of a long log; None, None for a wide one."""
    settings = look.settings
    if settings.shape == "wide":
        return None, None
    tag = _named(look, names, settings.tag_column, "tag_column", _TAG_WORDS, places)
    value = _named(look, names, settings.value_column, "value_column", _VALUE_WORDS, places)
    if tag is not None and value is not None:
        return tag, value
    texts = [at for at in places if body and _text_share(body, at) > 0.9 and not _UNIT_WORDS.match(names[at])]
    texts = [at for at in texts if not _QUALITY_WORDS.match(names[at])]
    numbers = [at for at in places if _text_share(body, at) < 0.5 and not _QUALITY_WORDS.match(names[at])]
    if tag is None and len(texts) == 1 and len(numbers) == 1 and _tags_repeat([row[texts[0]] for row in body]):
        tag = texts[0]
    if value is None and len(numbers) == 1:
        value = numbers[0]
    if tag is not None and value is not None and tag != value:
        return tag, value
    if settings.shape == "long":
        what = "tag" if tag is None else "value"
        found = ", ".join(filter(None, names))
        raise look.fail(f"no {what} column was found", found, f"its name in [log] {what}_column")
    return None, None


def _tags_repeat(cells: Sequence[str]) -> bool:
    """Whether the texts are several that come again and again, as tags do, and hold no mere word of a status."""
    kinds = {cell.strip() for cell in cells}
    return 1 < len(kinds) <= len(cells) // 2 and any(re.search(r"\d", kind) for kind in kinds)


def _wide_qualities(
    look: _Look, names: Sequence[str], body: Sequence[Sequence[str]], places: Sequence[int]
) -> dict[int, int]:
    """For each value field of a wide log that has one, the field of its quality: its own, or that of the whole row."""
    by_name = {names[at].casefold(): at for at in places if names[at]}
    qualities = {}
    for at in places:
        own = _QUALITY_OF.match(names[at])
        if own and own["tag"].casefold() in by_name:
            qualities[by_name[own["tag"].casefold()]] = at
    whole = _named(look, names, look.settings.quality_column, "quality_column", _QUALITY_WORDS, places)
    if whole is not None and (look.settings.quality_column or _text_share(body, whole) > 0.5):
        taken = set(qualities.values()) | {whole}
        qualities |= {at: whole for at in places if at not in taken and at not in qualities}
    return qualities


def _find_marks(look: _Look, body: Sequence[Sequence[str]]) -> tuple[str, str]:
    """Decimal and thousands mark, by the cells of the values."""
    cells = [cell.strip() for row in body for cell in row]
    commas = [cell for cell in cells if _COMMA.fullmatch(cell)]
    points = [cell for cell in cells if _POINT.fullmatch(cell)]
    comma_groups = sum(bool(_COMMA_GROUPS.fullmatch(cell)) for cell in commas)
    point_groups = sum(bool(_POINT_GROUPS.fullmatch(cell)) for cell in points)
    if any(_POINT_GROUPS.fullmatch(cell) and "," in cell for cell in cells):
        return ",", "."
    if any(_COMMA_GROUPS.fullmatch(cell) and "." in cell for cell in cells):
        return ".", ","
    if commas and points:
        # All of one mark stand before three digits, and the other does not: they are groups.
        if point_groups == len(points) and comma_groups < len(commas) >= 0.3 * len(points):
            return ",", "."
        if comma_groups == len(commas) and point_groups < len(points) >= 0.3 * len(commas):
            return ".", ","
    if len(commas) != len(points):
        return (",", "") if len(commas) > len(points) else (".", "")
    return (",", "") if look.delimiter == ";" and not points else (".", "")
