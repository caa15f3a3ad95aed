"""Polytropes: exact stars to test on and to play with.

The Lane-Emden equation is integrated by Taylor series of its solution, step by step, which is
exact to round-off and gives the solution at any radius, not only at the steps.
"""

from __future__ import annotations

import math
from fractions import Fraction

import numpy as np

from oscsolve.errors import InputError
from oscsolve.star.model import StarModel
from oscsolve.units import NEWTON_G, SOLAR_MASS, SOLAR_RADIUS

#: Terms of each Taylor series, and the fraction of its radius of convergence that is stepped.
_TERMS = 26
_STEP = 0.22
#: Points of the model in each Taylor step.
_POINTS_PER_STEP = 64
#: The model's last point before its edge lies this far inside it, in fractional radius.
_EDGE = 1e-9
#: Outermost part that is graded geometrically towards the edge, and the ratio of the grading.
_GRADED, _RATIO = 0.02, 0.87


def polytrope(
    index: float,
    gamma1: float = 5.0 / 3.0,
    *,
    mass: float = SOLAR_MASS,
    radius: float = SOLAR_RADIUS,
    gravitational_constant: float = NEWTON_G,
) -> StarModel:
    """A polytrope P = K rho^(1 + 1/index), its edge included.

    Parameters
    ----------
    index : polytropic index, 0 <= index < 5
    gamma1 : first adiabatic exponent, the same everywhere
    mass, radius : g, cm
    gravitational_constant : cm^3 g^-1 s^-2

    Returns
    -------
    StarModel
        About a thousand points, each exact to 1e-13; the last is the edge, where P = rho = 0
        (P = 0 alone for index 0).

    Raises
    ------
    InputError
        `index` is outside [0, 5) or too close to 5, or gamma1, mass or radius is not above zero.

    Notes
    -----
    (xi^2 theta')' = -xi^2 theta^n, theta(0) = 1, theta'(0) = 0 (Chandrasekhar 1939, ch. IV);
    rho = rho_c theta^n, P/rho = (P_c/rho_c) theta, m = -4 pi rho_c r_n^3 xi^2 theta'.

    Examples
    --------
    >>> star = polytrope(1)
    >>> bool(abs(star.density[0] / star.density.mean()) > 1)
    True
    """
    if not 0.0 <= index < 5.0:
        raise InputError(f"a polytrope of finite size has 0 <= index < 5; got {index:g}")
    for name, value in (("gamma1", gamma1), ("mass", mass), ("radius", radius)):
        if not (math.isfinite(value) and value > 0.0):
            raise InputError(f"{name} of a polytrope must be above zero; got {value:g}")
    steps = _lane_emden(float(index))
    xi, theta, slope = _sample(steps)
    edge_xi, edge_slope = xi[-1], slope[-1]
    x = xi / edge_xi
    ratio = np.divide(-3.0 * slope, xi, out=np.ones_like(xi), where=xi > 0.0)
    mean_density = 3.0 * mass / (4.0 * np.pi * radius**3)
    rho_c = mean_density / ratio[-1]
    # G M/R = (n + 1)(P_c/rho_c) (-xi theta') at the edge.
    w_c = gravitational_constant * mass / radius / ((index + 1.0) * -edge_xi * edge_slope)
    with np.errstate(divide="ignore"):
        density = rho_c * theta**index
    v = np.divide(-(index + 1.0) * xi * slope, theta, out=np.zeros_like(xi), where=theta > 0.0)
    name = f"polytrope of index {Fraction(index).limit_denominator(1000)}"
    return StarModel(
        radius=x * radius,
        mass=mass * x**3 * ratio / ratio[-1],
        pressure=density * w_c * theta,
        density=density,
        gamma1=np.full_like(x, gamma1),
        a_star=v * (index / (index + 1.0) - 1.0 / gamma1),
        total_mass=mass,
        photospheric_radius=radius,
        gravitational_constant=gravitational_constant,
        name=name,
    )


def uniform_sphere(
    gamma1: float = 5.0 / 3.0,
    *,
    mass: float = SOLAR_MASS,
    radius: float = SOLAR_RADIUS,
    gravitational_constant: float = NEWTON_G,
) -> StarModel:
    """A sphere of one density: the polytrope of index 0, whose spectrum is known in closed form.

    Parameters, units and errors as in `polytrope`.
    """
    star = polytrope(
        0.0, gamma1, mass=mass, radius=radius, gravitational_constant=gravitational_constant
    )
    return star.with_changes(name="uniform sphere")


def _lane_emden(index: float) -> list[tuple[float, float, np.ndarray]]:
    """Taylor steps (xi, length, coefficients of theta) from the centre to the edge.

    The last entry has length 0 and sits at the edge: theta = 0 to round-off.
    """
    steps = []
    xi, theta, slope = 0.0, 1.0, 0.0
    while True:
        series = _taylor(index, xi, theta, slope)
        length = _STEP * _convergence_radius(series)
        edge = _first_zero(series)
        if edge < 1e-9 * (xi + edge):
            steps.append((xi, edge, series))
            break
        # Stay clear of the edge, where theta^n is not analytic.
        length = min(length, 0.4 * edge)
        steps.append((xi, length, series))
        xi, (theta, slope) = xi + length, _evaluate(series, length)
        if len(steps) > 2000:
            raise InputError(f"index {index:g} is too close to 5: the edge is not reached")
    xi, length, series = steps[-1]
    theta, slope = _evaluate(series, length)
    steps.append((xi + length, 0.0, np.array([0.0, slope])))
    return steps


def _taylor(n: float, xi: float, theta: float, slope: float) -> np.ndarray:
    """Coefficients a_k of theta(xi + t) = sum a_k t^k, by recurrence.

    u = theta^n obeys theta u' = n u theta'; the equation reads
    (xi + t) theta'' + 2 theta' + (xi + t) u = 0.
    """
    a = [theta, slope] + [0.0] * (_TERMS - 2)
    u = [theta**n] + [0.0] * (_TERMS - 1)
    for k in range(_TERMS - 2):
        if k > 0:
            u[k] = sum((j * n - (k - j)) * a[j] * u[k - j] for j in range(1, k + 1)) / (k * theta)
        if xi == 0.0:
            a[k + 2] = -u[k] / ((k + 2) * (k + 3))
        else:
            below = u[k - 1] if k > 0 else 0.0
            a[k + 2] = -((k + 1) * (k + 2) * a[k + 1] + xi * u[k] + below) / (
                xi * (k + 2) * (k + 1)
            )
    return np.array(a)


def _convergence_radius(series: np.ndarray) -> float:
    """Radius of convergence by the root test on the last coefficients, at most 10."""
    last = np.abs(series[-4:])
    powers = np.arange(series.size - 4, series.size)
    with np.errstate(divide="ignore"):
        return float(min(10.0, np.min(last ** (-1.0 / powers))))


def _first_zero(series: np.ndarray) -> float:
    """Distance to the edge, where theta falls to zero, as seen from here (good when close)."""
    theta, slope, curvature = series[0], series[1], series[2]
    if slope == 0.0:
        return math.inf
    distance = -theta / slope
    for _ in range(3):
        value = theta + distance * (slope + distance * curvature)
        distance -= value / (slope + 2.0 * distance * curvature)
    return distance if distance > 0.0 else -theta / slope


def _evaluate(series: np.ndarray, t: float | np.ndarray) -> tuple:
    """theta and dtheta/dxi at distance t from the start of a step."""
    theta: float | np.ndarray = 0.0
    slope: float | np.ndarray = 0.0
    for a in series[::-1]:
        slope = slope * t + theta
        theta = theta * t + a
    return theta, slope


def _sample(steps: list[tuple[float, float, np.ndarray]]) -> tuple[np.ndarray, ...]:
    """xi, theta and theta' on the points of the model, the edge last."""
    edge = steps[-1][0]
    graded = edge * _GRADED * _RATIO ** np.arange(int(math.log(_EDGE / _GRADED, _RATIO)) + 1)
    xi, theta, slope = [], [], []
    for start, length, series in steps[:-1]:
        t = length * np.arange(_POINTS_PER_STEP) / _POINTS_PER_STEP
        outside = edge - (start + t) <= edge * _GRADED
        distance = edge - graded - start
        t = np.concatenate((t[~outside], distance[(distance >= 0.0) & (distance < length)]))
        values = _evaluate(series, t)
        xi.append(start + t)
        theta.append(np.broadcast_to(values[0], t.shape))
        slope.append(np.broadcast_to(values[1], t.shape))
    xi.append(np.array([edge]))
    theta.append(np.array([0.0]))
    slope.append(np.array([steps[-1][2][1]]))
    return tuple(np.concatenate(part) for part in (xi, theta, slope))
