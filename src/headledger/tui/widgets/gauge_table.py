"""One row a gauge, the worst news first."""

from __future__ import annotations

from typing import ClassVar

from rich.style import Style
from rich.text import Text
from textual.widgets import DataTable

from headledger.diagnosis.result import GaugeFound, Verdict
from headledger.sheets.columns import error_columns
from headledger.sheets.marks import by_trouble, verdict_label
from headledger.sheets.numbers import percent

_NUMBERS = ("Error", "± u95", "Tolerance", "Outside")


class GaugeTable(DataTable[Text]):
    """Verdict with mark and word, error and tolerance of every gauge.

    Parameters
    ----------
    gauges : tuple of GaugeFound
    """

    COMPONENT_CLASSES: ClassVar[set[str]] = DataTable.COMPONENT_CLASSES | {
        f"gauge-table--{verdict.value}" for verdict in Verdict
    }

    def __init__(self, gauges: tuple[GaugeFound, ...]) -> None:
        super().__init__(cursor_type="row", zebra_stripes=False)
        self._gauges = by_trouble(gauges)

    def on_mount(self) -> None:
        """Fill the table, and again when the theme changes, since cells keep the colours they were made with."""
        for name in ("Verdict", "Gauge", "Error", "± u95", "Tolerance", "Unit", "Outside"):
            self.add_column(Text(name, justify="right" if name in _NUMBERS else "left"), key=name)
        self._fill()
        self.app.theme_changed_signal.subscribe(self, lambda _theme: self._fill())

    def gauge_at(self, row: int) -> GaugeFound:
        """The gauge that a row shows."""
        return self._gauges[row]

    def choose(self, tag: str) -> None:
        """Move the cursor to a gauge."""
        self.move_cursor(row=[gauge.tag for gauge in self._gauges].index(tag))

    def _fill(self) -> None:
        row = self.cursor_row
        self.clear()
        for gauge in self._gauges:
            self.add_row(*self._cells(gauge), key=gauge.tag)
        self.move_cursor(row=row)

    def _cells(self, gauge: GaugeFound) -> tuple[Text, ...]:
        style = self._style(gauge.verdict)
        numbers = (*error_columns(gauge), percent(gauge.outside_probability))
        error, doubt, tolerance, outside = (Text(number, justify="right") for number in numbers)
        return (
            Text(verdict_label(gauge.verdict), style=style),
            Text(gauge.tag),
            error,
            doubt,
            tolerance,
            Text(gauge.unit.text),
            outside,
        )

    def _style(self, verdict: Verdict) -> Style:
        """Colour and weight of a verdict; the background stays the row's."""
        style = self.get_component_rich_style(f"gauge-table--{verdict.value}", partial=True)
        return Style(color=style.color, bold=style.bold, underline=style.underline)
