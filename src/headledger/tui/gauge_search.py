"""Gauges in the command palette: type a part of a tag, and its page opens."""

from __future__ import annotations

from collections.abc import Callable
from functools import partial
from typing import TYPE_CHECKING, cast

from textual.command import DiscoveryHit, Hit, Hits, Provider

from headledger.sheets.marks import by_trouble, verdict_label

if TYPE_CHECKING:
    from headledger.tui.screens.findings import FindingsScreen


class GaugeSearch(Provider):
    """Every gauge of the screen's result, the worst news first."""

    async def discover(self) -> Hits:
        """What is offered before anything is typed."""
        for tag, words, go in self._gauges():
            yield DiscoveryHit(tag, go, help=words)

    async def search(self, query: str) -> Hits:
        """Gauges whose tag matches."""
        matcher = self.matcher(query)
        for tag, words, go in self._gauges():
            score = matcher.match(tag)
            if score > 0.0:
                yield Hit(score, matcher.highlight(tag), go, help=words)

    def _gauges(self) -> list[tuple[str, str, Callable[[], None]]]:
        screen = cast("FindingsScreen", self.screen)
        return [
            (gauge.tag, f"{verdict_label(gauge.verdict)}, at {gauge.station}", partial(screen.open_gauge, gauge.tag))
            for gauge in by_trouble(screen.result.gauges)
        ]
