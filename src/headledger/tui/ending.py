"""How a stay at the screen ended, for whoever started it."""

from __future__ import annotations

from enum import StrEnum


class Ending(StrEnum):
    """What was on the screen last."""

    FOUND = "found"
    STOPPED = "stopped"
    REFUSED = "refused"
    NOTHING_TO_CHECK = "nothing to check"
    FAULT = "fault"
