"""The adiabatic equations in canonical form, as coefficients at given radii.

With G = M = R = 1 inside, L2 = l(l+1) and lam = omega^2, the variables are

    q1 = r^2 xi_r        p1 = p' (Eulerian form)  or  P1 = delta p (Lagrangian form)
    q2 = Phi'            p2 = -r^2 (dPhi'/dr + 4 pi rho xi_r)/(4 pi)

and q' = dH/dp, p' = -dH/dq with the Hamiltonian

    H = 1/2 b0 p1^2 + 1/2 (b1/lam) (p1 + z)^2 + 1/2 b22 p2^2 + c11 p1 q1 + c21 p2 q1
        + 1/2 (d0 + d1 lam) q1^2 + 1/2 d2 q2^2,            z = s1 q1 + s2 q2

(Unno et al. 1989, ch. III, rearranged). The second term is the horizontal motion:
p1 + z = rho lam r xi_h. Written like this no two large terms cancel, and the kinetic energy
-dH/dlam = 1/2 (b1/lam^2) (p1 + z)^2 - 1/2 d1 q1^2 is visibly positive, which is why negative
eigenvalues of the action count modes.

The coefficients, in the order of `FIELDS`:

    b0 = -r^2/(rho c^2)   b1 = L2/rho   b22 = -4 pi/r^2   c21 = -4 pi rho/r^2
    d1 = -rho/r^2         d2 = L2/(4 pi)                  s2 = rho
    Eulerian:    c11 = g/c^2   s1 = 0           d0 = rho N^2/r^2 - 4 pi rho^2/r^2
    Lagrangian:  c11 = 0       s1 = rho g/r^2   d0 = -4 rho g/r^3

The Cowling approximation has neither q2 nor p2, and c21 = 0. It leaves out the term
-4 pi rho^2/r^2 of d0, which the Lagrangian form then gains with the other sign. Radial motion in
full gravity is the Lagrangian form with L2 = 0: Phi' decouples exactly (no N^2 appears).
"""

from __future__ import annotations

import numpy as np

from oscsolve.star.profile import Structure

#: Names and order of the coefficients.
FIELDS = ("b0", "b1", "s1", "s2", "b22", "c11", "c21", "d0", "d1", "d2")


def degrees_of_freedom(degree: int, gravity: str) -> int:
    """Canonical pairs per radius: 2 in general, 1 for radial motion and in the Cowling case."""
    return 1 if degree == 0 or gravity == "cowling" else 2


def coefficients(
    at: Structure, degree: int, gravity: str, lagrangian: np.ndarray | bool
) -> np.ndarray:
    """Coefficients of the Hamiltonian.

    Parameters
    ----------
    at : structure at radii of any shape
    degree : spherical degree l >= 0
    gravity : "full" or "cowling"
    lagrangian : bool, broadcastable to the shape of the radii: which form is used there

    Returns
    -------
    (..., 10) array in the order of `FIELDS`
    """
    r, rho, g = at.x, at.rho, at.g
    ll = float(degree * (degree + 1))
    full = gravity == "full"
    out = np.zeros((*r.shape, len(FIELDS)))
    self_gravity = 4.0 * np.pi * rho**2 / r**2
    eulerian_d0 = rho * at.n2 / r**2 - (self_gravity if full else 0.0)
    lagrangian_d0 = -4.0 * rho * g / r**3 + (0.0 if full else self_gravity)
    out[..., 0] = -(r**2) / (rho * at.c2)
    out[..., 1] = ll / rho
    out[..., 2] = np.where(lagrangian, rho * g / r**2, 0.0)
    out[..., 3] = rho if degrees_of_freedom(degree, gravity) == 2 else 0.0
    out[..., 4] = -4.0 * np.pi / r**2
    out[..., 5] = np.where(lagrangian, 0.0, g / at.c2)
    out[..., 6] = -4.0 * np.pi * rho / r**2 if full else 0.0
    out[..., 7] = np.where(lagrangian, lagrangian_d0, eulerian_d0)
    out[..., 8] = -rho / r**2
    out[..., 9] = ll / (4.0 * np.pi)
    return out
