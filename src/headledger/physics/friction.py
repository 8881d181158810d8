"""Friction of full pipes: the Darcy friction factor with its slope, Darcy–Weisbach and Hazen–Williams head losses."""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike, NDArray

Array = NDArray[np.float64]

LAMINAR_END, TURBULENT_START = 2000.0, 4000.0
"""Reynolds numbers between which the factor is joined smoothly. [-]"""

BLOCK = 8192
"""Values worked on at a time, so that temporaries stay in the processor's cache."""

HAZEN_WILLIAMS_FACTOR = (4.0**1.63 / (np.pi * 0.849)) ** (1.0 / 0.54)
"""SI constant of h = k L (Q/C)^(1/0.54) / D^(2.63/0.54), exact for V = 0.849 C R^0.63 S^0.54: 10.675."""


def _colebrook_root(reynolds: Array, relative_roughness: Array) -> Array:
    """``1/√f`` of Colebrook–White, from an explicit start by two steps of third order.

    With ``x = 1/√f`` the equation is ``x + 2 log10(ε/3.7 + 2.51 x/Re) = 0``.
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
        Positive. [-]
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
    C. F. Colebrook, Turbulent flow in pipes, J. Inst. Civ. Eng. 11 (1939) 133-156.
    """
    re, eps = np.broadcast_arrays(np.asarray(reynolds, dtype=float), np.asarray(relative_roughness, dtype=float))
    factor, slope = np.empty(re.shape), np.empty(re.shape)
    laminar, turbulent = re <= LAMINAR_END, re >= TURBULENT_START
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
        Positive. [-]
    relative_roughness : array_like
        [-]

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
