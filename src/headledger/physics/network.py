"""Heads and flows of a piping graph: mass at every station, energy along every run, and exact sensitivities.

A graph is split once into a spanning forest and chords. With ``q`` the flows of a few independent runs, everything follows by
matrices that hold only the graph:

    Q = N q                   mass balance at every closed station
    E = E_ref − P d(Q)        energy along the forest, d the head lost in each run (a pump's lift counts negative)
    0 = C d(Q)                energy around every chord's loop

so that heads are explicit functions of reference heads and independent flows and every derivative is a product of these matrices.
In a still spell Q = 0 and d = 0; runs that are shut part the graph.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]


@dataclass(frozen=True, slots=True, kw_only=True)
class Graph:
    """Matrices of a piping graph in one state of its valves.

    Parameters
    ----------
    part : ndarray of int, shape (stations,)
        Connected part of each station, 0 the first.
    parts : int
    path : ndarray, shape (stations, runs)
        ``P``: +1 where a run is passed forwards on the way from the part's reference station, −1 backwards, else 0.
    loop : ndarray, shape (chords, runs)
        ``C``: the runs of each chord's loop with their signs.
    basis : ndarray of int, shape (independent,)
        Runs whose flows are independent, the most preferred first.
    flow : ndarray, shape (runs, independent)
        ``N``: flows of all runs from those of the basis.
    chords : ndarray of int, shape (chords,)
        Open runs that are not in the forest.
    """

    part: NDArray[np.int64]
    parts: int
    path: Array
    loop: Array
    basis: NDArray[np.int64]
    flow: Array
    chords: NDArray[np.int64]

    def heads_m(self, reference_head_m: Array, drop_m: Array) -> Array:
        """Total head at every station.

        Parameters
        ----------
        reference_head_m : ndarray, shape (parts,)
            Of each part's reference station. [m]
        drop_m : ndarray, shape (runs,)
            Head lost along each run in its own direction. [m]

        Returns
        -------
        ndarray, shape (stations,)
            [m]
        """
        return np.asarray(reference_head_m[self.part] - self.path @ drop_m)


def build_graph(
    station_count: int,
    ends: Sequence[tuple[int, int]],
    *,
    is_open: Sequence[bool],
    exchanges: Sequence[bool],
    preference: Sequence[int],
    ties: Sequence[bool] | None = None,
) -> Graph:
    """Matrices of a piping graph.

    Parameters
    ----------
    station_count : int
    ends : sequence of (int, int)
        Stations from and to of each run.
    is_open : sequence of bool
        Whether liquid can pass each run.
    exchanges : sequence of bool, length `station_count`
        Whether liquid may enter or leave at each station.
    preference : sequence of int
        Runs in the order in which their flows should be taken as independent (metered ones first).
    ties : sequence of bool, optional
        Runs whose drop is known, so that they tie the heads of their ends; all open ones by default. One that carries liquid but ties
        nothing (a control valve, a pump without a curve) parts the heads and not the flows.

    Returns
    -------
    Graph
    """
    ties = is_open if ties is None else ties
    part, path, tree = _forest(station_count, ends, ties)
    chords = [run for run in range(len(ends)) if ties[run] and run not in tree]
    loop = np.zeros((len(chords), len(ends)))
    for row, chord in enumerate(chords):
        start, end = ends[chord]
        loop[row] = path[start] - path[end]
        loop[row, chord] += 1.0
    basis, flow = _flow_basis(station_count, ends, is_open, exchanges, preference)
    return Graph(
        part=part,
        parts=int(part.max()) + 1 if part.size else 0,
        path=path,
        loop=loop,
        basis=np.array(basis, dtype=np.int64),
        flow=flow,
        chords=np.array(chords, dtype=np.int64),
    )


def _forest(
    station_count: int, ends: Sequence[tuple[int, int]], is_open: Sequence[bool]
) -> tuple[NDArray[np.int64], Array, set[int]]:
    """Part of each station, signed runs on its way from the part's reference, and the runs of the spanning forest."""
    neighbours: list[list[tuple[int, int, float]]] = [[] for _ in range(station_count)]
    for run, (start, end) in enumerate(ends):
        if is_open[run]:
            neighbours[start].append((run, end, 1.0))
            neighbours[end].append((run, start, -1.0))
    part = np.full(station_count, -1, dtype=np.int64)
    path = np.zeros((station_count, len(ends)))
    tree: set[int] = set()
    parts = 0
    for root in range(station_count):
        if part[root] >= 0:
            continue
        part[root] = parts
        waiting = [root]
        for station in waiting:
            for run, other, sign in neighbours[station]:
                if part[other] < 0:
                    part[other] = parts
                    path[other] = path[station]
                    path[other, run] = sign
                    tree.add(run)
                    waiting.append(other)
        parts += 1
    return part, path, tree


def _flow_basis(
    station_count: int,
    ends: Sequence[tuple[int, int]],
    is_open: Sequence[bool],
    exchanges: Sequence[bool],
    preference: Sequence[int],
) -> tuple[list[int], Array]:
    """Independent runs and the matrix that gives every flow from theirs, by Gauss–Jordan elimination of the mass balances."""
    runs = len(ends)
    balance = np.zeros((station_count, runs))
    for run, (start, end) in enumerate(ends):
        if is_open[run]:
            balance[start, run] -= 1.0
            balance[end, run] += 1.0
    balance = balance[[not exchanges[station] for station in range(station_count)]]
    # columns are eliminated from the least preferred on, so that the preferred runs stay independent
    order = [run for run in reversed(list(preference)) if is_open[run]]
    dependent: dict[int, int] = {}
    row = 0
    for run in order:
        if row == balance.shape[0]:
            break
        pivot = row + int(np.argmax(np.abs(balance[row:, run])))
        if abs(balance[pivot, run]) < 0.5:  # entries are whole numbers throughout
            continue
        balance[[row, pivot]] = balance[[pivot, row]]
        balance[row] /= balance[row, run]
        others = np.arange(balance.shape[0]) != row
        balance[others] -= np.outer(balance[others, run], balance[row])
        dependent[run] = row
        row += 1
    basis = [run for run in preference if is_open[run] and run not in dependent]
    flow = np.zeros((runs, len(basis)))
    for column, run in enumerate(basis):
        flow[run, column] = 1.0
        for other, other_row in dependent.items():
            flow[other, column] = -balance[other_row, run]
    return basis, flow
