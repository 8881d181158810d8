"""Units at the border only: text and columns become SI floats and back, and pressures keep their kind."""

from __future__ import annotations

from dataclasses import dataclass
from enum import StrEnum


class PressureKind(StrEnum):
    """Against what a pressure is measured."""

    GAUGE = "gauge"
    ABSOLUTE = "absolute"
    DIFFERENCE = "difference"


class Dimension(StrEnum):
    """The dimensions that a job file can ask for."""

    LENGTH = "length"
    PRESSURE = "pressure"
    FLOW = "flow"
    TEMPERATURE = "temperature"
    TEMPERATURE_DIFFERENCE = "temperature difference"
    DENSITY = "density"
    VISCOSITY = "viscosity"
    TIME = "time"
    ANGLE = "angle"
    SALINITY = "salinity"
    VOLUME = "volume"
    VOLTAGE = "voltage"
    CURRENT = "current"
    RATIO = "ratio"


@dataclass(frozen=True, slots=True)
class Unit:
    """A unit as written, with what turns it into SI: ``si = value * factor + offset``.

    Parameters
    ----------
    text : str
        As the user wrote it, tidied; used to print values back.
    dimension : Dimension
    factor : float
        SI units per unit.
    offset : float
        SI value of zero; only temperatures have one.
    kind : PressureKind or None
        For pressures.
    """

    text: str
    dimension: Dimension
    factor: float
    offset: float = 0.0
    kind: PressureKind | None = None
