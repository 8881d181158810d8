"""The digest: a log reduced once, in bounded memory, to statistics of blocks of time that merge."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, fields, replace
from typing import Any

import numpy as np
from numpy.typing import NDArray

MOST_REJECTS = 1000
"""As many rejects are kept one by one; all are counted."""


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

    Blocks lie on the grid of whole multiples of `width_s` since 1970-01-01 UTC and only blocks that hold a row are
    kept; widths are powers of two times one second, so that any two digests can be brought to a common grid by merging
    blocks. Array rows are blocks in time order, array columns are log columns.

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
        Rows of the log in the block that were used; of a long log, its distinct stamps.
    first_s, last_s : float
        Time of the first and last row, seconds since 1970-01-01 UTC. [s]
    count : ndarray of int64, shape (blocks, columns)
        Values used.
    mean, variance : ndarray of float, shape (blocks, columns)
        Of the values in the log's own unit; nan where `count` is 0. `variance` is the population one.
    first, last, least, greatest : ndarray of float, shape (blocks, columns)
    difference_variance : ndarray of float, shape (blocks, columns)
        Mean square of successive differences within the block, halved; nan where `count` is below 2.
    longest_equal, leading_equal, trailing_equal : ndarray of int64, shape (blocks, columns)
        Longest run of equal successive values within the block, and the runs that begin and end it.
    rejected : ndarray of int64, shape (columns,)
        Cells rejected, by column.
    rejects : tuple of Reject
        The first of them (at most 1,000), in file order.
    reject_count : int
        All of them, rows included.
    row_count : int
        Rows read, rejected ones included.
    reject_reasons : tuple of (str, int)
        Every reject counted by cause, in the order in which the causes first appeared.
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
    leading_equal: NDArray[np.int64]
    trailing_equal: NDArray[np.int64]
    rejected: NDArray[np.int64]
    rejects: tuple[Reject, ...] = ()
    reject_count: int = 0
    row_count: int = 0
    reject_reasons: tuple[tuple[str, int], ...] = ()


@dataclass(frozen=True, slots=True, kw_only=True)
class Cells:
    """Statistics of values by column and block, one entry a cell that holds a value; cells may repeat until `reduced`.

    Parameters
    ----------
    column, index : ndarray of int64
        Log column and block.
    count : ndarray of int64
    mean, square_sum : ndarray of float
        `square_sum` is of the deviations from the mean.
    first, last, least, greatest : ndarray of float
    difference_square_sum : ndarray of float
        Of successive values.
    longest_equal, leading_equal, trailing_equal : ndarray of int64
    """

    column: NDArray[np.int64]
    index: NDArray[np.int64]
    count: NDArray[np.int64]
    mean: NDArray[np.float64]
    square_sum: NDArray[np.float64]
    first: NDArray[np.float64]
    last: NDArray[np.float64]
    least: NDArray[np.float64]
    greatest: NDArray[np.float64]
    difference_square_sum: NDArray[np.float64]
    longest_equal: NDArray[np.int64]
    leading_equal: NDArray[np.int64]
    trailing_equal: NDArray[np.int64]


def no_cells() -> Cells:
    """Cells of nothing."""
    number, measure = np.zeros(0, dtype=np.int64), np.zeros(0)
    return Cells(
        column=number,
        index=number,
        count=number,
        mean=measure,
        square_sum=measure,
        first=measure,
        last=measure,
        least=measure,
        greatest=measure,
        difference_square_sum=measure,
        longest_equal=number,
        leading_equal=number,
        trailing_equal=number,
    )


def joined(parts: Sequence[Cells]) -> Cells:
    """All cells of some parts, earlier values in earlier parts, in order of column and block."""
    parts = parts or [no_cells()]
    arrays = {field.name: np.concatenate([getattr(part, field.name) for part in parts]) for field in fields(Cells)}
    order = np.lexsort((arrays["index"], arrays["column"]))
    return Cells(**{name: array[order] for name, array in arrays.items()})


def reduced(cells: Cells, ratio: int = 1) -> Cells:
    """Cells merged into blocks `ratio` times as wide, one a column and block.

    Parameters
    ----------
    cells : Cells
        In order of column and block; within a block in order of time.
    ratio : int
        A power of two.

    Returns
    -------
    Cells

    Notes
    -----
    Squares about a common mean add by the parallel-axis sum; each seam between two cells adds its own difference and
    may join the equal runs on either side of it.
    """
    if cells.index.size == 0:
        return cells
    index = cells.index // ratio
    begins = np.ones(index.size, dtype=bool)
    begins[1:] = (index[1:] != index[:-1]) | (cells.column[1:] != cells.column[:-1])
    starts = np.flatnonzero(begins)
    ends = np.append(starts[1:], index.size) - 1
    count = np.add.reduceat(cells.count, starts)
    with np.errstate(over="ignore", invalid="ignore"):
        mean = np.add.reduceat(cells.count * cells.mean, starts) / count
        apart = cells.mean - np.repeat(mean, ends - starts + 1)
        square_sum = np.add.reduceat(cells.square_sum + cells.count * apart**2, starts)
        seam = np.where(begins, 0.0, cells.first - np.roll(cells.last, 1))
        difference_square_sum = np.add.reduceat(cells.difference_square_sum + seam**2, starts)
    longest, leading, trailing = _joined_runs(cells, begins, starts, ends)
    return Cells(
        column=cells.column[starts],
        index=index[starts],
        count=count,
        mean=mean,
        square_sum=square_sum,
        first=cells.first[starts],
        last=cells.last[ends],
        least=np.minimum.reduceat(cells.least, starts),
        greatest=np.maximum.reduceat(cells.greatest, starts),
        difference_square_sum=difference_square_sum,
        longest_equal=longest,
        leading_equal=leading,
        trailing_equal=trailing,
    )


def _joined_runs(
    cells: Cells, begins: NDArray[np.bool_], starts: NDArray[np.int64], ends: NDArray[np.int64]
) -> tuple[NDArray[np.int64], NDArray[np.int64], NDArray[np.int64]]:
    """Longest, leading and trailing equal runs of merged cells.

    Each cell stands for the run that begins it and the run that ends it; of a constant cell these are one, its second
    entry is empty. Runs that meet at a seam with one value are added up.
    """
    constant = cells.leading_equal == cells.count
    lengths = np.stack([cells.leading_equal, np.where(constant, 0, cells.trailing_equal)], axis=1).ravel()
    meets = ~begins & (cells.first == np.roll(cells.last, 1))
    breaks = np.stack([~meets, ~constant], axis=1).ravel()
    run_starts = np.flatnonzero(breaks)
    runs = np.add.reduceat(lengths, run_starts)
    run_of = np.cumsum(breaks) - 1
    seam_longest = np.maximum.reduceat(runs, run_of[2 * starts])
    longest = np.maximum(np.maximum.reduceat(cells.longest_equal, starts), seam_longest)
    return longest, runs[run_of[2 * starts]], runs[run_of[2 * ends + 1]]


def cells_of(digest: Digest) -> Cells:
    """The cells of a digest that hold a value."""
    column, row = np.nonzero(digest.count.T)
    count = digest.count[row, column]
    differences = 2.0 * (count - 1)
    return Cells(
        column=column.astype(np.int64),
        index=digest.index[row],
        count=count,
        mean=digest.mean[row, column],
        square_sum=digest.variance[row, column] * count,
        first=digest.first[row, column],
        last=digest.last[row, column],
        least=digest.least[row, column],
        greatest=digest.greatest[row, column],
        difference_square_sum=np.where(count > 1, digest.difference_variance[row, column] * differences, 0.0),
        longest_equal=digest.longest_equal[row, column],
        leading_equal=digest.leading_equal[row, column],
        trailing_equal=digest.trailing_equal[row, column],
    )


def block_arrays(cells: Cells, index: NDArray[np.int64], columns: int) -> dict[str, Any]:
    """The arrays of a digest by name, shape (blocks, columns).

    Parameters
    ----------
    cells : Cells
        Reduced.
    index : ndarray of int64
        Every block that holds a row, in order.
    columns : int
        How many the log has.
    """
    at = (np.searchsorted(index, cells.index), cells.column)

    def spread(values: NDArray[Any], empty: float) -> NDArray[Any]:
        array = np.full((index.size, columns), empty, dtype=values.dtype)
        array[at] = values
        return array

    differences = np.maximum(2.0 * (cells.count - 1), 1.0)
    return {
        "mean": spread(cells.mean, np.nan),
        "variance": spread(cells.square_sum / cells.count, np.nan),
        "difference_variance": spread(
            np.where(cells.count > 1, cells.difference_square_sum / differences, np.nan), np.nan
        ),
        **{name: spread(getattr(cells, name), np.nan) for name in ("first", "last", "least", "greatest")},
        **{
            name: spread(getattr(cells, name), 0)
            for name in ("count", "longest_equal", "leading_equal", "trailing_equal")
        },
    }


def width_ratio(width_s: float, wider_s: float) -> int:
    """How many blocks of one width make one of a wider.

    Raises
    ------
    ValueError
        Not a whole power of two.
    """
    ratio = wider_s / width_s
    if ratio < 1.0 or ratio != int(ratio) or int(ratio) & (int(ratio) - 1):
        raise ValueError(f"blocks of {width_s:g} s do not make blocks of {wider_s:g} s: not a power of two apart")
    return int(ratio)


def coarsened(digest: Digest, width_s: float) -> Digest:
    """The same digest in wider blocks.

    Parameters
    ----------
    digest : Digest
    width_s : float
        At least the digest's own, a power of two apart. [s]

    Returns
    -------
    Digest

    Raises
    ------
    ValueError
        A width that cannot be made of the digest's.
    """
    ratio = width_ratio(digest.width_s, width_s)
    if ratio == 1:
        return digest
    index, inverse = np.unique(digest.index // ratio, return_inverse=True)
    return replace(
        digest,
        width_s=width_s,
        index=index,
        rows=np.bincount(inverse, digest.rows, index.size).astype(np.int64),
        **block_arrays(reduced(cells_of(digest), ratio), index, len(digest.columns)),
    )


def merged(a: Digest, b: Digest) -> Digest:
    """One digest of two pieces of a log; where they share a block, `a` is the earlier.

    Parameters
    ----------
    a, b : Digest
        Of whatever widths; the result has the wider, the columns of `a` and then those that only `b` has.

    Returns
    -------
    Digest
    """
    width_s = max(a.width_s, b.width_s)
    a, b = coarsened(a, width_s), coarsened(b, width_s)
    columns = a.columns + tuple(name for name in b.columns if name not in a.columns)
    index, inverse = np.unique(np.concatenate([a.index, b.index]), return_inverse=True)
    theirs = np.array([columns.index(name) for name in b.columns], dtype=np.int64)
    others = cells_of(b)
    cells = reduced(joined([cells_of(a), replace(others, column=theirs[others.column])]))
    rejected = np.zeros(len(columns), dtype=np.int64)
    rejected[: len(a.columns)] += a.rejected
    rejected[theirs] += b.rejected
    reasons = dict(a.reject_reasons)
    for why, number in b.reject_reasons:
        reasons[why] = reasons.get(why, 0) + number
    units = dict(zip(b.columns, b.units, strict=True)) | {
        name: unit for name, unit in zip(a.columns, a.units, strict=True) if unit
    }
    return replace(
        a,
        columns=columns,
        units=tuple(units.get(name, "") for name in columns),
        width_s=width_s,
        index=index,
        rows=np.bincount(inverse, np.concatenate([a.rows, b.rows]), index.size).astype(np.int64),
        first_s=min(a.first_s, b.first_s),
        last_s=max(a.last_s, b.last_s),
        rejected=rejected,
        rejects=(a.rejects + b.rejects)[:MOST_REJECTS],
        reject_count=a.reject_count + b.reject_count,
        row_count=a.row_count + b.row_count,
        reject_reasons=tuple(reasons.items()),
        **block_arrays(cells, index, len(columns)),
    )


def common_grid(digests: Sequence[Digest]) -> tuple[Digest, ...]:
    """All digests at the width of the widest."""
    if not digests:
        return ()
    width_s = max(digest.width_s for digest in digests)
    return tuple(coarsened(digest, width_s) for digest in digests)
