"""Building blocks of the text reports: sections, bulleted lines, plain tables, and where they are printed."""

from __future__ import annotations

from collections.abc import Callable, Iterable, Iterator
from io import StringIO
from typing import Any, TextIO

from rich.console import Console
from rich.padding import Padding
from rich.table import Table
from rich.text import Text

# Square brackets are units and colons are times, never markup or pictures.
_TEXT_AS_IT_IS: dict[str, Any] = {"highlight": False, "markup": False, "emoji": False}
# Of a pipe or a file, where no terminal says how wide it is.
_PLAIN_WIDTH = 80
_INDENT = 2


def print_report(
    body: Callable[[Console], None], stream: TextIO, *, width: int | None = None, color: bool = True
) -> None:
    """Print a report.

    Parameters
    ----------
    body : callable
        Prints it on a console.
    stream : TextIO
    width : int, optional
        Columns; the terminal's, or 80 where there is none.
    color : bool
        False prints no colour even on a terminal; a stream that is no terminal never gets any.
    """
    if stream.isatty():
        body(Console(file=stream, width=width, no_color=None if color else True, **_TEXT_AS_IT_IS))
        return
    buffer = StringIO()
    body(Console(file=buffer, width=width or _PLAIN_WIDTH, no_color=True, **_TEXT_AS_IT_IS))
    stream.writelines(line.rstrip() + "\n" for line in buffer.getvalue().splitlines())


def section_width(console: Console) -> int:
    """Columns that a section's body has."""
    return console.width - _INDENT


def print_section(console: Console, title: str, parts: Iterable[Table | Text]) -> None:
    """Print a titled section; nothing where it has no parts."""
    blocks = list(parts)
    if not blocks:
        return
    console.print()
    if title:
        console.print(Text(title, style="bold"))
    for block in blocks:
        console.print(Padding(block, (0, 0, 0, _INDENT)) if title else block)


def hanging(label: str | Text, body: Text, *, label_width: int | None = None) -> Table:
    """A label and a text that wraps beside it."""
    grid = Table.grid(padding=(0, 1))
    grid.add_column(width=label_width, no_wrap=True)
    grid.add_column(overflow="fold")
    grid.add_row(label if isinstance(label, Text) else Text(label), body)
    return grid


def plain_table(*columns: str, right: frozenset[str] = frozenset()) -> Table:
    """A table without lines; cells fold where there is no room."""
    table = Table(box=None, padding=(0, 2, 0, 0), pad_edge=False, show_edge=False, header_style="")
    for name in columns:
        table.add_column(Text(name, style="underline"), justify="right" if name in right else "left", overflow="fold")
    return table


def bulleted(lines: Iterable[str]) -> Iterator[Table]:
    """Each line after a dash, wrapped beside it."""
    for line in lines:
        yield hanging("-", Text(line))
