"""A log that cannot be used is refused with its place, what is wrong, what was found and what would be right."""

from __future__ import annotations

import gzip
import struct
import zlib
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from headledger.errors import JobError
from headledger.plant.job import LogSettings
from headledger.readers.logs import read_log
from tests.readers.log_makers import PLAIN, problem, read


def refusal(folder: Path, content: str | bytes, *, name: str = "log.csv", **stated: Any) -> str:
    with pytest.raises(JobError) as caught:
        read(folder, content, name=name, **stated)
    assert problem(caught.value).place
    return str(caught.value)


def test_missing_log_is_refused(tmp_path: Path) -> None:
    with pytest.raises(JobError) as caught:
        read_log(tmp_path / "log.csv", name="log.csv", settings=LogSettings(), timezone="UTC")
    assert str(caught.value) == "log.csv: the log does not exist, expected a file in the job folder."


def test_folder_in_place_of_a_log_is_refused(tmp_path: Path) -> None:
    with pytest.raises(JobError) as caught:
        read_log(tmp_path, name="logs", settings=LogSettings(), timezone="UTC")
    assert problem(caught.value).fault == "the log cannot be read"


@pytest.mark.parametrize("content", [b"", gzip.compress(b"")])
def test_empty_log_is_refused(tmp_path: Path, content: bytes) -> None:
    assert refusal(tmp_path, content) == (
        "log.csv: the log is empty, got 0 bytes, expected a header row and rows of readings."
    )


def test_log_of_blank_lines_is_refused(tmp_path: Path) -> None:
    assert refusal(tmp_path, "\n \n\n") == (
        "log.csv: the log is empty, got blank lines, expected a header row and rows of readings."
    )


def test_binary_log_is_refused(tmp_path: Path) -> None:
    header = struct.pack(">I4sIIBBBBB", 13, b"IHDR", 8, 8, 8, 2, 0, 0, 0)
    picture = b"\x89PNG\r\n\x1a\n" + header + struct.pack(">I", zlib.crc32(header[4:])) + bytes(range(256))
    assert refusal(tmp_path, picture) == (
        "log.csv: the log is a binary file, got zero bytes, expected a text file (CSV)."
    )


@pytest.mark.parametrize(
    ("name", "content", "kind"),
    [
        ("log.csv.zst", b"\x28\xb5\x2f\xfd....", "Zstandard"),
        ("log.xlsx", b"PK\x03\x04....", "Excel"),
        ("log.parquet", b"PAR1....", "Parquet"),
        ("log.csv", b"PK\x03\x04....", "a ZIP archive or Excel workbook"),
    ],
)
def test_log_of_another_kind_is_refused(tmp_path: Path, name: str, content: bytes, kind: str) -> None:
    assert refusal(tmp_path, content, name=name) == (
        f"{name}: this kind of log is not read yet, got {kind}, expected a CSV file, or one packed as .gz."
    )


@pytest.mark.parametrize("spoilt", ["cut", "changed"])
def test_damaged_gzip_is_refused(tmp_path: Path, spoilt: str) -> None:
    packed = bytearray(gzip.compress((PLAIN + "2026-03-04T10:00:03Z,1,2\n" * 9).encode()))
    content = bytes(packed[:-12]) if spoilt == "cut" else bytes(packed[:-6]) + b"??" + bytes(packed[-4:])
    assert refusal(tmp_path, content, name="log.csv.gz").startswith("log.csv.gz: the compressed log is damaged, got ")


@pytest.mark.parametrize("content", ["time,PT-1\n", "Logger 7\n\ntime,PT-1", "time,PT-1\n,bar\n"])
def test_header_without_rows_is_refused(tmp_path: Path, content: str) -> None:
    assert refusal(tmp_path, content) == (
        "log.csv: the log holds a header but no rows, expected a row of readings a line."
    )


def test_stated_header_without_rows_is_refused(tmp_path: Path) -> None:
    assert "a header but no rows" in refusal(tmp_path, "time,PT-1\n", header_line=1)


def test_log_without_stamp_is_refused(tmp_path: Path) -> None:
    assert refusal(tmp_path, "run,PT-1,PT-2\n1,1.5,20\n2,1.6,21\n3,1.7,22\n") == (
        "log.csv: no stamp column was found, got columns run, PT-1, PT-2, "
        "expected a column of dates and times, or its name in [log] stamp."
    )


def test_log_with_time_of_day_alone_is_refused(tmp_path: Path) -> None:
    assert "no stamp column was found" in refusal(tmp_path, "time,PT-1\n10:00:00,1.5\n10:00:01,1.6\n")


def test_log_without_header_is_refused(tmp_path: Path) -> None:
    rows = PLAIN.split("\n", 1)[1]
    assert refusal(tmp_path, rows) == (
        "log.csv: no header was found above the first row, got line 1 is the first row, "
        "expected a line with the names of the columns, or its number in [log] header_line."
    )


def test_log_without_values_is_refused(tmp_path: Path) -> None:
    text = "Date,Time\n2026-03-04,10:00\n2026-03-04,10:01\n"
    assert refusal(tmp_path, text) == (
        "log.csv: the log holds no column of values, got Date, Time, expected a column a gauge."
    )


def test_log_without_usable_row_is_refused_with_the_first_cause(tmp_path: Path) -> None:
    text = PLAIN.replace("2026-03-04T10:00", "at ten")
    assert refusal(tmp_path, text, stamp=("time",)) == (
        "log.csv: no row of the log can be used, got 3 of 3 rows: unreadable stamp, the first in line 2: 'at ten:00Z', "
        "expected rows with a stamp and a cell a column."
    )


def test_log_in_another_encoding_than_stated_is_refused(tmp_path: Path) -> None:
    content = PLAIN.replace("PT-2", "TT-2 [°C]").encode("latin-1")
    assert refusal(tmp_path, content, encoding="utf-8") == (
        "log.csv: is not written in utf-8, got b'\\xb0C]\\n', expected another encoding in [log], "
        "or none there to have it found."
    )


def test_plain_log_stated_as_utf_16_is_refused(tmp_path: Path) -> None:
    for encoding in ("utf-16", "utf-16-le"):
        assert refusal(tmp_path, PLAIN, encoding=encoding).startswith(f"log.csv: is not written in {encoding}, got ")


def test_unknown_encoding_is_refused(tmp_path: Path) -> None:
    assert refusal(tmp_path, PLAIN, encoding="uft-8") == (
        "job.toml, [log] encoding: unknown encoding, got uft-8, expected utf-8, utf-16, latin-1 or cp1252."
    )


def test_stated_encoding_that_is_right_is_used(tmp_path: Path) -> None:
    digest = read(tmp_path, PLAIN.replace("PT-2", "TT-2 [°C]").encode("cp1252"), encoding="cp1252")
    assert digest.units == ("", "°C")


def test_stated_stamp_that_is_not_there_is_refused(tmp_path: Path) -> None:
    assert refusal(tmp_path, PLAIN, stamp=("Zeit",)) == (
        "job.toml, [log] stamp: no line holds the stamp columns that were stated, got Zeit, "
        "expected the names as the header writes them."
    )


def test_stated_column_that_is_not_there_is_answered_with_the_nearest(tmp_path: Path) -> None:
    text = "time,where,much\n2026-03-04T10:00:00Z,PT-1,1\n2026-03-04T10:00:01Z,PT-1,2\n"
    assert refusal(tmp_path, text, shape="long", tag_column="were", value_column="much") == (
        "job.toml, [log] tag_column: no such column in log.csv, got were, expected the name where."
    )


def test_stated_long_shape_without_tags_is_refused(tmp_path: Path) -> None:
    assert refusal(tmp_path, PLAIN, shape="long") == (
        "log.csv: no tag column was found, got time, PT-1, PT-2, expected its name in [log] tag_column."
    )


def test_stated_line_that_is_not_there_is_refused(tmp_path: Path) -> None:
    assert refusal(tmp_path, PLAIN, header_line=9) == (
        "job.toml, [log] header_line: there is no such line, got 9, "
        "expected a line of log.csv that is not blank, within its first 4."
    )


@given(
    edits=st.lists(
        st.tuples(
            st.integers(0, 110),
            st.sampled_from([b",", b"\n", b'"', b";", b"\r", b"\0", b"", b"\xff", b"9", b" ", b"x"]),
        ),
        max_size=12,
    ),
    doubled=st.booleans(),
)
def test_spoilt_log_is_read_with_every_row_accounted_for_or_refused(
    tmp_path_factory: pytest.TempPathFactory, edits: list[tuple[int, bytes]], doubled: bool
) -> None:
    content = PLAIN.encode() + (PLAIN.encode().split(b"\n", 1)[1] if doubled else b"")
    for place, edit in edits:
        content = content[:place] + edit + content[place + 1 :]
    try:
        digest = read(tmp_path_factory.mktemp("spoilt"), content)
    except JobError:
        return
    row_rejects = sum(not reject.column and reject.why != "stamp goes backward" for reject in digest.rejects)
    assert digest.rows.sum() + row_rejects == digest.row_count
    assert digest.reject_count == len(digest.rejects) == sum(number for _, number in digest.reject_reasons)
    assert np.isfinite(digest.mean[digest.count > 0]).all()
