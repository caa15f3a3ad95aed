"""Modes between the points of a model: the adiabatic equations as slopes, and polynomials.

Source of the equations: Unno et al. 1989, Nonradial Oscillations of Stars, ch. III. Dimensionless
throughout, G = M = R = 1.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import NamedTuple

import numpy as np

from oscsolve.pulsation.modeset import ModeSet
from oscsolve.star.profile import Structure

#: Where in a cell the equations are used once more: here and at the same distance from the other
#: end. At 0.4 the slopes of both corrections are well away from zero.
PLACE = 0.4
#: How often: every round gains a factor of about the phase in a cell over ten.
_ROUNDS = 1


class Motion(NamedTuple):
    """One mode at some radii, all arrays of one shape; units as in `Eigenfunctions`."""

    xi_r: np.ndarray
    xi_h: np.ndarray
    eta: np.ndarray  # p'/rho
    phi: np.ndarray
    dphi: np.ndarray


@dataclass(frozen=True)
class Wave:
    """What the adiabatic equations need to know of a mode."""

    degree: int
    lam: float  # sigma2
    full_gravity: bool

    @property
    def ll(self) -> float:
        """l(l+1)."""
        return float(self.degree * (self.degree + 1))


def wave_of(modes: ModeSet, index: int) -> Wave:
    """Degree, frequency and gravity of one mode of a list."""
    full = modes.options.get("gravity", "full") != "cowling"
    return Wave(int(modes.degree[index]), float(modes.sigma2[index]), full)


def slopes(wave: Wave, at: Structure, f: Motion) -> Motion:
    """d/dr of a motion by the adiabatic equations (Unno et al. 1989, ch. III).

    With eta = p'/rho, G = M = R = 1, L2 = l(l+1) and lam = sigma2:

        dxi_r/dr = (g/c^2 - 2/r) xi_r + L2 xi_h/r - eta/c^2
        deta/dr  = (lam - N^2) xi_r - dPhi'/dr + (N^2/g) eta
        dxi_h/dr = (deta/dr + dPhi'/dr)/(lam r) - xi_h/r
        d2Phi'   = -(2/r) dPhi'/dr + L2 Phi'/r^2 + 4 pi rho (eta/c^2 + (N^2/g) xi_r)

    The centre, where these divide by zero, is given slopes of 0.
    """
    inside = at.x > 0.0
    r = np.where(inside, at.x, 1.0)
    n2_g = np.divide(at.n2, at.g, out=np.zeros_like(at.g), where=at.g > 0.0)
    ll = wave.ll
    xi_r = (at.g / at.c2 - 2.0 / r) * f.xi_r + ll * f.xi_h / r - f.eta / at.c2
    eta = (wave.lam - at.n2) * f.xi_r - f.dphi + n2_g * f.eta
    xi_h = np.zeros_like(eta)
    if ll > 0.0:
        # lam xi_r is left outside the bracket: at low frequency it would drown in N^2 xi_r.
        forced = (n2_g * f.eta - at.n2 * f.xi_r) / wave.lam + f.xi_r
        xi_h = (forced - f.xi_h) / r
    dphi = np.zeros_like(eta)
    if wave.full_gravity:
        source = 4.0 * np.pi * at.rho * (f.eta / at.c2 + n2_g * f.xi_r)
        dphi = -2.0 * f.dphi / r + ll * f.phi / r**2 + source
    return Motion(*(np.where(inside, part, 0.0) for part in (xi_r, xi_h, eta, f.dphi, dphi)))


class Pieces(NamedTuple):
    """Quintic polynomials in every interval, one tuple for each part of a motion.

    Coefficients of f0, f1, h f0', h f1' and of the two corrections, (intervals,) each.
    """

    xi_r: tuple[np.ndarray, ...]
    xi_h: tuple[np.ndarray, ...]
    eta: tuple[np.ndarray, ...]
    phi: tuple[np.ndarray, ...]
    dphi: tuple[np.ndarray, ...]

    def at(self, t: np.ndarray, owner: np.ndarray) -> Motion:
        """The motion at fractions `t` (c, k) of the intervals `owner` (c,)."""
        basis = [*cubic(t), *corrections(t)]
        return Motion(
            *(
                sum(weight * value[owner, None] for weight, value in zip(basis, part, strict=True))
                for part in self
            )
        )


def pieces(
    wave: Wave,
    width: np.ndarray,
    left: tuple[Structure, Motion],
    right: tuple[Structure, Motion],
    between: tuple[Structure, ...],
) -> Pieces:
    """Polynomials through a mode known at both ends of every interval.

    Parameters
    ----------
    wave : the mode
    width : (i,) widths of the intervals
    left, right : structure and mode at the ends
    between : structure at the fractions `PLACE` and 1 - `PLACE`
    """
    (at0, f0), (at1, f1) = left, right
    d0, d1 = slopes(wave, at0, f0), slopes(wave, at1, f1)
    if at0.x[0] == 0.0:
        d0 = _central_slopes(wave, d0, f1, d1, float(width[0]))
    ends = zip(f0, f1, d0, d1, strict=True)
    none = np.zeros_like(width)
    parts = Pieces(*((v0, v1, width * s0, width * s1, none, none) for v0, v1, s0, s1 in ends))
    for _ in range(_ROUNDS):
        parts = _corrected(wave, width, parts, between)
    return parts


def _corrected(
    wave: Wave, width: np.ndarray, parts: Pieces, between: tuple[Structure, ...]
) -> Pieces:
    """Polynomials with the slopes that the equations ask for at the two inner places."""
    defects = []
    for at, place in zip(between, (PLACE, 1.0 - PLACE), strict=True):
        value = (*cubic(np.array(place)), *corrections(np.array(place)))
        slope = cubic_slope(place)
        inside = Motion(*(sum(w * c for w, c in zip(value, part, strict=True)) for part in parts))
        defects.append(
            [
                width * wanted - sum(w * c for w, c in zip(slope, part[:4], strict=True))
                for wanted, part in zip(slopes(wave, at, inside), parts, strict=True)
            ]
        )
    even, odd = correction_slopes(PLACE)
    return Pieces(
        *(
            (*part[:4], 0.5 * (first - second) / even, 0.5 * (first + second) / odd)
            for part, first, second in zip(parts, *defects, strict=True)
        )
    )


def cubic(t: np.ndarray) -> tuple[np.ndarray, ...]:
    """Cubic Hermite weights of f0, f1, h f0', h f1' at t in [0, 1]."""
    u = 1.0 - t
    return u * u * (1.0 + 2.0 * t), t * t * (3.0 - 2.0 * t), t * u * u, -t * t * u


def cubic_slope(t: float) -> tuple[float, ...]:
    """Derivatives of `cubic` by t."""
    u = 1.0 - t
    return -6.0 * t * u, 6.0 * t * u, u * (1.0 - 3.0 * t), t * (3.0 * t - 2.0)


def corrections(t: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """t^2 (1-t)^2 and t^2 (1-t)^2 (2t-1): no value and no slope at either end."""
    bump = (t * (1.0 - t)) ** 2
    return bump, bump * (2.0 * t - 1.0)


def correction_slopes(t: float) -> tuple[float, float]:
    """Derivatives of `corrections` by t; the first is odd about the middle, the second even."""
    product, away = t * (1.0 - t), 1.0 - 2.0 * t
    return 2.0 * product * away, 2.0 * product * (product - away * away)


def central_value(values: np.ndarray, degree: int, part: int) -> float:
    """Value at the centre of a part of the motion, for a model whose first point is at r > 0.

    xi_r, xi_h and dPhi'/dr (parts 0, 1, 4) fall as r^(l-1) and are even for l = 1; the others
    fall as r^l, but Phi' and p'/rho of radial motion do not vanish.
    """
    if degree == (1 if part in (0, 1, 4) else 0):
        return float(values[0])
    return 0.0


def _central_slopes(wave: Wave, d0: Motion, f1: Motion, d1: Motion, h: float) -> Motion:
    """Slopes with those at the centre put in: f = a r + b r^3 where f falls as r, else 0."""
    parts = []
    for name, slope, value, other in zip(Motion._fields, d0, f1, d1, strict=True):
        linear = (0, 2) if name in ("xi_r", "xi_h", "dphi") else (1,)
        if wave.degree in linear:
            slope = slope.copy()
            slope[0] = 0.5 * (3.0 * value[0] / h - other[0])
        parts.append(slope)
    return Motion(*parts)
