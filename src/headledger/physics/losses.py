"""Head lost in a run as a function of flow: pipe, fittings, valve and equipment; and what a pump adds.

Every loss gives its value and its exact derivative, is odd in the flow and smooth through zero.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from math import pi

import numpy as np
from numpy.typing import ArrayLike, NDArray

from headledger.physics.friction import HAZEN_WILLIAMS_FACTOR, friction_factor_and_slope

Array = NDArray[np.float64]

KV_FROM_CV = 0.8649776554
"""Kv in m³/h at 1 bar for a Cv in US gallons a minute at 1 psi, from the exact gallon and pound. [-]"""

ENTRANCE_SHARP_K, EXIT_K = 0.5, 1.0
"""Loss coefficients of a sharp entrance and of an exit into a large space (Crane TP-410). [-]"""

KV_PRESSURE_PA, KV_DENSITY_KG_M3 = 1e5, 1000.0
"""The drop and the density at which a Kv is stated (IEC 60534, from memory). [Pa], [kg/m³]"""

FLOW_EXPONENT = 1.0 / 0.54
"""Exponent of flow in Hazen–Williams. [-]"""

BORE_EXPONENT = 2.63 / 0.54
"""Exponent of bore in Hazen–Williams. [-]"""

SMALLEST_REYNOLDS = 1e-9
"""Below this the laminar law is taken at its limit, so that no flow is divided by. [-]"""


@dataclass(frozen=True, slots=True, kw_only=True)
class RunLoss:
    """What of a run loses head.

    Parameters
    ----------
    bore_m, length_m : float
        [m]
    roughness_m : float or None
        Darcy–Weisbach with Colebrook–White where given. [m]
    hazen_williams_c : float or None
        Hazen–Williams where given. [-]
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
    density_kg_m3, viscosity_pa_s : array_like, shape () or (runs,)
        Of the liquid: one for all, or one for each run. Heads are of each run's own liquid. [kg/m³], [Pa s]
    gravity_m_s2 : float
        [m/s²]
    """

    def __init__(
        self, runs: Sequence[RunLoss], *, density_kg_m3: ArrayLike, viscosity_pa_s: ArrayLike, gravity_m_s2: float
    ) -> None:
        density = np.broadcast_to(np.asarray(density_kg_m3, dtype=float), (len(runs),))
        bore = np.array([run.bore_m for run in runs])
        length = np.array([run.length_m for run in runs])
        area = pi * bore**2 / 4.0
        per_square = 1.0 / (2.0 * gravity_m_s2 * area**2)
        williams = np.array([run.hazen_williams_c or np.nan for run in runs])
        by_williams = np.isfinite(williams)
        self._reynolds = density / (np.asarray(viscosity_pa_s, dtype=float) * area) * bore
        self._roughness = np.array([(run.roughness_m or 0.0) for run in runs]) / bore
        self._pipe = np.where(by_williams, 0.0, length / bore * per_square)
        self._williams = np.where(
            by_williams,
            HAZEN_WILLIAMS_FACTOR
            * length
            / np.where(by_williams, williams, 1.0) ** FLOW_EXPONENT
            / bore**BORE_EXPONENT,
            0.0,
        )
        self._square = np.array([run.fittings_k for run in runs]) * per_square
        for index, run in enumerate(runs):
            if run.valve_kv_m3_s:
                self._square[index] += KV_PRESSURE_PA / (KV_DENSITY_KG_M3 * gravity_m_s2 * run.valve_kv_m3_s**2)
            if run.rated_drop_pa and run.rated_flow_m3_s:
                self._square[index] += run.rated_drop_pa / (density[index] * gravity_m_s2 * run.rated_flow_m3_s**2)

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
        Darcy–Weisbach ``h = f L/D v²/2g`` or Hazen–Williams ``h = k L (Q/C)^1.852 / D^4.870``, plus ``K v²/2g``, plus valve and
        equipment with the square of flow.

        References
        ----------
        G. S. Williams and A. Hazen, Hydraulic Tables (1905), in SI by V = 0.849 C R^0.63 S^0.54.
        """
        flow = np.asarray(flow_m3_s, dtype=float)
        size = np.abs(flow)
        reynolds = np.maximum(self._reynolds * size, SMALLEST_REYNOLDS)
        factor, log_slope = friction_factor_and_slope(reynolds, np.broadcast_to(self._roughness, reynolds.shape))
        # f Q stays finite as the flow goes to nothing: f falls as 1/Q there
        linear = self._pipe * factor * (reynolds / self._reynolds)
        head = flow * (linear + self._square * size)
        slope = linear * (2.0 + log_slope) + 2.0 * self._square * size
        power = size ** (FLOW_EXPONENT - 1.0)
        head = head + self._williams * flow * power
        slope = slope + self._williams * FLOW_EXPONENT * power
        return np.asarray(head), np.asarray(slope)


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
    Borda–Carnot: ``(1 − β²)²``.
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
    Crane TP-410: ``0.5 (1 − β²)``.
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
    ``H(Q, n) = n² H(Q/n, 1) = a n² + b n Q + c Q²``.
    """
    if speed_ratio <= 0.0:
        return 0.0, 0.0
    a, b, c = coefficients
    return (
        a * speed_ratio**2 + b * speed_ratio * flow_m3_s + c * flow_m3_s**2,
        b * speed_ratio + 2.0 * c * flow_m3_s,
    )
