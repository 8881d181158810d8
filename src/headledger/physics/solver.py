"""Flows and heads of a whole piping system from its losses, pumps, known heads and known draws: no gauge, no log.

With the flows ``Q = Q₀ + N y`` that keep every mass balance, the energy balances of all open runs are the gradient of a convex function
of ``y`` as long as every run loses more the more flows. Newton's method with a line search on that gradient reaches its one minimum from
any start; the derivative of a loss that has none (a quadratic loss at rest) gets a floor in Newton's matrix and none in the balance.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable, Mapping, Sequence
from dataclasses import dataclass, field
from heapq import heappop, heappush

import numpy as np
from numpy.typing import NDArray

from headledger.errors import NetworkError

Array = NDArray[np.float64]

LossFunction = Callable[[Array], tuple[Array, Array]]
"""From the flows of all runs to the head lost in each (a lift counts negative) and its derivative, both of shape (runs,)."""

SLOPE_FLOOR = 1e-9
"""Least derivative of a loss in Newton's matrix, as a part of the run's resistance at a typical head. [-]"""

ENERGY_TOLERANCE_M = 1e-10
"""The energy balance of every loop and between known heads closes to this, or to rounding where heads are great. [m]"""

LEAST_FLOW_M3_S, GREATEST_FLOW_M3_S = 1e-15, 1e6
"""Between these a run's flow is looked for at which it takes a typical head. [m³/s]"""

ROUNDINGS = 16.0
"""Roundings that a sum of drops is allowed, in units of the last place of its greatest parts. [-]"""

FLATTER = 0.1
"""A step may overshoot to this part of the slope that it left, and must take this part off it. [-]"""

MOST_STEPS, MOST_HALVINGS, MOST_CHECKS = 200, 60, 40


@dataclass(frozen=True, slots=True, kw_only=True)
class Piping:
    """What is known of a piping system before its flows are.

    Parameters
    ----------
    station_count : int
    ends : tuple of (int, int)
        Stations from and to of each run.
    is_open : tuple of bool
        Whether liquid can pass each run.
    one_way : tuple of bool
        Check valves: liquid passes forwards alone.
    head_m : dict of int to float
        Known heads: surfaces, and stations where a head is held. [m]
    draw_m3_s : dict of int to float
        Liquid drawn off at stations, negative where it is fed in. [m³/s]
    names : tuple of str
        Of the stations, for what is said of them; their numbers by default.
    """

    station_count: int
    ends: tuple[tuple[int, int], ...]
    is_open: tuple[bool, ...]
    one_way: tuple[bool, ...] = ()
    head_m: Mapping[int, float] = field(default_factory=dict)
    draw_m3_s: Mapping[int, float] = field(default_factory=dict)
    names: tuple[str, ...] = ()

    def name(self, station: int) -> str:
        """What a station is called."""
        return self.names[station] if self.names else f"station {station}"


@dataclass(frozen=True, slots=True, kw_only=True)
class Solved:
    """A piping system at its balance.

    Parameters
    ----------
    flow_m3_s : ndarray, shape (runs,)
        [m³/s]
    head_m : ndarray, shape (stations,)
        Above the datum; of a part without a known head, above its first station. [m]
    steps : int
        Newton steps taken.
    rounding_m : float
        What sums of flows and of drops may be off by for want of digits: far below a nanometre, save where a bore of millimetres carries
        the flow of a main. [m]
    """

    flow_m3_s: Array
    head_m: Array
    steps: int
    rounding_m: float


def solve_piping(piping: Piping, losses: LossFunction, start_m3_s: Array | None = None) -> Solved:
    """Flows and heads that keep every mass and every energy balance.

    Parameters
    ----------
    piping : Piping
    losses : callable
        Each run's loss grows with its own flow.
    start_m3_s : ndarray, shape (runs,), optional
        Flows to start from; a cold start takes those that the draws alone force.

    Returns
    -------
    Solved

    Raises
    ------
    NetworkError
        Draws of a part without a known head do not sum to nothing, or no balance is reached; says where.
    """
    shut = [not opened for opened in piping.is_open]
    one_way = piping.one_way or tuple(False for _ in piping.ends)
    for _ in range(MOST_CHECKS):
        solved = _balance(piping, shut, losses, start_m3_s)
        turned = _turned(piping, shut, one_way, solved)
        if not turned:
            return solved
        for run in turned:
            shut[run] = not shut[run]
    raise NetworkError("the check valves find no state in which each lets liquid pass forwards alone")


def _turned(piping: Piping, shut: Sequence[bool], one_way: Sequence[bool], solved: Solved) -> list[int]:
    """Check valves that are open against their flow, or shut although the head before them is the higher one; the worst first."""
    wrong: list[tuple[float, int]] = []
    for run, (start, end) in enumerate(piping.ends):
        if not one_way[run] or not piping.is_open[run]:
            continue
        if not shut[run] and solved.flow_m3_s[run] < -1e-12:
            wrong.append((-float(solved.flow_m3_s[run]), run))
        elif shut[run] and solved.head_m[start] - solved.head_m[end] > ENERGY_TOLERANCE_M:
            wrong.append((float(solved.head_m[start] - solved.head_m[end]), run))
    # one at a time: several at once may chase one another
    return [max(wrong)[1]] if wrong else []


def _balance(piping: Piping, shut: Sequence[bool], losses: LossFunction, start_m3_s: Array | None) -> Solved:
    """The balance with every check valve held open or shut."""
    runs = len(piping.ends)
    open_runs = [run for run in range(runs) if not shut[run]]
    resistance = _resistances(losses, runs, piping.head_m.values())
    roots, way, tree = _spanning_forest(piping, open_runs, resistance)
    forced, cycles, known = _flow_space(piping, open_runs, roots, way, tree)
    shift = np.zeros(cycles.shape[1], dtype=np.float64)
    if cycles.shape[1] and start_m3_s is not None:
        shift = np.asarray(np.linalg.lstsq(cycles, np.asarray(start_m3_s) - forced, rcond=None)[0], dtype=np.float64)
    elif cycles.shape[1]:
        # as if every loss grew in proportion to its flow
        linear = cycles.T @ (resistance[:, None] * cycles)
        shift = _solve(linear, known - cycles.T @ (resistance * forced))
    found, steps = _newton(piping, losses, _Space(forced, cycles, known, SLOPE_FLOOR * resistance), shift)
    drop, _ = losses(found.flow_m3_s)
    head = np.zeros(piping.station_count)
    for station, (root, path) in enumerate(way):
        head[station] = piping.head_m.get(root, 0.0) - sum(sign * drop[run] for run, sign in path)
    rounding = float(found.rounding_m.max(initial=0.0))
    return Solved(flow_m3_s=found.flow_m3_s, head_m=head, steps=steps, rounding_m=rounding)


@dataclass(frozen=True, slots=True)
class _Space:
    """The flows that are allowed, the heads that drive them, and the least slope of each run in Newton's matrix."""

    forced: Array
    cycles: Array
    known: Array
    floor: Array


def _resistances(losses: LossFunction, runs: int, heads: Iterable[float]) -> Array:
    """Head over flow of every run at the flow at which it would take a head such as there is, shape (runs,). [s/m²]"""
    values = list(heads)
    typical_m = max(max(values, default=0.0) - min(values, default=0.0), 1.0)
    at_rest, _ = losses(np.zeros(runs))
    low, high = np.full(runs, LEAST_FLOW_M3_S), np.full(runs, GREATEST_FLOW_M3_S)
    for _ in range(40):
        flow = np.sqrt(low * high)
        drop, _ = losses(flow)
        more = np.abs(drop - at_rest) > typical_m
        high, low = np.where(more, flow, high), np.where(more, low, flow)
    return np.asarray(typical_m / np.sqrt(low * high))


def _spanning_forest(
    piping: Piping, open_runs: Sequence[int], resistance: Array
) -> tuple[list[int], list[tuple[int, tuple[tuple[int, float], ...]]], set[int]]:
    """Roots of the connected parts (a known head where there is one), the way from its root to every station, and the runs of the ways.

    The ways take the runs of least resistance, so that a run of great resistance closes one cycle and is in no other: a 6 mm line beside
    a 2 m main would else drown the main's balance in its own rounding.
    """
    at: list[list[tuple[int, int, float]]] = [[] for _ in range(piping.station_count)]
    for run in open_runs:
        start, end = piping.ends[run]
        at[start].append((run, end, 1.0))
        at[end].append((run, start, -1.0))
    way: list[tuple[int, tuple[tuple[int, float], ...]] | None] = [None] * piping.station_count
    roots: list[int] = []
    tree: set[int] = set()
    for root in (*sorted(piping.head_m), *range(piping.station_count)):
        if way[root] is not None:
            continue
        roots.append(root)
        nearest: list[tuple[float, int, int, float]] = [(0.0, -1, root, 0.0)]
        came: dict[int, int] = {root: root}
        while nearest:
            _, run, station, sign = heappop(nearest)
            if way[station] is not None:
                continue
            before = way[came[run]] if run >= 0 else (root, ())
            assert before is not None
            way[station] = (root, (*before[1], (run, sign)) if run >= 0 else ())
            tree |= {run} if run >= 0 else set()
            for onward, other, direction in at[station]:
                if way[other] is None:
                    came[onward] = station
                    heappush(nearest, (float(resistance[onward]), onward, other, direction))
    return roots, [one for one in way if one is not None], tree


def _flow_space(
    piping: Piping,
    open_runs: Sequence[int],
    roots: Sequence[int],
    way: Sequence[tuple[int, tuple[tuple[int, float], ...]]],
    tree: set[int],
) -> tuple[Array, Array, Array]:
    """Flows that the draws force, ways in which flows may differ from them, and the known head that drives each such way."""
    forced = np.zeros(len(piping.ends))
    unmet = dict.fromkeys(roots, 0.0)
    for station, draw in piping.draw_m3_s.items():
        root, path = way[station]
        unmet[root] += draw
        for run, sign in path:
            forced[run] += sign * draw
    sizes = sum(abs(draw) for draw in piping.draw_m3_s.values())
    for root, total in unmet.items():
        if root not in piping.head_m and abs(total) > 1e-9 * max(sizes, 1e-300):
            raise NetworkError(
                f"the part of {piping.name(root)} has no known head, and its draws sum to {total:g} m3/s instead of nothing"
            )
    columns, known = [], []
    for run in open_runs:
        if run not in tree:
            start, end = piping.ends[run]
            columns.append(_cycle(len(piping.ends), way[start][1], way[end][1], run))
            known.append(0.0)
    for station, head in piping.head_m.items():
        root, path = way[station]
        if station != root:
            # liquid may pass from the root's known head to this one
            column = np.zeros(len(piping.ends))
            for run, sign in path:
                column[run] += sign
            columns.append(column)
            known.append(piping.head_m[root] - head)
    space = np.array(columns).T if columns else np.zeros((len(piping.ends), 0))
    return forced, space, np.array(known)


def _cycle(runs: int, to_start: Sequence[tuple[int, float]], to_end: Sequence[tuple[int, float]], chord: int) -> Array:
    """One round trip: to the chord's start, along it, and back from its end."""
    column = np.zeros(runs)
    for run, sign in to_start:
        column[run] += sign
    column[chord] += 1.0
    for run, sign in to_end:
        column[run] -= sign
    return column


def _newton(piping: Piping, losses: LossFunction, space: _Space, shift: Array) -> tuple[_Look, int]:
    """The point at which the drops along every cycle are what the known heads drive."""
    here, cycles = _look(losses, space, shift), space.cycles
    for step in range(MOST_STEPS):
        if np.all(np.abs(here.open_m) <= np.maximum(ENERGY_TOLERANCE_M, here.rounding_m)):
            return here, step
        direction = -_solve(cycles.T @ (np.maximum(here.slope, space.floor)[:, None] * cycles), here.open_m)
        found = _search(losses, space, here, direction)
        if found is None:
            break
        here = found
    worst = int(np.argmax(np.abs(here.open_m) - here.rounding_m))
    start, end = piping.ends[int(np.argmax(np.abs(cycles[:, worst])))]
    raise NetworkError(
        f"no balance was reached: the way that passes from {piping.name(start)} to {piping.name(end)} stays "
        f"{abs(here.open_m[worst]):.3g} m open; look for a pump whose lift grows with its flow, or a loss of nothing"
    )


@dataclass(frozen=True, slots=True, kw_only=True)
class _Look:
    """What a point of the search looks like: how far every cycle is open, and how nearly that can be known."""

    shift: Array
    flow_m3_s: Array
    slope: Array
    open_m: Array
    rounding_m: Array


def _look(losses: LossFunction, space: _Space, shift: Array) -> _Look:
    forced, cycles, known = space.forced, space.cycles, space.known
    flow = forced + cycles @ shift
    drop, slope = losses(flow)
    # a flow is a sum of others, and a drop no surer than its flow
    summed = np.abs(forced) + np.abs(cycles) @ np.abs(shift)
    unsure = np.abs(drop) + np.abs(slope) * summed
    return _Look(
        shift=shift,
        flow_m3_s=flow,
        slope=slope,
        open_m=cycles.T @ drop - known,
        rounding_m=ROUNDINGS * np.finfo(float).eps * (np.abs(cycles.T) @ unsure + np.abs(known)),
    )


def _solve(matrix: Array, right: Array) -> Array:
    """Solution of a symmetric system whose rows may differ by many powers of ten."""
    scale = 1.0 / np.sqrt(np.maximum(np.diag(matrix), 1e-300))
    scaled = matrix * scale[:, None] * scale[None, :]
    scaled[np.diag_indices_from(scaled)] += 1e-14
    return np.asarray(scale * np.linalg.solve(scaled, scale * right))


def _search(losses: LossFunction, space: _Space, here: _Look, direction: Array) -> _Look | None:
    """A step along a direction of descent, such that the slope of the convex function has grown much flatter; None where none is found."""
    slope_here = abs(float(here.open_m @ direction))
    size, low, high = 1.0, 0.0, np.inf
    best: _Look | None = None
    for _ in range(MOST_HALVINGS):
        shift = here.shift + size * direction
        if np.abs(shift).max() > GREATEST_FLOW_M3_S:
            high = size
            size = 0.5 * (low + high)
            continue
        there = _look(losses, space, shift)
        slope_there = float(there.open_m @ direction)
        if slope_there > FLATTER * slope_here:
            high = size  # beyond the valley
        elif slope_there < -(1.0 - FLATTER) * slope_here and size < 1.0:
            low, best = size, there
        else:
            return there
        size = 0.5 * (low + high)
    return best
