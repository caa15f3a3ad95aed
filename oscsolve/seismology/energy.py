"""Where the energy of a mode is: inertia, mode mass, energy density, share of the g-mode cavity.

All of it follows from the eigenfunctions of a mode list, which may come from a file.
"""

from __future__ import annotations

import numpy as np

from oscsolve.pulsation.modeset import ModeSet
from oscsolve.seismology.integrals import Quadrature
from oscsolve.seismology.motion import Motion, Wave, cubic
from oscsolve.star.profile import Structure


def energy_density(modes: ModeSet, index: int) -> np.ndarray:
    """Kinetic energy of a mode per fractional radius, on the points of the model.

    Parameters
    ----------
    modes : mode list with eigenfunctions
    index : row of the mode

    Returns
    -------
    (n,) array
        rho (xi_r^2 + l(l+1) xi_h^2) r^2 over its integral by x = r/R, so that it integrates to 1.

    Raises
    ------
    InputError
        The list holds no eigenfunctions, or there is no such mode.
    """
    quadrature = Quadrature(modes)
    at, mode = quadrature.points, quadrature.motion_on_points(index)
    ll = quadrature.wave(index).ll
    density = at.rho * (mode.xi_r**2 + ll * mode.xi_h**2) * at.x**2
    return density / kinetic(quadrature, index)


def mode_inertia(modes: ModeSet) -> np.ndarray:
    """(m,) normalised inertia from the eigenfunctions on the points of the model.

    4 pi int rho (xi_r^2 + l(l+1) xi_h^2) r^2 dr over M times the squared total displacement at
    the photosphere: what `ModeSet.inertia` holds from the finer mesh of the solver. The two differ
    where the points of the model are too few for the mode.

    Raises
    ------
    InputError
        The list holds no eigenfunctions.
    """
    quadrature = Quadrature(modes)
    return np.array([4.0 * np.pi * kinetic(quadrature, i) for i in range(len(modes))])


def mode_mass(modes: ModeSet) -> np.ndarray:
    """(m,) mode mass in g: the mass that, moving as the photosphere does, has the mode's energy."""
    return modes.inertia * modes.star.total_mass


def energy_share(modes: ModeSet) -> np.ndarray:
    """Share of the energy of every mode that is in the g-mode cavity.

    Parameters
    ----------
    modes : mode list with eigenfunctions

    Returns
    -------
    (m,) array, 0 to 1
        The part of int rho (xi_r^2 + l(l+1) xi_h^2) r^2 dr from the layers where sigma2 is below
        both N^2 and S_l^2 = l(l+1) c^2/r^2; 0 for radial modes. In evolved stars, where the
        cavity is the core, it is the zeta of mixed modes (Goupil et al. 2013): near 1 for a mode
        that is all g, near 0 for one that is all p.

    Raises
    ------
    InputError
        The list holds no eigenfunctions.

    Notes
    -----
    N^2 and S_l^2 are taken to be straight between two points when the turning points are sought.
    """
    quadrature = Quadrature(modes)
    return np.array([_share(quadrature, i) for i in range(len(modes))])


def g_cavity(modes: ModeSet, index: int) -> np.ndarray:
    """(n,) bool, True on the points where mode `index` moves as a gravity wave.

    There sigma2 is below both N^2 and S_l^2. All False for radial modes.
    """
    at = Quadrature(modes).points
    degree, lam = int(modes.degree[index]), float(modes.sigma2[index])
    return (degree > 0) & (at.n2 > lam) & (at.lamb2(degree) > lam)


def kinetic(quadrature: Quadrature, index: int) -> float:
    """int rho (xi_r^2 + l(l+1) xi_h^2) r^2 dr of a mode, G = M = R = 1."""
    motion, wave = quadrature.motion(index), quadrature.wave(index)
    return quadrature.integral(_density(quadrature.at, motion, wave))


def _density(at: Structure, motion: Motion, wave: Wave) -> np.ndarray:
    return at.rho * (motion.xi_r**2 + wave.ll * motion.xi_h**2) * at.x**2


def _share(quadrature: Quadrature, index: int) -> float:
    wave = quadrature.wave(index)
    if wave.degree == 0:
        return 0.0
    cumulative = quadrature.cumulative(_density(quadrature.at, quadrature.motion(index), wave))
    total, energy = cumulative[-1], np.diff(cumulative)
    (at0, f0), (at1, f1) = quadrature.ends(index)
    above0, above1 = _above(at0, wave), _above(at1, wave)
    # Where the mode turns inside an interval, the energy up to there comes from the cubic
    # through the running integral and its slope at both ends.
    crossing = np.flatnonzero((above0 > 0.0) != (above1 > 0.0))
    inside = np.sum(energy[(above0 > 0.0) & (above1 > 0.0)])
    width = quadrature.width[crossing]
    slope0 = width * _density(at0, f0, wave)[crossing]
    slope1 = width * _density(at1, f1, wave)[crossing]
    t = above0[crossing] / (above0[crossing] - above1[crossing])
    weights = cubic(t)
    part = weights[1] * energy[crossing] + weights[2] * slope0 + weights[3] * slope1
    part = np.where(above0[crossing] > 0.0, part, energy[crossing] - part)
    return float(np.clip((inside + np.sum(part)) / total, 0.0, 1.0))


def _above(at: Structure, wave: Wave) -> np.ndarray:
    """How far the smaller of N^2 and S_l^2 lies above sigma2."""
    lamb2 = np.full(at.x.shape, np.inf)
    np.divide(wave.ll * at.c2, at.x**2, out=lamb2, where=at.x > 0.0)
    return np.minimum(at.n2, lamb2) - wave.lam
