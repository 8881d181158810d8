"""Head lost in a run as a function of flow: pipe, fittings, valve and equipment; and what a pump adds.

Every loss gives its value and its exact derivative, is odd in the flow and smooth through zero.
"""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from math import pi

import numpy as np
from numpy.typing import ArrayLike, NDArray

from headledger.physics.friction import hazen_williams_resistance, head_of_factor_m, head_of_resistance_m

Array = NDArray[np.float64]

KV_FROM_CV = 0.8649776554
"""Kv in m³/h at 1 bar for a Cv in US gallons a minute at 1 psi, from the exact gallon and pound. [-]"""

ENTRANCE_SHARP_K, EXIT_K = 0.5, 1.0
"""Loss coefficients of a sharp entrance and of an exit into a large space (Crane TP-410). [-]"""

KV_PRESSURE_PA, KV_DENSITY_KG_M3 = 1e5, 1000.0
"""The drop and the density at which a Kv is stated (IEC 60534, from memory). [Pa], [kg/m³]"""


@dataclass(frozen=True, slots=True, kw_only=True)
class RunLoss:
    """What of a run loses head.

    Parameters
    ----------
    bore_m, length_m : float
        [m]
    roughness_m : float or None
        For Darcy–Weisbach with Colebrook–White; a smooth pipe where neither this nor the next is given. [m]
    hazen_williams_c : float or None
        Hazen–Williams, and no Darcy–Weisbach, where given. [-]
    fittings_k : float
        Sum of loss coefficients on the bore's velocity head. [-]
    valve_kv_m3_s : float or None
        Flow at 1 bar and 1000 kg/m³. [m³/s]
    rated_drop_pa, rated_flow_m3_s : float or None
        With the liquid at hand. [Pa], [m³/s]
    """

    bore_m: float
    length_m: float = 0.0
    roughness_m: float | None = None
    hazen_williams_c: float | None = None
    fittings_k: float = 0.0
    valve_kv_m3_s: float | None = None
    rated_drop_pa: float | None = None
    rated_flow_m3_s: float | None = None


class LossTable:
    """Losses of many runs, evaluated together.

    Parameters
    ----------
    runs : sequence of RunLoss
    density_kg_m3, viscosity_pa_s : array_like
        Of the liquid: one for all, or one for each run. [kg/m³], [Pa s]
    gravity_m_s2 : float
        [m/s²]
    """

    def __init__(
        self, runs: Sequence[RunLoss], *, density_kg_m3: ArrayLike, viscosity_pa_s: ArrayLike, gravity_m_s2: float
    ) -> None:
        bore, length = _column(run.bore_m for run in runs), _column(run.length_m for run in runs)
        area = pi * bore**2 / 4.0
        per_square = 1.0 / (2.0 * gravity_m_s2 * area**2)
        williams = np.array([bool(run.hazen_williams_c) for run in runs])
        density = np.asarray(density_kg_m3, dtype=float)
        self._reynolds = density / (np.asarray(viscosity_pa_s) * area) * bore
        self._roughness = _column(run.roughness_m or 0.0 for run in runs) / bore
        self._pipe = np.where(williams, 0.0, length / bore * per_square)
        coefficient = _column(run.hazen_williams_c or 1.0 for run in runs)
        self._resistance = np.where(williams, hazen_williams_resistance(length, bore, coefficient), 0.0)
        self._any_williams = bool(williams.any())
        rated = [
            run.rated_drop_pa and run.rated_flow_m3_s and run.rated_drop_pa / run.rated_flow_m3_s**2 for run in runs
        ]
        self._square = (
            _column(run.fittings_k for run in runs) * per_square
            + _column(run.valve_kv_m3_s and run.valve_kv_m3_s**-2 for run in runs)
            * (KV_PRESSURE_PA / (KV_DENSITY_KG_M3 * gravity_m_s2))
            + _column(rated) / (density * gravity_m_s2)
        )

    def evaluate(self, flow_m3_s: ArrayLike) -> tuple[Array, Array]:
        """Head lost in every run and its derivative.

        Parameters
        ----------
        flow_m3_s : array_like, shape (..., runs)
            [m³/s]

        Returns
        -------
        head_m, slope_s_m2 : ndarray, shape (..., runs)
            Positive where head is lost in the run's own direction. [m], [s/m²]

        Notes
        -----
        Pipe by Darcy–Weisbach or Hazen–Williams, plus ``K v²/2g`` of fittings, ``(Q/Kv)² 1 bar / (1000 kg/m³ g)`` of a valve, and
        ``Δp (Q/Q_rated)² / (ρ g)`` of equipment; each with the sign of the flow. A valve's drop goes with the liquid's density, so
        its head does not.

        References
        ----------
        `darcy_weisbach_head_m` and `hazen_williams_head_m`; Crane, Technical Paper 410, Flow of Fluids, K of fittings; IEC 60534-2-1,
        Kv of incompressible flow (from memory).
        """
        flow = np.asarray(flow_m3_s, dtype=float)
        head, slope = head_of_factor_m(
            flow,
            head_per_square_s2_m5=self._pipe,
            reynolds_per_flow_s_m3=self._reynolds,
            relative_roughness=self._roughness,
        )
        squared = self._square * np.abs(flow)
        head, slope = head + flow * squared, slope + 2.0 * squared
        if self._any_williams:
            extra_head, extra_slope = head_of_resistance_m(flow, self._resistance)
            head, slope = head + extra_head, slope + extra_slope
        return head, slope


def _column(values: Iterable[float | None]) -> Array:
    """One value a run, nothing where none was given."""
    return np.array([value or 0.0 for value in values])


def head_loss(
    run_loss: RunLoss, flow_m3_s: ArrayLike, *, density_kg_m3: float, viscosity_pa_s: float, gravity_m_s2: float
) -> tuple[Array, Array]:
    """Head lost in one run, and its derivative, for any number of flows.

    Parameters
    ----------
    run_loss : RunLoss
    flow_m3_s : array_like
        [m³/s]
    density_kg_m3, viscosity_pa_s, gravity_m_s2 : float
        [kg/m³], [Pa s], [m/s²]

    Returns
    -------
    head_m, slope_s_m2 : ndarray, of the shape of `flow_m3_s`
        [m], [s/m²]
    """
    table = LossTable([run_loss], density_kg_m3=density_kg_m3, viscosity_pa_s=viscosity_pa_s, gravity_m_s2=gravity_m_s2)
    head, slope = table.evaluate(np.asarray(flow_m3_s, dtype=float)[..., None])
    return head[..., 0], slope[..., 0]


def velocity_head_m(flow_m3_s: ArrayLike, bore_m: float, gravity_m_s2: float) -> Array:
    """Velocity head v²/2g of a flow in a bore. [m]"""
    velocity = np.asarray(flow_m3_s, dtype=float) / (pi * bore_m**2 / 4.0)
    return np.asarray(velocity**2 / (2.0 * gravity_m_s2))


def widening_k(bore_ratio: float) -> float:
    """Loss coefficient of a sudden widening, on the small bore's velocity head.

    Parameters
    ----------
    bore_ratio : float
        Small over large bore. [-]

    References
    ----------
    Borda–Carnot, ``K = (1 − β²)²``: F. M. White, Fluid Mechanics, chapter 6, minor losses, sudden expansion.
    """
    return (1.0 - bore_ratio**2) ** 2


def narrowing_k(bore_ratio: float) -> float:
    """Loss coefficient of a sudden narrowing, on the small bore's velocity head.

    Parameters
    ----------
    bore_ratio : float
        Small over large bore. [-]

    References
    ----------
    Crane, Technical Paper 410, Flow of Fluids, ``K = 0.5 (1 − β²)`` for a sudden contraction.
    """
    return 0.5 * (1.0 - bore_ratio**2)


def pump_polynomial(flow_m3_s: Sequence[float], head_m: Sequence[float]) -> tuple[float, float, float]:
    """Coefficients ``(a, b, c)`` of a pump's lift ``a + b Q + c Q²`` at its curve speed.

    Parameters
    ----------
    flow_m3_s, head_m : sequence of float
        Pairs of the curve: a line through two, a quadratic through three, the least-squares quadratic through more. [m³/s], [m]

    Returns
    -------
    tuple of float
        [m], [s/m²], [s²/m⁵]
    """
    flows = np.asarray(flow_m3_s, dtype=float)
    scale = float(np.abs(flows).max()) or 1.0
    degree = 1 if flows.size == 2 else 2
    fit = np.linalg.lstsq(np.vander(flows / scale, degree + 1, increasing=True), np.asarray(head_m), rcond=None)[0]
    a, b, c = (*fit, 0.0)[:3]
    return float(a), float(b) / scale, float(c) / scale**2


def pump_head(coefficients: Sequence[float], flow_m3_s: float, speed_ratio: float) -> tuple[float, float]:
    """Lift of a pump and its derivative with flow, by the affinity laws.

    Parameters
    ----------
    coefficients : sequence of float
        Of `pump_polynomial`.
    flow_m3_s : float
        [m³/s]
    speed_ratio : float
        Speed over curve speed; at 0 the pump adds nothing. [-]

    Returns
    -------
    head_m, slope_s_m2 : float
        [m], [s/m²]

    Notes
    -----
    Affinity laws, ``H(Q, n) = n² H(Q/n, 1) = a n² + b n Q + c Q²``.

    References
    ----------
    F. M. White, Fluid Mechanics, chapter 11, similarity rules of pumps.
    """
    if speed_ratio <= 0.0:
        return 0.0, 0.0
    a, b, c = coefficients
    return (
        a * speed_ratio**2 + b * speed_ratio * flow_m3_s + c * flow_m3_s**2,
        b * speed_ratio + 2.0 * c * flow_m3_s,
    )
