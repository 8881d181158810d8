"""Numbers, times and places as plain JSON values."""

from __future__ import annotations

import math
from datetime import UTC, datetime
from typing import Any

from headledger.diagnosis.result import Place
from headledger.quantities import Unit

_SIGNIFICANT_DIGITS = 6


def stamp(time_s: float | None) -> str | None:
    """ISO 8601 in UTC with a Z, to the second or, where there is a fraction, the millisecond."""
    if time_s is None or not math.isfinite(time_s):
        return None
    time = datetime.fromtimestamp(round(time_s, 3), UTC)
    return time.isoformat(timespec="milliseconds" if time.microsecond else "seconds").replace("+00:00", "Z")


def number(value: float | None) -> float | None:
    """The value to six significant digits; None where there is none."""
    if value is None or not math.isfinite(value):
        return None
    return float(f"{value:.{_SIGNIFICANT_DIGITS}g}") + 0.0


def scaled(value: float | None, scale: float) -> float | None:
    """The value times a factor; None where there is none."""
    return None if value is None else value * scale


def in_unit(value_si: float | None, unit: Unit) -> float | None:
    """A pressure, flow or length of a unit without an offset."""
    return number(scaled(value_si, 1.0 / unit.factor))


def place_to_json(place: Place) -> dict[str, Any]:
    """Where a cause sits, with the one key that applies."""
    named: dict[str, Any] = {
        "gauge": place.gauge,
        "gauges": list(place.gauges),
        "run": place.run,
        "station": place.station,
    }
    found = {key: value for key, value in named.items() if value}
    return found if place.distance_m is None else found | {"distance": number(place.distance_m)}
