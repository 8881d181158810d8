"""The gauge under the cursor: its verdict in words, and what it read and should have read."""

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

    def __init__(self, spells: tuple[SpellFound, ...]) -> None:
        super().__init__("", markup=False)
        self._kinds = {spell.id: spell.kind.value for spell in spells}

    def watch_gauge(self) -> None:
        """Show the newly chosen gauge."""
        if self.gauge is not None:
            self.update(self._content(self.gauge))

    def _content(self, gauge: GaugeFound) -> Content:
        heading = Content.styled(f"{gauge.tag} at {gauge.station}", "bold")
        parts = [heading, Content(f"   {verdict_label(gauge.verdict)}")]
        if gauge.why:
            parts.append(Content(f"\n{gauge.why}"))
        return Content("").join([*parts, Content("\n"), self._spell_rows(gauge)])

    def _spell_rows(self, gauge: GaugeFound) -> Content:
        rows = [("Spell", "reads", "expected", "± u95", "")]
        for spell in gauge.spells:
            reading, expected, doubt = spell_columns(spell, gauge.unit)
            rows.append((f"{spell.id} {self._kinds.get(spell.id, '')}", reading, expected, doubt, gauge.unit.text))
        widths = [max(len(row[column]) for row in rows) for column in range(5)]
        lines = []
        for name, *numbers, unit in rows:
            cells = [name.ljust(widths[0]), *(n.rjust(w) for n, w in zip(numbers, widths[1:4], strict=True)), unit]
            lines.append("  ".join(cells).rstrip())
        return Content("\n").join([Content.styled(lines[0], "underline"), *map(Content, lines[1:])])
