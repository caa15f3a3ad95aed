"""Order labels: by counting nodes, and by counting eigenvalues.

The count label follows the order of the spectrum and cannot slip; node counting is the habit of
the trade and can fail for l >= 2 in condensed stars. Both are kept.
"""

from __future__ import annotations

import numpy as np

from oscsolve.pulsation.eigenfunction import NodalMode, Reconstruction


def count_labels(
    negative: np.ndarray, cells: int, stages: int, dof: int, dipole: bool
) -> np.ndarray:
    """Radial orders from the number of negative eigenvalues just below each mode.

    n = dof * cells * stages + 1 - negative: the part of the action that is the same for a
    uniform medium is taken away, so that the f mode (or nothing, for l = 0) is zero. For l = 1
    in full gravity the f mode is the translation of the star at sigma2 = 0, which is no
    oscillation: orders below p1 shift by one.

    Parameters
    ----------
    negative : (m,) int
    cells, stages, dof : of the action
    dipole : True for l = 1 in full gravity
    """
    order = dof * cells * stages + 1 - negative
    return np.where(order <= 0, order - 1, order) if dipole else order


def node_labels(
    mode: NodalMode, rebuilt: Reconstruction, lam: float, degree: int, full_gravity: bool
) -> tuple[int, int]:
    """n_p and n_g: zeros of the radial displacement by the sense in which the mode turns there.

    A zero is p-type where d(xi_r)/dr * xi_h < 0 (Scuflaire 1974, Osaki 1975). For l = 1 in full
    gravity both displacements are taken relative to the mean displacement of the mass inside,
    which gives the variables of Takata (2006) up to positive factors; p modes, n_p >= n_g, then
    have one node less than their order. In a star of uniform density the two become equal and
    the plain count, which is right there, is used. For l = 0 every zero is p-type and the
    fundamental has order 1.
    """
    first = _first_reliable(mode, rebuilt)
    r = rebuilt.mesh.node[first:]
    radial, horizontal = mode.q1[first:] / r**2, mode.xi_h[first:]
    if degree == 0:
        return sum(_crossings(radial, np.ones_like(r))) + 1, 0
    if degree == 1 and full_gravity and _is_condensed(rebuilt):
        n_p, n_g = _dipole_crossings(mode, rebuilt, lam)
        return (n_p + 1, n_g) if n_p >= n_g else (n_p, n_g)
    return _crossings(radial, horizontal)


def _dipole_crossings(mode: NodalMode, rebuilt: Reconstruction, lam: float) -> tuple[int, int]:
    """Zeros of xi_r relative to the mean displacement xi_m of the mass inside, p-wise and g-wise.

    Where xi_r = xi_m, momentum balance gives
    r d(xi_r - xi_m)/dr = (2 J - lam r^2/(c^2 J)) (xi_h - xi_m), J = 1 - 4 pi r^3 rho/(3 m),
    so a zero is p-type where lam r^2/c^2 > 2 J^2. The sign of that factor is used instead of the
    two slopes: it is the same in a consistent model and does not suffer where N^2 of a model
    does not quite fit its density.
    """
    # Inside the first point of the model J is an extrapolation and the difference is lost in it.
    first = int(np.count_nonzero(rebuilt.mesh.interval == rebuilt.mesh.interval[0])) + 1
    r, rho, c2 = rebuilt.mesh.node[first:], rebuilt.rho[first:], rebuilt.c2[first:]
    # The mass that Phi' comes from: where that of the model does not fit its density to a few
    # digits, near the centre, the difference would show zeros that are not there.
    m = rebuilt.mass[first - 1 :]
    mean = -(4.0 * np.pi * mode.p2[first:] * r + mode.q2[first:] * r**2) / (3.0 * m)
    relative = mode.q1[first:] / r**2 - mean
    at = np.flatnonzero(np.signbit(relative[1:]) != np.signbit(relative[:-1]))
    condensed = 1.0 - 4.0 * np.pi * rho * r**3 / (3.0 * m)
    sound = lam * r**2 / c2 > 2.0 * condensed**2
    n_p = int(np.count_nonzero(sound[at]))
    return n_p, at.size - n_p


def _is_condensed(rebuilt: Reconstruction) -> bool:
    """True where the mean density inside some radius exceeds the local one, J = 1 - U/3 > 0."""
    mean = 3.0 * rebuilt.g[1:] / (4.0 * np.pi * rebuilt.mesh.node[1:])
    return bool(np.any(rebuilt.rho[1:] < 0.999999 * mean))


def _first_reliable(mode: NodalMode, rebuilt: Reconstruction) -> int:
    """The first node, not the centre, at which q1 can have a zero and stands clear of noise.

    Around the centre q1 ~ r^(l+1): at high degree it falls below any noise there, but up to the
    first radius at which waves propagate it has no zeros.
    """
    clear = np.abs(mode.q1[1:]) > 1e-9 * np.max(np.abs(mode.q1))
    lamb = rebuilt.action.ll * rebuilt.c2[1:] / rebuilt.mesh.node[1:] ** 2
    waves = (mode.lam - rebuilt.n2[1:]) * (mode.lam - lamb) > 0.0
    return int(np.argmax(clear | waves)) + 1


def _crossings(radial: np.ndarray, horizontal: np.ndarray) -> tuple[int, int]:
    """Number of zeros of `radial` where radial' * horizontal is negative, and positive."""
    keep = radial != 0.0
    a, b = radial[keep], horizontal[keep]
    at = np.flatnonzero(np.signbit(a[1:]) != np.signbit(a[:-1]))
    share = a[at] / (a[at] - a[at + 1])
    there = b[at] + share * (b[at + 1] - b[at])
    turning = (a[at + 1] - a[at]) * there
    return int(np.sum(turning < 0.0)), int(np.sum(turning > 0.0))


def kinds(degree: int, n_p: np.ndarray, n_g: np.ndarray, order: np.ndarray) -> np.ndarray:
    """(m,) str, what each mode is: radial, mixed (n_p and n_g above zero), p, f or g.

    For l = 1 in full gravity n_p holds the extra one of `node_labels`, which does not count
    towards mixed character unless there is a g node too.
    """
    if degree == 0:
        return np.full(order.size, "radial")
    named = np.where(order > 0, "p", np.where(order < 0, "g", "f"))
    return np.where((n_p > 0) & (n_g > 0), "mixed", named)
