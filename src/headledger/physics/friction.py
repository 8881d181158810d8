"""Friction of full pipes: the Darcy friction factor with its slope, Darcy–Weisbach and Hazen–Williams head losses.

Heads are odd in the flow, come with their exact derivative and pass smoothly through zero.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike, NDArray

Array = NDArray[np.float64]

LAMINAR_END, TURBULENT_START = 2000.0, 4000.0
"""Reynolds numbers between which the factor is joined smoothly. [-]"""

BLOCK = 8192
"""Values worked on at a time, so that temporaries stay in the processor's cache."""

SMALLEST_REYNOLDS = 1e-9
"""Below this the laminar law is taken at its limit, so that no flow is divided by. [-]"""

FLOW_EXPONENT, BORE_EXPONENT = 1.0 / 0.54, 2.63 / 0.54
"""Exponents of flow and bore in Hazen–Williams. [-]"""

HAZEN_WILLIAMS_FACTOR = (4.0**1.63 / (np.pi * 0.849)) ** FLOW_EXPONENT
"""SI constant of h = k L (Q/C)^(1/0.54) / D^(2.63/0.54), exact for V = 0.849 C R^0.63 S^0.54: 10.675; the rounded 10.67 with
exponents 1.852 and 4.8704, and the forms of fire protection, differ from it by 0.15 to 0.5 %."""


def _colebrook_root(reynolds: Array, relative_roughness: Array) -> Array:
    """``1/√f`` of Colebrook–White, from an explicit start by two steps of third order.

    With ``x = 1/√f`` the equation is ``x + 2 log10(ε/3.7 + 2.51 x/Re) = 0``. The start is S. E. Haaland, J. Fluids Eng. 105 (1983) 89-90,
    with his grouping of roughness; the steps are Halley's.
    """
    rough = relative_roughness / 3.7
    smooth = 2.51 / reynolds
    per_decade = 2.0 / np.log(10.0)
    x = -2.0 * np.log10(rough**1.11 + 6.9 / reynolds) * 0.9
    for _ in range(2):
        inner = rough + smooth * x
        miss = x + per_decade * np.log(inner)
        bend = smooth / inner
        slope = 1.0 + per_decade * bend
        curve = -per_decade * bend * bend
        x = x - miss / slope * (1.0 + 0.5 * miss * curve / (slope * slope))
    return np.asarray(x)


def _turbulent(reynolds: Array, relative_roughness: Array) -> tuple[Array, Array]:
    """Colebrook–White factor and its logarithmic slope ``d ln f / d ln Re``."""
    x = _colebrook_root(reynolds, relative_roughness)
    bend = 2.51 / reynolds / (relative_roughness / 3.7 + 2.51 * x / reynolds)
    per_decade = 2.0 / np.log(10.0)
    # implicit differentiation: dx/d ln Re = per_decade bend x / (1 + per_decade bend); f = x⁻²
    slope = -2.0 * per_decade * bend / (1.0 + per_decade * bend)
    return 1.0 / (x * x), slope


def friction_factor_and_slope(reynolds: ArrayLike, relative_roughness: ArrayLike) -> tuple[Array, Array]:
    """Darcy friction factor and its logarithmic slope with Reynolds number.

    Parameters
    ----------
    reynolds : array_like
        Zero or positive; the factor at zero is infinite. [-]
    relative_roughness : array_like
        Roughness over bore, 0 to 0.05. [-]

    Returns
    -------
    factor, slope : ndarray
        ``f`` and ``d ln f / d ln Re``. [-]

    Notes
    -----
    ``64/Re`` below 2000; Colebrook–White above 4000, to 1e-12 relative; between them a cubic Hermite join of ``f`` in ``ln Re`` with
    matching slopes, so that a solver has a derivative everywhere.

    References
    ----------
    C. F. Colebrook, Turbulent flow in pipes, with particular reference to the transition region between the smooth and rough pipe
    laws, J. Inst. Civ. Eng. 11 (1939) 133-156. ``64/Re``: F. M. White, Fluid Mechanics, chapter 6, laminar pipe flow
    (Hagen–Poiseuille).
    """
    re, eps = np.broadcast_arrays(np.asarray(reynolds, dtype=float), np.asarray(relative_roughness, dtype=float))
    factor, slope = np.empty(re.shape), np.empty(re.shape)
    laminar, turbulent = re <= LAMINAR_END, re >= TURBULENT_START
    with np.errstate(divide="ignore"):  # of a liquid at rest
        factor[laminar], slope[laminar] = 64.0 / re[laminar], -1.0
    if turbulent.any():
        factor[turbulent], slope[turbulent] = _turbulent(re[turbulent], eps[turbulent])
    between = ~laminar & ~turbulent
    if between.any():
        factor[between], slope[between] = _joined(re[between], eps[between])
    return factor, slope


def _joined(reynolds: Array, relative_roughness: Array) -> tuple[Array, Array]:
    """Cubic Hermite join between the laminar and the turbulent factor, in ln Re."""
    width = np.log(TURBULENT_START / LAMINAR_END)
    t = np.log(reynolds / LAMINAR_END) / width
    start, start_slope = 64.0 / LAMINAR_END, -64.0 / LAMINAR_END * width
    end, end_log_slope = _turbulent(np.full(reynolds.shape, TURBULENT_START), relative_roughness)
    end_slope = end * end_log_slope * width
    rise = end - start
    factor = start + t * (start_slope + t * (3.0 * rise - 2.0 * start_slope - end_slope))
    factor = factor + t**3 * (start_slope + end_slope - 2.0 * rise)
    change = start_slope + 2.0 * t * (3.0 * rise - 2.0 * start_slope - end_slope)
    change = change + 3.0 * t**2 * (start_slope + end_slope - 2.0 * rise)
    return factor, change / width / factor


def friction_factor(reynolds: ArrayLike, relative_roughness: ArrayLike) -> Array:
    """Darcy friction factor.

    Parameters
    ----------
    reynolds : array_like
        Zero or positive; the factor at zero is infinite. [-]
    relative_roughness : array_like
        Roughness over bore, 0 to 0.05. [-]

    Returns
    -------
    ndarray
        [-]

    Notes
    -----
    As `friction_factor_and_slope`, which see; this one is made for large arrays.
    """
    re = np.atleast_1d(np.asarray(reynolds, dtype=float))
    eps = np.asarray(relative_roughness, dtype=float)
    shape = np.broadcast_shapes(re.shape, eps.shape)
    flat_re = np.broadcast_to(re, shape).reshape(-1)
    flat_eps = np.broadcast_to(eps, shape).reshape(-1)
    out = np.empty(flat_re.size)
    for start in range(0, flat_re.size, BLOCK):
        cut = slice(start, start + BLOCK)
        part, rough = flat_re[cut], flat_eps[cut]
        if part.min() >= TURBULENT_START:
            root = _colebrook_root(part, rough)
            np.divide(1.0, root * root, out=out[cut])
        else:
            out[cut] = friction_factor_and_slope(part, rough)[0]
    return out.reshape(shape) if np.ndim(reynolds) or np.ndim(relative_roughness) else out[0]


def head_of_factor_m(
    flow_m3_s: ArrayLike,
    *,
    head_per_square_s2_m5: ArrayLike,
    reynolds_per_flow_s_m3: ArrayLike,
    relative_roughness: ArrayLike,
) -> tuple[Array, Array]:
    """Head lost to friction, and its derivative, where what does not depend on the flow was worked out before.

    Parameters
    ----------
    flow_m3_s : array_like
        [m³/s]
    head_per_square_s2_m5 : array_like
        Head lost at unit flow and a factor of 1, ``L / (2 g D A²)``. [s²/m⁵]
    reynolds_per_flow_s_m3 : array_like
        Reynolds number at unit flow, ``D / (ν A)``. [s/m³]
    relative_roughness : array_like
        [-]

    Returns
    -------
    head_m, slope_s_m2 : ndarray
        [m], [s/m²]

    Notes
    -----
    ``h = f L/D v²/2g``; at rest ``f Q`` keeps its laminar limit, so that the slope does too.

    References
    ----------
    Darcy–Weisbach: F. M. White, Fluid Mechanics, chapter 6, head loss and the friction factor.
    """
    flow = np.asarray(flow_m3_s, dtype=float)
    reynolds = np.maximum(np.asarray(reynolds_per_flow_s_m3) * np.abs(flow), SMALLEST_REYNOLDS)
    factor, log_slope = friction_factor_and_slope(reynolds, relative_roughness)
    linear = np.asarray(head_per_square_s2_m5) * factor * (reynolds / np.asarray(reynolds_per_flow_s_m3))
    return np.asarray(flow * linear), np.asarray(linear * (2.0 + log_slope))


def darcy_weisbach_head_m(
    flow_m3_s: ArrayLike,
    *,
    length_m: ArrayLike,
    bore_m: ArrayLike,
    roughness_m: ArrayLike,
    kinematic_viscosity_m2_s: ArrayLike,
    gravity_m_s2: float,
) -> tuple[Array, Array]:
    """Head lost to friction in a full pipe by Darcy–Weisbach with `friction_factor`, and its derivative.

    Parameters
    ----------
    flow_m3_s, length_m, bore_m, roughness_m : array_like
        [m³/s], [m], [m], [m]
    kinematic_viscosity_m2_s : array_like
        Viscosity over density. [m²/s]
    gravity_m_s2 : float
        [m/s²]

    Returns
    -------
    head_m, slope_s_m2 : ndarray
        ``h`` and ``dh/dQ``; odd and even in the flow. [m], [s/m²]

    Notes
    -----
    As `head_of_factor_m`, which see.
    """
    length, bore = np.asarray(length_m, dtype=float), np.asarray(bore_m, dtype=float)
    area = np.pi * bore**2 / 4.0
    return head_of_factor_m(
        flow_m3_s,
        head_per_square_s2_m5=length / (2.0 * gravity_m_s2 * bore * area**2),
        reynolds_per_flow_s_m3=bore / (np.asarray(kinematic_viscosity_m2_s) * area),
        relative_roughness=np.asarray(roughness_m) / bore,
    )


def hazen_williams_resistance(length_m: ArrayLike, bore_m: ArrayLike, c: ArrayLike) -> Array:
    """Resistance ``r = k L / (C^1.852 D^4.870)`` of ``h = r Q^1.852``, in the form that `HAZEN_WILLIAMS_FACTOR` names.

    Parameters
    ----------
    length_m, bore_m : array_like
        [m]
    c : array_like
        Hazen–Williams coefficient. [-]

    Returns
    -------
    ndarray
        [m (s/m³)^1.852]
    """
    length, bore, coefficient = (np.asarray(values, dtype=float) for values in (length_m, bore_m, c))
    return np.asarray(HAZEN_WILLIAMS_FACTOR * length / (coefficient**FLOW_EXPONENT * bore**BORE_EXPONENT))


def head_of_resistance_m(flow_m3_s: ArrayLike, resistance: ArrayLike) -> tuple[Array, Array]:
    """Head ``r Q |Q|^0.852`` of `hazen_williams_resistance`, and its derivative. [m], [s/m²]"""
    flow = np.asarray(flow_m3_s, dtype=float)
    linear = np.asarray(resistance) * np.abs(flow) ** (FLOW_EXPONENT - 1.0)
    return np.asarray(flow * linear), np.asarray(FLOW_EXPONENT * linear)


def hazen_williams_head_m(
    flow_m3_s: ArrayLike, length_m: ArrayLike, bore_m: ArrayLike, c: ArrayLike
) -> tuple[Array, Array]:
    """Head lost to friction in a full pipe of cold water by Hazen–Williams, and its derivative.

    Parameters
    ----------
    flow_m3_s : array_like
        [m³/s]
    length_m, bore_m : array_like
        [m]
    c : array_like
        Hazen–Williams coefficient. [-]

    Returns
    -------
    head_m, slope_s_m2 : ndarray
        ``h`` and ``dh/dQ``; odd and even in the flow. [m], [s/m²]

    Notes
    -----
    ``V = 0.849 C R^0.63 S^0.54`` solved for the slope S of a round pipe, ``R = D/4``, without rounding. The slope is zero at rest.

    References
    ----------
    G. S. Williams and A. Hazen, Hydraulic Tables (1905); 0.849 is their 1.318 of feet in SI.
    """
    return head_of_resistance_m(flow_m3_s, hazen_williams_resistance(length_m, bore_m, c))
