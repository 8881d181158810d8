"""One family of errors: each problem says its place, what is wrong, what was found and what would be right."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass


@dataclass(frozen=True, slots=True)
class Problem:
    """One fault of the input, in the order in which a reader asks: where, what, found, expected.

    Parameters
    ----------
    place : str
        File, row and field, for example ``gauges.csv, row 4, unit`` (rows as a spreadsheet counts them, the header is 1).
    fault : str
        What is wrong, without a full stop.
    found : str
        The offending text or value, as it was written; empty if there is none.
    expected : str
        What would be right; empty if that is clear from the fault.
    """

    place: str
    fault: str
    found: str = ""
    expected: str = ""

    def __str__(self) -> str:
        got = f", got {self.found}" if self.found else ""
        want = f", expected {self.expected}" if self.expected else ""
        return f"{self.place}: {self.fault}{got}{want}."


class HeadledgerError(Exception):
    """Base of every error that a user can mend; never shown as a traceback."""


class JobError(HeadledgerError):
    """A job folder or one of its logs cannot be used; carries every problem found.

    Parameters
    ----------
    problems : iterable of Problem
        At least one.
    """

    def __init__(self, problems: Iterable[Problem]) -> None:
        self.problems: tuple[Problem, ...] = tuple(problems)
        super().__init__("\n".join(str(problem) for problem in self.problems))


class QuantityError(HeadledgerError):
    """A text that is no quantity or unit of the wanted dimension.

    Parameters
    ----------
    fault, found, expected : str
        As in `Problem`, which the caller makes of it by adding the place.
    """

    def __init__(self, fault: str, found: str = "", expected: str = "") -> None:
        self.fault, self.found, self.expected = fault, found, expected
        super().__init__(str(Problem("quantity", fault, found, expected)))


class NetworkError(HeadledgerError):
    """The piping graph has no solution; says which run or station and why."""


class NothingToCheckError(HeadledgerError):
    """No gauge can be checked with these data; says why."""
