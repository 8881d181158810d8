"""The energy balance between two points of a pipe: what every hand calculation of an expected pressure rests on."""

from __future__ import annotations

from dataclasses import dataclass

from headledger.physics.losses import velocity_head_m


@dataclass(frozen=True, slots=True, kw_only=True)
class Point:
    """A point on the centreline of a pipe, or a free surface.

    Parameters
    ----------
    elevation_m : float
        [m]
    bore_m : float or None
        None at a free surface, where nothing moves. [m]
    """

    elevation_m: float
    bore_m: float | None = None


@dataclass(frozen=True, slots=True, kw_only=True)
class EnergyBalance:
    """The terms that lead from the pressure at one point to the pressure at another, as heads of the flowing liquid.

    Parameters
    ----------
    first_pressure_head_m : float
        Pressure at the first point. [m]
    elevation_head_m : float
        Gained by going down. [m]
    velocity_head_m : float
        Gained by slowing down. [m]
    lost_head_m : float
        Lost on the way; negative where the flow runs from the second point to the first. [m]
    pressure_per_head_pa_m : float
        Weight of the liquid, ``ρ g``. [Pa/m]
    """

    first_pressure_head_m: float
    elevation_head_m: float
    velocity_head_m: float
    lost_head_m: float
    pressure_per_head_pa_m: float

    @property
    def second_pressure_head_m(self) -> float:
        """Pressure at the second point as a head. [m]"""
        return self.first_pressure_head_m + self.elevation_head_m + self.velocity_head_m - self.lost_head_m

    @property
    def second_pressure_pa(self) -> float:
        """Pressure at the second point, against what the first was measured against. [Pa]"""
        return self.pressure_pa(self.second_pressure_head_m)

    def pressure_pa(self, head_m: float) -> float:
        """Pressure of a head of the flowing liquid. [Pa]"""
        return head_m * self.pressure_per_head_pa_m


def energy_balance(
    first: Point,
    second: Point,
    *,
    first_pressure_pa: float,
    flow_m3_s: float,
    lost_head_m: float,
    density_kg_m3: float,
    gravity_m_s2: float,
) -> EnergyBalance:
    """Balance of energy along the flow from the first point to the second.

    Parameters
    ----------
    first, second : Point
    first_pressure_pa : float
        Against the air or absolute; the second's then is the same. [Pa]
    flow_m3_s : float
        From the first to the second point. [m³/s]
    lost_head_m : float
        In that direction, of everything between the points. [m]
    density_kg_m3, gravity_m_s2 : float
        [kg/m³], [m/s²]

    Returns
    -------
    EnergyBalance

    Notes
    -----
    ``p1 + ρ g z1 + ½ρ v1² = p2 + ρ g z2 + ½ρ v2² + ρ g h_lost``, one liquid of one temperature.
    The change of the air's own weight between the points, about 12 Pa a metre, is left out.
    """
    weight_pa_m = density_kg_m3 * gravity_m_s2
    return EnergyBalance(
        first_pressure_head_m=first_pressure_pa / weight_pa_m,
        elevation_head_m=first.elevation_m - second.elevation_m,
        velocity_head_m=_velocity_head_m(first, flow_m3_s, gravity_m_s2)
        - _velocity_head_m(second, flow_m3_s, gravity_m_s2),
        lost_head_m=lost_head_m,
        pressure_per_head_pa_m=weight_pa_m,
    )


def _velocity_head_m(point: Point, flow_m3_s: float, gravity_m_s2: float) -> float:
    return 0.0 if point.bore_m is None else float(velocity_head_m(flow_m3_s, point.bore_m, gravity_m_s2))
