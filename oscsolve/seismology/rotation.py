"""Slow rotation: kernels, Ledoux constants and splittings to first order, and what they invert to.

Frame and sign. Frequencies are those an observer at rest sees (inertial frame), modes vary as
exp(i m phi - i omega t), so that m > 0 runs with the rotation and is seen at the higher frequency:

    nu(m) = nu(0) + m splitting,    splitting = beta int K(r) Omega(r)/(2 pi) dr

(Hansen, Cox & van Horn 1977; Aerts, Christensen-Dalsgaard & Kurtz 2010, section 3.8) with

    beta = int [xi_r^2 + L2 xi_h^2 - 2 xi_r xi_h - xi_h^2] rho r^2 dr
           / int [xi_r^2 + L2 xi_h^2] rho r^2 dr,            L2 = l(l+1)

and K the integrand above over its own integral. The Ledoux constant is C = 1 - beta: a star that
rotates as a solid body splits by (1 - C) Omega/(2 pi). Neither second order in Omega nor latitude
is covered.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from oscsolve.errors import InputError
from oscsolve.pulsation.modeset import ModeSet
from oscsolve.seismology.integrals import Quadrature
from oscsolve.seismology.motion import Motion, Wave
from oscsolve.star.model import StarModel


@dataclass(frozen=True, eq=False)
class Rotation:
    """How fast each layer rotates: straight lines between points.

    Attributes
    ----------
    radius : (k,) fractional radii r/R, never falling; two at one radius mark a jump. Inside the
        first and outside the last point the rate is that of the point.
    rate : (k,) cyclic rotation frequency Omega/(2 pi), nHz; negative against the sense of m
    name : what it is, in a few words

    Raises
    ------
    InputError
        Shapes differ, a value is not finite, or radii fall.
    """

    radius: np.ndarray
    rate: np.ndarray
    name: str = ""

    def __post_init__(self) -> None:
        for name in ("radius", "rate"):
            array = np.array(getattr(self, name), dtype=np.float64, order="C", ndmin=1)
            array.setflags(write=False)
            object.__setattr__(self, name, array)
        radius, rate = self.radius, self.rate
        if radius.ndim != 1 or radius.size == 0 or radius.shape != rate.shape:
            raise InputError(
                f"a rotation profile needs as many rates as radii; got {rate.size} for "
                f"{radius.size}"
            )
        for name, values in (("radius", radius), ("rate", rate)):
            bad = np.flatnonzero(~np.isfinite(values))
            if bad.size:
                raise InputError(f"rotation: {name} is no finite number at point {bad[0] + 1}")
        step = np.diff(radius)
        if radius[0] < 0.0 or np.any(step < 0.0):
            place = int(np.flatnonzero(step < 0.0)[0]) + 2 if radius[0] >= 0.0 else 1
            raise InputError(
                f"rotation: radius must rise from 0 on; it does not at point {place} "
                f"(x = {radius[place - 1]:g})"
            )
        if np.any((step[1:] == 0.0) & (step[:-1] == 0.0)):
            raise InputError("rotation: three points share one radius; two make a jump")

    def at(self, x: np.ndarray) -> np.ndarray:
        """Rate in nHz at fractional radii; at a jump, the mean of both sides."""
        jump = np.diff(self.radius) == 0.0
        starts = np.concatenate(([0], np.flatnonzero(jump) + 1))
        stops = np.append(np.flatnonzero(jump) + 1, self.radius.size)
        x = np.asarray(x, dtype=float)
        total = np.zeros(x.shape)
        for k, (first, last) in enumerate(zip(starts, stops, strict=True)):
            part = np.interp(x, self.radius[first:last], self.rate[first:last])
            low = -np.inf if k == 0 else self.radius[first]
            high = np.inf if last == self.radius.size else self.radius[last - 1]
            share = 0.5 * ((x >= low) & (x <= high)) + 0.5 * ((x > low) & (x < high))
            total += np.where(share > 0.0, share * part, 0.0)
        return total


def uniform_rotation(rate: float) -> Rotation:
    """Solid-body rotation at `rate` nHz."""
    return Rotation(np.zeros(1), np.array([rate]), f"solid body, {rate:g} nHz")


def step_rotation(core: float, envelope: float, radius: float) -> Rotation:
    """Rotation at `core` nHz inside the fractional radius and at `envelope` nHz outside.

    Raises
    ------
    InputError
        The radius is not above zero.
    """
    if not radius > 0.0:
        raise InputError(f"the step must lie above the centre; got x = {radius:g}")
    name = f"{core:g} nHz inside x = {radius:g}, {envelope:g} nHz outside"
    return Rotation(np.array([radius, radius]), np.array([core, envelope]), name)


def model_rotation(star: StarModel) -> Rotation:
    """The rotation that came with the model.

    Raises
    ------
    InputError
        The model holds none.
    """
    if star.rotation is None:
        raise InputError(
            f"{star.name or 'the model'}: holds no rotation; give a rate, a step or a table"
        )
    rate = star.rotation / (2.0 * np.pi) * 1e9
    return Rotation(star.fractional_radius, rate, "rotation of the model")


@dataclass(frozen=True, eq=False)
class Splittings:
    """First-order splittings of the nonradial modes of a list.

    Attributes
    ----------
    row : (k,) int, rows of the modes in the list; radial modes do not split and are left out
    beta : (k,) splitting over rate where a star rotates as a solid body
    ledoux : (k,) Ledoux constant C = 1 - beta
    splitting : (k,) nHz, nu(m) = nu(0) + m splitting in the inertial frame
    mean_rate : (k,) nHz, the rate as the mode senses it: splitting over beta
    rotation : the `Rotation`
    """

    row: np.ndarray
    beta: np.ndarray
    ledoux: np.ndarray
    splitting: np.ndarray
    mean_rate: np.ndarray
    rotation: Rotation


def rotation_kernel(modes: ModeSet, index: int) -> np.ndarray:
    """Rotation kernel K of one mode on the points of the model, of unit integral.

    Parameters
    ----------
    modes : mode list with eigenfunctions
    index : row of a nonradial mode

    Returns
    -------
    (n,) array
        Per fractional radius: int K dx = 1. See the docstring of this module for the formula.

    Raises
    ------
    InputError
        The mode is radial, there is no such mode, or the list holds no eigenfunctions.
    """
    quadrature = Quadrature(modes)
    mode, at = quadrature.motion_on_points(index), quadrature.points
    wave = quadrature.wave(index)
    if wave.degree == 0:
        raise InputError(f"mode {index} is radial and does not split; choose one of l > 0")
    density = at.rho * at.x**2 * _sense(mode.xi_r, mode.xi_h, wave.ll)
    return density / quadrature.integral(_integrands(quadrature, index)[0])


def ledoux_constant(modes: ModeSet) -> np.ndarray:
    """(m,) Ledoux constant C = 1 - beta of every mode; NaN for radial modes, which do not split.

    Raises
    ------
    InputError
        The list holds no eigenfunctions.
    """
    quadrature = Quadrature(modes)
    out = np.full(len(modes), np.nan)
    for row in np.flatnonzero(modes.degree > 0):
        sense, energy = (quadrature.integral(f) for f in _integrands(quadrature, int(row)))
        out[row] = 1.0 - sense / energy
    return out


def rotational_splitting(modes: ModeSet, rotation: Rotation | float) -> Splittings:
    """Splittings of all nonradial modes of a list to first order in the rate.

    Parameters
    ----------
    modes : mode list with eigenfunctions
    rotation : a `Rotation`, or a solid-body rate Omega/(2 pi) in nHz

    Raises
    ------
    InputError
        The list holds no eigenfunctions.

    Examples
    --------
    >>> import oscsolve
    >>> modes = oscsolve.solve_modes(oscsolve.polytrope(3), [1], (20, 60), unit="sigma2")
    >>> oscsolve.rotational_splitting(modes, 430.0).splitting.round(1).tolist()
    [415.3, 415.6, 416.9]
    """
    if not isinstance(rotation, Rotation):
        rotation = uniform_rotation(float(rotation))
    return split_rows(modes, rotation, np.flatnonzero(modes.degree > 0))


def split_rows(modes: ModeSet, rotation: Rotation, rows: np.ndarray) -> Splittings:
    """Splittings of some nonradial modes, in the order of `rows`."""
    quadrature = Quadrature(modes, breaks=rotation.radius)
    rate = rotation.at(quadrature.x)
    beta, splitting = np.empty(rows.size), np.empty(rows.size)
    for place, row in enumerate(rows):
        sense, energy = _integrands(quadrature, int(row))
        norm = quadrature.integral(energy)
        beta[place] = quadrature.integral(sense) / norm
        splitting[place] = quadrature.integral(sense * rate) / norm
    mean = np.divide(splitting, beta, out=np.full(beta.shape, np.nan), where=beta != 0.0)
    return Splittings(rows, beta, 1.0 - beta, splitting, mean, rotation)


def _integrands(quadrature: Quadrature, index: int) -> tuple[np.ndarray, np.ndarray]:
    """Integrands of the numerator and the denominator of beta at the Gauss points."""
    motion: Motion = quadrature.motion(index)
    wave: Wave = quadrature.wave(index)
    weight = quadrature.at.rho * quadrature.x**2
    energy = weight * (motion.xi_r**2 + wave.ll * motion.xi_h**2)
    return weight * _sense(motion.xi_r, motion.xi_h, wave.ll), energy


def _sense(xi_r: np.ndarray, xi_h: np.ndarray, ll: float) -> np.ndarray:
    """xi_r^2 + L2 xi_h^2 - 2 xi_r xi_h - xi_h^2, as squares so that nothing cancels."""
    return (xi_r - xi_h) ** 2 + (ll - 2.0) * xi_h**2
