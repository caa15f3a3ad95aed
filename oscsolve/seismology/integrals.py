"""Integrals over a star with eigenfunctions that are known on the points of its model.

Between two points the structure is that of `oscsolve.star.profile` (what the solver saw) and
xi_r, xi_h, p'/rho, Phi' and dPhi'/dr are polynomials of degree seven with the values that the mode
list holds at the two ends, which obey the adiabatic equations at the ends and at four places
between (`oscsolve.seismology.motion`). Gauss points in every cell integrate products of these.
Errors fall as width^7. Intervals in which a mode turns by half a wave or more hold too little of
it for anyone to rebuild it; `oscsolve.seismology.checks.coarse_points` tells where that matters.
Cells never reach across a density jump.
"""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass

import numpy as np

from oscsolve.errors import InputError
from oscsolve.pulsation.modeset import ModeSet
from oscsolve.seismology.motion import PLACES, Motion, Wave, pieces, wave_of
from oscsolve.star.model import StarModel
from oscsolve.star.profile import Profile, Structure


def _partial_weights(size: int) -> np.ndarray:
    point = 0.5 * (np.polynomial.legendre.leggauss(size)[0] + 1.0)
    power = np.arange(size)
    integrals = point[:, None] ** (power + 1) / (power + 1)
    return np.linalg.solve((point[:, None] ** power).T, integrals.T).T


#: Gauss points per cell: with five, squares of the polynomials are off by less than these are.
_NODES = 5
#: Integrals over [0, 1] from 0 to each Gauss point of the polynomial through all of them.
_PARTIAL = _partial_weights(_NODES)


@dataclass(frozen=True, eq=False)
class PointStructure:
    """Dimensionless structure (G = M = R = 1) on the points of the model, (n,) arrays.

    Attributes
    ----------
    x, rho, m, g, c2, n2, gamma1, pressure : r/R, density, mass inside, gravity, squared sound
        speed, squared buoyancy frequency, first adiabatic exponent, pressure. c2 is 0 at an edge,
        g at the centre.
    """

    x: np.ndarray
    rho: np.ndarray
    m: np.ndarray
    g: np.ndarray
    c2: np.ndarray
    n2: np.ndarray
    gamma1: np.ndarray
    pressure: np.ndarray

    def lamb2(self, degree: int) -> np.ndarray:
        """Squared Lamb frequency S_l^2 = l(l+1) c^2/r^2; infinite at the centre for l > 0."""
        ll = float(degree * (degree + 1))
        inside = self.x > 0.0
        out = np.full(self.x.shape, np.inf if degree else 0.0)
        np.divide(ll * self.c2, self.x**2, out=out, where=inside)
        return out


def point_structure(star: StarModel) -> PointStructure:
    """The structure of a model on its own points, dimensionless."""
    mass, radius, newton = star.total_mass, star.photospheric_radius, star.gravitational_constant
    x = star.fractional_radius
    rho = star.density * radius**3 / mass
    pressure = star.pressure * radius**4 / (newton * mass**2)
    m = star.mass / mass
    assert star.brunt_n2 is not None
    inside = x > 0.0
    return PointStructure(
        x=x,
        rho=rho,
        m=m,
        g=np.divide(m, x**2, out=np.zeros_like(x), where=inside),
        c2=star.gamma1 * np.divide(pressure, rho, out=np.zeros_like(x), where=rho > 0.0),
        n2=star.brunt_n2 * radius**3 / (newton * mass),
        gamma1=star.gamma1,
        pressure=pressure,
    )


class Quadrature:
    """Cells between the points of a model, with Gauss points in each.

    Parameters
    ----------
    modes : mode list with eigenfunctions
    breaks : fractional radii at which cells are cut as well, because what is integrated jumps or
        bends there

    Attributes
    ----------
    profile, points : structure between the points, and on them
    edges : (cells + 1,) fractional radii of the ends of the cells, centre to surface
    x, weight : (cells, k) Gauss points and their weights
    at : structure there
    width : (i,) widths of the intervals between points, not cut

    Raises
    ------
    InputError
        The list holds no eigenfunctions.
    """

    def __init__(self, modes: ModeSet, breaks: Iterable[float] = ()) -> None:
        if modes.eigenfunctions is None:
            raise InputError(
                "this mode list holds no eigenfunctions, which integrals over the star need; "
                "solve with eigenfunctions=True, or with oscsolve modes --out FILE.h5"
            )
        self.modes, self.profile = modes, Profile(modes.star)
        self.points = point_structure(modes.star)
        self._offset = self.profile.x.size - modes.star.radius.size
        interval = self.profile.interval
        ends = (self.profile.x[interval], self.profile.x[interval + 1])
        left, right, owner = _cut(*ends, np.unique(np.asarray(list(breaks), dtype=float)))
        self.edges = np.append(left, right[-1])
        point, weight = np.polynomial.legendre.leggauss(_NODES)
        width = (right - left)[:, None]
        self.x = left[:, None] + width * 0.5 * (point + 1.0)
        self.weight = width * 0.5 * weight
        self._owner = owner
        intervals = np.broadcast_to(interval[owner][:, None], self.x.shape)
        self.at = self.profile.at(self.x, intervals)
        start, width = ends[0], ends[1] - ends[0]
        self._fraction = (self.x - start[owner][:, None]) / width[owner][:, None]
        self.width = width
        self._ends = tuple(self.profile.at(x, interval) for x in ends)
        self._between = tuple(self.profile.at(start + place * width, interval) for place in PLACES)

    def integral(self, f: np.ndarray) -> float:
        """Integral over the star of a function known at the Gauss points."""
        return float(np.sum(f * self.weight))

    def cumulative(self, f: np.ndarray) -> np.ndarray:
        """(cells + 1,) integral from the centre to the ends of the cells."""
        return np.concatenate(([0.0], np.cumsum(np.sum(f * self.weight, axis=1))))

    def running(self, f: np.ndarray) -> np.ndarray:
        """(cells, k) integral from the centre to the Gauss points themselves."""
        before = self.cumulative(f)[:-1]
        width = np.diff(self.edges)[:, None]
        return before[:, None] + width * (f @ _PARTIAL.T)

    def on_points(self, ends: np.ndarray) -> np.ndarray:
        """Values at the ends of cells, carried to the points of the model, (n,).

        For a quadrature without breaks. An edge takes the value of the point inside it.
        """
        first = np.arange(self.modes.star.radius.size) + self._offset
        return ends[np.searchsorted(self.profile.interval, first)]

    def wave(self, index: int) -> Wave:
        """Degree, frequency and gravity of mode `index`."""
        return wave_of(self.modes, index)

    def motion(self, index: int) -> Motion:
        """Mode `index` at the Gauss points."""
        left, right = self.ends(index)
        found = pieces(self.wave(index), self.width, left, right, self._between)
        return found.at(self._fraction, self._owner)

    def ends(self, index: int) -> tuple[tuple[Structure, Motion], tuple[Structure, Motion]]:
        """Structure and mode at the left and at the right ends of the model's intervals."""
        columns = self._with_centre(index)
        interval = self.profile.interval
        sides = (Motion(*(c[interval + k] for c in columns)) for k in (0, 1))
        left, right = zip(self._ends, sides, strict=True)
        return left, right

    def motion_on_points(self, index: int) -> Motion:
        """Mode `index` on the points of the model, (n,).

        p'/rho is 0 at an edge. xi_h jumps with the density; the stored column holds its inner
        value on both sides of a jump, and the outer one is made from p' and Phi' here.
        """
        mode, wave, rho = self.modes.eigenfunction(index), self.wave(index), self.points.rho
        eta = np.divide(mode.p_prime, rho, out=np.zeros_like(rho), where=rho > 0.0)
        xi_h = mode.xi_h
        outer = np.flatnonzero(np.diff(mode.radius) == 0.0) + 1
        if wave.degree > 0 and outer.size:
            xi_h = xi_h.copy()
            xi_h[outer] = (eta[outer] + mode.phi_prime[outer]) / (wave.lam * mode.radius[outer])
        return Motion(mode.xi_r, xi_h, eta, mode.phi_prime, mode.dphi_prime)

    def _with_centre(self, index: int) -> Motion:
        """Mode `index` on the points of the profile."""
        mode = self.motion_on_points(index)
        if not self._offset:
            return mode
        # `pieces` puts in what holds at the centre.
        return Motion(*(np.append(0.0, column) for column in mode))


def _cut(
    left: np.ndarray, right: np.ndarray, breaks: np.ndarray
) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    """Cells cut at `breaks`: left ends, right ends, and the interval each lies in."""
    inside = breaks[(breaks > left[0]) & (breaks < right[-1])]
    # A break on a point, or within round-off of it, cuts nothing.
    owner = np.clip(np.searchsorted(right, inside), 0, right.size - 1)
    apart = 1e-12 * right[owner]
    keep = (inside - left[owner] > apart) & (right[owner] - inside > apart)
    inside, owner = inside[keep], owner[keep]
    place = np.searchsorted(left, inside, side="right")
    starts = np.insert(left, place, inside)
    owners = np.insert(np.arange(left.size), place, owner)
    return starts, np.append(starts[1:], right[-1]), owners
