"""Options that carry quantities, read into SI with every problem kept."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

from headledger.errors import JobError, Problem, QuantityError
from headledger.quantities import Dimension, PressureKind, Unit, parse_quantity, parse_unit, split_quantity


class QuantityOptions:
    """Reads options one by one and keeps what is wrong, so that all of it is told at once.

    Parameters
    ----------
    given : mapping of str to str, float or None
        By the option's name with underscores.
    """

    def __init__(self, given: Mapping[str, Any]) -> None:
        self._given = given
        self._problems: list[Problem] = []

    def text(self, name: str) -> str | None:
        """An option as written; None where it was not given."""
        value = self._given.get(name)
        return None if value is None else str(value)

    def number(self, name: str) -> float | None:
        """An option that is a plain number."""
        value = self._given.get(name)
        return None if value is None else float(value)

    def si(self, name: str, dimension: Dimension, *, above_zero: bool = False) -> float | None:
        """A quantity in SI; None where it was not given or is wrong. Pressures are differences."""
        text = self.text(name)
        if text is None:
            return None
        try:
            value = parse_quantity(text, dimension, default_kind=PressureKind.DIFFERENCE)
        except QuantityError as error:
            self.refuse(name, error.fault, error.found, error.expected)
            return None
        if above_zero and value <= 0.0:
            self.refuse(name, f"no {dimension}", text, "more than nothing")
            return None
        return value

    def unit(self, name: str, dimension: Dimension, default_kind: PressureKind | None = None) -> Unit | None:
        """The unit of an option that is a quantity or a unit alone; None where it was not given or is wrong."""
        text = self.text(name)
        if text is None:
            return None
        try:
            written = split_quantity(text)[1] if any(sign.isdigit() for sign in text.split()[0]) else text
            return parse_unit(written, dimension, default_kind=default_kind)
        except QuantityError as error:
            self.refuse(name, error.fault, error.found, error.expected)
            return None

    def refuse(self, name: str, fault: str, found: str = "", expected: str = "") -> None:
        """Keep a problem of an option."""
        problem = Problem(f"--{name.replace('_', '-')}", fault, found, expected)
        if problem not in self._problems:
            self._problems.append(problem)

    def raise_problems(self) -> None:
        """Stop where anything was wrong.

        Raises
        ------
        JobError
            With every problem kept.
        """
        if self._problems:
            raise JobError(self._problems)
