"""Quantities that follow from the rest of a model: G from hydrostatic balance, and A*."""

from __future__ import annotations

import numpy as np
from scipy.interpolate import CubicSpline

#: Groups of cells over which pressure is added up before G is read off; enough for a robust
#: median, few enough that the rounding of a ten-digit file averages out inside each.
_GRAVITY_GROUPS = 100


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
    gravity, scatter : cm^3 g^-1 s^-2 and relative; both NaN if fewer than 10 points are usable.

    Notes
    -----
    dlnP/dlnr = -G m rho / (r P). The right side without G is integrated over ln r with a cubic
    spline (fourth order); points are grouped so that ln P falls by equal amounts, each group
    gives one G, and the median is kept. The scatter is 1.48 times the median absolute
    deviation over the square root of the number of groups.
    """
    use = (radius > 0.0) & (mass > 0.0) & (pressure > 0.0) & (density > 0.0)
    use[1:] &= np.diff(radius) > 0.0
    if radius.size and use.any():
        # A stand-in for the centre is no point of the mesh, and above R the balance may hold
        # another law (radiation, turbulence) than hydrostatics alone.
        use &= radius > 1e-12 * radius[-1]
    if np.count_nonzero(use) < 10:
        return float("nan"), float("nan")
    lnr, lnp = np.log(radius[use]), np.log(pressure[use])
    weight = (mass * density)[use] / (radius * pressure)[use]
    integral = CubicSpline(lnr, weight).antiderivative()(lnr)
    fall = lnp[0] - lnp
    edges = _equal_falls(fall)
    values = np.diff(fall[edges]) / np.diff(integral[edges])
    middle = float(np.median(values))
    spread = 1.4826 * float(np.median(np.abs(values / middle - 1.0)))
    return middle, spread / np.sqrt(values.size)


def _equal_falls(fall: np.ndarray) -> np.ndarray:
    """Indices that cut the points into groups over which `fall` grows by equal amounts."""
    rising = np.maximum.accumulate(fall)
    marks = np.linspace(0.0, rising[-1], _GRAVITY_GROUPS + 1)
    return np.unique(np.clip(np.searchsorted(rising, marks), 0, fall.size - 1))
