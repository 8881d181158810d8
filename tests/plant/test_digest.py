"""A digest of a whole is the merge of the digests of its pieces, at any width."""

from __future__ import annotations

import math
from itertools import groupby, pairwise
from typing import Any

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from headledger.plant.digest import (
    Cells,
    Digest,
    Reject,
    block_arrays,
    coarsened,
    common_grid,
    joined,
    merged,
)

ARRAYS = ("mean", "variance", "first", "last", "least", "greatest", "difference_variance")
COUNTS = ("index", "rows", "count", "longest_equal", "leading_equal", "trailing_equal", "rejected")
Row = tuple[int, tuple[float | None, ...]]


def digest_by_hand(rows: list[Row], width_s: float, columns: int) -> Digest:
    """A digest from its definition, a block and a column at a time, in plain Python."""
    blocks: dict[int, list[Row]] = {}
    for row in rows:
        blocks.setdefault(math.floor(row[0] / width_s), []).append(row)
    cells = [
        cell_by_hand(column, index, [row[1][column] for row in blocks[index] if row[1][column] is not None])
        for column in range(columns)
        for index in sorted(blocks)
        if any(row[1][column] is not None for row in blocks[index])
    ]
    index = np.array(sorted(blocks), dtype=np.int64)
    return Digest(
        file="log.csv",
        columns=tuple(f"PT-{column}" for column in range(columns)),
        units=("bar",) * columns,
        width_s=width_s,
        index=index,
        rows=np.array([len(blocks[block]) for block in sorted(blocks)], dtype=np.int64),
        first_s=float(rows[0][0]),
        last_s=float(rows[-1][0]),
        rejected=np.zeros(columns, dtype=np.int64),
        row_count=len(rows),
        **block_arrays(joined(cells), index, columns),
    )


def cell_by_hand(column: int, index: int, values: list) -> Cells:
    runs = [len(list(run)) for _, run in groupby(values)]
    mean = math.fsum(values) / len(values)
    numbers = {
        "column": column,
        "index": index,
        "count": len(values),
        "mean": mean,
        "square_sum": math.fsum((value - mean) ** 2 for value in values),
        "first": values[0],
        "last": values[-1],
        "least": min(values),
        "greatest": max(values),
        "difference_square_sum": math.fsum((b - a) ** 2 for a, b in pairwise(values)),
        "longest_equal": max(runs),
        "leading_equal": runs[0],
        "trailing_equal": runs[-1],
    }
    arrays: dict[str, Any] = {name: np.array([number]) for name, number in numbers.items()}
    return Cells(**arrays)


def assert_same(found: Digest, expected: Digest) -> None:
    """Equal to rounding: values here are below 100, so 1e-9 is far above it and far below any error of method."""
    assert found.width_s == expected.width_s
    assert (found.columns, found.units, found.row_count) == (expected.columns, expected.units, expected.row_count)
    assert (found.first_s, found.last_s) == (expected.first_s, expected.last_s)
    for name in COUNTS:
        np.testing.assert_array_equal(getattr(found, name), getattr(expected, name), err_msg=name)
    for name in ARRAYS:
        np.testing.assert_allclose(getattr(found, name), getattr(expected, name), rtol=0, atol=1e-9, err_msg=name)


# Few values, so that equal ones often meet; blank cells among them.
value = st.one_of(st.none(), st.sampled_from([0.0, 1.5, 1.5, 2.25]), st.floats(-99.0, 99.0))


@st.composite
def logs(draw: st.DrawFn) -> list[Row]:
    steps = draw(st.lists(st.integers(1, 9), min_size=2, max_size=40))
    start = draw(st.integers(-50, 50))
    times = np.cumsum([start, *steps]).tolist()
    return [(time, draw(st.tuples(value, value))) for time in times]


@given(rows=logs(), data=st.data(), width=st.sampled_from([1.0, 2.0, 8.0]))
def test_merge_of_pieces_is_digest_of_whole(rows: list[Row], data: st.DataObject, width: float) -> None:
    cut = data.draw(st.integers(1, len(rows) - 1))
    pieces = digest_by_hand(rows[:cut], width, 2), digest_by_hand(rows[cut:], width, 2)
    assert_same(merged(*pieces), digest_by_hand(rows, width, 2))


@given(rows=logs(), data=st.data())
def test_merge_is_associative(rows: list[Row], data: st.DataObject) -> None:
    first = data.draw(st.integers(1, len(rows) - 2))
    second = data.draw(st.integers(first + 1, len(rows) - 1))
    a, b, c = (digest_by_hand(part, 4.0, 2) for part in (rows[:first], rows[first:second], rows[second:]))
    assert_same(merged(merged(a, b), c), merged(a, merged(b, c)))


@given(rows=logs(), ratio=st.sampled_from([2, 4, 16]))
def test_coarsened_is_digest_at_that_width(rows: list[Row], ratio: int) -> None:
    assert_same(coarsened(digest_by_hand(rows, 0.5, 2), 0.5 * ratio), digest_by_hand(rows, 0.5 * ratio, 2))


@given(rows=logs(), data=st.data())
def test_coarsening_commutes_with_merging(rows: list[Row], data: st.DataObject) -> None:
    cut = data.draw(st.integers(1, len(rows) - 1))
    a, b = digest_by_hand(rows[:cut], 1.0, 2), digest_by_hand(rows[cut:], 1.0, 2)
    assert_same(coarsened(merged(a, b), 8.0), merged(coarsened(a, 8.0), coarsened(b, 8.0)))


def test_merged_widths_apart_takes_the_wider() -> None:
    a = digest_by_hand([(0, (1.0,)), (1, (2.0,))], 0.5, 1)
    b = digest_by_hand([(5, (4.0,)), (6, (4.0,))], 4.0, 1)
    assert_same(merged(a, b), digest_by_hand([(0, (1.0,)), (1, (2.0,)), (5, (4.0,)), (6, (4.0,))], 4.0, 1))


def test_merged_columns_apart_keeps_all() -> None:
    a = digest_by_hand([(0, (1.0,))], 1.0, 1)
    b = digest_by_hand([(1, (5.0, 7.0))], 1.0, 2)
    both = merged(a, b)
    assert both.columns == ("PT-0", "PT-1")
    assert both.count.tolist() == [[1, 0], [1, 1]]
    assert both.mean[1].tolist() == [5.0, 7.0]
    assert math.isnan(both.mean[0, 1])


def test_merged_rejects_keeps_first_thousand_and_counts_all() -> None:
    def with_rejects(number: int, why: str) -> Digest:
        rejects = tuple(Reject(file="log.csv", line=line, column="PT-0", text="Bad", why=why) for line in range(number))
        plain = digest_by_hand([(0, (1.0,))], 1.0, 1)
        arrays = {name: getattr(plain, name) for name in plain.__slots__}
        return Digest(
            **arrays
            | {
                "rejects": rejects,
                "reject_count": number,
                "reject_reasons": ((why, number),),
                "rejected": np.array([number]),
            }
        )

    both = merged(with_rejects(700, "not a number"), with_rejects(600, "not finite"))
    assert len(both.rejects) == 1000
    assert [reject.why for reject in both.rejects].count("not finite") == 300
    assert both.reject_count == 1300
    assert both.reject_reasons == (("not a number", 700), ("not finite", 600))
    assert both.rejected.tolist() == [1300]


def test_common_grid_brings_all_to_the_widest() -> None:
    digests = [digest_by_hand([(0, (1.0,)), (9, (3.0,))], width, 1) for width in (0.25, 4.0, 1.0)]
    grid = common_grid(digests)
    assert [digest.width_s for digest in grid] == [4.0, 4.0, 4.0]
    for digest in grid:
        assert_same(digest, digests[1])


def test_common_grid_of_nothing_is_nothing() -> None:
    assert common_grid([]) == ()


@pytest.mark.parametrize("width_s", [0.5, 3.0, 1.5])
def test_coarsened_to_no_power_of_two_is_refused(width_s: float) -> None:
    with pytest.raises(ValueError, match="not a power of two apart"):
        coarsened(digest_by_hand([(0, (1.0,))], 1.0, 1), width_s)


def test_coarsened_joins_equal_runs_across_blocks() -> None:
    """By hand: 5 5 | 5 5 | 5 6 | 6 6 in blocks of two; the five 5s and the three 6s each are one run."""
    rows: list[Row] = [(time, (reading,)) for time, reading in enumerate([5.0, 5.0, 5.0, 5.0, 5.0, 6.0, 6.0, 6.0])]
    wide = coarsened(digest_by_hand(rows, 2.0, 1), 8.0)
    assert (wide.longest_equal.item(), wide.leading_equal.item(), wide.trailing_equal.item()) == (5, 5, 3)
    assert wide.difference_variance.item() == pytest.approx(1.0 / 7.0 / 2.0, rel=1e-12)
