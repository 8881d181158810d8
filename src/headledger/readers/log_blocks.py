"""From bytes of a log to statistics of blocks: rows cut, numbers parsed, values gathered by column and block."""

from __future__ import annotations

import csv
import io
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from headledger.plant.digest import Cells, joined, reduced
from headledger.readers.log_fast import cells_of_rows
from headledger.readers.log_files import text_of
from headledger.readers.log_shape import EMPTY_WORDS, LogShape, split_line

Array = NDArray[np.float64]
Ints = NDArray[np.int64]

MOST_CELL_BYTES = 64
"""Of a stamp, a tag or a quality; the rest of a longer cell is not looked at. [B]"""


@dataclass(frozen=True, slots=True)
class Fault:
    """A row or cell that cannot be used: its line, the field (-1 for the row), what stands there and why."""

    line: int
    field: int
    text: str
    why: str


@dataclass(frozen=True, slots=True, kw_only=True)
class Rows:
    """Rows of one block, all of the same number of fields.

    Parameters
    ----------
    block : bytes
        The lines of these rows and no others.
    lines : ndarray of int64
        Physical line of each row.
    starts, ends : ndarray of int64, shape (rows, fields)
        Where each cell stands in the block.
    """

    block: bytes
    lines: Ints
    starts: Ints
    ends: Ints

    def cells(self, position: int) -> NDArray[np.bytes_]:
        """Bytes of one field, without quotes and blanks around them."""
        starts, sizes = self.starts[:, position], self.ends[:, position] - self.starts[:, position]
        width = int(min(max(sizes.max(initial=1), 1), MOST_CELL_BYTES))
        data = np.frombuffer(self.block, dtype=np.uint8)
        reach = np.arange(width)
        matrix = data[np.minimum(starts[:, None] + reach, data.size - 1)]
        matrix[reach >= sizes[:, None]] = 0
        cells: NDArray[np.bytes_] = matrix.reshape(-1).view(f"S{width}")
        edges = matrix[:, 0], data[np.maximum(self.ends[:, position] - 1, 0)]
        if any(np.isin(edge, (32, 34)).any() for edge in edges):
            cells = np.strings.strip(cells, b'" ')
        return cells

    def text(self, row: int, position: int) -> str:
        """Text of one cell, without quotes around it."""
        return text_of(self.block[self.starts[row, position] : self.ends[row, position]]).strip().strip('"').strip()


def cut_rows(block: bytes, first_line: int, shape: LogShape) -> tuple[Rows, list[Fault], int]:
    """Rows of a block, the faults of lines that are none, and how many lines the block has.

    Parameters
    ----------
    block : bytes
        Whole lines.
    first_line : int
        Physical number of its first line.
    shape : LogShape
    """
    data = np.frombuffer(block, dtype=np.uint8)
    ends = np.flatnonzero(data == 10)
    starts = np.concatenate(([0], ends[:-1] + 1))
    marks = _marks(block, data, starts, shape.delimiter)
    number = np.diff(np.searchsorted(marks, ends), prepend=0)
    bad = number != shape.width - 1
    if b'"' in block:
        bad |= _odd_quotes(data, starts, shape.delimiter)
    for sign in (0, 13):
        if sign in block:
            bad |= np.add.reduceat(data == sign, starts, dtype=np.int64) > 0
    if not bad.any():
        lines = np.arange(first_line, first_line + ends.size)
        edge = marks.reshape(ends.size, shape.width - 1)
        spans = np.hstack([starts[:, None], edge + 1]), np.hstack([edge, ends[:, None]])
        return Rows(block=block, lines=lines, starts=spans[0], ends=spans[1]), [], ends.size
    kept, numbers, faults = _mended(block.split(b"\n")[:-1], bad, first_line, shape)
    if not kept:
        nothing = np.zeros((0, shape.width), dtype=np.int64)
        return Rows(block=b"", lines=np.zeros(0, dtype=np.int64), starts=nothing, ends=nothing), faults, ends.size
    rows, _, _ = cut_rows(b"\n".join(kept) + b"\n", 0, shape)
    return Rows(block=rows.block, lines=np.array(numbers), starts=rows.starts, ends=rows.ends), faults, ends.size


def _quoted(data: NDArray[np.uint8], starts: Ints) -> NDArray[np.bool_]:
    """Bytes that stand inside quotes, or open them; each line begins outside."""
    quotes = np.cumsum(data == 34)
    before = np.where(starts > 0, quotes[np.maximum(starts - 1, 0)], 0)
    inside: NDArray[np.bool_] = (quotes - np.repeat(before, np.diff(np.append(starts, data.size)))) % 2 == 1
    return inside


def _marks(block: bytes, data: NDArray[np.uint8], starts: Ints, delimiter: str) -> Ints:
    """Places of the delimiters that stand outside quotes."""
    found = data == ord(delimiter)
    if b'"' in block:
        found &= ~_quoted(data, starts)
    return np.flatnonzero(found)


def _odd_quotes(data: NDArray[np.uint8], starts: Ints, delimiter: str) -> NDArray[np.bool_]:
    """Lines in which a quote stands within a cell or is not closed."""
    opening = np.flatnonzero((data == 34) & _quoted(data, starts))
    before = np.where(opening > 0, data[np.maximum(opening - 1, 0)], 10)
    within = opening[~np.isin(before, (10, 34, ord(delimiter)))]
    odd: NDArray[np.bool_] = np.add.reduceat(data == 34, starts, dtype=np.int64) % 2 == 1
    odd[np.searchsorted(starts, within, side="right") - 1] = True
    return odd


def _mended(
    lines: Sequence[bytes], bad: NDArray[np.bool_], first_line: int, shape: LogShape
) -> tuple[list[bytes], list[int], list[Fault]]:
    """Lines that are rows, with their numbers, and the faults of the others; blank lines are neither."""
    kept, numbers, faults = [], [], []
    for at, (line, doubtful) in enumerate(zip(lines, bad.tolist(), strict=True)):
        if doubtful:
            mended = _mended_line(line, first_line + at, shape)
            if isinstance(mended, Fault):
                faults.append(mended)
                continue
            line = mended
        if line:
            kept.append(line)
            numbers.append(first_line + at)
    return kept, numbers, faults


def _mended_line(line: bytes, number: int, shape: LogShape) -> bytes | Fault:
    """A line brought to the width of the log where nothing is lost by it; empty where the line is blank."""
    if b"\0" in line:
        return Fault(number, -1, text_of(line.replace(b"\0", b""))[:40], "zero bytes")
    text = text_of(line).replace("\r", "")
    if not text.strip():
        return b""
    cells = split_line(text, shape.delimiter)
    if len(cells) < shape.needed:
        return Fault(number, -1, text[:40], "too few cells")
    if any(cell.strip() for cell in cells[shape.width :]):
        return Fault(number, -1, text[:40], "too many cells")
    cells = cells[: shape.width] + [""] * (shape.width - len(cells))
    out = io.StringIO()
    csv.writer(out, delimiter=shape.delimiter, lineterminator="").writerow(cells)
    return out.getvalue().encode()


def parse_values(rows: Rows, shape: LogShape) -> tuple[Array, list[tuple[int, int, str]]]:
    """Numbers of a block's value fields, and the cells that hold none though they are not blank.

    Returns
    -------
    values : ndarray of float, shape (fields in `shape.values`, rows)
        nan where a cell is blank or no number.
    faults : list of (int, int, str)
        Row, place in `shape.values`, and why.
    """
    import pandas as pd

    frame = pd.read_csv(
        io.BytesIO(rows.block),
        sep=shape.delimiter,
        header=None,
        usecols=list(shape.values),
        index_col=False,
        decimal=shape.decimal,
        thousands=shape.thousands or None,
        keep_default_na=False,
        na_values=["", "nan", "NaN", "NAN", "null", "NULL", "Null"],
        skip_blank_lines=False,
        lineterminator="\n",
        quoting=csv.QUOTE_MINIMAL if b'"' in rows.block else csv.QUOTE_NONE,
        low_memory=False,
        encoding="latin-1",
    )
    values = np.empty((len(shape.values), rows.lines.size))
    faults: list[tuple[int, int, str]] = []
    for place, position in enumerate(shape.values):
        column = frame[position]
        if column.dtype.kind in "iuf":
            values[place] = column.to_numpy(dtype=np.float64)
        else:
            texts = column.astype(str) if column.dtype.kind == "b" else column
            if shape.decimal != "." or shape.thousands:
                texts = texts.map(lambda cell: _english(str(cell), shape), na_action="ignore")
            values[place] = pd.to_numeric(texts, errors="coerce").to_numpy(dtype=np.float64)
            wrong = np.flatnonzero(np.isnan(values[place]) & column.notna().to_numpy())
            faults += [(int(row), place, "not a number") for row in wrong if not _is_blank(str(column[row]))]
        endless = np.flatnonzero(np.isinf(values[place]))
        faults += [(int(row), place, "not finite") for row in endless]
        values[place, endless] = np.nan
    return values, faults


def _is_blank(cell: str) -> bool:
    """Whether a cell says that there is no value."""
    return cell.strip().lower() in EMPTY_WORDS


def _english(cell: str, shape: LogShape) -> str:
    """A number with a decimal point and without groups; one with the other decimal mark is made no number."""
    if shape.thousands:
        cell = cell.replace(shape.thousands, "")
    return cell if shape.decimal == "." else cell.replace(".", "x").replace(shape.decimal, ".")


def cells_of_column(column: int, index: Ints, values: Array) -> Cells:
    """Statistics of one column's values by block.

    Parameters
    ----------
    column : int
    index : ndarray of int64
        Block of each value, never falling.
    values : ndarray of float
        In order of time; at least one.
    """
    size = values.size
    begins = np.ones(size, dtype=bool)
    np.not_equal(index[1:], index[:-1], out=begins[1:])
    starts = np.flatnonzero(begins)
    count = np.diff(starts, append=size)
    ends = starts + count - 1
    step = np.zeros(size)
    with np.errstate(over="ignore", invalid="ignore"):
        mean = np.add.reduceat(values, starts) / count
        np.subtract(values[1:], values[:-1], out=step[1:])
        step[starts] = 0.0
        apart = values - np.repeat(mean, count)
        square_sum, step_sum = np.add.reduceat(apart * apart, starts), np.add.reduceat(step * step, starts)
    changes = step != 0.0
    changes[starts] = True
    runs = np.flatnonzero(changes)
    lengths = np.diff(runs, append=size)
    first_run = np.searchsorted(runs, starts)
    last_run = np.append(first_run[1:], runs.size) - 1
    return Cells(
        column=np.full(starts.size, column, dtype=np.int64),
        index=index[starts],
        count=count,
        mean=mean,
        square_sum=square_sum,
        first=values[starts],
        last=values[ends],
        least=np.minimum.reduceat(values, starts),
        greatest=np.maximum.reduceat(values, starts),
        difference_square_sum=step_sum,
        longest_equal=np.maximum.reduceat(lengths, first_run),
        leading_equal=lengths[first_run],
        trailing_equal=lengths[last_run],
    )


class Gathering:
    """Cells of a whole log in bounded memory: the width doubles whenever more than `max_blocks` blocks hold a row.

    Parameters
    ----------
    max_blocks : int
    rows_expected : int
        A guess, so that the first blocks are not narrower than they can stay; 0 where nothing is known.
    """

    def __init__(self, max_blocks: int, rows_expected: int = 0) -> None:
        self.max_blocks = max_blocks
        self._first_doublings = max(int(np.log2(max(rows_expected, 1) / max_blocks)), 0)
        self.width_s = 0.0
        self.index: Ints = np.zeros(0, dtype=np.int64)
        self.rows: Ints = np.zeros(0, dtype=np.int64)
        self._parts: list[Cells] = []
        self._held = 0
        self._most_held = 500_000

    def add(self, row_s: Array, columns: Sequence[tuple[int, Array, Array]], interval_s: float) -> None:
        """Take some rows and their values into account, column by column.

        Parameters
        ----------
        row_s : ndarray of float
            Times of the rows, in order. [s]
        columns : sequence of (int, ndarray of float, ndarray of float)
            Number of a column, times of its values in order, and the values. [s], in the log's unit
        interval_s : float
            Between rows; decides the first width. [s]
        """
        at = self._blocks_of(row_s, interval_s)
        cells = [
            cells_of_column(column, at if time_s is row_s else np.floor(time_s / self.width_s).astype(np.int64), values)
            for column, time_s, values in columns
            if values.size
        ]
        if cells:
            self._hold(joined(cells))

    def add_whole(self, row_s: Array, values: Array, interval_s: float) -> None:
        """Take rows into account of which no value is missing, `values` of shape (columns, rows)."""
        self._hold(cells_of_rows(self._blocks_of(row_s, interval_s), values))

    def _blocks_of(self, row_s: Array, interval_s: float) -> Ints:
        """Block of each row, wide enough that all blocks stay few; the rows are counted."""
        if not self.width_s:
            # A hair wider, for stamps that carry the rounding of a float.
            self.width_s = float(2.0 ** (np.floor(np.log2(interval_s * (1.0 + 1e-6))) + self._first_doublings))
        at = np.floor(row_s / self.width_s).astype(np.int64)
        at = at >> self._fit(at)
        begins = np.flatnonzero(np.diff(at, prepend=at[:1] - 1))
        index, rows = at[begins], np.diff(begins, append=at.size)
        if self.index.size and index.size and index[0] < self.index[-1]:
            merged, inverse = np.unique(np.concatenate([self.index, index]), return_inverse=True)
            self.rows = np.bincount(inverse, np.concatenate([self.rows, rows]), merged.size).astype(np.int64)
            self.index = merged
            return at
        again = int(bool(self.index.size and index.size and index[0] == self.index[-1]))
        if again:
            self.rows = np.append(self.rows[:-1], self.rows[-1] + rows[0])
        self.index, self.rows = np.append(self.index, index[again:]), np.append(self.rows, rows[again:])
        return at

    def absorb(self, later: Gathering) -> None:
        """Take blocks into account that were gathered of later rows."""
        if not later.index.size:
            return
        self.width_s = self.width_s or later.width_s
        wide = max(self.width_s, later.width_s)
        theirs = later.index >> round(np.log2(wide / later.width_s))
        cells = reduced(later.cells(), round(wide / later.width_s))
        self._widen(round(np.log2(wide / self.width_s)))
        doublings = self._fit(theirs)
        theirs, cells = theirs >> doublings, reduced(cells, 2**doublings)
        self.index, inverse = np.unique(np.concatenate([self.index, theirs]), return_inverse=True)
        self.rows = np.bincount(inverse, np.concatenate([self.rows, later.rows]), self.index.size).astype(np.int64)
        self._hold(cells)

    def _hold(self, cells: Cells) -> None:
        """Keep some cells, merged with the others now and then."""
        self._parts.append(cells)
        self._held += cells.index.size
        if len(self._parts) > 1 and self._held > self._most_held:
            self._parts = [self.cells()]
            self._held = self._parts[0].index.size
            self._most_held = max(500_000, 2 * self._held)

    def _fit(self, at: Ints) -> int:
        """Double the width until all blocks are few enough; how often that was."""
        if (
            at.size
            and at[-1] - (self.index[0] if self.index.size else at[0]) < self.max_blocks
            and (at[0] >= self.index[:1]).all()
        ):
            return 0
        doublings, index = 0, np.union1d(self.index, at)
        while index.size > self.max_blocks:
            doublings, index = doublings + 1, np.unique(index >> 1)
        self._widen(doublings)
        return doublings

    def _widen(self, doublings: int) -> None:
        """Double the width so many times."""
        if doublings:
            self.width_s *= 2.0**doublings
            self.index, inverse = np.unique(self.index >> doublings, return_inverse=True)
            self.rows = np.bincount(inverse, self.rows, self.index.size).astype(np.int64)
            self._parts = [reduced(part, 2**doublings) for part in self._parts]
            self._held = sum(part.index.size for part in self._parts)

    def cells(self) -> Cells:
        """One cell a column and block."""
        return reduced(joined(self._parts))
