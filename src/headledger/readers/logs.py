"""Logs of gauges, each read once from start to end and reduced to a digest."""

from __future__ import annotations

import copy
import multiprocessing
import os
import threading
from collections.abc import Callable, Iterator, Sequence
from concurrent.futures import ProcessPoolExecutor
from dataclasses import dataclass, field, replace
from datetime import UTC, tzinfo
from pathlib import Path
from zoneinfo import ZoneInfo, ZoneInfoNotFoundError

import numpy as np
from numpy.typing import NDArray

from headledger.errors import JobError, Problem
from headledger.plant.digest import MOST_REJECTS, Digest, Reject, block_arrays
from headledger.plant.job import Job, LogSettings
from headledger.readers.log_blocks import Array, Fault, Gathering, Ints, Rows, cut_rows, parse_values
from headledger.readers.log_fast import clean_rows, suits
from headledger.readers.log_files import BLOCK_BYTES, SAMPLE_BYTES, LogFile, line_ranges, look_at_file, text_of
from headledger.readers.log_shape import LogShape, find_shape
from headledger.readers.log_stamps import DayOrder, LocalClock, StampKind, StampReader, format_pattern

GOOD_QUALITY = ("good", "ok", "192")
LEAST_PART_BYTES = 24 * 1024 * 1024
"""A part of a file smaller than this is not worth a process. [B]"""
MOST_STAMPS = 1_000_000
"""As many of the latest stamps are remembered, so that one that comes again out of order is known."""

Bools = NDArray[np.bool_]


def read_logs(
    job: Job,
    *,
    recall: Callable[[Path, str], Digest | None] | None = None,
    remember: Callable[[Path, str, Digest], None] | None = None,
    on_progress: Callable[[float], None] | None = None,
) -> tuple[Digest, ...]:
    """One digest a log file of the job, in its order.

    Parameters
    ----------
    job : Job
    recall : callable, optional
        The digest of a file as it was read before with the same settings, where it is known and the file unchanged.
    remember : callable, optional
        Told the digest of a file that had to be read, and its settings.
    on_progress : callable, optional
        Told the fraction of all logs that has been read. [-]

    Raises
    ------
    JobError
        The first log that cannot be used.
    """
    sizes = [path.stat().st_size if path.exists() else 0 for path in job.log_files]
    whole, before, digests = max(sum(sizes), 1), 0, []
    for path, size in zip(job.log_files, sizes, strict=True):
        tell = _share_teller(on_progress, before / whole, size / whole)
        name = Path(os.path.relpath(path, job.folder)).as_posix()
        said = repr((name, job.log, job.timezone))
        digest = recall(path, said) if recall else None
        if digest is None:
            digest = read_log(path, name=name, settings=job.log, timezone=job.timezone, on_progress=tell)
            if remember:
                remember(path, said, digest)
        digests.append(digest)
        before += size
    return tuple(digests)


def _share_teller(
    on_progress: Callable[[float], None] | None, done: float, share: float
) -> Callable[[float], None] | None:
    """Progress of one file as progress of all."""
    return (lambda fraction: on_progress(done + share * fraction)) if on_progress else None


def read_log(
    path: Path,
    *,
    name: str,
    settings: LogSettings,
    timezone: str,
    max_blocks: int = 4096,
    processes: int | None = None,
    on_progress: Callable[[float], None] | None = None,
) -> Digest:
    """The digest of one log.

    Parameters
    ----------
    path : Path
    name : str
        As it is named in the digest and in messages.
    settings : LogSettings
        What the job states goes before what is found.
    timezone : str
        Of stamps that carry no offset, as an IANA name.
    max_blocks : int
        Blocks double in width until no more than these hold a row.
    processes : int, optional
        That share a large file; by default as many as there are processors, where they can be had without a start of their own.
    on_progress : callable, optional
        Told the fraction of the file that has been read. [-]

    Returns
    -------
    Digest

    Raises
    ------
    JobError
        The file cannot be read, its shape is not understood, or no row of it can be used.
    """
    zone = _zone(timezone)
    file = look_at_file(path, name, settings.encoding)
    shape = find_shape(file, settings)
    stamps = _stamp_reader(file, shape, settings, zone)
    gathering = Gathering(max_blocks, _rows_expected(file, shape))
    bare = _Reading(name, shape, stamps, gathering, _good_words(settings))
    parts = _parts_of(file, shape, stamps, processes)
    if len(parts) > 1:
        together = _read_together(bare, file, parts, on_progress)
        if together is not None:
            return together.digest()
    return _read_part(bare, file, None, on_progress).digest()


def _rows_expected(file: LogFile, shape: LogShape) -> int:
    """About how many rows a wide log has, from the length of its first ones; 0 where its bytes do not tell."""
    if not file.is_plain or shape.is_long:
        return 0
    sample = file.sample()
    return file.path.stat().st_size * sample.count(b"\n") // max(len(sample), 1)


def _read_part(
    reading: _Reading, file: LogFile, span: tuple[int, int] | None, on_progress: Callable[[float], None] | None
) -> _Reading:
    """Read a log, or some whole lines of it, into a reading."""
    shape, clean = reading.shape, suits(reading.shape)
    for block, line in _line_blocks(file, shape, on_share=on_progress, span=span):
        if not (clean and reading.take_clean(block)):
            rows, faults, _ = cut_rows(block, line, shape)
            reading.take(rows, faults)
        reading.lines = line - 1 + block.count(b"\n")
    return reading


def _parts_of(file: LogFile, shape: LogShape, stamps: StampReader, processes: int | None) -> list[tuple[int, int]]:
    """Parts of a large file for processes to share; one where it is small, packed, long, or its clock repeats hours."""
    if not (file.is_plain and suits(shape) and stamps.clock.zone is UTC):
        return []
    wanted = processes if processes is not None else _processes_to_be_had()
    most = file.path.stat().st_size // LEAST_PART_BYTES
    return line_ranges(file, min(wanted, most)) if min(wanted, most) > 1 else []


def _processes_to_be_had() -> int:
    """Processors, where a process can be forked from one thread; else one: a start of its own would cost more than it brings."""
    if "fork" not in multiprocessing.get_all_start_methods() or threading.active_count() > 1:
        return 1
    return os.cpu_count() or 1


def _read_together(
    bare: _Reading, file: LogFile, parts: list[tuple[int, int]], on_progress: Callable[[float], None] | None
) -> _Reading | None:
    """Read the parts of a file in processes of their own; None where some stamp of one may stand in another."""
    context = multiprocessing.get_context("fork" if "fork" in multiprocessing.get_all_start_methods() else None)
    with ProcessPoolExecutor(len(parts) - 1, mp_context=context) as pool:
        waiting = [pool.submit(_read_part, bare, file, part, None) for part in parts[1:]]
        first = _read_part(copy.deepcopy(bare), file, parts[0], on_progress)
        others = [one.result() for one in waiting]
    for other in others:
        if other.row_count and not other.first_s > first.last_s:
            return None
        first.absorb(other)
    return first


def _zone(timezone: str) -> tzinfo:
    """The time zone of a job."""
    if timezone.upper() in ("UTC", "Z", "GMT"):
        return UTC
    try:
        return ZoneInfo(timezone)
    except (ZoneInfoNotFoundError, ValueError, OSError):
        problem = Problem(
            "job.toml, [job] timezone", "unknown time zone", timezone, "a name such as Europe/Berlin or UTC"
        )
        raise JobError([problem]) from None


def _good_words(settings: LogSettings) -> frozenset[str]:
    """Words of a good quality, in lower case."""
    return frozenset(word.strip().casefold() for word in settings.good or GOOD_QUALITY)


def _line_blocks(
    file: LogFile,
    shape: LogShape,
    *,
    size: int | None = None,
    on_share: Callable[[float], None] | None = None,
    span: tuple[int, int] | None = None,
) -> Iterator[tuple[bytes, int]]:
    """Lines of a log below its header, block by block, each with the number of its first line, counted from the top of a span."""
    line = 1
    if span is not None and span[0] > 0:
        shape = replace(shape, first_line=0)
    for block in file.blocks(size=size or BLOCK_BYTES, on_share=on_share, span=span):
        lines = block.count(b"\n")
        above = lines if line + lines <= shape.first_line else max(shape.first_line - line, 0)
        block = _without_lines(block, above)
        if block:
            yield block, line + above
        line += lines


def _without_lines(block: bytes, number: int) -> bytes:
    """A block without its first lines."""
    position = 0
    for _ in range(number):
        position = block.index(b"\n", position) + 1
    return block[position:]


def _stamp_cells(rows: Rows, shape: LogShape) -> NDArray[np.bytes_]:
    """Stamps of rows as they are written; a date and a time of day are put together."""
    first, *second = (rows.cells(position) for position in shape.stamp)
    for cells in second:
        first = np.strings.add(np.strings.add(first, b" "), cells)
    return first


def _stamp_reader(file: LogFile, shape: LogShape, settings: LogSettings, zone: tzinfo) -> StampReader:
    """Reads the stamps of a log, once the order of day and month is known."""
    clock = LocalClock(zone)
    if settings.stamp_format is not None:
        try:
            pattern = format_pattern(settings.stamp_format)
        except ValueError as error:
            expected = "directives such as %Y %m %d %H %M %S %f %z"
            problem = Problem("job.toml, [log] stamp_format", "unknown directive", str(error), expected)
            raise JobError([problem]) from None
        return StampReader(StampKind.STAMP, clock, pattern=pattern)
    day_first = settings.day_first
    if day_first is None and shape.stamp_kind in (StampKind.STAMP, StampKind.DATE):
        day_first = _find_day_first(file, shape)
    return StampReader(shape.stamp_kind, clock, day_first=day_first is not False)


def _find_day_first(file: LogFile, shape: LogShape) -> bool | None:
    """Whether dates such as 03/04/2026 have the day first; None where there are none that need it.

    Raises
    ------
    JobError
        The whole log does not say.
    """
    order = DayOrder()
    for block, line in _line_blocks(file, shape, size=SAMPLE_BYTES):
        rows, _, _ = cut_rows(block, line, shape)
        order.look(rows.cells(shape.stamp[0]))
        if not order.seen or order.day_first is not None:
            break
    if order.is_open:
        raise JobError(
            [
                Problem(
                    f"{file.name}, stamps",
                    "dates may have the day or the month first, and no row tells which",
                    order.example,
                    "[log] day_first = true or false in job.toml",
                )
            ]
        )
    return order.day_first


class _Seen:
    """Stamps of one log, or of one tag of it, as they come by."""

    def __init__(self) -> None:
        self._last, self._greatest = -np.inf, -np.inf
        self._recent: list[Array] = []
        self._held = 0

    def is_later(self, seconds: Array) -> bool:
        """Whether some stamps, in file order, rise and follow all that came before."""
        return bool(seconds[0] > self._greatest and (np.diff(seconds) > 0.0).all())

    def look(self, seconds: Array) -> tuple[Bools, Bools]:
        """Which of some stamps, in file order, came before, and which are earlier than the one above them."""
        backward = np.diff(seconds, prepend=self._last) < 0.0
        repeated = np.zeros(seconds.size, dtype=bool)
        if seconds.size == 0:
            return repeated, backward
        if seconds[0] <= self._greatest or (np.diff(seconds) <= 0.0).any():
            _, firsts = np.unique(seconds, return_index=True)
            repeated[:] = True
            repeated[firsts] = False
            old = np.flatnonzero(seconds <= self._greatest)
            repeated[old] |= np.isin(seconds[old], np.concatenate([*self._recent, np.zeros(0)]))
        self._last, self._greatest = float(seconds[-1]), max(self._greatest, float(seconds.max()))
        self._recent.append(seconds)
        self._held += seconds.size
        while self._held - self._recent[0].size >= MOST_STAMPS:
            self._held -= self._recent.pop(0).size
        return repeated, backward


@dataclass(slots=True)
class _Reading:
    """What has been read of one log so far."""

    name: str
    shape: LogShape
    stamps: StampReader
    gathering: Gathering
    good: frozenset[str]
    columns: list[str] = field(default_factory=list)
    units: list[str] = field(default_factory=list)
    rejected: list[int] = field(default_factory=list)
    rejects: list[Reject] = field(default_factory=list)
    reasons: dict[str, int] = field(default_factory=dict)
    row_count: int = 0
    first_s: float = np.inf
    last_s: float = -np.inf
    interval_s: float = 0.0
    lines: int = 0
    seen: dict[int, _Seen] = field(default_factory=dict)

    def __post_init__(self) -> None:
        """Take the columns of a wide log."""
        for column, unit in zip(self.shape.columns, self.shape.units, strict=True):
            self._column(column, unit)

    def _column(self, name: str, unit: str = "") -> int:
        """Number of a column, which is new."""
        self.columns.append(name)
        self.units.append(unit)
        self.rejected.append(0)
        return len(self.columns) - 1

    def take_clean(self, block: bytes) -> bool:
        """Take a block of which every cell is a number and every stamp later than the one before; False leaves it untaken."""
        rows = clean_rows(block, self.shape)
        if rows is None:
            return False
        clock = replace(self.stamps.clock)
        seconds = self.stamps.seconds(rows.stamps)
        seen = self.seen.setdefault(0, _Seen())
        if np.isnan(seconds).any() or not seen.is_later(seconds):
            self.stamps.clock = clock
            return False
        seen.look(seconds)
        self.row_count += seconds.size
        missing = np.isnan(rows.values)
        if missing.any():
            columns = [
                (column, seconds[~gap], row[~gap])
                for column, (row, gap) in enumerate(zip(rows.values, missing, strict=True))
            ]
            self._add(seconds, columns, seconds)
        else:
            self._see_stamps(seconds)
            self.gathering.add_whole(seconds, rows.values, self.interval_s)
        return True

    def take(self, rows: Rows, faults: list[Fault]) -> None:
        """Take one block of rows into account."""
        self.row_count += rows.lines.size + len(faults)
        notes = [_Note(fault.line, -1, "", fault.text, fault.why) for fault in faults]
        if rows.lines.size:
            seconds = self.stamps.seconds(_stamp_cells(rows, self.shape))
            self._note_unreadable(rows, seconds, notes)
            values, wrong = parse_values(rows, self.shape)
            wrong += self._spoil_poor(rows, values)
            take = self._take_long if self.shape.is_long else self._take_wide
            take(rows, seconds, values, wrong, notes)
        self._file(notes)

    def _note_unreadable(self, rows: Rows, seconds: Array, notes: list[_Note]) -> None:
        """Note rows whose stamp says no time; a line of delimiters alone is a blank line."""
        for row in np.flatnonzero(np.isnan(seconds)).tolist():
            if (rows.ends[row] == rows.starts[row]).all():
                self.row_count -= 1
                continue
            text = " ".join(rows.text(row, position) for position in self.shape.stamp)
            notes.append(_Note(int(rows.lines[row]), -1, "", text, "unreadable stamp"))

    def _spoil_poor(self, rows: Rows, values: Array) -> list[tuple[int, int, str]]:
        """Take out values of a quality that is not good; a blank quality says nothing against a value."""
        poor = []
        for place, position in enumerate(self.shape.values):
            if position not in self.shape.quality:
                continue
            kinds, inverse = np.unique(rows.cells(self.shape.quality[position]), return_inverse=True)
            words = [text_of(bytes(kind)) for kind in kinds]
            bad = np.array([bool(word) and word.casefold() not in self.good for word in words])[inverse]
            bad &= ~np.isnan(values[place])
            values[place, bad] = np.nan
            poor += [(int(row), place, f"quality is {words[inverse[row]]}") for row in np.flatnonzero(bad)]
        return poor

    def _look_at_order(self, rows: Rows, which: Ints, seconds: Array, key: int, notes: list[_Note]) -> Ints:
        """The rows that are not repeated; notes those that are, and those that go backward."""
        repeated, backward = self.seen.setdefault(key, _Seen()).look(seconds[which])
        for mask, why in ((repeated, "repeated stamp"), (backward & ~repeated, "stamp goes backward")):
            for row in which[mask].tolist():
                text = " ".join(rows.text(row, position) for position in self.shape.stamp)
                notes.append(_Note(int(rows.lines[row]), -1, "", text, why))
        return which[~repeated]

    def _take_wide(
        self, rows: Rows, seconds: Array, values: Array, wrong: list[tuple[int, int, str]], notes: list[_Note]
    ) -> None:
        """Take rows of one value a column."""
        kept = self._look_at_order(rows, np.flatnonzero(~np.isnan(seconds)), seconds, 0, notes)
        used = np.zeros(seconds.size, dtype=bool)
        used[kept] = True
        for row, place, why in wrong:
            if used[row]:
                notes.append(self._cell_note(rows, row, place, place, why))
        if (np.diff(seconds[kept]) < 0.0).any():
            kept = kept[np.argsort(seconds[kept], kind="stable")]
        times = seconds[kept]
        values = values[:, kept] if kept.size < seconds.size or (np.diff(kept) != 1).any() else values
        held = ~np.isnan(values)
        whole: Bools = np.all(held, axis=1)
        columns = [
            (column, times, row) if whole[column] else (column, times[held[column]], row[held[column]])
            for column, row in enumerate(values)
        ]
        self._add(times, columns, times)

    def _take_long(
        self, rows: Rows, seconds: Array, values: Array, wrong: list[tuple[int, int, str]], notes: list[_Note]
    ) -> None:
        """Take rows of one value a tag."""
        column = self._tags(rows, seconds, notes)
        good = ~np.isnan(seconds) & (column >= 0) & self._of_one_unit(rows, seconds, column, notes)
        kept_parts = [
            self._look_at_order(rows, np.flatnonzero(good & (column == key)), seconds, int(key), notes)
            for key in np.unique(column[good])
        ]
        kept = np.concatenate([*kept_parts, np.zeros(0, dtype=np.int64)])
        used = np.zeros(seconds.size, dtype=bool)
        used[kept] = True
        for row, place, why in wrong:
            if used[row]:
                notes.append(self._cell_note(rows, row, place, int(column[row]), why))
        kept = kept[np.lexsort((seconds[kept], column[kept]))]
        held = kept[~np.isnan(values[0, kept])]
        stamps = np.unique(seconds[kept])
        again, _ = self.seen.setdefault(-1, _Seen()).look(stamps)
        apart = np.where(np.diff(column[kept]) == 0, np.diff(seconds[kept]), np.nan)
        columns = [
            (int(key), seconds[rows_of], values[0, rows_of])
            for key in np.unique(column[held])
            for rows_of in (held[column[held] == key],)
        ]
        self._add(stamps[~again], columns, stamps, apart)

    def _tags(self, rows: Rows, seconds: Array, notes: list[_Note]) -> Ints:
        """Column of each row by its tag, -1 where it has none; new tags become new columns."""
        assert self.shape.tag is not None
        tags, firsts, inverse = np.unique(rows.cells(self.shape.tag), return_index=True, return_inverse=True)
        numbers = np.full(tags.size, -1, dtype=np.int64)
        known = {name: number for number, name in enumerate(self.columns)}
        for at in np.argsort(firsts):
            name = text_of(bytes(tags[at])).strip()
            if name:
                numbers[at] = known[name] if name in known else self._column(name)
        column: Ints = numbers[inverse]
        for row in np.flatnonzero((column < 0) & ~np.isnan(seconds)):
            notes.append(_Note(int(rows.lines[row]), -1, "", "", "no tag"))
        return column

    def _of_one_unit(self, rows: Rows, seconds: Array, column: Ints, notes: list[_Note]) -> Bools:
        """Whether each row is in the unit of the first row of its tag; notes those that are not."""
        same = np.ones(column.size, dtype=bool)
        if self.shape.unit is None:
            return same
        units, inverse = np.unique(rows.cells(self.shape.unit), return_inverse=True)
        words = [text_of(bytes(unit)) for unit in units]
        pairs = column * len(words) + inverse
        for pair in np.unique(pairs[(column >= 0) & ~np.isnan(seconds)]):
            key, word = int(pair) // len(words), words[int(pair) % len(words)]
            self.units[key] = self.units[key] or (word if key not in self.seen else "")
            if word != self.units[key]:
                same &= (pairs != pair) | np.isnan(seconds)
                for row in np.flatnonzero((pairs == pair) & ~np.isnan(seconds)):
                    notes.append(_Note(int(rows.lines[row]), -1, "", word, "unit is not that of the tag's first row"))
        return same

    def _cell_note(self, rows: Rows, row: int, place: int, column: int, why: str) -> _Note:
        """Note of a cell, counted for its column."""
        self.rejected[column] += 1
        position = self.shape.values[place]
        return _Note(int(rows.lines[row]), position, self.columns[column], (rows, row), why)

    def _add(
        self, row_s: Array, columns: Sequence[tuple[int, Array, Array]], stamps: Array, apart: Array | None = None
    ) -> None:
        """Hand rows and values on to the blocks."""
        if stamps.size == 0:
            return
        self._see_stamps(stamps, apart)
        self.gathering.add(row_s, columns, self.interval_s)

    def absorb(self, later: _Reading) -> None:
        """Take the reading of the lines that follow into account."""
        self.rejects += [replace(reject, line=reject.line + self.lines) for reject in later.rejects]
        del self.rejects[MOST_REJECTS:]
        for why, number in later.reasons.items():
            self.reasons[why] = self.reasons.get(why, 0) + number
        self.rejected = [mine + theirs for mine, theirs in zip(self.rejected, later.rejected, strict=True)]
        self.row_count, self.lines = self.row_count + later.row_count, self.lines + later.lines
        self.first_s, self.last_s = min(self.first_s, later.first_s), max(self.last_s, later.last_s)
        self.gathering.absorb(later.gathering)

    def _see_stamps(self, stamps: Array, apart: Array | None = None) -> None:
        """Note the first and last of some stamps, and, of the first ones, the time between them."""
        self.first_s, self.last_s = min(self.first_s, float(stamps.min())), max(self.last_s, float(stamps.max()))
        if not self.interval_s:
            steps = np.diff(stamps) if apart is None else apart
            steps = steps[steps > 0.0]
            self.interval_s = float(np.median(steps)) if steps.size else 1.0

    def _file(self, notes: list[_Note]) -> None:
        """Count the rejects of a block, and keep the first of them one by one."""
        notes.sort(key=lambda note: (note.line, note.field))
        for note in notes:
            self.reasons[note.why] = self.reasons.get(note.why, 0) + 1
        for note in notes[: MOST_REJECTS - len(self.rejects)]:
            self.rejects.append(
                Reject(file=self.name, line=note.line, column=note.column, text=note.words()[:40], why=note.why)
            )

    def digest(self) -> Digest:
        """What was read, as a digest.

        Raises
        ------
        JobError
            No row could be used.
        """
        if self.gathering.index.size == 0:
            raise JobError([self._no_row()])
        cells, index = self.gathering.cells(), self.gathering.index
        arrays = block_arrays(cells, index, len(self.columns))
        held = arrays["count"].any(axis=0) | (np.array(self.rejected) > 0)
        unnamed = np.array(self.shape.unnamed or [False] * len(self.columns), dtype=bool)
        kept = np.flatnonzero(held | ~unnamed)
        return Digest(
            file=self.name,
            columns=tuple(self.columns[at] for at in kept),
            units=tuple(self.units[at] for at in kept),
            width_s=self.gathering.width_s,
            index=index,
            rows=self.gathering.rows,
            first_s=self.first_s,
            last_s=self.last_s,
            rejected=np.array(self.rejected, dtype=np.int64)[kept],
            rejects=tuple(self.rejects),
            reject_count=sum(self.reasons.values()),
            row_count=self.row_count,
            reject_reasons=tuple(self.reasons.items()),
            **{name: array[:, kept] for name, array in arrays.items()},
        )

    def _no_row(self) -> Problem:
        """The problem of a log of which nothing can be used."""
        if not self.rejects:
            return Problem(self.name, "the log holds a header but no rows", "", "a row of readings a line")
        why, number = max(self.reasons.items(), key=lambda item: item[1])
        first = next(reject for reject in self.rejects if reject.why == why)
        found = f"{number} of {self.row_count} rows: {why}, the first in line {first.line}: {first.text!r}"
        return Problem(self.name, "no row of the log can be used", found, "rows with a stamp and a cell a column")


@dataclass(frozen=True, slots=True)
class _Note:
    """A reject on its way to being filed; the text of a cell is looked up only where it is kept."""

    line: int
    field: int
    column: str
    text: str | tuple[Rows, int]
    why: str

    def words(self) -> str:
        """What stands in the cell or row."""
        if isinstance(self.text, str):
            return self.text
        rows, row = self.text
        return rows.text(row, self.field)
