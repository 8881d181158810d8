"""``headledger`` and ``python -m headledger``."""

from __future__ import annotations

import sys

from headledger.cli.main import main


def run() -> None:
    """Run the command line and leave with its exit status."""
    sys.exit(main())


if __name__ == "__main__":
    run()
