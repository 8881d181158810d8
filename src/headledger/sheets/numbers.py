"""How numbers, probabilities and times are printed for a reader."""

from __future__ import annotations

import math
from datetime import UTC, datetime, tzinfo


def decimals_for(doubt: float, *, most: int = 6) -> int:
    """Decimal places at which a doubt shows two significant digits, from 0 to `most`; 3 where there is none."""
    if not math.isfinite(doubt) or doubt <= 0.0:
        return min(3, most)
    return min(most, max(0, 1 - math.floor(math.log10(doubt))))


def fixed(value: float | None, decimals: int, *, signed: bool = False) -> str:
    """The value with that many decimals; a dash where there is none."""
    if value is None or not math.isfinite(value):
        return "–"
    rounded = round(value, decimals) + 0.0
    return f"{rounded:+.{decimals}f}" if signed and rounded != 0.0 else f"{rounded:.{decimals}f}"


def percent(probability: float) -> str:
    """A probability as a percentage that never claims certainty: ``< 1 %`` and ``> 99 %`` at the ends."""
    if not math.isfinite(probability):
        return "–"
    if probability < 0.01:
        return "< 1 %"
    if probability > 0.99:
        return "> 99 %"
    return f"{100.0 * probability:.0f} %"


def clock(time_s: float, zone: tzinfo = UTC) -> str:
    """Day and time to the minute. `time_s` in seconds since 1970-01-01 UTC."""
    return datetime.fromtimestamp(time_s, zone).strftime("%Y-%m-%d %H:%M")


def clock_range(start_s: float, end_s: float, zone: tzinfo = UTC) -> str:
    """From and until, the day written once where both share it."""
    start, end = datetime.fromtimestamp(start_s, zone), datetime.fromtimestamp(end_s, zone)
    until = f"{end:%H:%M}" if start.date() == end.date() else f"{end:%Y-%m-%d %H:%M}"
    return f"{start:%Y-%m-%d %H:%M} – {until}"
