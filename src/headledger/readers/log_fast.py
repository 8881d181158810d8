"""The quick way through clean blocks of a wide log: plain numbers, one stamp of one width, nothing quoted, nothing rejected.

Whatever does not look exactly so is left to the thorough way; both give the same cells.
"""

from __future__ import annotations

import csv
import io
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from headledger.plant.digest import Cells
from headledger.readers.log_shape import LogShape

Array = NDArray[np.float64]
Ints = NDArray[np.int64]

MOST_STAMP_BYTES = 40
_ODD_BYTES = (b'"', b"\r", b"\0")
_FEED = 10


@dataclass(frozen=True, slots=True, kw_only=True)
class CleanRows:
    """Rows of a block in which every cell is a number or blank.

    Parameters
    ----------
    stamps : ndarray of bytes, shape (rows,)
    values : ndarray of float, shape (fields in the shape's `values`, rows)
        nan where a cell is blank.
    """

    stamps: NDArray[np.bytes_]
    values: Array


def suits(shape: LogShape) -> bool:
    """Whether a log's shape can have clean blocks."""
    return (
        not shape.is_long
        and not shape.quality
        and shape.decimal == "."
        and not shape.thousands
        and len(shape.stamp) == 1
    )


def clean_rows(block: bytes, shape: LogShape) -> CleanRows | None:
    """The rows of a clean block; None where some line of it needs a closer look.

    Parameters
    ----------
    block : bytes
        Whole lines, below the header.
    shape : LogShape
        One that `suits`.
    """
    if any(odd in block for odd in _ODD_BYTES):
        return None
    data = np.frombuffer(block, dtype=np.uint8)
    ends = np.flatnonzero(data == _FEED)
    delimiters = int(np.count_nonzero(data == ord(shape.delimiter)))
    if not ends.size or delimiters != ends.size * (shape.width - 1):
        return None
    stamps = _stamps(data, ends, shape)
    values = None if stamps is None else _values(block, shape)
    if stamps is None or values is None or values.shape[1] != ends.size:
        return None
    return CleanRows(stamps=stamps, values=values)


def _stamps(data: NDArray[np.uint8], ends: Ints, shape: LogShape) -> NDArray[np.bytes_] | None:
    """The first cell of every line, where all are of one width and hold no blank at their edges."""
    if shape.stamp[0] != 0:
        return None
    delimiter = ord(shape.delimiter)
    width = int(np.argmax(data[: MOST_STAMP_BYTES + 1] == delimiter))
    starts = np.concatenate(([0], ends[:-1] + 1))
    if width == 0 or int(ends[-1]) - int(starts[-1]) < width or (np.diff(ends) <= width).any():
        return None
    matrix = data[starts[:, None] + np.arange(width + 1)]
    text = matrix[:, :width]
    if (matrix[:, width] != delimiter).any() or (text == delimiter).any() or (text[:, [0, -1]] == 32).any():
        return None
    found: NDArray[np.bytes_] = np.ascontiguousarray(text).view(f"S{width}").reshape(-1)
    return found


def _values(block: bytes, shape: LogShape) -> Array | None:
    """Numbers of all value fields; None where a cell holds something else, or a line is longer than the others."""
    import pandas as pd

    try:
        frame = pd.read_csv(
            io.BytesIO(block),
            sep=shape.delimiter,
            header=None,
            usecols=list(shape.values),
            index_col=False,
            keep_default_na=False,
            na_values=[""],
            skip_blank_lines=False,
            lineterminator="\n",
            quoting=csv.QUOTE_NONE,
            low_memory=False,
        )
    except ValueError:
        return None
    if any(dtype.kind not in "iuf" for dtype in frame.dtypes):
        return None
    values = np.ascontiguousarray(frame.to_numpy(dtype=np.float64).T)
    return None if np.isinf(values).any() else values


def cells_of_rows(index: Ints, values: Array) -> Cells:
    """Statistics of all columns' values by block, where no value is missing.

    Parameters
    ----------
    index : ndarray of int64, shape (rows,)
        Block of each row, never falling.
    values : ndarray of float, shape (columns, rows)
        In order of time; at least one row.
    """
    columns, size = values.shape
    begins = np.ones(size, dtype=bool)
    np.not_equal(index[1:], index[:-1], out=begins[1:])
    starts = np.flatnonzero(begins)
    count = np.diff(starts, append=size)
    first, last = values[:, starts], values[:, starts + count - 1]
    with np.errstate(over="ignore", invalid="ignore"):
        # about each column's own first value, so that squares lose nothing to its level
        apart = values - values[:, :1]
        total = np.add.reduceat(apart, starts, axis=1)
        step = np.zeros_like(values)
        np.subtract(values[:, 1:], values[:, :-1], out=step[:, 1:])
        step[:, starts] = 0.0
        squares = np.add.reduceat(np.square(apart, out=apart), starts, axis=1) - total**2 / count
        mean = values[:, :1] + total / count
    longest, leading, trailing = _runs(step, starts)
    with np.errstate(over="ignore", invalid="ignore"):
        differences = np.add.reduceat(np.square(step, out=step), starts, axis=1)
    return Cells(
        column=np.repeat(np.arange(columns, dtype=np.int64), starts.size),
        index=np.tile(index[starts], columns),
        count=np.tile(count, columns),
        mean=mean.reshape(-1),
        square_sum=np.maximum(squares, 0.0).reshape(-1),
        first=first.reshape(-1),
        last=last.reshape(-1),
        least=np.minimum.reduceat(values, starts, axis=1).reshape(-1),
        greatest=np.maximum.reduceat(values, starts, axis=1).reshape(-1),
        difference_square_sum=differences.reshape(-1),
        longest_equal=longest.reshape(-1),
        leading_equal=leading.reshape(-1),
        trailing_equal=trailing.reshape(-1),
    )


def _runs(step: Array, starts: Ints) -> tuple[Ints, Ints, Ints]:
    """Longest, leading and trailing runs of equal values of every column and block."""
    found = np.ones((3, step.shape[0], starts.size), dtype=np.int64)
    moves = np.count_nonzero(step, axis=1)
    for column in np.flatnonzero(moves < step.shape[1] - starts.size):
        row = step[column]
        changes = row != 0.0
        changes[starts] = True
        runs = np.flatnonzero(changes)
        lengths = np.diff(runs, append=row.size)
        first = np.searchsorted(runs, starts)
        last = np.append(first[1:], runs.size) - 1
        found[0, column] = np.maximum.reduceat(lengths, first)
        found[1, column], found[2, column] = lengths[first], lengths[last]
    return found[0], found[1], found[2]
