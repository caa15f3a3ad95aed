"""Stars with a prescribed run of dln rho/dln P: hydrostatic balance without microphysics."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from scipy.integrate import solve_ivp

from oscsolve.errors import InputError
from oscsolve.star.model import StarModel
from oscsolve.units import NEWTON_G

#: Depth, in ln P, at which the integration leaves the centre; the series there is good to s^2.
_START = 1e-7


def stratified_star(
    layers: Sequence[tuple[float, float]],
    *,
    photosphere: float,
    outermost: float,
    mass: float,
    radius: float,
    gamma1: float = 5.0 / 3.0,
    smoothing: float = 0.3,
    points: int = 1500,
    gravitational_constant: float = NEWTON_G,
    name: str = "stratified star",
) -> StarModel:
    """A star in exact hydrostatic balance whose density follows a given power of pressure.

    Parameters
    ----------
    layers : (s, beta) pairs, s rising from 0: from the depth s = ln(P_c/P) on, dln rho/dln P is
        beta. 1/gamma1 makes a layer neutrally stable (convective), 1 isothermal, less than
        1/gamma1 unstable.
    photosphere, outermost : s of the radius R and of the last point
    mass, radius : M, R in g, cm
    gamma1 : first adiabatic exponent, the same everywhere
    smoothing : half-width in s over which beta goes from one layer to the next (tanh)
    points : number of points, evenly spaced in a mixture of r and s
    gravitational_constant : cm^3 g^-1 s^-2
    name : name of the star

    Returns
    -------
    StarModel
        r, m, P, rho consistent to 1e-11; A* follows from beta exactly.

    Raises
    ------
    InputError
        Layers do not start at s = 0 or do not rise, or the outermost point lies inside the
        photosphere.

    Notes
    -----
    With w = P/rho, q = m/r^3 and G = P_c = rho_c = 1: dln w/ds = beta - 1, dr^2/ds = 2 w/q,
    dq/ds = (4 pi rho - 3 q) w/(r^2 q), from dP/dr = -rho g and dm/dr = 4 pi r^2 rho.
    """
    edges = np.array([s for s, _ in layers], dtype=float)
    if edges.size == 0 or edges[0] != 0.0 or np.any(np.diff(edges) <= 0.0):
        raise InputError("layers must start at s = 0 and rise")
    if not edges[-1] < photosphere <= outermost:
        raise InputError(
            "the photosphere must lie outside the last layer's start, and the "
            "outermost point at it or beyond"
        )
    values = np.array([beta for _, beta in layers], dtype=float)
    s, squared, q = _integrate(edges, values, smoothing, outermost, photosphere, points)
    beta, ln_w = _stratification(s, edges, values, smoothing)
    r, w = np.sqrt(squared), np.exp(ln_w)
    m = q * r**3
    at = int(np.argmin(np.abs(s - photosphere)))
    scale_p = gravitational_constant * (mass / m[at]) ** 2 * (r[at] / radius) ** 4
    scale_rho = mass / m[at] * (r[at] / radius) ** 3
    v = np.divide(q * squared, w)
    return StarModel(
        radius=r * radius / r[at],
        mass=m * mass / m[at],
        pressure=np.exp(-s) * scale_p,
        density=np.exp(-s) / w * scale_rho,
        gamma1=np.full_like(s, gamma1),
        a_star=v * (beta - 1.0 / gamma1),
        total_mass=mass,
        photospheric_radius=radius,
        gravitational_constant=gravitational_constant,
        name=name,
    )


def _stratification(
    s: np.ndarray, edges: np.ndarray, values: np.ndarray, smoothing: float
) -> tuple[np.ndarray, np.ndarray]:
    """beta(s) and ln w(s) = int (beta - 1) ds, both in closed form."""
    beta = np.full_like(s, values[0])
    ln_w = (values[0] - 1.0) * s
    for edge, step in zip(edges[1:], np.diff(values), strict=True):
        t = (s - edge) / smoothing
        beta += 0.5 * step * (1.0 + np.tanh(t))
        # The integral of (1 + tanh t)/2 is ln(1 + e^2t)/2.
        ln_w += (
            0.5
            * step
            * smoothing
            * (np.logaddexp(0.0, 2.0 * t) - np.log1p(np.exp(-2.0 * edge / smoothing)))
        )
    return beta, ln_w


def _integrate(
    edges: np.ndarray,
    values: np.ndarray,
    smoothing: float,
    outermost: float,
    photosphere: float,
    points: int,
) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    """s, r^2 and q on the points of the model, the centre first."""

    def slopes(s: float, y: np.ndarray) -> list[float]:
        w = float(np.exp(_stratification(np.array([s]), edges, values, smoothing)[1][0]))
        rho = np.exp(-s) / w
        return [2.0 * w / y[1], (4.0 * np.pi * rho - 3.0 * y[1]) * w / (y[0] * y[1])]

    central = 4.0 * np.pi / 3.0
    start = [2.0 * _START / central, central * (1.0 - 0.6 * values[0] * _START)]
    found = solve_ivp(
        slopes,
        (_START, outermost),
        start,
        method="DOP853",
        rtol=1e-13,
        atol=1e-16,
        dense_output=True,
    )
    grid = np.geomspace(_START, outermost, 20 * points)
    radius = np.sqrt(found.sol(grid)[0])
    place = radius / radius[-1] + grid / outermost
    s = np.interp(np.linspace(place[0], place[-1], points - 1), place, grid)
    s[np.argmin(np.abs(s - photosphere))] = photosphere
    squared, q = found.sol(s)
    return np.append(0.0, s), np.append(0.0, squared), np.append(central, q)
