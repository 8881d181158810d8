"""What a trait is: what a log shows of a gauge between and within its spells, with its odds."""

from __future__ import annotations

from dataclasses import dataclass

from headledger.diagnosis.result import CauseKind, Place

TRAIT_KINDS = (CauseKind.NOISY, CauseKind.SLUGGISH, CauseKind.CLOCK_OFFSET, CauseKind.LEAK)

FEWEST_SAMPLES = 30
"""Readings below which a gauge's noise or lag is not judged."""


@dataclass(frozen=True, slots=True, kw_only=True)
class Trait:
    """One such cause with its odds.

    Parameters
    ----------
    kind : CauseKind
    place : Place
    own : tuple of int
        Gauges that it belongs to.
    log_ratio : float
        Log of the density of the data with it over that without. [nat]
    size, sd : float
        In SI; 0 where the kind has no size.
    places : int
        At how many places its kind may sit.
    """

    kind: CauseKind
    place: Place
    own: tuple[int, ...]
    log_ratio: float
    size: float
    sd: float
    places: int
