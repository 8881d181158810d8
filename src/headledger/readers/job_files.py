"""The files that job.toml names, each kept inside the job folder."""

from __future__ import annotations

from collections.abc import Mapping
from pathlib import Path

from headledger.quantities import nearest
from headledger.readers.job_settings import FILE, Section
from headledger.readers.tables import Column, Problems, Table, read_table

WALK_FILE = "walk.csv"
MOST_LOGS = 10_000
LOGS_EXAMPLE = 'logs = ["log.csv"]'


class JobFiles:
    """The files of a job folder: tables read as they are asked for, logs found by path or glob.

    Parameters
    ----------
    folder : Path
    section : Section
        The ``[job]`` table.
    problems : Problems
    """

    def __init__(self, folder: Path, section: Section, problems: Problems) -> None:
        self.folder, self.section, self.problems = folder, section, problems
        self.read: list[Path] = [folder / FILE]

    def table(self, key: str, columns: Mapping[str, Column], *, needed: bool = False) -> Table:
        """The table that a key names; one without rows where it is not given or cannot be read."""
        name = self.section.text(key)
        empty = Table(file=name or key, problems=self.problems)
        if not name:
            if needed:
                self.section.fault(key, "is missing", "", f'{key} = "{key}.csv"')
            return empty
        file, _, sheet = name.partition("#")
        path = self._inside(key, file)
        if path is None:
            return empty
        if not path.is_file():
            self.section.fault(key, "there is no such file", file, self._nearest_file(file))
            return empty
        if path not in self.read:
            self.read.append(path)
        return read_table(path, name, columns, self.problems, sheet=sheet or None)

    def _inside(self, key: str, file: str) -> Path | None:
        """A path within the job folder."""
        path = self.folder / file
        try:
            inside = path.resolve().is_relative_to(self.folder.resolve())
        except (OSError, ValueError, RuntimeError):
            inside = False
        if Path(file).is_absolute() or not inside:
            self.section.fault(key, "leads out of the job folder", file, "a file inside it; copy it there")
            return None
        return path

    def _nearest_file(self, file: str) -> str:
        """What is in the folder under a similar name."""
        return nearest(file, [path.name for path in self.folder.iterdir()]) or "a file in the job folder"

    def logs(self, *, needed: bool) -> tuple[tuple[Path, ...], list[str]]:
        """Existing log files in the order stated and the walk where there is one; and what of them is not there.

        Parameters
        ----------
        needed : bool
            Whether a log that is not there is a problem; beside a walk it never is, and is said as a remark.
        """
        walk = self.folder / WALK_FILE
        lenient = walk.is_file() or not needed
        found: list[Path] = []
        remarks: list[str] = []
        for pattern in self._stated_logs(lenient=lenient):
            if self._inside("logs", pattern) is None:
                continue
            matches = self._matching(pattern)
            found += [path for path in matches if path not in found]
            if not matches and lenient:
                remarks.append(f"{pattern}: there is no such log yet.")
            elif not matches:
                self.section.fault("logs", "there is no such file", pattern, self._nearest_file(pattern))
        if walk.is_file() and walk not in found:
            found.append(walk)
        return tuple(found), remarks

    def _stated_logs(self, *, lenient: bool) -> list[str]:
        """The paths and globs of ``logs``."""
        stated = self.section.values.get("logs", [])
        if isinstance(stated, str):
            stated = [stated]
        if not (isinstance(stated, list) and all(isinstance(item, str) and item for item in stated)):
            self.section.fault("logs", "must be a list of paths", repr(stated), LOGS_EXAMPLE)
            return []
        if not stated and not lenient:
            fault = "names no log" if "logs" in self.section.values else "is missing"
            self.section.fault("logs", fault, "", LOGS_EXAMPLE)
        return [str(item) for item in stated]

    def _matching(self, pattern: str) -> list[Path]:
        """Files that a path or glob names."""
        path = self.folder / pattern
        if path.is_file():
            return [path]
        if not any(mark in pattern for mark in "*?["):
            return []
        found: list[Path] = []
        for match in self.folder.glob(pattern):
            if match.is_file() and match.resolve().is_relative_to(self.folder.resolve()):
                found.append(match)
            if len(found) > MOST_LOGS:
                self.section.fault("logs", "matches too many files", pattern, f"at most {MOST_LOGS}")
                break
        return sorted(found)
