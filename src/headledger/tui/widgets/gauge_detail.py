"""One gauge in words and numbers: its verdict, and what it read and should have read, spell by spell."""

from __future__ import annotations

from textual.content import Content
from textual.reactive import var
from textual.widgets import Static

from headledger.diagnosis.result import GaugeFound, SpellFound
from headledger.sheets.columns import spell_columns
from headledger.sheets.marks import verdict_label


class GaugeDetail(Static):
    """One gauge, spell by spell.

    Parameters
    ----------
    spells : tuple of SpellFound
        Of the result, for the kind of each.
    """

    gauge: var[GaugeFound | None] = var(None, init=False)
    spell_id: var[int] = var(0, init=False)

    def __init__(self, spells: tuple[SpellFound, ...]) -> None:
        super().__init__("", markup=False)
        self._kinds = {spell.id: spell.kind.value for spell in spells}

    def watch_gauge(self) -> None:
        """Show the newly chosen gauge."""
        self._show()

    def watch_spell_id(self) -> None:
        """Show which spell is looked at."""
        self._show()

    def _show(self) -> None:
        if self.gauge is not None:
            self.update(self._content(self.gauge))

    def _content(self, gauge: GaugeFound) -> Content:
        heading = Content.styled(f"{gauge.tag} at {gauge.station}", "bold")
        parts = [heading, Content(f"   {verdict_label(gauge.verdict)}")]
        if gauge.why:
            parts.append(Content(f"\n{gauge.why}"))
        return Content("").join([*parts, Content("\n"), self._spell_rows(gauge)])

    def _spell_rows(self, gauge: GaugeFound) -> Content:
        rows = [(f"  {gauge.unit.text}", "reads", "expected", "± u95", "off by")]
        for spell in gauge.spells:
            mark = "▸ " if spell.id == self.spell_id else "  "
            name = f"{mark}{spell.id} {self._kinds.get(spell.id, '')}"
            rows.append((name, *spell_columns(spell, gauge.unit)))
        widths = [max(len(row[column]) for row in rows) for column in range(5)]
        lines = []
        for name, *numbers in rows:
            cells = [name.ljust(widths[0]), *(n.rjust(w) for n, w in zip(numbers, widths[1:], strict=True))]
            lines.append("  ".join(cells).rstrip())
        return Content("\n").join([Content.styled(lines[0], "underline"), *map(Content, lines[1:])])
