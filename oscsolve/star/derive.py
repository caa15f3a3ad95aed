"""Quantities that follow from the rest of a model: G from hydrostatic balance, and A*."""

from __future__ import annotations

import math

import numpy as np
from scipy.interpolate import CubicSpline

#: Groups of cells over which pressure is added up before G is read off; enough for a robust
#: median, few enough that the rounding of a ten-digit file averages out inside each.
_GRAVITY_GROUPS = 60
#: Range of r over the outermost r that is used for G. Further in, the differences of ten-digit
#: numbers are noise; further out, evolution codes join an atmosphere with constant gravity or
#: a turbulent pressure (7e-4 of G in two public solar models).
_GRAVITY_RANGE = (0.05, 0.95)


def estimate_gravity(
    radius: np.ndarray, mass: np.ndarray, pressure: np.ndarray, density: np.ndarray
) -> tuple[float, float]:
    """G implied by hydrostatic balance, and its uncertainty (relative).

    Parameters
    ----------
    radius, mass, pressure, density : (n,) cgs units, radius rising; points with repeated or
        zero radius, zero mass or zero pressure are left out.

    Returns
    -------
    gravity, uncertainty : cm^3 g^-1 s^-2 and relative; both NaN if fewer than 10 points are
        usable.

    Notes
    -----
    dlnP/dlnr = -G m rho / (r P). The right side without G is integrated over ln r with a cubic
    spline (fourth order); cells are grouped so that ln P falls by equal amounts, each group
    gives one G, and the median is kept. The uncertainty adds the spread of the groups over the
    square root of their number and the difference from the trapezoidal rule, since many codes
    hold the balance to second order on their own mesh.
    """
    use = (radius > 0.0) & (mass > 0.0) & (pressure > 0.0) & (density > 0.0)
    use[1:] &= np.diff(radius) > 0.0
    if np.count_nonzero(use) < 10:
        return float("nan"), float("nan")
    r, lnr, lnp = radius[use], np.log(radius[use]), np.log(pressure[use])
    weight = mass[use] * density[use] / (r * pressure[use])
    low, high = np.searchsorted(r, np.array(_GRAVITY_RANGE) * r[-1])
    if high - low < 20:
        low, high = 0, r.size
    part = slice(low, high)
    integral = CubicSpline(lnr, weight).antiderivative()(lnr)[part]
    plain = np.concatenate(([0.0], np.cumsum(np.diff(lnr) * (weight[1:] + weight[:-1]) / 2)))[part]
    fall = lnp[low] - lnp[part]
    edges = _equal_falls(fall)
    values = np.diff(fall[edges]) / np.diff(integral[edges])
    second = float(np.median(np.diff(fall[edges]) / np.diff(plain[edges])))
    middle = float(np.median(values))
    spread = 1.4826 * float(np.median(np.abs(values / middle - 1.0))) / math.sqrt(values.size)
    return middle, math.hypot(spread, second / middle - 1.0)


def _equal_falls(fall: np.ndarray) -> np.ndarray:
    """Indices that cut the points into groups over which `fall` grows by equal amounts."""
    rising = np.maximum.accumulate(fall)
    marks = np.linspace(0.0, rising[-1], _GRAVITY_GROUPS + 1)
    return np.unique(np.clip(np.searchsorted(rising, marks), 0, fall.size - 1))
