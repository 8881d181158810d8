"""Ways through a job's piping: the lines along which its grade line is drawn."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

from headledger.plant.job import Job
from headledger.plant.runs import Run


@dataclass(frozen=True, slots=True, kw_only=True)
class Leg:
    """One run on the way.

    Parameters
    ----------
    run : Run
    index : int
        Of the run in the job.
    forwards : bool
        Whether it is passed from its `start` to its `end`.
    """

    run: Run
    index: int
    forwards: bool

    @property
    def first(self) -> str:
        """Station at which the way enters it."""
        return self.run.start if self.forwards else self.run.end

    @property
    def last(self) -> str:
        """Station at which the way leaves it."""
        return self.run.end if self.forwards else self.run.start


@dataclass(frozen=True, slots=True, kw_only=True)
class Way:
    """Runs one after the other, from one station to another."""

    legs: tuple[Leg, ...]

    @property
    def stations(self) -> tuple[str, ...]:
        """Names of its stations, in order."""
        return (self.legs[0].first, *(leg.last for leg in self.legs))

    @property
    def name(self) -> str:
        """Where it leads from and to."""
        names = self.stations
        return f"{names[0]} to {names[-1]}"


# A run without length is drawn this much of the way long, so that what it takes of the head can be seen.
_LEAST_SHARE = 0.06


def places_along(way: Way) -> tuple[float, ...]:
    """Where each station stands along a way, from 0 to 1: by length, with a least share for what has none."""
    total = sum(leg.run.length_m for leg in way.legs)
    least = min(_LEAST_SHARE, 0.5 / len(way.legs)) * total if total > 0.0 else 1.0
    widths = [max(leg.run.length_m, least) for leg in way.legs]
    places, done = [0.0], 0.0
    for width in widths:
        done += width
        places.append(done / sum(widths))
    return tuple(places)


def ways_through(job: Job) -> tuple[Way, ...]:
    """Ways that together pass every run, the one with the most gauges first.

    Parameters
    ----------
    job : Job

    Returns
    -------
    tuple of Way
        From the first station of each connected part to each of its ends; a run that closes a loop has a way of its own.
    """
    tree, closing = _spanning_tree(job)
    inner = {way[-2].last if len(way) > 1 else way[0].first for way in tree.values() if way}
    ends = [way for station, way in tree.items() if way and station not in inner]
    loops = [(*tree[leg.first], leg) for leg in closing]
    found = [Way(legs=tuple(legs)) for legs in (*ends, *loops)]
    tapped = {gauge.station for gauge in job.gauges}
    return tuple(sorted(found, key=lambda way: (-len(tapped & set(way.stations)), -len(way.legs))))


def way_past(ways: Sequence[Way], *, station: str = "", run: str = "") -> int | None:
    """Index of the first way that passes a station or a run; None where none does."""
    for index, way in enumerate(ways):
        if (station and station in way.stations) or any(leg.run.name == run for leg in way.legs):
            return index
    return None


def _spanning_tree(job: Job) -> tuple[dict[str, tuple[Leg, ...]], list[Leg]]:
    """The way to every station from the first of its part, and the runs that close loops."""
    at: dict[str, list[Leg]] = {station.name: [] for station in job.stations}
    for index, run in enumerate(job.runs):
        at[run.start].append(Leg(run=run, index=index, forwards=True))
        at[run.end].append(Leg(run=run, index=index, forwards=False))
    # a way begins where liquid can enter the first run of the table, so that the picture reads as the table does
    heads = [run.start for run in job.runs] + [station.name for station in job.stations]
    tree: dict[str, tuple[Leg, ...]] = {}
    used: set[int] = set()
    closing: list[Leg] = []
    for root in heads:
        if root in tree:
            continue
        tree[root] = ()
        waiting = [root]
        for station in waiting:
            for leg in at[station]:
                if leg.index in used:
                    continue
                used.add(leg.index)
                if leg.last in tree:
                    closing.append(leg)
                else:
                    tree[leg.last] = (*tree[station], leg)
                    waiting.append(leg.last)
    return tree, closing
