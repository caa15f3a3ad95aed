"""Structure kernels: how a frequency answers to a small change of the structure.

For two stars of the same M and R, compared at the same r/R,

    delta omega/omega = int K_a,b (delta a/a) dx + int K_b,a (delta b/b) dx

for the pairs (a, b) = (c^2, rho) and (Gamma1, rho) (Gough & Thompson 1991; Kosovichev 1999).

Derivation, with G = M = R = 1, lam = omega^2, L2 = l(l+1), D = div xi. With N^2 written out and
the density gradient integrated by parts, the energy integral (Chandrasekhar 1964) holds no
derivative of the structure, density jumps and a surface of any density included:

    lam T = W,     T = int rho (xi_r^2 + L2 xi_h^2) r^2 dr,
    W = int { rho c^2 D^2 r^2 - 2 rho m xi_r (2 xi_r - L2 xi_h)/r + 4 pi rho^2 xi_r^2 r^2
              + 2 rho r^2 (xi_r Phi'_r + L2 xi_h Phi'/r) } dr  +  (field energy of Phi' alone)

It is stationary for all changes of xi and Phi', so only rho, c^2 and m(r) = int 4 pi rho r^2 dr are
to be varied, and 2 lam T (delta omega/omega) = delta W - lam delta T gives

    2 lam T K_c2,rho = rho c^2 D^2 r^2
    2 lam T K_rho,c2 = rho c^2 D^2 r^2 - 2 rho m xi_r (2 xi_r - L2 xi_h)/r + 8 pi rho^2 xi_r^2 r^2
                       + 2 rho r^2 (xi_r Phi'_r + L2 xi_h Phi'/r)
                       - lam rho (xi_r^2 + L2 xi_h^2) r^2
                       - 8 pi rho r^2 int_r^R rho xi_r (2 xi_r - L2 xi_h) ds/s

which differs from the published forms, where Phi' is written as integrals over xi, by partial
integration only. From c^2 = Gamma1 P/rho and dP/dr = -rho m/r^2 follow, with P fixed at the top,

    K_Gamma1,rho = K_c2,rho
    K_rho,Gamma1 = K_rho,c2 - K_c2,rho + rho m A/r^2 + 4 pi rho r^2 int_r^R A rho ds/s^2,
                   A(r) = int_0^r K_c2,rho/P ds

As both stars have the mass M, kernels of rho are free by a constant times rho r^2. The outermost
point and what lies above it are taken to be the same in both stars.
"""

from __future__ import annotations

from typing import NamedTuple

import numpy as np

from oscsolve.errors import InputError
from oscsolve.pulsation.modeset import ModeSet
from oscsolve.seismology.integrals import Quadrature, point_structure
from oscsolve.seismology.motion import Motion, Wave
from oscsolve.star.model import StarModel
from oscsolve.star.profile import Profile

#: (quantity that changes, quantity that is held): name of both as `structure_kernel` takes them.
PAIRS = (("c2", "rho"), ("rho", "c2"), ("gamma1", "rho"), ("rho", "gamma1"))


class _Local(NamedTuple):
    """What the kernels are made of at some radii."""

    sound: np.ndarray  # rho c^2 D^2 r^2
    density: np.ndarray  # K_rho,c2 without its integral
    tail: np.ndarray  # integrand of that integral
    energy: np.ndarray  # integrand of T


def structure_kernel(
    modes: ModeSet, index: int, quantity: str = "c2", held: str = "rho"
) -> np.ndarray:
    """Kernel of one mode for a relative change of the structure, on the points of the model.

    Parameters
    ----------
    modes : mode list with eigenfunctions
    index : row of the mode
    quantity, held : what changes, and what is held fixed at the same r/R: ("c2", "rho"),
        ("rho", "c2"), ("gamma1", "rho") or ("rho", "gamma1")

    Returns
    -------
    (n,) array
        delta omega/omega per relative change of `quantity` and per fractional radius, at fixed M
        and R. The formulas stand in the docstring of this module.

    Raises
    ------
    InputError
        The pair is unknown, there is no such mode, or the list holds no eigenfunctions.
    """
    if (quantity, held) not in PAIRS:
        known = ", ".join(f"({a}, {b})" for a, b in PAIRS)
        raise InputError(f"no kernel of {quantity!r} at fixed {held!r}; use one of {known}")
    quadrature = Quadrature(modes)
    sums = _Sums(quadrature, index)
    at, motion = quadrature.points, quadrature.motion_on_points(index)
    local = _local(at.x, at.rho, at.m, at.g, at.c2, motion, quadrature.wave(index))
    if quantity != "rho":
        return local.sound / sums.scale
    tail = quadrature.on_points(sums.tail_ends)
    kernel = (local.density - 8.0 * np.pi * at.rho * at.x**2 * (tail[-1] - tail)) / sums.scale
    if held == "c2":
        return kernel
    inner, outer = (quadrature.on_points(ends) for ends in (sums.inner_ends, sums.outer_ends))
    pressure = at.rho * (at.g * inner + 4.0 * np.pi * at.x**2 * (outer[-1] - outer))
    return kernel - local.sound / sums.scale + pressure


def frequency_change(
    modes: ModeSet, star: StarModel, quantity: str = "c2", held: str = "rho"
) -> np.ndarray:
    """First-order delta omega/omega of all modes when their star is replaced by a near one.

    Parameters
    ----------
    modes : mode list with eigenfunctions
    star : the other star; compared at the same r/R, in units of its own G, M and R
    quantity, held : the pair of kernels to use, one of ("c2", "rho") and ("gamma1", "rho"), in
        either order

    Returns
    -------
    (m,) array
        Relative change of sqrt(sigma2), other star less this one. Where G M/R^3 of the two differ,
        half the relative difference of that comes on top in nu. A difference delta P of the
        pressure at the outermost point, which the kernels of Gamma1 and rho leave out, is put in
        as A(R) delta P.

    Raises
    ------
    InputError
        The pair is unknown, the list holds no eigenfunctions, or the stars end at different r/R.
    """
    if (quantity, held) not in PAIRS:
        known = ", ".join(f"({a}, {b})" for a, b in PAIRS)
        raise InputError(f"no kernels of {quantity!r} and {held!r}; use one of {known}")
    quadrature = Quadrature(modes)
    other = _structure_of(star, quadrature)
    at = quadrature.at
    top_change = point_structure(star).pressure[-1] - quadrature.points.pressure[-1]
    # The logarithm treats both stars alike.
    change_rho = np.log(other[0] / at.rho)
    use_c2 = "c2" in (quantity, held)
    change = np.log(other[1] / at.c2) if use_c2 else np.log(other[2] / at.gamma1)
    out = np.empty(len(modes))
    for index in range(len(modes)):
        sums = _Sums(quadrature, index)
        density = sums.kernel_rho_c2() if use_c2 else sums.kernel_rho_gamma1()
        integrand = sums.local.sound / sums.scale * change + density * change_rho
        out[index] = quadrature.integral(integrand)
        if not use_c2:
            out[index] += sums.inner_ends[-1] * top_change
    return out


class _Sums:
    """Kernels of one mode at the Gauss points, and their integrals at the ends of cells."""

    def __init__(self, quadrature: Quadrature, index: int) -> None:
        self.quadrature, at = quadrature, quadrature.at
        self.x, self.rho, self.g = quadrature.x, at.rho, at.g
        motion, wave = quadrature.motion(index), quadrature.wave(index)
        m = at.g * at.x**2
        self.local = _local(at.x, at.rho, m, at.g, at.c2, motion, wave)
        self.scale = 2.0 * wave.lam * quadrature.integral(self.local.energy)
        self.tail_ends = quadrature.cumulative(self.local.tail)
        # K_c2/P holds no small quantity: K_c2 is proportional to Gamma1 P.
        inner = self.local.sound / (at.rho * at.w) / self.scale
        self.inner_ends = quadrature.cumulative(inner)
        self._inner = quadrature.running(inner)
        outer = self._inner * at.rho / at.x**2
        self.outer_ends = quadrature.cumulative(outer)
        self._outer = self.outer_ends[-1] - quadrature.running(outer)

    def kernel_rho_c2(self) -> np.ndarray:
        tail = self.tail_ends[-1] - self.quadrature.running(self.local.tail)
        return (self.local.density - 8.0 * np.pi * self.rho * self.x**2 * tail) / self.scale

    def kernel_rho_gamma1(self) -> np.ndarray:
        pressure = self.rho * (self.g * self._inner + 4.0 * np.pi * self.x**2 * self._outer)
        return self.kernel_rho_c2() - self.local.sound / self.scale + pressure


def _local(
    x: np.ndarray,
    rho: np.ndarray,
    m: np.ndarray,
    g: np.ndarray,
    c2: np.ndarray,
    f: Motion,
    wave: Wave,
) -> _Local:
    inside = (x > 0.0) & (c2 > 0.0)
    inverse = np.divide(1.0, x, out=np.zeros_like(x), where=x > 0.0)
    # div xi = -delta rho/rho = -(p' - rho g xi_r)/(rho c^2).
    lagrangian = f.eta - g * f.xi_r
    sound = x**2 * rho * np.divide(lagrangian**2, c2, out=np.zeros_like(x), where=inside)
    tail = rho * f.xi_r * (2.0 * f.xi_r - wave.ll * f.xi_h) * inverse
    energy = rho * (f.xi_r**2 + wave.ll * f.xi_h**2) * x**2
    gravity = f.xi_r * f.dphi * x + wave.ll * f.xi_h * f.phi
    density = (
        sound
        - 2.0 * m * tail
        + 8.0 * np.pi * (rho * f.xi_r * x) ** 2
        + 2.0 * rho * x * gravity
        - wave.lam * energy
    )
    return _Local(sound, density, tail, energy)


def _structure_of(star: StarModel, quadrature: Quadrature) -> tuple[np.ndarray, ...]:
    """rho, c2 and Gamma1 of another star at the Gauss points."""
    profile = Profile(star)
    here, there = quadrature.edges[-1], profile.outermost()[0]
    # Edges are closed to within 1e-9 of the radius by every builder.
    if abs(here - there) > 1e-6:
        raise InputError(
            f"the stars end at different radii, x = {here:.8g} and {there:.8g}; compare models "
            "with the same outermost point"
        )
    place = np.searchsorted(profile.x[profile.interval], quadrature.x, side="right") - 1
    at = profile.at(np.minimum(quadrature.x, there), profile.interval[place])
    return at.rho, at.c2, at.gamma1
