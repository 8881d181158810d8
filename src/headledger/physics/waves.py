"""Pressure waves in a full pipe: how fast a change travels, and how great a change a stop of the flow is."""

from __future__ import annotations

import math

SLOWEST_WAVE_M_S = 250.0
"""Speed of a wave in soft pipe, the slowest that is reckoned with where the wall is not known (common practice, no source). [m/s]"""


def wave_speed_m_s(
    *, bulk_modulus_pa: float, density_kg_m3: float, bore_to_wall_ratio: float = 0.0, wall_modulus_pa: float = math.inf
) -> float:
    """Speed of a pressure wave in a full pipe with an elastic wall.

    Parameters
    ----------
    bulk_modulus_pa, density_kg_m3 : float
        Of the liquid. [Pa], [kg/m³]
    bore_to_wall_ratio : float
        Bore over thickness of the wall. [-]
    wall_modulus_pa : float
        Young's modulus of the wall; infinite for a rigid one. [Pa]

    Returns
    -------
    float
        [m/s]

    Notes
    -----
    ``a = sqrt(K/ρ) / sqrt(1 + K D / (E e))``: a thin wall, free to move along its axis, and no gas in the liquid; a little gas slows
    a wave far more than a soft wall does.

    References
    ----------
    D. J. Korteweg, Annalen der Physik 241 (1878), pages 525-542; from memory.
    """
    in_rigid_pipe = math.sqrt(bulk_modulus_pa / density_kg_m3)
    return in_rigid_pipe / math.sqrt(1.0 + bulk_modulus_pa / wall_modulus_pa * bore_to_wall_ratio)


def stop_pressure_pa(*, density_kg_m3: float, wave_m_s: float, change_m_s: float) -> float:
    """Rise of pressure where a flow is stopped faster than a wave comes back.

    Parameters
    ----------
    density_kg_m3, wave_m_s : float
        Of the liquid, and of the wave in it. [kg/m³], [m/s]
    change_m_s : float
        Velocity that is lost. [m/s]

    Returns
    -------
    float
        ``ρ a Δv``. [Pa]

    References
    ----------
    N. Joukowsky, Über den hydraulischen Stoss in Wasserleitungsröhren (1898); from memory.
    """
    return density_kg_m3 * wave_m_s * change_m_s


def travel_s(length_m: float, wave_m_s: float = SLOWEST_WAVE_M_S) -> float:
    """Time that a change takes to travel a length; by the slowest wave where none is stated. [s]"""
    return length_m / wave_m_s
