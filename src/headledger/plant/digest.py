"""The digest: a log reduced once, in bounded memory, to statistics of blocks of time that merge."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray


@dataclass(frozen=True, slots=True, kw_only=True)
class Reject:
    """A cell or row of a log that could not be used.

    Parameters
    ----------
    file : str
    line : int
        Physical line of the file, the first is 1.
    column : str
        Empty where the whole row was rejected.
    text : str
        As written, cut at 40 characters.
    why : str
    """

    file: str
    line: int
    column: str
    text: str
    why: str


@dataclass(frozen=True, slots=True, kw_only=True)
class Digest:
    """One log file by blocks of time.

    Blocks lie on the grid of whole multiples of `width_s` since 1970-01-01 UTC and only blocks that hold a row are kept; widths
    are powers of two times one second, so that any two digests can be brought to a common grid by merging blocks.
    Array rows are blocks in time order, array columns are log columns.

    Parameters
    ----------
    file : str
        Name of the log, relative to the job folder.
    columns : tuple of str
        Names as the header gives them, without the unit.
    units : tuple of str
        Unit text of each column from header or units row; empty where none was given.
    width_s : float
        [s]
    index : ndarray of int64, shape (blocks,)
        ``floor(time / width_s)`` of each block.
    rows : ndarray of int64, shape (blocks,)
        Rows of the log in the block.
    first_s, last_s : float
        Time of the first and last row, seconds since 1970-01-01 UTC. [s]
    count : ndarray of int64, shape (blocks, columns)
        Values used.
    mean, variance : ndarray of float, shape (blocks, columns)
        Of the values in the log's own unit; nan where `count` is 0. `variance` is the population one.
    first, last, least, greatest : ndarray of float, shape (blocks, columns)
    difference_variance : ndarray of float, shape (blocks, columns)
        Mean square of successive differences within the block, halved.
    longest_equal : ndarray of int64, shape (blocks, columns)
        Longest run of equal successive values within the block.
    rejected : ndarray of int64, shape (columns,)
        Cells rejected, by column.
    rejects : tuple of Reject
        The first of them (at most 1,000), in file order.
    reject_count : int
        All of them, rows included.
    row_count : int
        Rows read, rejected ones included.
    """

    file: str
    columns: tuple[str, ...]
    units: tuple[str, ...]
    width_s: float
    index: NDArray[np.int64]
    rows: NDArray[np.int64]
    first_s: float
    last_s: float
    count: NDArray[np.int64]
    mean: NDArray[np.float64]
    variance: NDArray[np.float64]
    first: NDArray[np.float64]
    last: NDArray[np.float64]
    least: NDArray[np.float64]
    greatest: NDArray[np.float64]
    difference_variance: NDArray[np.float64]
    longest_equal: NDArray[np.int64]
    rejected: NDArray[np.int64]
    rejects: tuple[Reject, ...] = ()
    reject_count: int = 0
    row_count: int = 0
