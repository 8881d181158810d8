"""What the wheel carries besides code: samples, data of physics, the screen's style sheet, the type marker."""

from __future__ import annotations

import subprocess
import sys
import zipfile
from pathlib import Path

import pytest

ROOT = Path(__file__).parents[1]


@pytest.fixture(scope="module")
def wheel_names(tmp_path_factory: pytest.TempPathFactory) -> set[str]:
    """Names of all files in a wheel built from this checkout."""
    folder = tmp_path_factory.mktemp("wheel")
    command = [sys.executable, "-m", "hatchling", "build", "-t", "wheel", "-d", str(folder)]
    done = subprocess.run(command, cwd=ROOT, capture_output=True, text=True, check=False)
    assert done.returncode == 0, done.stderr
    (wheel,) = folder.glob("*.whl")
    with zipfile.ZipFile(wheel) as archive:
        return set(archive.namelist())


def packed(folder: Path, inside: str) -> set[str]:
    """Names under which the files of a folder should stand in the wheel."""
    files = (path for path in folder.rglob("*") if path.is_file() and "__pycache__" not in path.parts)
    return {f"{inside}/{path.relative_to(folder).as_posix()}" for path in files}


def test_wheel_holds_every_sample(wheel_names: set[str]):
    expected = packed(ROOT / "sample_logs", "headledger/sample_logs")
    assert any(name.endswith("/job.toml") for name in expected)
    assert expected <= wheel_names


def test_wheel_holds_data_style_sheet_and_type_marker(wheel_names: set[str]):
    expected = packed(ROOT / "src" / "headledger" / "physics" / "data", "headledger/physics/data")
    assert expected
    assert expected | {"headledger/tui/app.tcss", "headledger/py.typed"} <= wheel_names
    assert packed(ROOT / "src" / "headledger" / "sheets" / "fonts", "headledger/sheets/fonts") <= wheel_names


def test_wheel_holds_nothing_of_the_tests(wheel_names: set[str]):
    top = {name.split("/")[0] for name in wheel_names}
    assert {name for name in top if not name.endswith(".dist-info")} == {"headledger"}
