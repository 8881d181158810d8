"""Numbers that no job has are refused where they stand."""

from __future__ import annotations

import pytest

from tests.readers.conftest import JobFolder


@pytest.mark.parametrize(
    ("name", "old", "new", "message"),
    [
        (
            "stations.csv",
            "S2,12.0",
            "S2,1e9",
            "stations.csv, row 3, elevation: is no height on earth, got 1e9, expected at most 12000 m up or down.",
        ),
        (
            "gauges.csv",
            "PT-1,S1,,1.2",
            "PT-1,S1,,-20000",
            "gauges.csv, row 2, elevation: is no height on earth, got -20000, expected at most 12000 m up or down.",
        ),
    ],
)
def test_elevation_beyond_the_earth_is_refused_in_its_place(
    job_folder: JobFolder, name: str, old: str, new: str, message: str
) -> None:
    assert job_folder.change(name, old, new).faults() == [message]
