"""Checks of a mode list that use nothing of the solver but its eigenfunctions.

*Energy integral* (Chandrasekhar 1964). Multiplying the equation of motion by the displacement and
integrating the pressure term by parts gives, G = M = R = 1 and L2 = l(l+1),

    sigma2 int rho |xi|^2 r^2 dr = int [p'^2/(rho c^2) + rho N^2 xi_r^2
                                        + rho (xi_r dPhi'/dr + L2 xi_h Phi'/r)] r^2 dr
                                   + sum over segments of [r^2 p' xi_r]

with |xi|^2 = xi_r^2 + L2 xi_h^2. A density jump ends one segment and begins the next: there p'
jumps by g xi_r times the jump of rho. In the Cowling approximation the terms with Phi' are absent.
The work of gravity is left as rho xi . grad Phi'; writing it as rho' Phi' would need a density
gradient that fits N^2, which files with rounded numbers do not hold. For l = 0 the same steps with
the Lagrangian delta p = p' - rho g xi_r need no N^2 at all:

    sigma2 int rho xi_r^2 r^2 dr = int [delta p^2/(rho c^2) - 4 rho g xi_r^2/r] r^2 dr
                                   + [r^2 delta p xi_r]

(in the Cowling approximation with 4 pi rho^2 xi_r^2 r^2 more under the integral).

*Orthogonality*: int rho (xi_r xi_r + l(l+1) xi_h xi_h) r^2 dr of two modes of one degree vanishes.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np

from oscsolve.pulsation.modeset import ModeSet
from oscsolve.seismology.energy import kinetic
from oscsolve.seismology.integrals import Quadrature
from oscsolve.seismology.motion import Motion, Wave
from oscsolve.star.findings import Finding
from oscsolve.star.profile import Structure

#: Numbers held at a time when overlaps are computed: modes of one block times Gauss points.
_BLOCK = 8_000_000
#: Relative error of an inertia above which `coarse_points` speaks.
_COARSE = 1e-3


@dataclass(frozen=True, eq=False)
class IntegralCheck:
    """sigma2 recomputed from the energy integral.

    Attributes
    ----------
    sigma2 : (m,) from the eigenfunctions
    difference : (m,) relative to the listed one, recomputed less listed
    worst : row of the mode with the largest difference; None in an empty list
    """

    sigma2: np.ndarray
    difference: np.ndarray
    worst: int | None


@dataclass(frozen=True, eq=False)
class Orthogonality:
    """Overlaps of the modes of one degree with each other.

    Attributes
    ----------
    overlap : (m,) largest |<xi_i|xi_j>| of a mode with another one of its degree, both of unit
        norm; 0 where it is the only one
    partner : (m,) row of that other mode; the mode itself where it is the only one
    worst : row of the mode with the largest overlap; None in an empty list
    """

    overlap: np.ndarray
    partner: np.ndarray
    worst: int | None


def integral_check(modes: ModeSet) -> IntegralCheck:
    """sigma2 of every mode by the energy integral, beside the listed one.

    Parameters
    ----------
    modes : mode list with eigenfunctions

    Raises
    ------
    InputError
        The list holds no eigenfunctions.

    Notes
    -----
    The equation as coded stands in the docstring of this module. The integral sees errors of the
    eigenfunctions in first order, and the points of the model, not the finer mesh of the solver.
    """
    quadrature = Quadrature(modes)
    sigma2 = np.array([_integral(quadrature, i) for i in range(len(modes))])
    scale = np.where(modes.sigma2 == 0.0, 1.0, modes.sigma2)
    difference = (sigma2 - modes.sigma2) / scale
    worst = int(np.argmax(np.abs(difference))) if len(modes) else None
    return IntegralCheck(sigma2, difference, worst)


def orthogonality(modes: ModeSet) -> Orthogonality:
    """Largest overlap of every mode with another one of its degree.

    Parameters
    ----------
    modes : mode list with eigenfunctions

    Raises
    ------
    InputError
        The list holds no eigenfunctions.

    Notes
    -----
    An isothermal atmosphere above the outermost point belongs to the star. By Green's identity
    its part of the overlap is -[r^2 (p'_i xi_r,j - p'_j xi_r,i)]/(sigma2_i - sigma2_j) there.
    """
    quadrature = Quadrature(modes)
    overlap, partner = np.zeros(len(modes)), np.arange(len(modes))
    for degree in np.unique(modes.degree):
        rows = np.flatnonzero(modes.degree == degree)
        for first, second, gram in _gram_blocks(quadrature, rows):
            gram = np.abs(gram)
            gram[first[:, None] == second] = 0.0
            for here, there, values in ((first, second, gram), (second, first, gram.T)):
                best = np.argmax(values, axis=1)
                value = values[np.arange(here.size), best]
                better = value > overlap[here]
                overlap[here[better]], partner[here[better]] = value[better], there[best[better]]
    worst = int(np.argmax(overlap)) if len(modes) else None
    return Orthogonality(overlap, partner, worst)


def coarse_points(modes: ModeSet) -> tuple[Finding, ...]:
    """A doubt where the points of the model are too few for its modes; empty where they suffice.

    Integrals over a star read eigenfunctions on the points of the model. Where the inertia that
    these give is not the listed one, from the finer mesh of the solver, nor will anything else be.

    Raises
    ------
    InputError
        The list holds no eigenfunctions.
    """
    quadrature = Quadrature(modes)
    off = np.array(
        [
            abs(4.0 * np.pi * kinetic(quadrature, i) - inertia) / inertia
            for i, inertia in enumerate(modes.inertia)
        ]
    )
    late = int(np.sum(off > _COARSE))
    if late == 0:
        return ()
    worst = int(np.argmax(off))
    return (
        Finding(
            "doubt",
            "coarse-points",
            f"the {modes.star.radius.size} points of the model are too few for the eigenfunctions "
            f"of {late} mode(s): the inertia of l = {modes.degree[worst]}, n = "
            f"{modes.order[worst]} comes out {off[worst]:.1e} off",
            "frequencies are not touched, but kernels and splittings are as far off; use a model "
            "with more points where N is large",
            size=float(off[worst]),
        ),
    )


def _integral(quadrature: Quadrature, index: int) -> float:
    wave, at, r2 = quadrature.wave(index), quadrature.at, quadrature.x**2
    f = quadrature.motion(index)
    kinetic = quadrature.integral(at.rho * (f.xi_r**2 + wave.ll * f.xi_h**2) * r2)
    if wave.degree == 0:
        lagrangian = f.eta - at.g * f.xi_r
        density = lagrangian**2 / at.c2 - 4.0 * at.g * f.xi_r**2 / at.x
        if not wave.full_gravity:
            density = density + 4.0 * np.pi * at.rho * f.xi_r**2
    else:
        density = f.eta**2 / at.c2 + at.n2 * f.xi_r**2
        density = density + f.xi_r * f.dphi + wave.ll * f.xi_h * f.phi / at.x
    potential = quadrature.integral(at.rho * density * r2)
    return (potential + _ends(quadrature, index, wave)) / kinetic


def _ends(quadrature: Quadrature, index: int, wave: Wave) -> float:
    """Sum of the terms at the ends of the segments between density jumps."""

    def flux(at: Structure, f: Motion) -> np.ndarray:
        if wave.degree == 0:
            return at.x**2 * at.rho * (f.eta - at.g * f.xi_r) * f.xi_r
        return at.x**2 * at.rho * f.eta * f.xi_r

    left, right = (flux(*side) for side in quadrature.ends(index))
    jump = np.flatnonzero(np.diff(quadrature.profile.interval) > 1)
    return float(right[-1] - left[0] + np.sum(right[jump] - left[jump + 1]))


def _gram_blocks(
    quadrature: Quadrature, rows: np.ndarray
) -> Iterator[tuple[np.ndarray, np.ndarray, np.ndarray]]:
    """Pairs of blocks of modes of one degree, and their overlaps."""
    size = max(1, _BLOCK // (2 * quadrature.x.size))
    blocks = [rows[k : k + size] for k in range(0, rows.size, size)]
    for place, first in enumerate(blocks):
        one = _scaled(quadrature, first)
        yield first, first, one @ one.T + _atmosphere(quadrature, first, first)
        for second in blocks[place + 1 :]:
            other = _scaled(quadrature, second)
            yield first, second, one @ other.T + _atmosphere(quadrature, first, second)


def _scaled(quadrature: Quadrature, rows: np.ndarray) -> np.ndarray:
    """Displacements times the square root of the weight, of unit norm, one row a mode."""
    root = np.sqrt(quadrature.at.rho * quadrature.weight) * quadrature.x
    out = np.empty((rows.size, 2 * root.size))
    for place, row in enumerate(rows):
        f = quadrature.motion(int(row))
        ll = quadrature.wave(int(row)).ll
        out[place] = np.concatenate(
            ((root * f.xi_r).ravel(), (np.sqrt(ll) * root * f.xi_h).ravel())
        )
    return out / np.linalg.norm(out, axis=1, keepdims=True)


def _atmosphere(quadrature: Quadrature, first: np.ndarray, second: np.ndarray) -> np.ndarray:
    """Overlaps of normalised modes in the isothermal atmosphere, where there is one."""
    modes = quadrature.modes
    if modes.options.get("surface") != "isothermal":
        return np.zeros((first.size, second.size))
    assert modes.eigenfunctions is not None
    x = float(modes.eigenfunctions.radius[-1])
    lam = modes.sigma2
    # 4 pi int rho |xi|^2 r^2 dr is the listed inertia, for unit displacement at the photosphere.
    norm = np.sqrt(modes.inertia / (4.0 * np.pi))
    xi_r = modes.eigenfunctions.xi_r[:, -1] / norm
    p_prime = modes.eigenfunctions.p_prime[:, -1] / norm
    wronskian = np.outer(p_prime[first], xi_r[second]) - np.outer(xi_r[first], p_prime[second])
    gap = lam[first][:, None] - lam[second]
    return -(x**2) * np.divide(wronskian, gap, out=np.zeros_like(gap), where=gap != 0.0)
