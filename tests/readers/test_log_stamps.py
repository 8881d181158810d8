"""Stamps of every usual layout become seconds since 1970-01-01 UTC."""

from __future__ import annotations

from datetime import UTC, datetime, timedelta
from pathlib import Path
from zoneinfo import ZoneInfo

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from headledger.errors import JobError
from headledger.readers.log_stamps import LocalClock, StampKind, StampReader, format_pattern, stamp_kind
from tests.readers.log_makers import at, columns, problem, read, rejects


def seconds(*stamps: str, zone: str = "UTC", day_first: bool = True) -> list[float]:
    cells = np.array([stamp.encode("latin-1") for stamp in stamps], dtype=np.bytes_)
    reader = StampReader(StampKind.STAMP, LocalClock(ZoneInfo(zone)), day_first=day_first)
    return [float(second) for second in reader.seconds(cells)]


@pytest.mark.parametrize(
    "stamp",
    [
        "2026-03-04T10:05:06Z",
        "2026-03-04 10:05:06",
        "2026-03-04T10:05:06+00:00",
        "2026-03-04T12:05:06+02:00",
        "2026-03-04T12:05:06+0200",
        "2026-03-04T04:35:06-05:30",
        "2026-03-04 10:05:06 UTC",
        "2026/03/04 10:05:06",
        "20260304T100506Z",
        "04.03.2026 10:05:06",
        "4.3.2026 10:05:06",
        "4/3/2026 10:05:06",
        "04-03-26 10:05:06",
        "4 Mar 2026 10:05:06",
        "04-MAR-2026 10:05:06",
        "Mar 4, 2026 10:05:06 AM",
        "04/03/2026 10:05:06 am",
    ],
)
def test_stamp_layout_is_read(stamp: str) -> None:
    assert seconds(stamp) == [at("2026-03-04T10:05:06")]


@pytest.mark.parametrize(
    ("stamp", "expected"),
    [
        ("2026-03-04T10:05:06.25Z", "2026-03-04T10:05:06.250000"),
        ("2026-03-04 10:05:06,125", "2026-03-04T10:05:06.125000"),
        ("2026-03-04 10:05", "2026-03-04T10:05:00"),
        ("2026-03-04", "2026-03-04T00:00:00"),
        ("4/3/2026 12:05:00 AM", "2026-03-04T00:05:00"),
        ("4/3/2026 12:05:00 PM", "2026-03-04T12:05:00"),
        ("4/3/2026 1:05:00 PM", "2026-03-04T13:05:00"),
        ("2024-02-29 00:00:00", "2024-02-29T00:00:00"),
    ],
)
def test_stamp_fraction_and_halves_of_the_day_are_read(stamp: str, expected: str) -> None:
    assert seconds(stamp) == [at(expected)]


@pytest.mark.parametrize(
    "stamp",
    [
        "",
        "x",
        "2026-13-04 10:00",
        "2025-02-29 10:00",
        "2026-03-04 24:00",
        "2026-03-04 10:60",
        "4 Foo 2026 10:00",
        "1.5",
    ],
)
def test_stamp_of_no_time_is_nan(stamp: str) -> None:
    assert np.isnan(seconds(stamp)).all()


@given(st.lists(st.datetimes(datetime(1971, 1, 1), datetime(2099, 12, 31)), min_size=1, max_size=30))
def test_stamps_mixed_in_one_column_agree_with_datetime(moments: list[datetime]) -> None:
    written = [moment.isoformat(" ") for moment in moments]
    expected = [moment.replace(tzinfo=UTC).timestamp() for moment in moments]
    assert seconds(*written) == pytest.approx(expected, abs=1e-6)


@given(
    moment=st.datetimes(datetime(1990, 1, 1), datetime(2037, 12, 31)),
    zone=st.sampled_from(["Europe/Berlin", "America/St_Johns", "Australia/Lord_Howe"]),
)
def test_local_stamp_agrees_with_its_zone(moment: datetime, zone: str) -> None:
    # a stamp's text says nothing of which pass of a repeated hour it is
    moment = moment.replace(microsecond=0, fold=0)
    assert seconds(moment.isoformat(), zone=zone) == [moment.replace(tzinfo=ZoneInfo(zone)).timestamp()]


def test_local_stamps_through_the_repeated_hour_run_on() -> None:
    """On 2026-10-25 Berlin goes from 03:00 back to 02:00: rows of ten minutes from 00:00 UTC on, by the wall clock."""
    start = datetime(2026, 10, 25, tzinfo=UTC)
    moments = [start + timedelta(minutes=10 * step) for step in range(18)]
    wall = [moment.astimezone(ZoneInfo("Europe/Berlin")).strftime("%Y-%m-%d %H:%M") for moment in moments]
    assert len(set(wall)) == 12
    assert seconds(*wall, zone="Europe/Berlin") == [moment.timestamp() for moment in moments]


def test_local_clock_remembers_the_repeated_hour_from_block_to_block() -> None:
    clock = LocalClock(ZoneInfo("Europe/Berlin"))
    local = [at(f"2026-10-25T{stamp}") for stamp in ("02:30", "02:50", "02:00", "02:20", "02:40", "03:00")]
    found = [float(clock.to_utc(np.array([second]))[0]) for second in local]
    assert np.diff(found).tolist() == [1200.0, 600.0, 1200.0, 1200.0, 1200.0]


@pytest.mark.parametrize(
    ("cells", "kind"),
    [
        (["2026-03-04 10:00", "2026-03-04 10:01"], StampKind.STAMP),
        (["2026-03-04", "", "2026-03-05"], StampKind.DATE),
        (["10:00:00", "10:00:01.5"], StampKind.CLOCK),
        (["1772618400", "1772618401.5"], StampKind.EPOCH_S),
        (["1772618400000"], StampKind.EPOCH_MS),
        (["1.5", "12.25"], None),
        (["100200", "7"], None),
        (["Good", "Bad"], None),
        (["", ""], None),
    ],
)
def test_stamp_kind_is_what_the_cells_say(cells: list[str], kind: StampKind | None) -> None:
    assert stamp_kind(np.array([cell.encode() for cell in cells], dtype=np.bytes_)) is kind


def log_of(*stamps: str) -> str:
    return "time,PT-1\n" + "".join(f"{stamp},{step}\n" for step, stamp in enumerate(stamps))


def test_log_day_first_is_found_from_a_day_above_twelve(tmp_path: Path) -> None:
    digest = read(tmp_path, log_of("12/03/2026 23:59", "13/03/2026 00:00"))
    assert digest.first_s == at("2026-03-12T23:59")


def test_log_month_first_is_found_from_a_day_above_twelve(tmp_path: Path) -> None:
    digest = read(tmp_path, log_of("03/12/2026 23:59", "03/13/2026 00:00"))
    assert digest.first_s == at("2026-03-12T23:59")


def test_log_day_first_is_found_beyond_the_first_look(tmp_path: Path) -> None:
    stamps = [f"{day:02}/04/2026 {minute // 60:02}:{minute % 60:02}" for day in range(1, 16) for minute in range(1440)]
    digest = read(tmp_path, log_of(*stamps))
    assert (digest.first_s, digest.last_s) == (at("2026-04-01T00:00"), at("2026-04-15T23:59"))


def test_log_ambiguous_dates_are_refused_naming_the_setting(tmp_path: Path) -> None:
    with pytest.raises(JobError) as caught:
        read(tmp_path, log_of("03/04/2026 10:00", "03/04/2026 10:01"))
    assert str(caught.value) == (
        "log.csv, stamps: dates may have the day or the month first, and no row tells which, got 03/04/2026 10:00, "
        "expected [log] day_first = true or false in job.toml."
    )


@pytest.mark.parametrize(("day_first", "first"), [(True, "2026-04-03T10:00"), (False, "2026-03-04T10:00")])
def test_log_stated_day_first_decides(tmp_path: Path, day_first: bool, first: str) -> None:
    digest = read(tmp_path, log_of("03/04/2026 10:00", "03/04/2026 10:01"), day_first=day_first)
    assert digest.first_s == at(first)


def test_log_dotted_dates_have_the_day_first(tmp_path: Path) -> None:
    assert read(tmp_path, log_of("03.04.2026 10:00", "03.04.2026 10:01")).first_s == at("2026-04-03T10:00")


def test_log_dates_alike_both_ways_need_no_setting(tmp_path: Path) -> None:
    assert read(tmp_path, log_of("05/05/2026 10:00", "05/05/2026 10:01")).first_s == at("2026-05-05T10:00")


def test_log_date_and_time_in_two_columns_are_put_together(tmp_path: Path) -> None:
    text = "Date;Time;PT-1\n04.03.2026;09:59:59;1,5\n04.03.2026;10:00:00;1,6\n"
    digest = read(tmp_path, text, timezone="Europe/Berlin")
    assert columns(digest) == {"PT-1": [1.5, 1.6]}
    assert digest.first_s == at("2026-03-04T08:59:59")


@pytest.mark.parametrize(("scale", "first"), [(1, "1772618400"), (1000, "1772618400250")])
def test_log_epoch_stamps_are_read(tmp_path: Path, scale: int, first: str) -> None:
    digest = read(tmp_path, log_of(first, str(int(first) + scale)))
    assert digest.first_s == pytest.approx(int(first) / scale, abs=1e-6)
    assert digest.last_s - digest.first_s == pytest.approx(1.0, abs=1e-6)


def test_log_local_stamps_take_the_zone_of_the_job(tmp_path: Path) -> None:
    digest = read(tmp_path, log_of("2026-07-04 10:00:00", "2026-07-04 10:00:01"), timezone="Europe/Berlin")
    assert digest.first_s == at("2026-07-04T08:00:00")


def test_log_stamps_with_offset_need_no_zone(tmp_path: Path) -> None:
    digest = read(tmp_path, log_of("2026-07-04T10:00:00+05:30", "2026-07-04T10:00:01+05:30"), timezone="Europe/Berlin")
    assert digest.first_s == at("2026-07-04T04:30:00")


def test_log_stated_format_is_used(tmp_path: Path) -> None:
    text = log_of("10h05m06 on 26-04-03", "10h05m07 on 26-04-03", "late")
    digest = read(tmp_path, text, stamp=("time",), stamp_format="%Hh%Mm%S on %y-%m-%d")
    assert (digest.first_s, digest.last_s) == (at("2026-04-03T10:05:06"), at("2026-04-03T10:05:07"))
    assert rejects(digest) == [(4, "", "late", "unreadable stamp")]


def test_log_stated_format_with_unknown_directive_is_refused(tmp_path: Path) -> None:
    with pytest.raises(JobError) as caught:
        read(tmp_path, log_of("2026-07-04 10:00:00"), stamp_format="%Y-%Q")
    assert problem(caught.value).place == "job.toml, [log] stamp_format"
    assert problem(caught.value).found == "%Q"


def test_format_pattern_takes_signs_literally() -> None:
    assert format_pattern("%Y.%m.%d").fullmatch("2026x03x04") is None


def test_log_unknown_zone_is_refused(tmp_path: Path) -> None:
    with pytest.raises(JobError) as caught:
        read(tmp_path, log_of("2026-07-04 10:00:00"), timezone="Europe/Berlln")
    assert problem(caught.value).found == "Europe/Berlln"
