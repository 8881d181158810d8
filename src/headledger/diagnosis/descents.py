"""Where a run turns down in the direction of its flow, and whether that flow would sweep gas down there.

Light to import: the wording of findings leans on it.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import TYPE_CHECKING

from headledger.physics.gas import clearing_range_m_s

if TYPE_CHECKING:
    from headledger.diagnosis.findings import Finding
    from headledger.diagnosis.layout import Layout


@dataclass(frozen=True, slots=True, kw_only=True)
class Descent:
    """A stretch of a run that falls with the flow.

    Parameters
    ----------
    distance_m : float
        Of its high point from the run's start. [m]
    fall_m, length_m : float
        From there to its low point, along the pipe for the length. [m], [m]
    """

    distance_m: float
    fall_m: float
    length_m: float

    @property
    def slope_rad(self) -> float:
        """Mean angle below the horizontal; a pipe no longer than its fall stands upright. [rad]"""
        return math.pi / 2.0 if self.fall_m >= self.length_m else math.asin(self.fall_m / self.length_m)


@dataclass(frozen=True, slots=True, kw_only=True)
class Sweep:
    """The flow beside what would sweep a pocket out. [m/s]"""

    velocity_m_s: float
    lowest_m_s: float
    highest_m_s: float


def descents(layout: Layout, run: int, direction: float) -> tuple[Descent, ...]:
    """Where a run's line turns down in the direction of its flow.

    Parameters
    ----------
    layout : Layout
    run : int
    direction : float
        Of its flow: 1 from its start, −1 towards it, 0 where nothing flows. [-]

    Returns
    -------
    tuple of Descent
        In the direction of flow; none where nothing flows.
    """
    if direction == 0.0:
        return ()
    distance, height = layout.profiles[run]
    if direction < 0.0:
        distance, height = distance[::-1], height[::-1]
    found = []
    top = 0
    for point in range(1, height.size):
        if height[point] >= height[point - 1]:
            top = point
        elif point + 1 == height.size or height[point + 1] >= height[point]:
            fall_m, length_m = float(height[top] - height[point]), abs(float(distance[point] - distance[top]))
            found.append(Descent(distance_m=float(distance[top]), fall_m=fall_m, length_m=length_m))
    return tuple(found)


def sweep_of(layout: Layout, finding: Finding) -> Sweep | None:
    """The greatest velocity of a pocket's run, and the range of those at which authors put gas to be swept down its slope.

    Parameters
    ----------
    layout : Layout
    finding : Finding
        An air pocket.

    Returns
    -------
    Sweep or None
        None where nothing flows down there.
    """
    run = layout.run_index[finding.place.run]
    flows = [float(state.flow_m3_s[run]) for state in finding.frame.linear.states]
    along = finding.place.distance_m
    there = [d for d in descents(layout, run, math.copysign(1.0, sum(flows))) if along in (None, d.distance_m)]
    greatest_m3_s = max(map(abs, flows))
    if not there or not greatest_m3_s:
        return None
    lowest, highest = clearing_range_m_s(
        bore_m=layout.job.runs[run].bore_m, slope_rad=there[0].slope_rad, gravity_m_s2=layout.gravity_m_s2
    )
    return Sweep(velocity_m_s=greatest_m3_s / float(layout.area_m2[run]), lowest_m_s=lowest, highest_m_s=highest)
