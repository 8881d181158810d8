"""Small tables of a job: text cells with their place, so that every fault can be named by row and field at once."""

from __future__ import annotations

import csv
import io
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field
from pathlib import Path

from headledger.errors import JobError, Problem, QuantityError
from headledger.quantities import Dimension, PressureKind, Unit, nearest, parse_number, parse_unit, split_header

MOST_BYTES = 64 * 1024 * 1024
"""A table of stations or gauges is never larger than this; a larger file is some other file. [B]"""


@dataclass(frozen=True, slots=True, kw_only=True)
class Column:
    """What a table may hold in a column.

    Parameters
    ----------
    dimension : Dimension or None
        Of a quantity whose unit stands in the header; None for text.
    required : bool
    """

    dimension: Dimension | None = None
    required: bool = False


@dataclass(slots=True)
class Problems:
    """Collects every problem of a job, so that all are reported at once."""

    found: list[Problem] = field(default_factory=list)

    def add(self, place: str, fault: str, found: str = "", expected: str = "") -> None:
        """Note a problem."""
        self.found.append(Problem(place, fault, found, expected))

    def raise_if_any(self) -> None:
        """Raise `JobError` with all of them.

        Raises
        ------
        JobError
        """
        if self.found:
            raise JobError(self.found)


@dataclass(frozen=True, slots=True)
class Row:
    """One row of a table; its cells are asked for by column and every fault is noted."""

    table: Table
    number: int
    cells: Mapping[str, str]

    def place(self, column: str = "") -> str:
        """Where this is, for a message."""
        return f"{self.table.file}, row {self.number}" + (f", {column}" if column else "")

    def fault(self, column: str, fault: str, found: str = "", expected: str = "") -> None:
        """Note a problem of a cell."""
        self.table.problems.add(self.place(column), fault, found, expected)

    def text(self, column: str) -> str:
        """A cell's text, empty where blank or absent."""
        return self.cells.get(column, "")

    def needed(self, column: str) -> str:
        """A cell that must not be blank."""
        value = self.text(column)
        if not value:
            self.fault(column, "is blank", "", "a value in every row")
        return value

    def number_of(self, column: str) -> float | None:
        """A plain number, None where blank or faulty."""
        text = self.text(column)
        if not text:
            return None
        try:
            return parse_number(text, decimal_comma=self.table.decimal_comma)
        except QuantityError as error:
            self.fault(column, error.fault, error.found, error.expected)
            return None

    def quantity(self, column: str) -> float | None:
        """A quantity in SI by its header's unit, None where blank or faulty."""
        unit = self.table.units.get(column)
        value = self.number_of(column)
        return None if value is None or unit is None else float(unit.to_si(value))

    def positive(self, column: str, *, zero: bool = False) -> float | None:
        """A quantity that must be positive (or zero where `zero`), None where blank or faulty."""
        value = self.quantity(column) if column in self.table.units else self.number_of(column)
        if value is not None and (value < 0.0 or (value == 0.0 and not zero)):
            self.fault(column, "must not be negative" if zero else "must be positive", self.text(column))
            return None
        return value

    def choice(self, column: str, choices: Sequence[str]) -> str:
        """A cell that must be one of some words; the first where blank or faulty."""
        text = self.text(column).casefold()
        if not text:
            return choices[0]
        if text not in choices:
            close = nearest(text, choices)
            hint = " or ".join(choices) + (f"; did you mean {close}?" if close else "")
            self.fault(column, "unknown word", self.text(column), hint)
            return choices[0]
        return text


@dataclass(slots=True)
class Table:
    """A table read as text, its headers understood.

    Parameters
    ----------
    file : str
    units : dict of str to Unit
        Of the quantity columns present.
    rows : list of Row
    decimal_comma : bool
    problems : Problems
    """

    file: str
    problems: Problems
    units: dict[str, Unit] = field(default_factory=dict)
    rows: list[Row] = field(default_factory=list)
    columns: tuple[str, ...] = ()
    decimal_comma: bool = False


def decode(raw: bytes, file: str) -> str:
    """Text of a file in UTF-8, UTF-16 or Latin-1.

    Raises
    ------
    JobError
        Empty or binary.
    """
    if not raw:
        raise JobError([Problem(file, "the file is empty", "0 bytes", "a table with a header row")])
    if raw[:2] in (b"\xff\xfe", b"\xfe\xff"):
        return raw.decode("utf-16", errors="replace")
    if b"\x00" in raw:
        raise JobError([Problem(file, "the file is binary", "zero bytes", "a text file (CSV)")])
    try:
        return raw.decode("utf-8-sig")
    except UnicodeDecodeError:
        return raw.decode("latin-1")


def read_table(
    path: Path, file: str, columns: Mapping[str, Column], problems: Problems, *, sheet: str | None = None
) -> Table:
    """Read a table and match its headers.

    Parameters
    ----------
    path : Path
    file : str
        As it is named in messages.
    columns : mapping of str to Column
        Every column that the table may hold; a name ending in ``*`` matches any text in its place.
    problems : Problems
        Where faults are noted.
    sheet : str, optional
        Of a workbook.

    Returns
    -------
    Table
        Without rows where the header cannot be used.
    """
    table = Table(file=file, problems=problems)
    try:
        rows = _workbook_rows(path, sheet) if sheet is not None else _csv_rows(path, file, table)
    except JobError as error:
        problems.found += error.problems
        return table
    except OSError as error:
        problems.add(file, "cannot be read", error.strerror or str(error), "a readable file")
        return table
    body = [(number, row) for number, row in enumerate(rows, 1) if any(cell.strip() for cell in row)]
    if not body:
        problems.add(file, "the table is empty", "", "a header row and one row or more")
        return table
    names = _match_headers(table, body[0][1], columns)
    for number, cells in body[1:]:
        if len(cells) > len(names) and any(cell.strip() for cell in cells[len(names) :]):
            problems.add(f"{file}, row {number}", "has more cells than the header", str(len(cells)), str(len(names)))
        values = {name: cell.strip() for name, cell in zip(names, cells, strict=False) if name}
        table.rows.append(Row(table, number, values))
    if not table.rows:
        problems.add(file, "holds no rows", "only a header", "one row or more")
    return table


def _csv_rows(path: Path, file: str, table: Table) -> list[list[str]]:
    """Cells of a CSV file, by whichever delimiter its header uses."""
    if path.stat().st_size > MOST_BYTES:
        raise JobError([Problem(file, "is too large for a table", f"{path.stat().st_size} bytes", "a small table")])
    text = decode(path.read_bytes(), file)
    header = text.lstrip("\r\n").split("\n", 1)[0]
    delimiter = max((",", ";", "\t", "|"), key=header.count)
    table.decimal_comma = delimiter == ";"
    csv.field_size_limit(1_000_000)
    try:
        return list(csv.reader(io.StringIO(text, newline=""), delimiter=delimiter))
    except csv.Error as error:
        raise JobError([Problem(file, "cannot be read as a table", str(error), "CSV")]) from None


def _workbook_rows(path: Path, sheet: str) -> list[list[str]]:
    """Cells of a sheet of a workbook, as text."""
    import python_calamine

    try:
        book = python_calamine.CalamineWorkbook.from_path(str(path))
        cells = book.get_sheet_by_name(sheet).to_python(skip_empty_area=False)
    except (python_calamine.CalamineError, OSError) as error:
        raise JobError([Problem(f"{path.name}#{sheet}", "cannot be read", str(error), "a sheet of a workbook")]) from None

    def text(cell: object) -> str:
        return f"{cell:.15g}" if isinstance(cell, float) else str(cell)

    return [[text(cell) for cell in row] for row in cells]


def _match_headers(table: Table, header: Sequence[str], columns: Mapping[str, Column]) -> list[str]:
    """The house's names of a table's columns, empty for unnamed ones; notes what is unknown, missing or told twice."""
    names: list[str] = []
    for text in header:
        name, unit = split_header(text)
        known = _known(name, columns)
        if not name:
            names.append("")
            continue
        if known is None:
            close = nearest(name, columns)
            expected = f"did you mean {close}?" if close else "one of " + ", ".join(columns)
            table.problems.add(f"{table.file}, header", "unknown column", name, expected)
            names.append("")
            continue
        actual = name.casefold() if known.endswith("*") else known
        if actual in names:
            table.problems.add(f"{table.file}, header", "column given twice", name)
        names.append(actual)
        _note_unit(table, actual, unit, columns[known])
    for name, column in columns.items():
        if column.required and name not in names:
            given = " [unit]" if column.dimension else ""
            table.problems.add(f"{table.file}, header", "required column is missing", "", f"a column {name}{given}")
    table.columns = tuple(names)
    return names


def _known(name: str, columns: Mapping[str, Column]) -> str | None:
    """The column that a header's name means."""
    folded = " ".join(name.casefold().split())
    for known in columns:
        if known.casefold() == folded or (known.endswith("*") and _fits(known, folded)):
            return known
    return None


def _fits(pattern: str, name: str) -> bool:
    """Whether a name fits a pattern whose one ``*`` stands for any text (a pattern's own ``*`` is its last character)."""
    head, tail = pattern[:-1].split("…") if "…" in pattern else (pattern[:-1], "")
    return name.startswith(head) and name.endswith(tail) and len(name) > len(head) + len(tail)


def _note_unit(table: Table, name: str, unit: str | None, column: Column) -> None:
    """Understand a header's unit."""
    place = f"{table.file}, header, {name}"
    if column.dimension is None:
        if unit is not None:
            table.problems.add(place, "this column takes no unit", f"[{unit}]", f"{name} alone")
        return
    if unit is None:
        example = {"length": "m", "pressure": "kPa", "flow": "m3/h", "temperature": "degC", "time": "s"}
        hint = f"{name} [{example.get(column.dimension, 'unit')}]"
        table.problems.add(place, "the unit is missing", name, hint)
        return
    try:
        table.units[name] = parse_unit(unit, column.dimension, default_kind=PressureKind.DIFFERENCE)
    except QuantityError as error:
        table.problems.add(place, error.fault, error.found, error.expected)
