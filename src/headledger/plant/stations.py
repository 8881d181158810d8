"""Stations: places along the pipe and free surfaces, with their elevation and its doubt."""

from __future__ import annotations

from dataclasses import dataclass
from enum import StrEnum

from headledger.quantities import Unit


class StationKind(StrEnum):
    """What stands at a station."""

    PIPE = "pipe"
    SURFACE = "surface"


class Exchange(StrEnum):
    """Whether liquid may enter or leave the system at a station."""

    OPEN = "open"
    CLOSED = "closed"


@dataclass(frozen=True, slots=True, kw_only=True)
class Station:
    """A place on the pipe, or a free surface open to the atmosphere.

    Parameters
    ----------
    name : str
    elevation_m : float
        Of the pipe's centreline, or of the surface, above the job's datum. [m]
    elevation_sd_m : float
        Standard uncertainty of it. [m]
    kind : StationKind
    exchange : Exchange
    exchange_stated : bool
        False where the default rule decided.
    level_column, level_unit : str or None, Unit or None
        Log column that measures a surface's elevation.
    """

    name: str
    elevation_m: float
    elevation_sd_m: float
    kind: StationKind = StationKind.PIPE
    exchange: Exchange = Exchange.CLOSED
    exchange_stated: bool = False
    level_column: str | None = None
    level_unit: Unit | None = None
