"""A sound job folder, to be spoilt one cell at a time."""

from __future__ import annotations

from dataclasses import dataclass
from pathlib import Path

import pytest

from headledger.errors import JobError
from headledger.plant.job import Job
from headledger.readers.job import read_job

SOUND = {
    "job.toml": """format = 1

[job]
title = "Riser"
site = "Quay 4"
prepared_by = "A. Fitter"
stations = "stations.csv"
runs = "runs.csv"
gauges = "gauges.csv"
logs = ["log.csv"]

[liquid]
kind = "water"
temperature = "18 degC"

[site]
datum_altitude = "210 m"
latitude = "47 deg"
barometer = "98.9 kPa"

[check]
tolerance = "1 % span"
""",
    "stations.csv": """station,elevation [m],kind,elevation uncertainty [mm]
S1,2.0,,
S2,12.0,,10
S3,30.0,surface,
""",
    "runs.csv": """run,from,to,length [m],bore [mm],roughness [mm],fittings K,flow column,flow unit
R1,S1,S2,40,100,0.045,3.5,FT-1,m3/h
R2,S2,S3,25,80,,1,,
""",
    "gauges.csv": """tag,station,low station,elevation [m],unit,range low,range high,accuracy
PT-1,S1,,1.2,barg,0,10,class 1.6
PT-2,S2,,,psia,0,150,0.25 % span
DP-1,S1,S2,,kPa,-50,150,grade 2A
""",
    "log.csv": "time,PT-1,PT-2,DP-1\n2026-03-02T08:00:00Z,3.1,60,98\n",
}


@dataclass(frozen=True)
class JobFolder:
    """A job folder under test."""

    path: Path

    def write(self, name: str, content: str | bytes) -> JobFolder:
        """Write a file."""
        raw = content if isinstance(content, bytes) else content.encode("utf-8")
        (self.path / name).write_bytes(raw)
        return self

    def change(self, name: str, old: str, new: str) -> JobFolder:
        """Replace a text that stands once in a file."""
        text = (self.path / name).read_text(encoding="utf-8")
        assert text.count(old) == 1, (name, old)
        return self.write(name, text.replace(old, new))

    def read(self) -> Job:
        """The job in it."""
        return read_job(self.path)

    def faults(self) -> list[str]:
        """What is said of a folder that cannot be used."""
        with pytest.raises(JobError) as caught:
            self.read()
        return [str(problem) for problem in caught.value.problems]


@pytest.fixture(scope="session")
def sound_files() -> dict[str, str]:
    """The files of a sound job folder."""
    return dict(SOUND)


@pytest.fixture
def job_folder(tmp_path: Path) -> JobFolder:
    """A sound job folder."""
    folder = JobFolder(tmp_path / "riser")
    folder.path.mkdir()
    for name, text in SOUND.items():
        folder.write(name, text)
    return folder
