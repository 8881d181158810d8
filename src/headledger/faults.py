"""What is said when the program itself is at fault: the same on the command line and on the screen."""

from __future__ import annotations

import traceback
from pathlib import Path

from headledger import __version__

TRACEBACK_VARIABLE = "HEADLEDGER_TRACEBACK"


def fault_lines(error: BaseException) -> tuple[str, str]:
    """Two sentences: what went wrong and where in the program, and how to report it."""
    frames = traceback.extract_tb(error.__traceback__)
    place = f" ({Path(frames[-1].filename).name}, line {frames[-1].lineno})" if frames else ""
    return (
        f"headledger {__version__} is at fault, not your job: {type(error).__name__}: {error}{place}.",
        "Please report this to its makers with the command that you gave, and with the job folder if you may; "
        f"{TRACEBACK_VARIABLE}=1 prints the whole trace.",
    )
