"""headledger: says which gauges on a liquid piping system can be believed, and why."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

__version__ = "0.1.0"

if TYPE_CHECKING:
    from headledger.diagnosis.check import check_folder, check_job
    from headledger.readers.job import read_job

__all__ = ["__version__", "check_folder", "check_job", "read_job"]


def __getattr__(name: str) -> Any:
    """Load a public name when it is asked for, so that ``--help`` need not wait for what a check needs."""
    if name in ("check_folder", "check_job"):
        from headledger.diagnosis import check

        return getattr(check, name)
    if name == "read_job":
        from headledger.readers.job import read_job

        return read_job
    raise AttributeError(f"module 'headledger' has no attribute {name!r}")
