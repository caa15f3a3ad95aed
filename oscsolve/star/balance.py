"""How well mass, pressure, density and buoyancy of a model obey the laws that join them.

Single differences of neighbouring points are noise where a file has ten digits and a fine mesh
(a solar model inside 0.05 R). The laws are therefore integrated over groups of cells in which
pressure, or mass, changes by equal amounts.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from oscsolve.star.model import StarModel

#: Groups of cells into which the fall of ln P, and the mass, are cut.
_GROUPS = 60
#: Expected fall of ln P in one cell from which the cell is left out.
_COARSE = 1.0


@dataclass(frozen=True, eq=False)
class Balance:
    """Residuals of three laws, one number a group of cells.

    Attributes
    ----------
    x : (k,) fractional radius in the middle of the groups of equal fall of ln P; cells in which
        ln P falls by 1 or more are in none
    hydrostatic : (k,) fall of ln P over that of G m rho / (r P) dln r, less 1
    density : (k,) fall of ln rho less that of (A* + V/Gamma1) dln r, over the fall of ln P
    mass_x : (j,) fractional radius in the middle of the groups of equal mass
    mass : (j,) growth of m over that of 4 pi r^2 rho dr
    """

    x: np.ndarray
    hydrostatic: np.ndarray
    density: np.ndarray
    mass_x: np.ndarray
    mass: np.ndarray


def measure_balance(star: StarModel, mass: np.ndarray | None = None) -> Balance:
    """Residuals of hydrostatic balance, of A* against the density, and of m against density.

    Parameters
    ----------
    star : the model
    mass : (n,) g, used in place of the mass of the model in the first two laws
    """
    use = (star.radius > 0.0) & (star.pressure > 0.0) & (star.density > 0.0)
    assert star.a_star is not None
    columns = (star.radius, star.mass if mass is None else mass, star.pressure, star.density)
    r, m, p, d = (column[use] for column in columns)
    a_star, gamma1 = star.a_star[use], star.gamma1[use]
    v = star.gravitational_constant * m * d / (r * p)
    step = np.diff(r) / r[:-1]
    # Cells in which P must fall by e or more (towards a true edge) are too coarse to judge.
    real = (step > 0.0) & (np.maximum(v[1:], v[:-1]) * step < _COARSE)
    lnp, lnd = np.log(p), np.log(d)
    fall = np.where(real, -np.diff(lnp), 0.0)
    thinning = np.where(real, -np.diff(lnd), 0.0)
    edges = _equal_parts(fall)
    load, expected, found, thinned = (
        _group(cells, edges)
        for cells in (
            _cells(r, v, real),
            _cells(r, v / gamma1 + a_star, real),
            fall,
            thinning,
        )
    )
    x = r / star.photospheric_radius
    shells = shell_masses(r, d)
    mass_edges = _equal_parts(shells)
    with np.errstate(divide="ignore", invalid="ignore"):
        return Balance(
            x=_middles(x, edges),
            hydrostatic=found / load - 1.0,
            density=(thinned - expected) / found,
            mass_x=_middles(x, mass_edges),
            mass=_group(np.diff(star.mass[use]), mass_edges) / _group(shells, mass_edges),
        )


def shell_masses(radius: np.ndarray, density: np.ndarray) -> np.ndarray:
    """(n-1,) g between the points: the mean density of two points times the volume."""
    low, high = radius[:-1], radius[1:]
    # Factored, since differences of r^3 cancel in thin cells.
    volume = (high - low) * (high**2 + high * low + low**2) * (4.0 * np.pi / 3.0)
    return 0.5 * (density[1:] + density[:-1]) * volume


def mass_of_density(star: StarModel) -> np.ndarray:
    """(n,) g, the mass that the density makes inside each point."""
    inner = 4.0 * np.pi / 3.0 * star.radius[0] ** 3 * star.density[0]
    return inner + np.concatenate(([0.0], np.cumsum(shell_masses(star.radius, star.density))))


def _cells(r: np.ndarray, f: np.ndarray, real: np.ndarray) -> np.ndarray:
    """(n-1,) integrals of f dln r between the points, by splines over runs of `real` cells."""
    out = np.zeros(r.size - 1)
    breaks = np.flatnonzero(~real) + 1
    for part in np.split(np.arange(r.size), breaks):
        # Against r, not ln r: near the centre f/r is linear in r, and steps in ln r are large.
        at, slope = r[part], f[part] / r[part]
        if part.size >= 4:
            # Imported here: the import takes longer than solving a star.
            from scipy.interpolate import CubicSpline

            out[part[:-1]] = np.diff(CubicSpline(at, slope).antiderivative()(at))
        elif part.size >= 2:
            out[part[:-1]] = 0.5 * np.diff(at) * (slope[1:] + slope[:-1])
    return out


def _equal_parts(steps: np.ndarray) -> np.ndarray:
    """Indices of points that cut the cells into groups over which `steps` add up equally."""
    rising = np.maximum.accumulate(np.concatenate(([0.0], np.cumsum(steps))))
    marks = np.linspace(0.0, rising[-1], _GROUPS + 1)
    return np.unique(np.clip(np.searchsorted(rising, marks), 0, rising.size - 1))


def _group(cells: np.ndarray, edges: np.ndarray) -> np.ndarray:
    return np.diff(np.concatenate(([0.0], np.cumsum(cells)))[edges])


def _middles(x: np.ndarray, edges: np.ndarray) -> np.ndarray:
    return 0.5 * (x[edges[1:]] + x[edges[:-1]])
