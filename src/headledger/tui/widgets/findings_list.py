"""Every cause that the data give weight to, in words, with its rivals."""

from __future__ import annotations

from textual.app import ComposeResult
from textual.containers import Vertical
from textual.content import Content
from textual.widgets import Static

from headledger.diagnosis.result import CauseFound
from headledger.sheets.headline import cause_label, rivals_line
from headledger.sheets.numbers import percent


class FindingsList(Vertical):
    """The most probable first.

    Parameters
    ----------
    causes : tuple of CauseFound
    """

    def __init__(self, causes: tuple[CauseFound, ...]) -> None:
        super().__init__()
        self._causes = causes

    def compose(self) -> ComposeResult:
        """A block a cause."""
        yield Static("Findings", classes="heading")
        if not self._causes:
            yield Static("No cause has weight.", classes="finding")
        for cause in self._causes:
            yield Static(_block(cause), classes="finding accepted" if cause.accepted else "finding")


def _block(cause: CauseFound) -> Content:
    accepted = " (accepted)" if cause.accepted else ""
    first = Content.styled(f"{percent(cause.probability)}  {cause_label(cause)}{accepted}", "bold")
    rest = [Content(line) for line in (cause.says, rivals_line(cause)) if line]
    return Content("\n").join([first, *rest])
