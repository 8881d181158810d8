"""The shape of a log is found by looking, and what the job states goes before what is found."""

from __future__ import annotations

from pathlib import Path

import pytest

from headledger.readers.log_shape import is_unit
from tests.readers.log_makers import PLAIN, at, columns, read, rejects

VALUES = {"PT-1": [1.5, 1.6, 1.7], "PT-2": [20.0, 21.0, 22.0]}
LONG = """time,tag,value
2026-03-04T10:00:00Z,PT-1,1.5
2026-03-04T10:00:00Z,PT-2,20
2026-03-04T10:00:01Z,PT-1,1.6
2026-03-04T10:00:01Z,PT-2,21
2026-03-04T10:00:02Z,PT-1,1.7
2026-03-04T10:00:02Z,PT-2,22
"""


@pytest.mark.parametrize(
    "preamble",
    [
        "Logger 7, export\nexported for checking\n",
        "Logger 7,,\nSerial 4711,,\n,,\n",
        "\n\nStarted 2026-03-04 09:59\n\n",
        "Device: A; B\nRange: 0-10, 0-40\n",
    ],
)
def test_shape_preamble_is_passed_over(tmp_path: Path, preamble: str) -> None:
    digest = read(tmp_path, preamble + PLAIN.replace("1.6", "Bad"))
    assert columns(digest) == VALUES | {"PT-1": [1.5, 1.7]}
    assert rejects(digest) == [(3 + preamble.count("\n"), "PT-1", "Bad", "not a number")]


@pytest.mark.parametrize(
    "row", [",bar,kPa\n", "UTC,[bar],[kPa]\n", "-,bar,kPa\n", "yyyy-mm-dd,bar,kPa\n", "\n,bar,kPa\n"]
)
def test_shape_units_row_is_taken_as_units(tmp_path: Path, row: str) -> None:
    header, *lines = PLAIN.splitlines(keepends=True)
    digest = read(tmp_path, header + row + "".join(lines))
    assert (columns(digest), digest.units, digest.reject_count) == (VALUES, ("bar", "kPa"), 0)


@pytest.mark.parametrize(
    ("header", "names", "units"),
    [
        ("PT-1 [barg],PT-2 [kPa]", ("PT-1", "PT-2"), ("barg", "kPa")),
        ("PT-1 (psi),PT-2 (m3/h)", ("PT-1", "PT-2"), ("psi", "m3/h")),
        ("PT-1 (bar(g)),TT-2 (°C)", ("PT-1", "TT-2"), ("bar(g)", "°C")),
        ("PT-1 (north),PT-2 (roof)", ("PT-1 (north)", "PT-2 (roof)"), ("", "")),
        ("PT-1 (north) [bar],PT-2", ("PT-1 (north)", "PT-2"), ("bar", "")),
    ],
)
def test_shape_units_in_headers_leave_bare_names(
    tmp_path: Path, header: str, names: tuple[str, ...], units: tuple[str, ...]
) -> None:
    digest = read(tmp_path, PLAIN.replace("PT-1,PT-2", header))
    assert (digest.columns, digest.units) == (names, units)


@pytest.mark.parametrize(
    "text",
    [
        "bar",
        "barg",
        "bar g",
        "psi(a)",
        "kPa",
        "m3/h",
        "m³/h",
        "L/s",
        "gpm",
        "°C",
        "degC",
        "%",
        "mA",
        "kg/cm2",
        "mH2O",
        "Hz",
    ],
)
def test_unit_words_are_known(text: str) -> None:
    assert is_unit(text)


@pytest.mark.parametrize("text", ["PT-101", "north", "inlet", "Discharge", "tank 3", "12.5", ""])
def test_other_words_are_no_units(text: str) -> None:
    assert not is_unit(text)


def test_shape_trailing_delimiters_make_no_column(tmp_path: Path) -> None:
    digest = read(tmp_path, PLAIN.replace("\n", ",\n"))
    assert (columns(digest), digest.reject_count) == (VALUES, 0)


def test_shape_trailing_delimiters_below_the_header_alone_make_no_column(tmp_path: Path) -> None:
    header, *lines = PLAIN.splitlines()
    digest = read(tmp_path, "\n".join([header, *(line + "," for line in lines)]))
    assert (columns(digest), digest.reject_count) == (VALUES, 0)


def test_shape_trailing_delimiter_of_the_header_alone_makes_no_column(tmp_path: Path) -> None:
    digest = read(tmp_path, PLAIN.replace("PT-2\n", "PT-2,\n"))
    assert (columns(digest), digest.reject_count) == (VALUES, 0)


def test_shape_unnamed_column_with_values_is_kept(tmp_path: Path) -> None:
    digest = read(tmp_path, PLAIN.replace("PT-1,PT-2", "PT-1,"))
    assert columns(digest) == {"PT-1": VALUES["PT-1"], "column 3": VALUES["PT-2"]}


def test_shape_column_told_twice_keeps_both_apart(tmp_path: Path) -> None:
    digest = read(tmp_path, PLAIN.replace("PT-2", "PT-1"))
    assert columns(digest) == {"PT-1": VALUES["PT-1"], "PT-1 (2)": VALUES["PT-2"]}


def test_shape_stamp_need_not_stand_first(tmp_path: Path) -> None:
    lines = [line.split(",") for line in PLAIN.splitlines()]
    digest = read(tmp_path, "\n".join(f"{b},{a},{c}" for a, b, c in lines))
    assert columns(digest) == VALUES


def test_long_log_becomes_a_column_a_tag(tmp_path: Path) -> None:
    digest = read(tmp_path, LONG)
    assert (columns(digest), digest.width_s, digest.rows.tolist()) == (VALUES, 1.0, [1, 1, 1])
    assert (digest.row_count, digest.reject_count) == (6, 0)


def test_long_log_sorted_by_tag_goes_backward_nowhere(tmp_path: Path) -> None:
    header, *lines = LONG.splitlines()
    digest = read(tmp_path, "\n".join([header, *sorted(lines, key=lambda line: line.split(",")[1])]))
    assert (columns(digest), digest.rows.tolist(), digest.reject_count) == (VALUES, [1, 1, 1], 0)


def test_long_log_is_found_without_known_headers(tmp_path: Path) -> None:
    assert columns(read(tmp_path, LONG.replace("time,tag,value", "Zeit,Ort,Zahl"))) == VALUES


def test_long_log_repeated_stamp_of_one_tag_keeps_the_first(tmp_path: Path) -> None:
    digest = read(tmp_path, LONG + "2026-03-04T10:00:02Z,PT-2,99\n")
    assert columns(digest) == VALUES
    assert rejects(digest) == [(8, "", "2026-03-04T10:00:02Z", "repeated stamp")]


def test_long_log_rejects_name_the_tag(tmp_path: Path) -> None:
    digest = read(tmp_path, LONG.replace("21\n", "Bad\n").replace("PT-1,1.7", ",1.7"))
    assert columns(digest) == {"PT-1": [1.5, 1.6], "PT-2": [20.0, 22.0]}
    assert rejects(digest) == [(5, "PT-2", "Bad", "not a number"), (6, "", "", "no tag")]
    assert digest.rejected.tolist() == [0, 1]


def test_long_log_keeps_good_quality_alone(tmp_path: Path) -> None:
    words = ["quality", "Good", "OK", "192", "Bad", "Uncertain", ""]
    text = "\n".join(f"{line},{word}" for line, word in zip(LONG.splitlines(), words, strict=True))
    digest = read(tmp_path, text)
    assert columns(digest) == {"PT-1": [1.5, 1.6], "PT-2": [20.0, 22.0]}
    assert rejects(digest) == [(5, "PT-2", "21", "quality is Bad"), (6, "PT-1", "1.7", "quality is Uncertain")]


def test_stated_good_words_go_before_the_usual(tmp_path: Path) -> None:
    text = "\n".join(
        f"{line},{word}" for line, word in zip(LONG.splitlines(), ["quality"] + ["A"] * 5 + ["Good"], strict=True)
    )
    digest = read(tmp_path, text, good=("A",))
    assert digest.reject_reasons == (("quality is Good", 1),)


def test_wide_log_quality_of_a_column_is_its_own(tmp_path: Path) -> None:
    text = (
        "time,PT-1,PT-1 quality,PT-2\n"
        "2026-03-04T10:00:00Z,1.5,Good,20\n2026-03-04T10:00:01Z,1.6,Bad,21\n2026-03-04T10:00:02Z,1.7,Good,22\n"
    )
    digest = read(tmp_path, text)
    assert columns(digest) == VALUES | {"PT-1": [1.5, 1.7]}
    assert rejects(digest) == [(3, "PT-1", "1.6", "quality is Bad")]


def test_wide_log_quality_of_the_row_is_that_of_every_value(tmp_path: Path) -> None:
    words = ["quality", "Good", "Bad", "Good"]
    text = "\n".join(f"{line},{word}" for line, word in zip(PLAIN.splitlines(), words, strict=True))
    digest = read(tmp_path, text)
    assert columns(digest) == {"PT-1": [1.5, 1.7], "PT-2": [20.0, 22.0]}
    assert digest.rejected.tolist() == [1, 1]


def test_walk_is_a_long_log_with_units(tmp_path: Path) -> None:
    text = (
        "time,tag,value,unit,by,note\n"
        '2026-03-04T10:00:00Z,PI-1,4.25,bar,A. Bee,"needle shakes, a bit"\n'
        "2026-03-04T10:02:00Z,PI-2,410,,A. Bee,\n"
        "2026-03-04T10:30:00Z,PI-1,4.5,bar,A. Bee,\n"
    )
    digest = read(tmp_path, text, name="walk.csv")
    assert (digest.columns, digest.units, digest.reject_count) == (("PI-1", "PI-2"), ("bar", ""), 0)
    assert columns(digest) == {"PI-1": [4.25, 4.5], "PI-2": [410.0]}


def test_long_log_value_in_another_unit_than_its_tag_is_rejected(tmp_path: Path) -> None:
    text = "time,tag,value,unit\n2026-03-04T10:00:00Z,PI-1,4.25,bar\n2026-03-04T10:30:00Z,PI-1,450,kPa\n"
    digest = read(tmp_path, text)
    assert columns(digest) == {"PI-1": [4.25]}
    assert rejects(digest) == [(3, "", "kPa", "unit is not that of the tag's first row")]


def test_stated_shape_wide_goes_before_the_look(tmp_path: Path) -> None:
    digest = read(tmp_path, LONG.replace("2026-03-04T10:00:00Z,PT-2,20\n", ""), shape="wide")
    assert digest.columns == ("tag", "value")


def test_stated_columns_of_a_long_log_are_used(tmp_path: Path) -> None:
    lines = LONG.splitlines()[1:]
    text = "\n".join(["when,where,much,other", *(line + ",7" for line in lines)])
    digest = read(tmp_path, text, shape="long", tag_column="where", value_column="much")
    assert columns(digest) == VALUES


def test_stated_lines_of_header_and_units_are_used(tmp_path: Path) -> None:
    text = PLAIN.replace("time,PT-1,PT-2\n", "time,A,B\ntime,PT-1,PT-2\nx,turns,steps\n")
    digest = read(tmp_path, text, header_line=2, units_line=3)
    assert (columns(digest), digest.units) == (VALUES, ("turns", "steps"))


def test_stated_marks_go_before_the_look(tmp_path: Path) -> None:
    text = "time;PT-1\n2026-03-04T10:00:00Z;1.234\n2026-03-04T10:00:01Z;2.500\n"
    assert columns(read(tmp_path, text, decimal=",", thousands=".")) == {"PT-1": [1234.0, 2500.0]}
    assert columns(read(tmp_path, text)) == {"PT-1": [1.234, 2.5]}


def test_stated_delimiter_goes_before_the_look(tmp_path: Path) -> None:
    text = "time:PT-1\n1772618400:1\n1772618401:2\n"
    assert columns(read(tmp_path, text, delimiter=":")) == {"PT-1": [1.0, 2.0]}


def test_stated_stamp_columns_are_used(tmp_path: Path) -> None:
    text = "made,seen,PT-1\n2026-03-04T10:00:00Z,2026-03-05T10:00:00Z,1\n2026-03-04T10:00:01Z,2026-03-05T10:00:01Z,2\n"
    digest = read(tmp_path, text, stamp=("seen",))
    assert digest.first_s == at("2026-03-05T10:00:00")
