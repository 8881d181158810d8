"""What the check tells the screen; each sent from its thread."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

from textual.message import Message

from headledger.tui.ending import Ending

if TYPE_CHECKING:
    from headledger.diagnosis.result import CheckResult


@dataclass
class CheckProgress(Message):
    """A step of the check, and how much of the whole is done. Only the newest counts."""

    step: str
    fraction: float

    def can_replace(self, message: Message) -> bool:
        """Whether this one makes a waiting one needless."""
        return isinstance(message, CheckProgress)


@dataclass
class CheckFinished(Message):
    """The check came to a result."""

    result: CheckResult


@dataclass
class CheckEnded(Message):
    """The check ended without a result: refused, stopped, or by a fault; says why in lines."""

    ending: Ending
    lines: tuple[str, ...]
