"""The quick way and several processes give the digest of the thorough way."""

from __future__ import annotations

import itertools
from dataclasses import fields
from pathlib import Path

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from headledger.plant.digest import Digest
from headledger.plant.job import LogSettings
from headledger.readers import log_files, logs
from headledger.readers.logs import read_log

CELLS = st.one_of(
    st.floats(-1e4, 1e4).map(lambda value: f"{value:.3f}"),
    st.sampled_from(["", "7", "7", "7", "1e3", "-0.5", "Bad", "1.5.2", '"4.25"', "nan", "inf", "true"]),
)
ROW = st.tuples(st.integers(1, 3), CELLS, CELLS, st.sampled_from(["", "", "", "", ",9", "\r", ",", " "]))


def same(one: Digest, other: Digest) -> None:
    """Assert that two digests are alike, sums to rounding."""
    for field in fields(Digest):
        mine, theirs = getattr(one, field.name), getattr(other, field.name)
        if isinstance(mine, np.ndarray) and mine.dtype.kind == "f":
            assert mine.shape == theirs.shape, field.name
            scale = max(1.0, float(np.nanmax(np.abs(mine), initial=0.0)))
            np.testing.assert_allclose(mine, theirs, rtol=1e-9, atol=1e-9 * scale, err_msg=field.name)
        elif isinstance(mine, np.ndarray):
            assert mine.tolist() == theirs.tolist(), field.name
        else:
            assert mine == theirs, field.name


def written(folder: Path, rows: list[tuple[int, str, str, str]], *, clean: bool = False) -> Path:
    """A log of these rows: seconds since the row above, two cells, and what stands behind them."""
    time_s, lines = 1_772_438_400, ["time,PT-1,PT-2"]
    for step, first, second, tail in rows:
        time_s += step
        lines.append(f"{np.datetime64(time_s, 's')}Z,{first},{second}{'' if clean else tail}")
    path = folder / "log.csv"
    path.write_bytes(("\n".join(lines) + "\n").encode())
    return path


def read(path: Path, **more: object) -> Digest:
    return read_log(path, name="log.csv", settings=LogSettings(delimiter=","), timezone="UTC", **more)  # type: ignore[arg-type]


@given(rows=st.lists(ROW, min_size=3, max_size=60), most=st.sampled_from([4, 4096]))
def test_log_read_the_quick_way_is_as_read_the_thorough_way(
    tmp_path_factory: pytest.TempPathFactory, rows: list[tuple[int, str, str, str]], most: int
) -> None:
    path = written(tmp_path_factory.mktemp("log"), [(1, "1.0", "2.0", ""), *rows])
    with pytest.MonkeyPatch.context() as patch:
        patch.setattr(logs, "BLOCK_BYTES", 400)
        quick = read(path, max_blocks=most)
        patch.setattr(logs, "suits", lambda _shape: False)
        same(quick, read(path, max_blocks=most))


def test_clean_log_goes_the_quick_way(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    path = written(tmp_path, [(1, f"{n}.5", f"{n}.25", "") for n in range(50)])
    monkeypatch.setattr(logs, "parse_values", None)
    assert read(path).row_count == 50


@pytest.mark.parametrize("processes", [2, 3])
def test_log_read_by_several_processes_is_as_read_by_one(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch, processes: int
) -> None:
    rng = np.random.default_rng(5)
    rows = [(int(rng.integers(1, 3)), f"{a:.3f}", f"{b:.2f}", "") for a, b in rng.normal(size=(3000, 2))]
    for at in (7, 1500, 2999):
        rows[at] = (1, "Bad", rows[at][2], "")
    path = written(tmp_path, rows)
    alone = read(path, max_blocks=256, processes=1)
    monkeypatch.setattr(logs, "LEAST_PART_BYTES", 4096)
    same(read(path, max_blocks=256, processes=processes), alone)
    assert [reject.line for reject in alone.rejects] == [9, 1502, 3001]


def test_log_that_runs_backward_across_parts_is_read_by_one_process(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    rows = [(1, f"{n}", f"{n}", "") for n in range(2000)]
    rows[1200] = (-600, "5", "6", "")
    path = written(tmp_path, rows)
    alone = read(path, processes=1)
    monkeypatch.setattr(logs, "LEAST_PART_BYTES", 4096)
    same(read(path, processes=2), alone)
    assert alone.reject_count > 0


def test_parts_of_a_file_cover_every_line_once(tmp_path: Path) -> None:
    path = written(tmp_path, [(1, f"{n}", "", "") for n in range(500)])
    file = log_files.look_at_file(path, "log.csv", None)
    parts = log_files.line_ranges(file, 4)
    assert len(parts) == 4
    assert parts[0][0] == 0
    assert parts[-1][1] == path.stat().st_size
    assert all(a[1] == b[0] for a, b in itertools.pairwise(parts))
    assert b"".join(b"".join(file.blocks(span=part)) for part in parts) == path.read_bytes()
