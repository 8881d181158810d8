"""However a job folder is spoilt, it is read or refused with placed problems; nothing else comes out."""

from __future__ import annotations

import csv
import io
import tempfile
from pathlib import Path

import pytest
from hypothesis import example, given
from hypothesis import strategies as st

from headledger.errors import JobError, Problem
from headledger.readers.job import read_job

SPOILERS = st.text(max_size=12) | st.sampled_from(
    ["nan", "-1", "1e999", "±", "%", "[", "[m]", "[barg]", "0", "1,5", "1.000", "class", "S1", "°C", "\x00", '"', "1e-320 Pa"]
)  # fmt: skip


def spoil_cell(text: str, row: int, column: int, cell: str) -> str:
    """A table with one cell replaced."""
    rows = list(csv.reader(io.StringIO(text)))
    chosen = rows[row % len(rows)]
    chosen[column % len(chosen)] = cell
    out = io.StringIO()
    csv.writer(out).writerows(rows)
    return out.getvalue()


def refusal_of(files: dict[str, str | bytes]) -> tuple[Problem, ...]:
    """The problems for which a folder is refused, none where it is read."""
    with tempfile.TemporaryDirectory() as name:
        for file, content in files.items():
            raw = content if isinstance(content, bytes) else content.encode("utf-8", errors="surrogatepass")
            (Path(name) / file).write_bytes(raw)
        try:
            read_job(name)
        except JobError as error:
            return error.problems
        return ()


def read_or_refuse(files: dict[str, str | bytes]) -> None:
    """Read a folder; a refusal must say where and what."""
    assert all(problem.place and problem.fault for problem in refusal_of(files))


@pytest.mark.parametrize("table", ["stations.csv", "runs.csv", "gauges.csv"])
@given(row=st.integers(0, 3), column=st.integers(0, 8), cell=SPOILERS)
def test_table_with_any_cell_spoilt_is_read_or_refused(sound_files, table, row, column, cell):
    read_or_refuse(sound_files | {table: spoil_cell(sound_files[table], row, column, cell)})


@pytest.mark.parametrize("file", ["job.toml", "stations.csv", "gauges.csv"])
@given(content=st.binary(max_size=200))
@example(content=b"\xff\xfe")
@example(content=b"[" * 5000)
@example(content=b"a." * 5000 + b"a = 1")
def test_file_of_any_bytes_is_read_or_refused(sound_files, file, content):
    read_or_refuse(sound_files | {file: content})


@given(
    key=st.sampled_from(["temperature", "kind", "barometer", "tolerance", "logs", "stations", "timezone", "format", "title"]),
    value=st.sampled_from(['""', '"\\u0000"', "1", "true", "[]", "{}", '["*"]', '["**/*"]', '"[!"', '["["]', "1979-05-27", "nan"])
    | st.text("abc/.\\*?#[] %±19", max_size=9).map(lambda text: "'" + text + "'"),
)  # fmt: skip
def test_job_file_with_any_value_spoilt_is_read_or_refused(sound_files, key, value):
    lines = sound_files["job.toml"].splitlines()
    spoilt = [f"{key} = {value}" if line.startswith(f"{key} =") else line for line in lines]
    read_or_refuse(sound_files | {"job.toml": "\n".join(spoilt)})
