"""Logs are read whole: every cell becomes a value, a blank or a reject with its line."""

from __future__ import annotations

import csv
import gzip
import math
from pathlib import Path

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from headledger.plant.digest import Digest, common_grid, merged
from headledger.plant.job import Job, LogSettings
from headledger.readers import log_files, logs
from headledger.readers.log_files import file_sha256
from headledger.readers.logs import read_log, read_logs
from tests.readers.log_makers import PLAIN, at, columns, read, rejects

VALUES = {"PT-1": [1.5, 1.6, 1.7], "PT-2": [20.0, 21.0, 22.0]}


def test_log_plain_is_one_row_a_block(tmp_path: Path) -> None:
    digest = read(tmp_path, PLAIN)
    assert columns(digest) == VALUES
    assert digest.width_s == 1.0
    assert digest.index.tolist() == [int(at("2026-03-04T10:00:00")) + step for step in range(3)]
    assert (digest.first_s, digest.last_s) == (at("2026-03-04T10:00:00"), at("2026-03-04T10:00:02"))
    assert (digest.row_count, digest.reject_count, digest.rejects) == (3, 0, ())


@pytest.mark.parametrize("interval_s", [0.1, 0.5, 1.0, 5.0, 60.0])
def test_log_width_is_largest_power_of_two_within_interval(tmp_path: Path, interval_s: float) -> None:
    start = int(at("2026-03-04T10:00:00")) * 1000
    rows = [f"{start + round(step * interval_s * 1000)},{step}" for step in range(20)]
    digest = read(tmp_path, "\n".join(["time,PT-1", *rows]))
    assert digest.width_s <= interval_s < 2.0 * digest.width_s
    assert math.log2(digest.width_s) == int(math.log2(digest.width_s))
    assert columns(digest) == {"PT-1": [float(step) for step in range(20)]}


@pytest.mark.parametrize("delimiter", [",", ";", "\t", "|"])
def test_log_delimiter_is_found(tmp_path: Path, delimiter: str) -> None:
    assert columns(read(tmp_path, PLAIN.replace(",", delimiter))) == VALUES


@pytest.mark.parametrize("delimiter", [";", "\t", "|"])
def test_log_decimal_comma_is_found(tmp_path: Path, delimiter: str) -> None:
    assert columns(read(tmp_path, PLAIN.replace(",", delimiter).replace(".", ","))) == VALUES


def test_log_quoted_decimal_comma_between_commas_is_found(tmp_path: Path) -> None:
    text = 'time,PT-1,PT-2\n2026-03-04T10:00:00Z,"1,5",20\n2026-03-04T10:00:01Z,"1,6",21\n'
    assert columns(read(tmp_path, text)) == {"PT-1": [1.5, 1.6], "PT-2": [20.0, 21.0]}


def test_log_thousands_points_with_decimal_comma_are_taken_out(tmp_path: Path) -> None:
    text = "time;PT-1\n2026-03-04T10:00:00Z;1.234,5\n2026-03-04T10:00:01Z;987,25\n"
    assert columns(read(tmp_path, text)) == {"PT-1": [1234.5, 987.25]}


def test_log_decimal_mark_is_of_the_file_never_of_a_cell(tmp_path: Path) -> None:
    text = "time;PT-1\n" + "".join(f"2026-03-04T10:00:0{step}Z;1,{step}5\n" for step in range(5))
    digest = read(tmp_path, text + "2026-03-04T10:00:05Z;1.55\n")
    assert columns(digest) == {"PT-1": [1.05, 1.15, 1.25, 1.35, 1.45]}
    assert rejects(digest) == [(7, "PT-1", "1.55", "not a number")]


def test_log_crlf_reads_as_lf(tmp_path: Path) -> None:
    assert columns(read(tmp_path, PLAIN.replace("\n", "\r\n"))) == VALUES


def test_log_bare_returns_read_as_lf(tmp_path: Path) -> None:
    assert columns(read(tmp_path, PLAIN.replace("\n", "\r"))) == VALUES


@pytest.mark.parametrize("encoding", ["utf-8-sig", "utf-16", "utf-16-le", "utf-16-be", "latin-1"])
def test_log_encoding_is_found(tmp_path: Path, encoding: str) -> None:
    digest = read(tmp_path, PLAIN.replace("PT-2", "TT-2 [°C]").encode(encoding))
    assert columns(digest) == {"PT-1": VALUES["PT-1"], "TT-2": VALUES["PT-2"]}
    assert digest.units == ("", "°C")


def test_log_gzipped_reads_as_plain(tmp_path: Path) -> None:
    assert columns(read(tmp_path, gzip.compress(PLAIN.encode()), name="log.csv.gz")) == VALUES


def test_log_without_last_line_end_is_read_whole(tmp_path: Path) -> None:
    assert columns(read(tmp_path, PLAIN.removesuffix("\n"))) == VALUES


@pytest.mark.parametrize("blank", ["", "NaN", "nan", "NULL", " "])
def test_log_blank_cell_is_missing_and_no_reject(tmp_path: Path, blank: str) -> None:
    digest = read(tmp_path, PLAIN.replace("1.6", blank))
    assert columns(digest) == {"PT-1": [1.5, 1.7], "PT-2": VALUES["PT-2"]}
    assert digest.count.tolist() == [[1, 1], [0, 1], [1, 1]]
    assert digest.reject_count == 0


@pytest.mark.parametrize(
    "text", ["Bad", "I/O Timeout", "---", "#N/A", "No Data", "NA", "1_600", "0x1A", "True", "1.6 bar", "1.6.1", "1,6"]
)
def test_log_text_cell_is_rejected_with_its_place(tmp_path: Path, text: str) -> None:
    digest = read(tmp_path, PLAIN.replace("1.6", f'"{text}"'))
    assert columns(digest) == {"PT-1": [1.5, 1.7], "PT-2": VALUES["PT-2"]}
    assert rejects(digest) == [(3, "PT-1", text, "not a number")]
    assert digest.rejected.tolist() == [1, 0]
    assert digest.reject_reasons == (("not a number", 1),)


@pytest.mark.parametrize("text", ["inf", "-Inf", "Infinity", "1e400", "-1e999"])
def test_log_endless_cell_is_rejected(tmp_path: Path, text: str) -> None:
    digest = read(tmp_path, PLAIN.replace("1.6", text))
    assert columns(digest)["PT-1"] == [1.5, 1.7]
    assert rejects(digest) == [(3, "PT-1", text, "not finite")]


def test_log_column_of_words_rejects_every_cell(tmp_path: Path) -> None:
    digest = read(tmp_path, PLAIN.replace("20\n", "True\n").replace("21\n", "False\n").replace("22\n", "True\n"))
    assert columns(digest) == {"PT-1": VALUES["PT-1"], "PT-2": []}
    assert digest.rejected.tolist() == [0, 3]


def test_log_ragged_rows_are_rejected_with_their_lines(tmp_path: Path) -> None:
    lines = PLAIN.splitlines()
    lines[2:2] = ["2026-03-04T10:00:00.5Z,9.9", "", "2026-03-04T10:00:00.6Z,9.9,9.9,9.9"]
    digest = read(tmp_path, "\n".join(lines))
    assert columns(digest) == VALUES
    assert rejects(digest) == [
        (3, "", "2026-03-04T10:00:00.5Z,9.9", "too few cells"),
        (5, "", "2026-03-04T10:00:00.6Z,9.9,9.9,9.9", "too many cells"),
    ]
    assert digest.row_count == 5


def test_log_row_cut_off_by_the_end_of_the_file_is_rejected(tmp_path: Path) -> None:
    digest = read(tmp_path, PLAIN + "2026-03-04T10:00:03Z,1.8")
    assert rejects(digest) == [(5, "", "2026-03-04T10:00:03Z,1.8", "too few cells")]


def test_log_zero_bytes_within_spoil_only_their_row(tmp_path: Path) -> None:
    filler = "".join(f"2026-03-04T11:{minute:02}:{second:02}Z,1,2\n" for minute in range(4) for second in range(60))
    digest = read(tmp_path, PLAIN + filler + "\0" * 40 + "\n2026-03-04T12:00:00Z,3,4\n")
    assert rejects(digest) == [(245, "", "", "zero bytes")]
    assert columns(digest)["PT-1"][-1] == 3.0


def test_log_unreadable_stamp_rejects_the_row(tmp_path: Path) -> None:
    digest = read(tmp_path, PLAIN.replace("2026-03-04T10:00:01Z", "2026-02-30T10:00:01Z"))
    assert columns(digest) == {"PT-1": [1.5, 1.7], "PT-2": [20.0, 22.0]}
    assert rejects(digest) == [(3, "", "2026-02-30T10:00:01Z", "unreadable stamp")]


def test_log_repeated_stamp_keeps_the_first(tmp_path: Path) -> None:
    digest = read(tmp_path, PLAIN + "2026-03-04T10:00:02Z,9,9\n2026-03-04T10:00:03Z,1.8,23\n2026-03-04T10:00:00Z,9,9\n")
    assert columns(digest) == {"PT-1": [1.5, 1.6, 1.7, 1.8], "PT-2": [20.0, 21.0, 22.0, 23.0]}
    assert rejects(digest) == [
        (5, "", "2026-03-04T10:00:02Z", "repeated stamp"),
        (7, "", "2026-03-04T10:00:00Z", "repeated stamp"),
    ]
    assert digest.row_count == 6


def test_log_backward_stamp_is_used_in_its_place_and_listed(tmp_path: Path) -> None:
    lines = PLAIN.splitlines()
    lines[2], lines[3] = lines[3], lines[2]
    digest = read(tmp_path, "\n".join(lines))
    assert columns(digest) == VALUES
    assert rejects(digest) == [(4, "", "2026-03-04T10:00:01Z", "stamp goes backward")]


def test_log_line_of_delimiters_is_blank(tmp_path: Path) -> None:
    digest = read(tmp_path, PLAIN + ",,\n,,\n")
    assert (columns(digest), digest.row_count, digest.reject_count) == (VALUES, 3, 0)


def test_log_quoted_note_with_delimiters_is_one_cell(tmp_path: Path) -> None:
    text = 'time,PT-1,note\n2026-03-04T10:00:00Z,1.5,"a, ""b"", c"\n2026-03-04T10:00:01Z,1.6,5" pipe\n'
    digest = read(tmp_path, text)
    assert columns(digest)["PT-1"] == [1.5, 1.6]
    assert [reject[:3] for reject in rejects(digest)] == [(2, "note", 'a, ""b"", c'), (3, "note", '5"" pipe')]


def test_log_rejects_are_kept_to_a_thousand_and_all_counted(tmp_path: Path) -> None:
    start = int(at("2026-03-04T10:00:00"))
    text = "time,PT-1,PT-2\n" + "".join(f"{start + step},Bad,{step}\n" for step in range(1500))
    digest = read(tmp_path, text)
    assert len(digest.rejects) == 1000
    assert digest.rejects[-1].line == 1001
    assert digest.reject_count == 1500
    assert digest.rejected.tolist() == [1500, 0]


def test_log_of_more_blocks_than_allowed_widens(tmp_path: Path) -> None:
    start = int(at("2026-03-04T10:00:00"))
    path = tmp_path / "log.csv"
    path.write_text("time,PT-1\n" + "".join(f"{start + step},{step % 7}\n" for step in range(1000)))
    fine = read_log(path, name="log.csv", settings=LogSettings(), timezone="UTC")
    wide = read_log(path, name="log.csv", settings=LogSettings(), timezone="UTC", max_blocks=64)
    assert 32 < wide.index.size <= 64
    assert_alike(common_grid([fine, wide])[0], wide)


def assert_alike(found: Digest, expected: Digest) -> None:
    assert (found.columns, found.width_s) == (expected.columns, expected.width_s)
    for name in ("index", "rows", "count", "longest_equal", "leading_equal", "trailing_equal"):
        np.testing.assert_array_equal(getattr(found, name), getattr(expected, name), err_msg=name)
    for name in ("mean", "variance", "first", "last", "least", "greatest", "difference_variance"):
        np.testing.assert_allclose(getattr(found, name), getattr(expected, name), rtol=1e-9, atol=1e-9, err_msg=name)


@pytest.mark.parametrize("shape", ["wide", "long"])
def test_log_read_in_small_blocks_is_the_same(tmp_path: Path, monkeypatch: pytest.MonkeyPatch, shape: str) -> None:
    rows = [(int(at("2026-03-04T10:00:00")) + step, step % 5 / 8, step % 3) for step in range(400)]
    if shape == "wide":
        text = "time,PT-1,PT-2\n" + "".join(f"{t},{a},{b if b else 'Bad'}\n" for t, a, b in rows)
    else:
        text = "time,tag,value\n" + "".join(f"{t},PT-1,{a}\n{t},PT-2,{b if b else 'Bad'}\n" for t, a, b in rows)
    whole = read(tmp_path, text)
    monkeypatch.setattr(logs, "BLOCK_BYTES", 700)
    pieces = read(tmp_path, text)
    assert_alike(pieces, whole)
    assert pieces.rejects == whole.rejects
    assert pieces.row_count == whole.row_count


@given(
    cells=st.lists(st.one_of(st.none(), st.floats(-1e6, 1e6), st.sampled_from([1.0, 2.0])), min_size=2, max_size=60),
    data=st.data(),
)
def test_log_cut_in_two_merges_to_the_whole(
    tmp_path_factory: pytest.TempPathFactory, cells: list[float | None], data: st.DataObject
) -> None:
    folder = tmp_path_factory.mktemp("cut")
    start = int(at("2026-03-04T10:00:00"))
    lines = [f"{start + step},{'' if cell is None else repr(cell)},{step}" for step, cell in enumerate(cells)]
    cut = data.draw(st.integers(1, len(lines) - 1))
    whole, a, b = (read(folder, "\n".join(["time,PT-1,PT-2", *part])) for part in (lines, lines[:cut], lines[cut:]))
    both = merged(a, b)
    scale = 1e12  # squares of values up to 1e6
    for name in ("mean", "variance", "least", "greatest"):
        np.testing.assert_allclose(getattr(both, name), getattr(whole, name), rtol=1e-9, atol=1e-12 * scale)
    np.testing.assert_array_equal(both.count, whole.count)
    np.testing.assert_array_equal(both.longest_equal, whole.longest_equal)


def test_log_counts_agree_with_a_plain_reading(tmp_path: Path) -> None:
    """The csv module reads the same file: each cell is a number, a blank or a reject, none is lost."""
    generator = np.random.default_rng(7)
    start = int(at("2026-03-04T10:00:00"))
    words = np.array(["", "Bad", "NaN", "1e400"])
    lines = ["time,PT-1,PT-2,PT-3"]
    for step in range(3000):
        cells = [f"{value:.3f}" for value in generator.normal(100.0, 5.0, 3)]
        if generator.random() < 0.05:
            cells[generator.integers(3)] = str(generator.choice(words))
        lines.append(",".join([str(start + step), *cells]))
    digest = read(tmp_path, "\n".join(lines))
    rows = list(csv.reader(lines[1:]))
    for column in range(3):
        texts = [row[column + 1] for row in rows]
        numbers = [float(text) for text in texts if text not in words]
        assert digest.count[:, column].sum() == len(numbers)
        assert digest.rejected[column] == sum(text in ("Bad", "1e400") for text in texts)
        total = np.nansum(digest.mean[:, column] * digest.count[:, column])
        assert total == pytest.approx(math.fsum(numbers), rel=1e-12)


def test_logs_of_a_job_are_read_in_order_under_their_names(tmp_path: Path) -> None:
    (tmp_path / "more").mkdir()
    paths = tmp_path / "b.csv", tmp_path / "more" / "a.csv"
    for path in paths:
        path.write_text(PLAIN)
    told: list[float] = []
    job = Job(folder=tmp_path, title="", stations=(), runs=(), gauges=(), log_files=paths)
    digests = read_logs(job, on_progress=told.append)
    assert [digest.file for digest in digests] == ["b.csv", "more/a.csv"]
    assert told == sorted(told)
    assert told[-1] == pytest.approx(1.0)


def test_file_sha256_is_that_of_the_bytes(tmp_path: Path) -> None:
    """FIPS 180-2, appendix B.1: the digest of `abc`."""
    path = tmp_path / "abc"
    path.write_bytes(b"abc")
    assert file_sha256(path) == "ba7816bf8f01cfea414140de5dae2223b00361a396177a9cb410ff61f20015ad"
    assert log_files.SAMPLE_BYTES < log_files.BLOCK_BYTES
