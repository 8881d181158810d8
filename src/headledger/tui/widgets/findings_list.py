"""Every cause that the data give weight to, in words, with its rivals."""

from __future__ import annotations

from textual.app import ComposeResult
from textual.containers import Vertical
from textual.content import Content
from textual.widgets import Static

from headledger.diagnosis.result import CauseFound
from headledger.sheets.headline import cause_label, told_causes
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
        told, rest = told_causes(self._causes)
        for cause in told:
            yield Static(_block(cause), classes="finding accepted" if cause.accepted else "finding")
        if rest:
            yield Static(Content(rest), classes="finding")


def _block(cause: CauseFound) -> Content:
    accepted = " (accepted)" if cause.accepted else ""
    first = Content.styled(f"{percent(cause.probability)}  {cause_label(cause)}{accepted}", "bold")
    return Content("\n").join([first, Content(cause.says)])
