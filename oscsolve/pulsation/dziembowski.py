"""Oscillation equations in Dziembowski's variables, with their regular ends.

The variables (Dziembowski 1971; Unno et al. 1989, ch. III), all continuous inside a star,

    y1 = xi_r/r     y2 = (p'/rho + Phi')/(g r)     y3 = Phi'/(g r)     y4 = (dPhi'/dr)/g

with y4 replaced by z4 = y4 + U y1, which takes no derivative of the density and does not jump
with it. With c1 = x^3/q', here 1/q (q = m/x^3), U = 4 pi rho/q, V = g x/w, Vg = V/Gamma1,
A = x N^2/g = V (beta - 1/Gamma1), D = -dln rho/dln x, K = dln g/dln x and lam = omega^2, x d/dx of

    y1:  (Vg - 3) y1 + (l(l+1)/(c1 lam) - Vg) y2 + Vg y3
    y2:  (c1 lam - A) y1 + (D - Vg - 1 - K) y2 + (Vg - D) y3
    y3:  -U y1 - (1 + K) y3 + z4
    z4:  U l(l+1)/(c1 lam) y2 + l(l+1) y3 - (2 + K) z4

follow from the equations of motion, continuity and Poisson's equation by change of variables
alone. In a model whose columns fit together D = A + Vg and K = U - 2, and this is the textbook
form. In a model whose columns do not quite, the D and K of the interpolated structure keep the
question the same as that of the relaxation method: the comparison then shows numerical errors
and not what the model leaves open.

Cowling approximation: y1 and y2 with y3 = 0. Radial motion: y1 and zeta = delta p/(rho q), x d/dx
of which are

    y1:    -3 y1 - (q/c^2) zeta
    zeta:  x^2 (c1 lam + 4) y1 + (D + 1 - K) zeta

exactly in full gravity; in the Cowling approximation 4 becomes 4 - U.

Nonradial variables are carried as u = x^(2-l) y, which tend to constants at the centre.
"""

from __future__ import annotations

import math
from typing import NamedTuple

import numpy as np

from oscsolve.pulsation.compiled import compiled
from oscsolve.star.profile import Polynomials, Profile

#: Which equations: self-gravity perturbed, Cowling approximation of l > 0, radial motion.
FULL, COWLING, RADIAL = 0, 1, 2

#: Relative size of the first correction to the series about the centre where integration starts;
#: what the series leaves out is its square, and decays outward.
_SERIES = 1e-6


class Layers(NamedTuple):
    """A profile packed for compiled code: its polynomials and what jumps between intervals.

    `gravity` and `weight` are the ratios, inside over outside, of q and of rho q at the left end
    of each interval; 1 where nothing jumps.
    """

    polynomials: Polynomials
    gravity: np.ndarray
    weight: np.ndarray


class Trial(NamedTuple):
    """One trial value: the equations and their parameters."""

    form: int
    degree: float
    ll: float  # l(l+1)
    screen: float  # 1 in the Cowling approximation, else 0
    lam: float


def make_trial(degree: int, cowling: bool, lam: float) -> Trial:
    """The equations of one degree at the trial value `lam`."""
    form = RADIAL if degree == 0 else COWLING if cowling else FULL
    return Trial(form, float(degree), float(degree * (degree + 1)), float(cowling), float(lam))


def pack_layers(profile: Profile) -> Layers:
    """The polynomials of a profile and its jumps at repeated radii."""
    pieces = profile.polynomials()
    gravity = np.ones_like(pieces.left)
    weight = np.ones_like(pieces.left)
    for k in np.flatnonzero(np.diff(profile.interval) > 1) + 1:
        inside, outside = (profile.at(pieces.left[k], profile.interval[j]) for j in (k - 1, k))
        gravity[k] = inside.g / outside.g
        weight[k] = inside.rho * inside.g / (outside.rho * outside.g)
    return Layers(pieces, gravity, weight)


@compiled
def _value(c, k, t):
    return c[k, 0] + t * (c[k, 1] + t * (c[k, 2] + t * (c[k, 3] + t * (c[k, 4] + t * c[k, 5]))))


@compiled
def _slope(c, k, t):
    return c[k, 1] + t * (
        2.0 * c[k, 2] + t * (3.0 * c[k, 3] + t * (4.0 * c[k, 4] + t * 5.0 * c[k, 5]))
    )


@compiled
def _cubic(c, k, t):
    return c[k, 0] + t * (c[k, 1] + t * (c[k, 2] + t * c[k, 3]))


@compiled
def structure(p, k, t):
    """x, q, w, 1/Gamma1, U, V, A, D and K at the share t of interval k.

    The share, not the radius, is what everything hangs on: near an edge 1 - x of a radius x that
    is rounded to 1e-16 would be good to few digits.
    """
    x = p.left[k] + t * p.width[k]
    per_x = x / p.width[k]
    q, w = _value(p.q, k, t), _value(p.w, k, t)
    rho = math.exp(_value(p.residue, k, t) + p.exponent[k] * math.log(w))
    v = q * x * x / w
    inverse_gamma1 = 1.0 / _cubic(p.gamma1, k, t)
    a = v * (_cubic(p.beta, k, t) - inverse_gamma1)
    d = -per_x * (_slope(p.residue, k, t) + p.exponent[k] * _slope(p.w, k, t) / w)
    growth = 1.0 + per_x * _slope(p.q, k, t) / q
    return x, q, w, inverse_gamma1, 4.0 * math.pi * rho / q, v, a, d, growth


@compiled
def fill_matrix(p, k, t, trial, m):
    """Put the matrix of x du/dx = m u at the share t of interval k into m; returns x."""
    x, q, w, inverse_gamma1, u, v, a, d, growth = structure(p, k, t)
    vg = v * inverse_gamma1
    c1_lam = trial.lam / q
    if trial.form == RADIAL:
        m[0, 0], m[0, 1] = -3.0, -q * inverse_gamma1 / w
        m[1, 0], m[1, 1] = x * x * (c1_lam + 4.0 - trial.screen * u), d + 1.0 - growth
        return x
    mu = trial.ll / c1_lam if trial.ll > 0.0 else 0.0
    shift = 2.0 - trial.degree
    m[0, 0], m[0, 1] = vg - 3.0 + shift, mu - vg
    m[1, 0], m[1, 1] = c1_lam - a, d - vg - 1.0 - growth + shift
    if trial.form == FULL:
        m[0, 2], m[0, 3] = vg, 0.0
        m[1, 2], m[1, 3] = vg - d, 0.0
        m[2, 0], m[2, 1], m[2, 2], m[2, 3] = -u, 0.0, -1.0 - growth + shift, 1.0
        m[3, 0], m[3, 1], m[3, 2], m[3, 3] = 0.0, u * mu, trial.ll, -2.0 - growth + shift
    return x


def central_plane(layers: Layers, trial: Trial) -> tuple[float, np.ndarray]:
    """Share of the first interval, and (n, m) regular solutions there, where integration starts.

    With x du/dx = (M0 + M2 x^2 + ...) u the regular ones are u0 + x^2 (2 - M0)^-1 M2 u0, where
    M0 u0 = 0.
    """
    pieces = layers.polynomials
    size = 4 if trial.form == FULL else 2
    centre, here = np.empty((size, size)), np.empty((size, size))
    fill_matrix(pieces, 0, 0.0, trial, centre)
    leading = _null_vectors(centre, trial)
    scale = np.max(np.abs(leading), axis=1, keepdims=True)
    t = 0.5
    while True:
        fill_matrix(pieces, 0, t, trial, here)
        first = np.linalg.solve(2.0 * np.eye(size) - centre, (here - centre) @ leading)
        if np.max(np.abs(first) / scale) < _SERIES or t < 1e-9:
            return t, leading + first
        t *= 0.5


def _null_vectors(centre: np.ndarray, trial: Trial) -> np.ndarray:
    """(n, m) solutions of M0 u = 0, known in closed form."""
    if trial.form == RADIAL:
        return np.array([[1.0], [3.0 / centre[0, 1]]])
    c1_lam = centre[1, 0]
    if trial.form == COWLING:
        return np.array([[1.0], [c1_lam / trial.degree]])
    columns = ((1.0, c1_lam / trial.degree, 0.0, 3.0), (0.0, 0.0, 1.0, trial.degree))
    return np.ascontiguousarray(np.transpose(columns))


def surface_plane(layers: Layers, trial: Trial, isothermal: bool, has_edge: bool) -> np.ndarray:
    """(n, m) solutions at the outermost point that meet the conditions there.

    Displacement: y2 - y3 = k y1 + ... with k = 1 where delta p = 0. Below an edge, with the shell
    outside of mass P/g per area, to first order in 1/V,

        y2 - y3 - y1 = -[(4 + c1 lam - l(l+1)/(c1 lam)) y1 - l(l+1)/(c1 lam) y3 - z4]/V
        z4 + (l+1) y3 = -(U/V) [l(l+1)/(c1 lam) y2 - (l+1) y1]

    without perturbed gravity the terms in y3 and z4 fall away and 4 becomes 4 - U. The second
    line with V infinite says that Phi' falls as r^-(l+1) outside.
    """
    pieces = layers.polynomials
    last = pieces.left.size - 1
    x, q, _, inverse_gamma1, u, v, _, _, _ = structure(pieces, last, 1.0)
    c1_lam, ll, degree = trial.lam / q, trial.ll, trial.degree
    mu = ll / c1_lam if ll > 0.0 else 0.0
    lift = np.array([1.0, 1.0])  # multiples of (y1, y2 - y3) on the surface
    shell = 1.0 / v if has_edge else 0.0
    if isothermal:
        lift = _isothermal_ratio(v, v * inverse_gamma1, mu, c1_lam)
    pull = 4.0 - trial.screen * u + c1_lam - mu
    above = lift[1] - lift[0] * shell * pull
    if trial.form == RADIAL:
        return np.array([[lift[0]], [x * x * (above - lift[0])]])
    if trial.form == COWLING:
        return np.array([[lift[0]], [above]])
    # Two solutions, one with Phi' = 0 at the surface and one without displacement there; each
    # solves the two conditions for y2 and z4.
    conditions = np.array([[1.0, -shell], [u * shell * mu, 1.0]])
    first = (above, u * shell * (degree + 1.0) * lift[0])
    second = (1.0 + shell * mu, -(degree + 1.0))
    y2, z4 = np.linalg.solve(conditions, np.transpose([first, second]))
    return np.array([[lift[0], 0.0], y2, [0.0, 1.0], z4])


def _isothermal_ratio(v: float, vg: float, mu: float, c1_lam: float) -> np.ndarray:
    """(y1, p'/(rho g r)) of the wave whose energy decays outward in a plane isothermal layer.

    There x d/dx (y1, p) = [[Vg, b], [e, V - Vg]] (y1, p) with b = l(l+1)/(c1 lam) - Vg and
    e = c1 lam - A, A = V - Vg. Of the exponents V/2 -+ sqrt((V/2 - Vg)^2 + b e) the energy of
    the first decays. NaN where both are complex and waves escape.
    """
    d, b, e = 0.5 * v - vg, mu - vg, c1_lam - (v - vg)
    root = np.sqrt(d * d + b * e)
    # Both say the same; each is free of cancellation on its side.
    return np.array([b, d - root]) if d < 0.0 else np.array([d + root, -e])
