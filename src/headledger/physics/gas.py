"""Trapped gas in a full pipe: the velocity that sweeps it down a slope, by several authors who part by a factor of two."""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass

Froude = Callable[[float], tuple[float, float]]

ESCARAMEIA_A = ((0.06, 0.45), (0.12, 0.50), (0.19, 0.57), (math.inf, 0.61))
"""Escarameia's ``a`` for relative volumes ``n = 4 V / (π D³)`` up to each, from memory. [-]"""


def relative_volume(volume_m3: float, bore_m: float) -> float:
    """Volume of a pocket in cubes of the bore: ``n = 4 V / (π D³)``. [-]"""
    return 4.0 * volume_m3 / (math.pi * bore_m**3)


def wisner(slope_rad: float) -> tuple[float, float]:
    """Wisner, Mohsen and Kouwen: ``0.25 √sin θ + 0.825``, as both ends of a range. [-]"""
    value = 0.25 * math.sqrt(math.sin(slope_rad)) + 0.825
    return value, value


def escarameia(slope_rad: float, volume_ratio: float | None = None) -> tuple[float, float]:
    """Escarameia: ``0.56 √sin θ + a``; without a relative volume the ends of her table. [-]"""
    if volume_ratio is None:
        least, most = ESCARAMEIA_A[0][1], ESCARAMEIA_A[-1][1]
    else:
        least = most = next(a for limit, a in ESCARAMEIA_A if volume_ratio < limit)
    grade = 0.56 * math.sqrt(math.sin(slope_rad))
    return grade + least, grade + most


def kent(slope_rad: float) -> tuple[float, float]:
    """Kent, as fitted by others: ``1.23 √sin θ``. [-]"""
    value = 1.23 * math.sqrt(math.sin(slope_rad))
    return value, value


def kalinske_bliss(slope_rad: float) -> tuple[float, float]:
    """Kalinske and Bliss: ``Q² / (g D⁵) = 0.707 tan θ``; without bound towards the vertical, where it says nothing. [-]"""
    value = math.sqrt(0.707 * math.tan(slope_rad)) / (math.pi / 4.0)
    return value, value


def pothof_clemens(_slope_rad: float) -> tuple[float, float]:
    """Pothof and Clemens: about 0.8 to 1.0 at moderate slopes. [-]"""
    return 0.8, 1.0


@dataclass(frozen=True, slots=True)
class Author:
    """Who put a clearing velocity, by what Froude number, up to what slope. [rad]"""

    name: str
    froude: Froude
    steepest_rad: float


STEEP_RAD = math.radians(45.0)
"""Slope up to which Kalinske and Bliss's tangent is used: towards the vertical it grows without bound (no source). [rad]"""

AUTHORS = (
    Author("Wisner, Mohsen and Kouwen 1975", wisner, math.pi / 2.0),
    Author("Escarameia 2005", escarameia, math.pi / 2.0),
    Author("Kent 1952", kent, math.pi / 2.0),
    Author("Kalinske and Bliss 1943", kalinske_bliss, STEEP_RAD),
    Author("Pothof and Clemens 2010", pothof_clemens, STEEP_RAD),
)


def clearing_velocities_m_s(
    *, bore_m: float, slope_rad: float, gravity_m_s2: float, volume_m3: float | None = None
) -> dict[str, tuple[float, float]]:
    """Velocities at which authors put gas to be swept down a slope.

    Parameters
    ----------
    bore_m : float
        [m]
    slope_rad : float
        Angle of the pipe below the horizontal, over 0 and up to π/2. [rad]
    gravity_m_s2 : float
        [m/s²]
    volume_m3 : float or None
        Gas in one pocket, of which Escarameia's depends. [m³]

    Returns
    -------
    dict of str to (float, float)
        By author: lowest and highest; one and the same where an author gives one. An author who says nothing of so steep a slope is
        left out. [m/s]

    Raises
    ------
    ValueError
        Where the pipe does not fall.

    Notes
    -----
    ``V = Fr √(g D)``. Laboratory pipes of 0.1 to 0.2 m bore mostly; no author's rule is a limit that holds everywhere.

    References
    ----------
    P. Wisner, F. Mohsen, N. Kouwen, J. Hydraulics Div. ASCE 101 (1975), as R. Sanks, Pumping Station Design, quotes it.
    M. Escarameia, Proc. ICE Water Management (2007): form as quoted by others, table from memory; no safety factor of 1.1.
    J. Kent, thesis, Berkeley (1952); A. Kalinske, P. Bliss, Proc. ASCE 69 (1943);
    I. Pothof, F. Clemens, Urban Water J. 7 (2010): all three from memory.
    """
    if not 0.0 < slope_rad <= math.pi / 2.0:
        raise ValueError(f"slope: must fall by more than 0 and at most π/2 rad, got {slope_rad:g} rad")
    unit = math.sqrt(gravity_m_s2 * bore_m)
    ratio = None if volume_m3 is None else relative_volume(volume_m3, bore_m)
    found = {}
    for author in AUTHORS:
        if slope_rad > author.steepest_rad:
            continue
        least, most = escarameia(slope_rad, ratio) if author.froude is escarameia else author.froude(slope_rad)
        found[author.name] = (least * unit, most * unit)
    return found


def clearing_range_m_s(
    *, bore_m: float, slope_rad: float, gravity_m_s2: float, volume_m3: float | None = None
) -> tuple[float, float]:
    """Lowest and highest clearing velocity over all authors, see `clearing_velocities_m_s`. [m/s], [m/s]"""
    ranges = clearing_velocities_m_s(
        bore_m=bore_m, slope_rad=slope_rad, gravity_m_s2=gravity_m_s2, volume_m3=volume_m3
    ).values()
    return min(least for least, _ in ranges), max(most for _, most in ranges)
