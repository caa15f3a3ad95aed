"""A sphere of uniform layers: exact hydrostatic balance, with density jumps between the layers."""

from __future__ import annotations

import math
from collections.abc import Sequence

import numpy as np

from oscsolve.errors import InputError
from oscsolve.star.model import StarModel
from oscsolve.units import NEWTON_G, SOLAR_MASS, SOLAR_RADIUS

#: The last point before the edge lies this far inside it, in fractional radius; the outer
#: tenth of the last layer is graded towards the edge by this ratio.
_EDGE, _GRADED, _RATIO = 1e-9, 0.1, 0.87


def layered_sphere(
    layers: Sequence[tuple[float, float]],
    gamma1: float = 5.0 / 3.0,
    *,
    mass: float = SOLAR_MASS,
    radius: float = SOLAR_RADIUS,
    points: int = 100,
    gravitational_constant: float = NEWTON_G,
) -> StarModel:
    """A sphere of layers of one density each, its edge included.

    Parameters
    ----------
    layers : (outer radius, density) pairs from the centre outward. Radii in units of the radius
        of the sphere, rising, the last one 1; densities in any common unit. A layer may be
        denser than the one below it, which makes the star unstable for l > 0.
    gamma1 : first adiabatic exponent, the same everywhere; 1e5 and more is nearly incompressible
    mass, radius : M, R in g, cm
    points : number of points in each layer, at least 5; the last one gets more towards the edge
    gravitational_constant : cm^3 g^-1 s^-2

    Returns
    -------
    StarModel
        Exact to round-off. Two points share each radius at which density jumps; at the last
        point P = 0.

    Raises
    ------
    InputError
        Radii do not rise to 1, a density, gamma1, mass or radius is not above zero, or a layer
        has too few points.

    Notes
    -----
    In a layer of density rho outside x_i, with k = m(x_i) - 4 pi rho x_i^3/3 and G = M = R = 1,

        m = k + 4 pi rho x^3/3,    P(x) - P(x_o) = rho (x_o - x) [k/(x x_o) + 2 pi rho (x + x_o)/3]

    up to its outer radius x_o; A* = -V/Gamma1, since density is uniform.

    Examples
    --------
    >>> star = layered_sphere([(0.6, 3.0), (1.0, 1.0)])
    >>> at = int((star.fractional_radius < 0.6).sum())
    >>> round(float(star.density[at] / star.density[at + 1]), 12)
    3.0
    """
    outer, density = _check(layers, gamma1, mass, radius, points)
    inner = np.append(0.0, outer[:-1])
    density = density / (4.0 * np.pi / 3.0 * np.sum(density * (outer**3 - inner**3)))
    offset = np.append(0.0, np.cumsum(4.0 * np.pi / 3.0 * -np.diff(density) * outer[:-1] ** 3))
    base, columns = 0.0, []
    for i in reversed(range(outer.size)):
        depth = _depths(outer[i] - inner[i], points, last=i == outer.size - 1)
        x = outer[i] - depth
        x[0] = inner[i]
        shape = np.divide(offset[i], x * outer[i], out=np.zeros_like(x), where=x > 0.0)
        rise = density[i] * depth * (shape + 2.0 * np.pi * density[i] * (x + outer[i]) / 3.0)
        m = offset[i] + 4.0 * np.pi / 3.0 * density[i] * x**3
        columns.append((x, m, base + rise, np.full_like(x, density[i])))
        base += rise[0]
    x, m, pressure, rho = (np.concatenate(part[::-1]) for part in zip(*columns, strict=True))
    weight = np.divide(rho * m, x, out=np.zeros_like(x), where=x > 0.0)
    v = np.divide(weight, pressure, out=np.zeros_like(x), where=pressure > 0.0)
    return StarModel(
        radius=x * radius,
        mass=m * mass,
        pressure=pressure * gravitational_constant * mass**2 / radius**4,
        density=rho * mass / radius**3,
        gamma1=np.full_like(x, gamma1),
        a_star=-v / gamma1,
        total_mass=mass,
        photospheric_radius=radius,
        gravitational_constant=gravitational_constant,
        name=f"sphere of {outer.size} uniform layers",
    )


def _check(
    layers: Sequence[tuple[float, float]], gamma1: float, mass: float, radius: float, points: int
) -> tuple[np.ndarray, np.ndarray]:
    """Outer radii and densities of the layers."""
    try:
        outer, density = np.array([(float(x), float(rho)) for x, rho in layers]).T
    except (TypeError, ValueError) as error:
        raise InputError(
            f"layers are pairs (outer radius, density), at least one; got {layers!r}"
        ) from error
    if not (np.all(np.diff(outer, prepend=0.0) > 0.0) and outer[-1] == 1.0):
        raise InputError(f"outer radii of layers must rise from above 0 to 1; got {outer.tolist()}")
    if not (np.all(np.isfinite(density)) and np.all(density > 0.0)):
        raise InputError(f"densities of layers must be above zero; got {density.tolist()}")
    for name, value in (("gamma1", gamma1), ("mass", mass), ("radius", radius)):
        if not (math.isfinite(value) and value > 0.0):
            raise InputError(f"{name} of a layered sphere must be above zero; got {value:g}")
    if points < 5:
        raise InputError(f"a layer needs at least 5 points; got {points}")
    return outer, density


def _depths(width: float, points: int, last: bool) -> np.ndarray:
    """Depths of the points below the outer radius of a layer, from `width` down to 0."""
    if not last:
        return np.linspace(width, 0.0, points)
    steps = math.ceil(math.log(_EDGE / (_GRADED * width)) / math.log(_RATIO))
    graded = _GRADED * width * _RATIO ** np.arange(1, steps + 1)
    return np.concatenate((np.linspace(width, _GRADED * width, points), graded, [0.0]))
