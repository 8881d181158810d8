"""What an exit status of headledger says."""

from __future__ import annotations

from enum import IntEnum


class ExitCode(IntEnum):
    """Exit statuses; scripts rely on them."""

    # Every gauge that can be checked passes and nothing is wrong.
    SOUND = 0
    # A gauge fails or is unresolved, a cause is accepted, or it is improbable that nothing is wrong.
    TROUBLE = 1
    # The job or its logs cannot be used, or the command line is wrong.
    UNUSABLE = 2
    # Nothing can be checked.
    NOTHING_CHECKED = 3
    # A fault of the program.
    FAULT = 70
    # Interrupted from the keyboard.
    INTERRUPTED = 130
