"""What lies on top of the outermost mesh point, as a term of the action.

The surface adds 1/2 (k11 q1^2 + 2 k12 q1 q2 + k22 q2^2) to the action. Its parts:

gravity field outside        k22 = -(l+1) r/(4 pi)                      (Phi' ~ r^-(l+1))
free surface, delta p = 0    k11 = -rho g/r^2 in the Eulerian form, nothing in the Lagrangian
edge of the star             the shell between the last point and the place where pressure
                             vanishes has the mass rho w/g per area and moves with the point.
                             It adds -(w/g) H at P1 = 0 and p2 = (l+1) r q2/(4 pi), less the
                             part that a vacuum would have, which the first line holds already
isothermal atmosphere        k11 = -p1/q1 of the solution whose energy decays outward:
                             p1/q1 = rho (d - sqrt(d^2 + B E))/B, with d = 1/(2 H) - g/c^2,
                             B = L2/lam - r^2/c^2, E = (lam - N^2)/r^2, H = w/g,
                             N^2 = (g/H)(1 - 1/Gamma1)
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import NamedTuple

import numpy as np

from oscsolve.pulsation.compiled import compiled
from oscsolve.pulsation.equations import coefficients
from oscsolve.star.profile import Profile, Structure


class Surface(NamedTuple):
    """Numbers that `surface_term` needs; the shell and the atmosphere vanish where absent."""

    constant_q1: float  # lam-independent part of k11
    constant_q2: float  # lam-independent part of k22
    shell_b1: float  # coefficients of D(lam), times the thickness w/g of the shell
    shell_d0: float
    shell_d1: float
    shell_c21: float  # c21 (l+1) r/(4 pi), likewise
    s1: float
    s2: float
    rho: float  # density at the foot of the atmosphere, 0 without one
    ll: float  # l(l+1)
    r2: float  # r^2
    c2: float  # sound speed squared
    n2: float  # buoyancy frequency squared of the isothermal layer
    d: float  # 1/(2 H) - g/c^2


@dataclass(frozen=True)
class Cutoff:
    """The range of lam = sigma2 in which an isothermal atmosphere holds waves back."""

    low: float
    high: float


def surface_structure(profile: Profile) -> Structure:
    """Structure at the outermost point that carries matter; arrays of shape ()."""
    x, interval = profile.outermost()
    return profile.at(np.array(x), np.array(interval))


def surface_numbers(
    profile: Profile, degree: int, gravity: str, surface: str, lagrangian: bool
) -> Surface:
    """Pack what `surface_term` needs.

    Parameters
    ----------
    profile : the star
    degree, gravity : as everywhere
    surface : "free" or "isothermal"
    lagrangian : form of the equations in the outermost cell
    """
    at = surface_structure(profile)
    r, rho, g, w, c2, gamma1 = (float(v) for v in (at.x, at.rho, at.g, at.w, at.c2, at.gamma1))
    height = w / g
    b1, s1, s2, c21, d0, d1 = coefficients(at, degree, gravity, True)[[1, 2, 3, 6, 7, 8]]
    atmosphere = surface == "isothermal"
    shell = height if profile.has_edge and not atmosphere else 0.0
    numbers = Surface(
        constant_q1=rho * g / r**2 * (float(atmosphere) - float(not lagrangian)),
        constant_q2=-(degree + 1) * r / (4.0 * np.pi),
        shell_b1=shell * b1,
        shell_d0=shell * d0,
        shell_d1=shell * d1,
        shell_c21=shell * c21 * (degree + 1) * r / (4.0 * np.pi),
        s1=s1,
        s2=s2,
        rho=rho if atmosphere else 0.0,
        ll=float(degree * (degree + 1)),
        r2=r**2,
        c2=c2,
        n2=g / height * (1.0 - 1.0 / gamma1),
        d=0.5 / height - g / c2,
    )
    return Surface(*(float(number) for number in numbers))


@compiled
def surface_term(top, lam, mu):
    """k11, k12, k22, their derivatives by lam, and the negative pivots hidden in the top.

    `mu` is 1/lam, or 0 for radial motion. For d <= 0 (Gamma1 <= 2) k11 has a pole where B = 0,
    and an atmosphere in which B > 0 hides one negative pivot of its p1, like any Gauss point with
    B11 > 0; for d > 0 it is regular there and hides none. All NaN where waves escape.
    """
    beta, slope = mu * top.shell_b1, mu * mu * top.shell_b1
    k11 = top.constant_q1 - top.shell_d0 - top.shell_d1 * lam - beta * top.s1**2
    k12 = -top.shell_c21 - beta * top.s1 * top.s2
    k22 = top.constant_q2 - beta * top.s2**2
    t11 = -top.shell_d1 + slope * top.s1**2
    t12 = slope * top.s1 * top.s2
    t22 = slope * top.s2**2
    hidden = 0
    if top.rho > 0.0:
        b, e = top.ll * mu - top.r2 / top.c2, (lam - top.n2) / top.r2
        b_slope, e_slope = -top.ll * mu * mu, 1.0 / top.r2
        root = math.sqrt(top.d**2 + b * e)
        root_slope = 0.5 * (b_slope * e + b * e_slope) / root
        if top.d > 0.0:
            # (d - root)/B = -E/(d + root), without the cancellation near B = 0.
            sum_ = top.d + root
            k11 += top.rho * e / sum_
            t11 += top.rho * (e_slope - e * root_slope / sum_) / sum_
        else:
            k11 -= top.rho * (top.d - root) / b
            t11 += top.rho * (root_slope / b + (top.d - root) * b_slope / (b * b))
            hidden = 1 if b > 0.0 else 0
    return k11, k12, k22, t11, t12, t22, hidden


def atmosphere_cutoff(profile: Profile, degree: int) -> Cutoff:
    """Where d^2 + B E >= 0: waves neither escape as sound (above) nor as gravity waves (below)."""
    at = surface_structure(profile)
    r, g, w, c2, gamma1 = (float(v) for v in (at.x, at.g, at.w, at.c2, at.gamma1))
    ll = degree * (degree + 1) / r**2
    d = 0.5 * g / w - g / c2
    n2 = g * g / w * (1.0 - 1.0 / gamma1)
    # lam (d^2 + B E) = -lam^2/c2 + lam (d^2 + ll + N^2/c2) - ll N^2
    middle = 0.5 * (c2 * (d * d + ll) + n2)
    product = c2 * ll * n2
    high = middle + math.sqrt(max(middle * middle - product, 0.0))
    return Cutoff(low=product / high, high=high)
