"""Quantities that follow from the rest of a model: G from hydrostatic balance, and A*."""

from __future__ import annotations

import math

import numpy as np

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
    dlnP/dlnr = -G m rho / (r P). The right side without G is integrated over ln r with cubics
    (fourth order); cells are grouped so that ln P falls by equal amounts, each group
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
    step, slope = np.diff(lnr), np.gradient(weight, lnr, edge_order=2)
    trapezoids = step * (weight[1:] + weight[:-1]) / 2
    plain = np.concatenate(([0.0], np.cumsum(trapezoids)))[part]
    # A cubic through the values and slopes of both ends of each cell (fourth order).
    corrected = trapezoids - step**2 * np.diff(slope) / 12
    integral = np.concatenate(([0.0], np.cumsum(corrected)))[part]
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


def derive_a_star(
    radius: np.ndarray,
    mass: np.ndarray,
    pressure: np.ndarray,
    density: np.ndarray,
    gamma1: np.ndarray,
    gravitational_constant: float,
    rounding: float = 0.0,
) -> tuple[np.ndarray, int]:
    """A* from pressure and density, and how many points needed a wider stencil.

    Parameters
    ----------
    radius, mass, pressure, density, gamma1 : (n,) cgs units, radius never falling; a repeated
        radius is a density jump, across which nothing is differentiated.
    gravitational_constant : cm^3 g^-1 s^-2
    rounding : relative rounding of `pressure` and `density`

    Returns
    -------
    a_star, widened : (n,), and the number of points whose neighbours differ by too little to
        be differentiated.

    Notes
    -----
    A* = V (dln rho/dlnP - 1/Gamma1) with V = G m rho / (r P), which is -dlnP/dlnr in
    hydrostatic balance and needs no difference. Only dln rho/dlnP is a difference: the slope of
    the parabola through three points, second order on any spacing. Where the three points span
    less than 1000 roundings of ln P, a line is fitted to as many points as that takes.
    """
    positive = (pressure > 0.0) & (density > 0.0)
    lnp, lnd = (np.log(np.where(positive, values, 1.0)) for values in (pressure, density))
    slope = np.zeros(radius.size)
    widened = 0
    points = np.flatnonzero(positive)
    cuts = np.flatnonzero(np.diff(radius) == 0.0) + 1
    for block in np.split(points, np.searchsorted(points, cuts)):
        if block.size >= 2:
            slope[block], wide = _slope(lnp[block], lnd[block], 1e3 * rounding)
            widened += wide
    strength = np.divide(
        gravitational_constant * mass * density,
        radius * pressure,
        out=np.zeros(radius.size),
        where=(radius > 0.0) & positive,
    )
    return strength * (slope - 1.0 / gamma1), widened


def slope_over(
    pressure: np.ndarray, values: np.ndarray, jumps: np.ndarray, rounding: float
) -> np.ndarray:
    """(n,) d(values)/dlnP, differentiated as in `derive_a_star`, not across the (n-1,) `jumps`."""
    lnp = np.log(pressure)
    slope = np.zeros(pressure.size)
    for block in np.split(np.arange(pressure.size), np.flatnonzero(jumps) + 1):
        if block.size >= 2:
            slope[block], _ = _slope(lnp[block], values[block], 1e3 * rounding)
    return slope


def _slope(x: np.ndarray, y: np.ndarray, least: float) -> tuple[np.ndarray, int]:
    """dy/dx at each point, and the number of points where `least` forced a wider fit."""
    if x.size == 2:
        step = x[1] - x[0]
        return np.full(2, (y[1] - y[0]) / step if step else 0.0), 0
    with np.errstate(divide="ignore", invalid="ignore"):
        step = np.diff(x)
        chord = np.diff(y) / step
        out = np.empty_like(x)
        out[1:-1] = (step[1:] * chord[:-1] + step[:-1] * chord[1:]) / (step[1:] + step[:-1])
        out[0] = chord[0] + (chord[0] - out[1])
        out[-1] = chord[-1] + (chord[-1] - out[-2])
    thin = np.empty(x.size, dtype=bool)
    thin[1:-1] = np.minimum(np.abs(step[1:]), np.abs(step[:-1])) <= 0.5 * least
    thin[0], thin[-1] = thin[1], thin[-2]
    thin |= ~np.isfinite(out)
    for k in np.flatnonzero(thin).tolist():
        out[k] = _wide_slope(x, y, k, least)
    return out, int(np.count_nonzero(thin))


def _wide_slope(x: np.ndarray, y: np.ndarray, k: int, least: float) -> float:
    """Least-squares slope over the smallest window about `k` in which x spans `least`."""
    low, high = max(k - 1, 0), min(k + 1, x.size - 1)
    while np.ptp(x[low : high + 1]) <= least and (low > 0 or high < x.size - 1):
        low, high = max(low - 1, 0), min(high + 1, x.size - 1)
    dx = x[low : high + 1] - x[low : high + 1].mean()
    spread = float(dx @ dx)
    return float(dx @ y[low : high + 1]) / spread if spread > 0.0 else 0.0
