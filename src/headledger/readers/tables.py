"""Small tables of a job: text cells with their place, so that every fault can be named by row and field at once."""

from __future__ import annotations

import csv
import io
import re
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field
from pathlib import Path

from headledger.errors import JobError, Problem, QuantityError
from headledger.quantities import Dimension, PressureKind, Unit, nearest, parse_number, parse_unit, split_header

MOST_BYTES = 64 * 1024 * 1024
"""A table of stations or gauges is never larger than this; a larger file is some other file. [B]"""


HIGHEST_M = 12_000.0
"""No pipe lies higher, or deeper under a datum: what is farther off is a slip of the pen. [m]"""


@dataclass(frozen=True, slots=True, kw_only=True)
class Column:
    """What a table may hold in a column.

    Parameters
    ----------
    dimension : Dimension or None
        Of a quantity whose unit stands in the header; None for text.
    required : bool
    kind : PressureKind
        Of a pressure; its header may say no other.
    """

    dimension: Dimension | None = None
    required: bool = False
    kind: PressureKind = PressureKind.DIFFERENCE


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
        """A cell that must not be blank; a column that is missing altogether is a fault of the header, noted there."""
        value = self.text(column)
        if not value and column in self.table.columns:
            self.fault(column, "is blank", "", "a value in every row")
        return value

    def number_of(self, column: str) -> float | None:
        """A plain number, None where blank or faulty."""
        text = self.text(column)
        if not text:
            return None
        if self.table.commas_seen and re.fullmatch(r"[-+]?[1-9]\d{0,2}\.\d{3}", text):
            either = f"{text.replace('.', '')} or {text.replace('.', ',')}"
            self.fault(column, "the point may mark thousands or decimals", text, either)
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

    def elevation(self, column: str) -> float | None:
        """An elevation, None where blank or faulty; one that no place on earth has is a fault. [m]"""
        value = self.quantity(column)
        if value is not None and abs(value) > HIGHEST_M:
            self.fault(column, "is no height on earth", self.text(column), f"at most {HIGHEST_M:g} m up or down")
            return None
        return value

    def positive(self, column: str, *, zero: bool = False) -> float | None:
        """A quantity that must be positive (or zero where `zero`), None where blank or faulty."""
        value = self.quantity(column) if column in self.table.units else self.number_of(column)
        if value is not None and (value < 0.0 or (value == 0.0 and not zero)):
            found = f"{self.text(column)} {self.table.unit_text(column)}".rstrip()
            self.fault(column, "must not be negative" if zero else "must be positive", found)
            return None
        return value

    def choice(self, column: str, choices: Sequence[str]) -> str:
        """A cell that must be one of some words; the first where blank or faulty."""
        text = self.text(column).casefold()
        if not text:
            return choices[0]
        if text not in choices:
            words = " or ".join(choice or "a blank cell" for choice in choices)
            self.fault(column, "unknown word", self.text(column), nearest(text, choices) or words)
            return choices[0]
        return text


@dataclass(slots=True)
class Table:
    """A table read as text, its headers understood.

    Parameters
    ----------
    file : str
    problems : Problems
        Where faults are noted.
    units : dict of str to Unit
        Of the quantity columns present.
    rows : list of Row
    columns : tuple of str
        In the order of the file; empty where the header cannot be used.
    decimal_comma : bool
        Whether a comma may mark decimals.
    commas_seen : bool
        Whether some cell does use it so.
    """

    file: str
    problems: Problems
    units: dict[str, Unit] = field(default_factory=dict)
    rows: list[Row] = field(default_factory=list)
    columns: tuple[str, ...] = ()
    decimal_comma: bool = False
    commas_seen: bool = False

    def unit_text(self, column: str) -> str:
        """The unit of a column as its header writes it, empty where it has none."""
        unit = self.units.get(column)
        return unit.text if unit else ""


def decode(raw: bytes, file: str) -> str:
    """Text of a file in UTF-8, UTF-16 or, failing these, Latin-1 in the variant of Windows.

    Raises
    ------
    JobError
        Empty, binary or damaged.
    """
    if not raw:
        raise JobError([Problem(file, "the file is empty", "0 bytes", "text")])
    if raw[:2] in (b"\xff\xfe", b"\xfe\xff"):
        try:
            return raw.decode("utf-16")
        except UnicodeDecodeError as error:
            fault = f"is marked as UTF-16 and cannot be read as such from byte {error.start} on"
            raise JobError([Problem(file, fault, "", "a file saved again as UTF-8")]) from None
    if b"\x00" in raw:
        expected = "a text file; a table in a workbook is named as plant.xlsx#sheet"
        raise JobError([Problem(file, "the file is binary", "zero bytes", expected)])
    for encoding in ("utf-8-sig", "cp1252"):
        try:
            return raw.decode(encoding)
        except UnicodeDecodeError:
            continue
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
        Every column that the table may hold.
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
        rows = _workbook_rows(path, file, sheet) if sheet is not None else _csv_rows(path, file, table)
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
    number, header = body[0]
    names = _match_headers(table, number, header, columns)
    for number, cells in body[1:]:
        if any(cell.strip() for cell in cells[len(names) :]):
            problems.add(f"{file}, row {number}", "has more cells than the header", str(len(cells)), str(len(names)))
        values = {name: cell.strip() for name, cell in zip(names, cells, strict=False) if name}
        table.rows.append(Row(table, number, values))
    if not table.rows:
        problems.add(file, "holds no rows", "only a header", "one row or more")
    table.commas_seen = table.decimal_comma and any(
        re.fullmatch(r"[-+]?\d+,\d+", cell) for row in table.rows for cell in row.cells.values()
    )
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
    rows = csv.reader(io.StringIO(text, newline=""), delimiter=delimiter, strict=True)
    try:
        return list(rows)
    except csv.Error as error:
        fault = f"cannot be read as a table ({error})"
        raise JobError([Problem(f"{file}, line {rows.line_num}", fault, "", "quotation marks in pairs")]) from None


def _workbook_rows(path: Path, file: str, sheet: str) -> list[list[str]]:
    """Cells of a sheet of a workbook, as text."""
    import python_calamine

    try:
        book = python_calamine.CalamineWorkbook.from_path(str(path))
    except (python_calamine.CalamineError, OSError) as error:
        raise JobError([Problem(file, "is no workbook that can be read", str(error), "an .xlsx file")]) from None
    if sheet not in book.sheet_names:
        expected = nearest(sheet, book.sheet_names) or "one of " + ", ".join(book.sheet_names)
        raise JobError([Problem(file, "there is no such sheet", sheet, expected)])
    cells = book.get_sheet_by_name(sheet).to_python(skip_empty_area=False)

    def text(cell: object) -> str:
        return f"{cell:.15g}" if isinstance(cell, float) else str(cell)

    return [[text(cell) for cell in row] for row in cells]


def _match_headers(table: Table, number: int, header: Sequence[str], columns: Mapping[str, Column]) -> list[str]:
    """The house's names of a table's columns, empty for unknown ones; notes what is unknown, missing or told twice."""
    place = f"{table.file}, row {number}"
    by_folded = {known.casefold(): known for known in columns}
    names: list[str] = []
    for text in header:
        name, unit = split_header(text)
        known = by_folded.get(_folded(name), "")
        if name and not known:
            bare, loose = split_header(text, round_brackets=True)
            meant = by_folded.get(_folded(bare), "")
            if unit is None and loose is not None and meant and columns[meant].dimension:
                table.problems.add(place, "a unit stands in square brackets", text.strip(), f"{bare} [{loose}]")
                known, unit = meant, loose
            else:
                expected = nearest(name, columns) or "one of " + ", ".join(columns)
                table.problems.add(place, "unknown column", name, expected)
        if known and known in names:
            table.problems.add(f"{place}, {known}", "this column stands twice", text.strip(), "one column of this name")
            known = ""
        names.append(known)
        if known:
            _note_unit(table, f"{place}, {known}", known, unit, columns[known])
    for name, column in columns.items():
        if column.required and name not in names:
            example = f"{name} [{_EXAMPLE_UNITS[column.dimension]}]" if column.dimension else name
            table.problems.add(place, "a required column is missing", "", f"a column {example}")
    table.columns = tuple(name for name in names if name)
    return names


def _folded(name: str) -> str:
    """A column's name without what case and spaces say."""
    return " ".join(name.casefold().split())


_EXAMPLE_UNITS: dict[Dimension, str] = {
    Dimension.LENGTH: "m",
    Dimension.PRESSURE: "kPa",
    Dimension.FLOW: "m3/h",
    Dimension.TEMPERATURE: "degC",
    Dimension.TIME: "s",
}


def _note_unit(table: Table, place: str, name: str, unit: str | None, column: Column) -> None:
    """Understand a header's unit."""
    if column.dimension is None:
        if unit is not None:
            table.problems.add(place, "this column takes no unit", f"{name} [{unit}]", name)
        return
    if unit is None:
        table.problems.add(place, "the unit is missing", name, f"{name} [{_EXAMPLE_UNITS[column.dimension]}]")
        return
    try:
        found = parse_unit(unit, column.dimension, default_kind=column.kind)
    except QuantityError as error:
        table.problems.add(place, error.fault, error.found, error.expected)
        return
    if column.dimension is Dimension.PRESSURE and found.kind is not column.kind:
        plain = found.as_difference().text
        fault = f"of the wrong kind, {found.kind} and not {column.kind}"
        table.problems.add(place, fault, f"{name} [{unit}]", f"{name} [{plain}]")
        return
    table.units[name] = found
