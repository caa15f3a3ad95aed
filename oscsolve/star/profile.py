"""The structure between the points of a model: consistent, dimensionless, piecewise smooth.

Five functions of x = r/R are interpolated, and everything else is derived from them, so that
density, gravity, sound speed and buoyancy stay consistent between the points:

    q     = m/x^3                 q'  = (4 pi rho - 3 q)/x
    w     = P/rho                 w'  = -g (1 - beta),           g = q x
    ln rho                        (ln rho)' = -beta g/w
    beta  = dln rho/dln P         from A*: beta = A*/V + 1/Gamma1, V = g x/w
    Gamma1

The first and second derivatives of q, w and ln rho are therefore known at the points without
finite differences, and these three are quintic Hermite polynomials. ln rho is interpolated as
ln rho - k ln w with k the mean polytropic index of the interval, which makes a surface where
both vanish as smooth as any other place. beta and Gamma1 get slopes that do not overshoot
(Akima 1970, modified). Intervals never reach across a density jump.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import NamedTuple

import numpy as np

from oscsolve.star.model import StarModel

#: Mean polytropic indices used by the density interpolation are kept within this range.
_LARGEST_INDEX = 20.0


@dataclass(frozen=True, eq=False)
class Structure:
    """Dimensionless structure (G = M = R = 1) at some radii; all arrays have one shape.

    Attributes
    ----------
    x : r/R
    rho : density, M/R^3
    g : gravity, G M/R^2
    c2 : squared adiabatic sound speed Gamma1 P/rho, G M/R
    n2 : squared buoyancy frequency, G M/R^3
    gamma1 : first adiabatic exponent
    w : P/rho, G M/R
    """

    x: np.ndarray
    rho: np.ndarray
    g: np.ndarray
    c2: np.ndarray
    n2: np.ndarray
    gamma1: np.ndarray
    w: np.ndarray


class Polynomials(NamedTuple):
    """The interpolants of a profile, interval by interval, in powers of t = (x - left)/width.

    Attributes
    ----------
    left, right, width : (i,) ends and lengths of the intervals
    q, w : (i, 6) m/x^3 and P/rho
    residue : (i, 6) ln rho - exponent ln w
    exponent : (i,) mean polytropic index
    beta, gamma1 : (i, 4) dln rho/dln P and Gamma1
    """

    left: np.ndarray
    right: np.ndarray
    width: np.ndarray
    q: np.ndarray
    w: np.ndarray
    residue: np.ndarray
    exponent: np.ndarray
    beta: np.ndarray
    gamma1: np.ndarray


class Profile:
    """Interpolated structure of a model.

    Parameters
    ----------
    star : the model.

    Attributes
    ----------
    x : (n,) fractional radii of the points, the centre added in front where the model lacks it
    interval : (i,) index of the left point of every interval of non-zero length, outward
    has_edge : bool, True where pressure vanishes at the outermost point; the last interval is
        then not interpolated, and the shell it holds has the mass ``w/g`` of the point inside it
    """

    def __init__(self, star: StarModel) -> None:
        self.has_edge = bool(star.pressure[-1] == 0.0)
        scale = _points(star)
        self.x, self._q, self._rho, self._w, self._beta, self._gamma1 = scale
        widths = np.diff(self.x)
        self.interval = np.flatnonzero(widths > 0.0)
        if self.has_edge:
            self.interval = self.interval[self.interval < self.x.size - 2]
        self._slopes()

    def _slopes(self) -> None:
        x, q, rho, w, beta = self.x, self._q, self._rho, self._w, self._beta
        self._beta1 = _segment_slopes(x, beta)
        self._gamma1_1 = _segment_slopes(x, self._gamma1)
        inverse_x = np.divide(1.0, x, out=np.zeros_like(x), where=x > 0.0)
        g = q * x
        g_over_w = np.divide(g, w, out=np.zeros_like(x), where=w > 0.0)
        self._q1 = (4.0 * np.pi * rho - 3.0 * q) * inverse_x
        self._w1 = -g * (1.0 - beta)
        self._lnrho1 = -beta * g_over_w
        self._q2 = 4.0 * (np.pi * rho * self._lnrho1 - self._q1) * inverse_x
        g1 = self._q1 * x + q
        self._w2 = -g1 * (1.0 - beta) + g * self._beta1
        w_ratio = np.divide(self._w1, w, out=np.zeros_like(x), where=w > 0.0)
        inverse_w = np.divide(1.0, w, out=np.zeros_like(x), where=w > 0.0)
        self._lnrho2 = -self._beta1 * g_over_w - beta * (g1 * inverse_w - g_over_w * w_ratio)
        if x[0] == 0.0:
            # Even functions of x: q'' and ln rho'' at the centre from q = q0 + q2 x^2.
            self._q2[0] = 0.8 * np.pi * rho[0] * self._lnrho2[0]

    def at(self, x: np.ndarray, interval: np.ndarray) -> Structure:
        """Structure at radii `x` inside the intervals whose left points are `interval`.

        Parameters
        ----------
        x, interval : arrays of one shape; every x lies within its interval.
        """
        i = np.asarray(interval)
        j = i + 1
        h = self.x[j] - self.x[i]
        t = (x - self.x[i]) / h
        quintic, cubic = _hermite_quintic(t), _hermite_cubic(t)

        def smooth(f: np.ndarray, f1: np.ndarray, f2: np.ndarray) -> np.ndarray:
            ends = (f[i], f[j], f1[i] * h, f1[j] * h, f2[i] * h * h, f2[j] * h * h)
            return sum(b * v for b, v in zip(quintic, ends, strict=True))

        q = smooth(self._q, self._q1, self._q2)
        w = smooth(self._w, self._w1, self._w2)
        rho = self._density(i, j, h, w, quintic)
        beta = _apply(cubic, self._beta, self._beta1, i, j, h)
        gamma1 = _apply(cubic, self._gamma1, self._gamma1_1, i, j, h)
        g = q * x
        n2 = (beta - 1.0 / gamma1) * g * g / w
        return Structure(x=x, rho=rho, g=g, c2=gamma1 * w, n2=n2, gamma1=gamma1, w=w)

    def _density(
        self, i: np.ndarray, j: np.ndarray, h: np.ndarray, w: np.ndarray, quintic: tuple
    ) -> np.ndarray:
        index, values = self._density_ends(i, j, h)
        return np.exp(sum(b * v for b, v in zip(quintic, values, strict=True))) * w**index

    def _density_ends(
        self, i: np.ndarray, j: np.ndarray, h: np.ndarray
    ) -> tuple[np.ndarray, tuple[np.ndarray, ...]]:
        """Polytropic index, and ln rho - index ln w with its scaled slopes at the two ends."""
        lnw_step = np.log(self._w[j] / self._w[i])
        lnrho_step = np.log(self._rho[j] / self._rho[i])
        index = np.divide(lnrho_step, lnw_step, out=np.zeros_like(h), where=np.abs(lnw_step) > 1e-3)
        index = np.clip(index, 0.0, _LARGEST_INDEX)
        ends = []
        for p in (i, j):
            w1, w2 = self._w1[p] / self._w[p], self._w2[p] / self._w[p]
            ends.append(
                (
                    np.log(self._rho[p]) - index * np.log(self._w[p]),
                    (self._lnrho1[p] - index * w1) * h,
                    (self._lnrho2[p] - index * (w2 - w1 * w1)) * h * h,
                )
            )
        left, right = ends
        return index, (left[0], right[0], left[1], right[1], left[2], right[2])

    def polynomials(self) -> Polynomials:
        """The same interpolants as coefficients, for code that evaluates them one by one."""
        i = self.interval
        j = i + 1
        h = self.x[j] - self.x[i]
        index, residue = self._density_ends(i, j, h)

        def smooth(f: np.ndarray, f1: np.ndarray, f2: np.ndarray) -> np.ndarray:
            ends = (f[i], f[j], f1[i] * h, f1[j] * h, f2[i] * h * h, f2[j] * h * h)
            return _quintic_powers(*ends)

        def cubic(f: np.ndarray, f1: np.ndarray) -> np.ndarray:
            return _cubic_powers(f[i], f[j], f1[i] * h, f1[j] * h)

        return Polynomials(
            left=self.x[i],
            right=self.x[j],
            width=h,
            q=smooth(self._q, self._q1, self._q2),
            w=smooth(self._w, self._w1, self._w2),
            residue=_quintic_powers(*residue),
            exponent=index,
            beta=cubic(self._beta, self._beta1),
            gamma1=cubic(self._gamma1, self._gamma1_1),
        )

    def outermost(self) -> tuple[float, int]:
        """The outermost radius that carries matter, and the interval that ends there."""
        last = int(self.interval[-1])
        return float(self.x[last + 1]), last


def _points(star: StarModel) -> tuple[np.ndarray, ...]:
    """x, q, rho, w, beta and Gamma1 on the points, with a centre."""
    mass, radius = star.total_mass, star.photospheric_radius
    x = star.radius / radius
    rho = star.density * radius**3 / mass
    pressure = star.pressure * radius**4 / (star.gravitational_constant * mass**2)
    inside = x > 0.0
    q = np.empty_like(x)
    q[inside] = star.mass[inside] / mass / x[inside] ** 3
    q[~inside] = 4.0 * np.pi * rho[~inside] / 3.0
    w = np.divide(pressure, rho, out=np.zeros_like(x), where=rho > 0.0)
    v = np.divide(q * x * x, w, out=np.zeros_like(x), where=w > 0.0)
    assert star.a_star is not None
    alpha = np.divide(star.a_star, v, out=np.zeros_like(x), where=v > 0.0)
    if star.pressure[-1] == 0.0:
        alpha[-1] = alpha[-2]
    if x[0] == 0.0:
        # Two radii that differ: the first points may be a density jump.
        second = int(np.argmax(x > x[1]))
        alpha[0] = _even_limit(x[[1, second]], alpha[[1, second]])
    gamma1 = np.array(star.gamma1)
    beta = alpha + 1.0 / gamma1
    columns = (x, q, rho, w, beta, gamma1)
    return columns if x[0] == 0.0 else _with_centre(*columns)


def _even_limit(x: np.ndarray, f: np.ndarray) -> float:
    """Value at the centre of an even function known at two radii."""
    return float(f[0] - (f[1] - f[0]) * x[0] ** 2 / (x[1] ** 2 - x[0] ** 2))


def _with_centre(
    x: np.ndarray,
    q: np.ndarray,
    rho: np.ndarray,
    w: np.ndarray,
    beta: np.ndarray,
    gamma1: np.ndarray,
) -> tuple[np.ndarray, ...]:
    """Columns with a centre point in front: f(0) = f - x f'/2 for f = f0 + f2 x^2."""
    g = q[0] * x[0]
    rho0 = rho[0] * (1.0 + 0.5 * x[0] * beta[0] * g / w[0])
    w0 = w[0] + 0.5 * x[0] * g * (1.0 - beta[0])
    front = (0.0, 4.0 * np.pi * rho0 / 3.0, rho0, w0, beta[0], gamma1[0])
    columns = (x, q, rho, w, beta, gamma1)
    return tuple(np.concatenate(([a], b)) for a, b in zip(front, columns, strict=True))


def _segment_slopes(x: np.ndarray, f: np.ndarray) -> np.ndarray:
    """Slopes at the points that do not look across repeated radii."""
    slopes = np.zeros_like(f)
    breaks = np.flatnonzero(np.diff(x) == 0.0) + 1
    for part in np.split(np.arange(x.size), breaks):
        if part.size == 2:
            slopes[part] = (f[part[1]] - f[part[0]]) / (x[part[1]] - x[part[0]])
        elif part.size > 2:
            slopes[part] = gentle_slopes(x[part], f[part])
    return slopes


def gentle_slopes(x: np.ndarray, f: np.ndarray) -> np.ndarray:
    """Slopes that do not overshoot: Akima (1970, J. ACM 17, 589) with modified weights.

    A library has this too, but importing that one takes longer than solving a star.

    Parameters
    ----------
    x, f : (n,) points and values, n >= 3
    """
    steps = np.diff(f) / np.diff(x)
    left = 2.0 * steps[0] - steps[1]
    right = 2.0 * steps[-1] - steps[-2]
    padded = np.concatenate(
        ([2.0 * left - steps[0], left], steps, [right, 2.0 * right - steps[-1]])
    )
    weight = np.abs(np.diff(padded)) + 0.5 * np.abs(padded[1:] + padded[:-1])
    before, after = weight[2:], weight[:-2]
    total = before + after
    flat = total <= 1e-300
    mean = before * padded[1:-2] + after * padded[2:-1]
    return np.where(flat, 0.0, mean / np.where(flat, 1.0, total))


def _apply(
    cubic: tuple, f: np.ndarray, f1: np.ndarray, i: np.ndarray, j: np.ndarray, h: np.ndarray
) -> np.ndarray:
    return cubic[0] * f[i] + cubic[1] * f[j] + cubic[2] * f1[i] * h + cubic[3] * f1[j] * h


def _hermite_cubic(t: np.ndarray) -> tuple[np.ndarray, ...]:
    """Weights of f0, f1, h f0', h f1' at t in [0, 1]."""
    u = 1.0 - t
    return u * u * (1.0 + 2.0 * t), t * t * (3.0 - 2.0 * t), t * u * u, -t * t * u


def _hermite_quintic(t: np.ndarray) -> tuple[np.ndarray, ...]:
    """Weights of f0, f1, h f0', h f1', h^2 f0'', h^2 f1'' at t in [0, 1]."""
    u = 1.0 - t
    t3, u3 = t**3, u**3
    return (
        u3 * (1.0 + 3.0 * t + 6.0 * t * t),
        t3 * (1.0 + 3.0 * u + 6.0 * u * u),
        u3 * t * (1.0 + 3.0 * t),
        -t3 * u * (1.0 + 3.0 * u),
        0.5 * u3 * t * t,
        0.5 * t3 * u * u,
    )


def _cubic_powers(f0: np.ndarray, f1: np.ndarray, a: np.ndarray, b: np.ndarray) -> np.ndarray:
    """(..., 4) coefficients of 1, t, t^2, t^3 from the ends and the scaled slopes a, b there."""
    step = f1 - f0
    return np.stack((f0, a, 3.0 * step - 2.0 * a - b, a + b - 2.0 * step), axis=-1)


def _quintic_powers(
    f0: np.ndarray, f1: np.ndarray, a: np.ndarray, b: np.ndarray, c: np.ndarray, d: np.ndarray
) -> np.ndarray:
    """(..., 6) likewise, with scaled second derivatives c, d."""
    step = f1 - f0
    return np.stack(
        (
            f0,
            a,
            0.5 * c,
            10.0 * step - 6.0 * a - 4.0 * b - 1.5 * c + 0.5 * d,
            -15.0 * step + 8.0 * a + 7.0 * b + 1.5 * c - d,
            6.0 * step - 3.0 * (a + b) - 0.5 * (c - d),
        ),
        axis=-1,
    )
