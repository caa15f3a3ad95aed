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

#: Fractions of a cell where the adiabatic equations hold exactly, besides its two ends. Not the
#: Lobatto points: there the slopes alone fix the rise, and values at both ends ask for too much.
PLACES = (0.2, 0.4, 0.6, 0.8)


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
    """A motion in every interval of a model as polynomials in t, which runs from 0 to 1.

    Attributes
    ----------
    ends : (4, i, 5) f0, f1, h f0', h f1' of the five parts of a motion
    inner : (k, i, 5) factors of t^2 (1-t)^2 (2t-1)^j, j < k, which leave the ends alone
    """

    ends: np.ndarray
    inner: np.ndarray

    def at(self, t: np.ndarray, owner: np.ndarray) -> Motion:
        """The motion at fractions `t` (c, k) of the intervals `owner` (c,)."""
        factors = np.concatenate((self.ends, self.inner))[:, owner]
        basis = np.stack((*cubic(t), *_bubbles(t)))
        return Motion(*np.einsum("bck,bcp->pck", basis, factors))


def pieces(
    wave: Wave,
    width: np.ndarray,
    left: tuple[Structure, Motion],
    right: tuple[Structure, Motion],
    between: tuple[Structure, ...],
) -> Pieces:
    """Polynomials through a mode known at both ends of every interval.

    They have the values given at the ends, and obey the adiabatic equations there and at the
    `PLACES` between (collocation).

    Parameters
    ----------
    wave : the mode
    width : (i,) widths of the intervals
    left, right : structure and mode at the ends
    between : structure at the `PLACES`
    """
    (at0, f0), (at1, f1) = left, right
    d0, d1 = slopes(wave, at0, f0), slopes(wave, at1, f1)
    if at0.x[0] == 0.0:
        f0, d0 = _with_centre(wave, f0, d0, f1, d1, float(width[0]))
    h = width[:, None]
    ends = np.stack(
        [np.stack(f0, -1), np.stack(f1, -1), h * np.stack(d0, -1), h * np.stack(d1, -1)]
    )
    count, parts = len(PLACES), len(Motion._fields)
    matrix = np.empty((width.size, count, parts, count, parts))
    right_side = np.empty((width.size, count, parts))
    unit = np.eye(parts)
    for row, (place, at) in enumerate(zip(PLACES, between, strict=True)):
        system = h[..., None] * _system(wave, at)
        value = np.einsum("b,bip->ip", np.stack(cubic(np.array(place))), ends)
        slope = np.einsum("b,bip->ip", np.array(_cubic_slope(place)), ends)
        right_side[:, row] = np.einsum("iqp,ip->iq", system, value) - slope
        bubbles, rises = _bubbles(np.array(place)), _bubble_slopes(place)
        for column in range(count):
            matrix[:, row, :, column] = rises[column] * unit - bubbles[column] * system
    size = count * parts
    solved = np.linalg.solve(
        matrix.reshape(-1, size, size), right_side.reshape(-1, size, 1)
    ).reshape(-1, count, parts)
    return Pieces(ends, np.moveaxis(solved, 1, 0))


def _system(wave: Wave, at: Structure) -> np.ndarray:
    """(i, 5, 5) matrices of the linear equations in `slopes`."""
    zero, one = np.zeros_like(at.x), np.ones_like(at.x)
    columns = []
    for part in range(len(Motion._fields)):
        unit = Motion(*(one if k == part else zero for k in range(len(Motion._fields))))
        columns.append(np.stack(slopes(wave, at, unit), -1))
    return np.stack(columns, -1)


def cubic(t: np.ndarray) -> tuple[np.ndarray, ...]:
    """Cubic Hermite weights of f0, f1, h f0', h f1' at t in [0, 1]."""
    u = 1.0 - t
    return u * u * (1.0 + 2.0 * t), t * t * (3.0 - 2.0 * t), t * u * u, -t * t * u


def _cubic_slope(t: float) -> tuple[float, ...]:
    """Derivatives of `cubic` by t."""
    u = 1.0 - t
    return -6.0 * t * u, 6.0 * t * u, u * (1.0 - 3.0 * t), t * (3.0 * t - 2.0)


def _bubbles(t: np.ndarray) -> list[np.ndarray]:
    """t^2 (1-t)^2 (2t-1)^j: no value and no slope at either end."""
    return [(t * (1.0 - t)) ** 2 * (2.0 * t - 1.0) ** j for j in range(len(PLACES))]


def _bubble_slopes(t: float) -> list[float]:
    """Derivatives of `_bubbles` by t."""
    product, away = t * (1.0 - t), 2.0 * t - 1.0
    return [
        -2.0 * product * away * away**j + 2.0 * j * product**2 * away ** max(j - 1, 0)
        for j in range(len(PLACES))
    ]


def _with_centre(
    wave: Wave, f0: Motion, d0: Motion, f1: Motion, d1: Motion, h: float
) -> tuple[Motion, Motion]:
    """Values and slopes at the left ends with those at the centre put in.

    xi_r, xi_h and dPhi'/dr grow as r^|l-1|, p'/rho and Phi' as r^l: near the centre each part is
    a + b r^2 where that power is 0, a r + b r^3 where it is 1, and nothing beyond.
    """
    values, rises = [], []
    for name, value, rise, f, d in zip(Motion._fields, f0, d0, f1, d1, strict=True):
        power = abs(wave.degree - 1) if name in ("xi_r", "xi_h", "dphi") else wave.degree
        value, rise = value.copy(), rise.copy()
        value[0] = f[0] - 0.5 * h * d[0] if power == 0 else 0.0
        rise[0] = 0.5 * (3.0 * f[0] / h - d[0]) if power == 1 else 0.0
        values.append(value)
        rises.append(rise)
    return Motion(*values), Motion(*rises)
