"""A second opinion on listed modes, by shooting: it shares only the profile with the first.

Each listed mode is looked for anew with the equations of `oscsolve.pulsation.dziembowski`: regular
solutions from the centre and solutions that meet the surface conditions are integrated towards
each other, and the determinant of all of them, at one fitting point, vanishes at a mode. Only the
planes that the solutions span matter, so that they may be made orthogonal on the way, and the
determinant is divided by the areas that they span: it lies between -1 and 1.

The rate at which the determinant changes with the trial value is inverse to the squared amplitude
of the mode, as a share of its energy, at the fitting point. One pair of full integrations thus
shows where the mode lives, and the point of the model with most of its energy per ln r becomes the
fitting point: elsewhere, deep in an evanescent zone, the determinant is a step and not a line.
"""

from __future__ import annotations

import os
from collections.abc import Callable
from concurrent.futures import ThreadPoolExecutor
from dataclasses import dataclass

import numpy as np
from scipy.optimize import brentq

from oscsolve.pulsation.dziembowski import (
    Layers,
    central_plane,
    make_trial,
    pack_layers,
    surface_plane,
)
from oscsolve.pulsation.integrator import Accuracy, integrate
from oscsolve.pulsation.modeset import ModeSet
from oscsolve.star.model import StarModel
from oscsolve.star.profile import Profile

#: Two integrations of each mode: the second is reported, their difference is its error estimate.
_COARSE, _FINE = Accuracy(1e-10, 1), Accuracy(1e-12, 2)
#: First bracket of a root, relative to lam: wide beside round-off, narrow beside any spacing.
_BRACKET = 1e-9
#: A bracket counts as straight where its width squared is less than this times lam and spacing.
_CURVATURE = 1e-14
#: Round-off of lam, relative; measured on the exact spectra of the uniform sphere.
ROUND_OFF = 1e-13
#: Modes are looked for up to this relative distance, and not beyond the middle to a neighbour.
_FARTHEST = 1e-2


@dataclass(frozen=True, eq=False)
class SecondOpinion:
    """Frequencies found by shooting beside those of a mode list, one entry a mode.

    Attributes
    ----------
    nu : (m,) uHz; NaN where no mode was found near the listed one
    nu_error : (m,) uHz, numerical error estimate
    difference : (m,) uHz, `nu` minus the listed frequency
    allowed : (m,) uHz, the largest difference that both error estimates, round-off included, allow
    """

    nu: np.ndarray
    nu_error: np.ndarray
    difference: np.ndarray
    allowed: np.ndarray

    @property
    def agrees(self) -> np.ndarray:
        """(m,) bool, True where the two solvers agree as closely as they claim."""
        return np.abs(self.difference) <= self.allowed


def second_opinion(
    star: StarModel, modes: ModeSet, progress: Callable[[int, int, str], None] | None = None
) -> SecondOpinion:
    """Every listed mode found again by an independent method.

    Parameters
    ----------
    star : the model that the modes are said to be of
    modes : the list; its options say which gravity and which surface
    progress : called as ``progress(done, total, what)`` between modes

    Returns
    -------
    SecondOpinion
    """
    profile = Profile(star)
    layers = pack_layers(profile)
    surface, cowling = modes.options.get("surface"), modes.options.get("gravity") == "cowling"
    lam, error = _listed_lam(star, modes)
    low, high = _fences(modes.degree, lam)

    def find(i: int) -> tuple[float, float]:
        matching = Matching(profile, layers, int(modes.degree[i]), cowling, surface == "isothermal")
        return matching.find(float(lam[i]), float(error[i]), (float(low[i]), float(high[i])))

    found = np.full((lam.size, 2), np.nan)
    with ThreadPoolExecutor(max_workers=os.cpu_count() or 1) as pool:
        for i, pair in enumerate(pool.map(find, range(lam.size))):
            found[i] = pair
            if progress is not None:
                progress(i + 1, lam.size, "second opinion")
    scale = star.nu_dynamical
    nu = np.copysign(np.sqrt(np.abs(found[:, 0])), found[:, 0]) * scale
    tiny = np.maximum(np.sqrt(np.abs(found[:, 0])), np.sqrt(found[:, 1]))
    nu_error = 0.5 * found[:, 1] / tiny * scale
    return SecondOpinion(
        nu=nu,
        nu_error=nu_error,
        difference=nu - modes.nu,
        allowed=modes.nu_error + nu_error,
    )


class Matching:
    """The normalised determinant of one degree as a function of lam, and its roots."""

    def __init__(
        self, profile: Profile, layers: Layers, degree: int, cowling: bool, isothermal: bool
    ) -> None:
        self.layers, self.degree, self.cowling = layers, degree, cowling
        self.isothermal, self.has_edge = isothermal, profile.has_edge
        self.last = layers.polynomials.left.size - 1
        right = layers.polynomials.right
        rho = profile.at(right, profile.interval).rho
        # Energy per ln r of a mode is this times |u|^2, u as in `dziembowski`.
        self.log_weight = np.log(rho) + (2 * degree + 1 if degree > 0 else 5) * np.log(right)

    def at(self, lam: float, accuracy: Accuracy, point: int | None = None) -> np.ndarray:
        """Determinant at the right ends of all intervals, or at that of interval `point` alone.

        Returns
        -------
        (i,) array, NaN where it was not asked for; or (1,)
        """
        trial = make_trial(self.degree, self.cowling, lam)
        start, u = central_plane(self.layers, trial)
        top = surface_plane(self.layers, trial, self.isothermal, self.has_edge)
        inner = np.full((self.last + 1, *u.shape), np.nan)
        outer = inner.copy()
        to = self.last if point is None else point
        back = 1 if point is None else point + 1
        good = integrate(self.layers, trial, 0, to, 1, start, accuracy, u, inner)
        if back > self.last:
            outer[self.last] = top
        else:
            good &= integrate(self.layers, trial, self.last, back, -1, 1.0, accuracy, top, outer)
        if not good:
            return np.full(1 if point is not None else self.last + 1, np.nan)
        if point is not None:
            inner, outer = inner[point : point + 1], outer[point : point + 1]
        areas = _area(inner) * _area(outer)
        return np.linalg.det(np.concatenate((inner, outer), axis=2)) / areas

    def find(self, lam: float, error: float, fence: tuple[float, float]) -> tuple[float, float]:
        """The mode next to `lam` and its error estimate; NaN where there is none in the fence."""
        scale = max(abs(lam), error)
        narrow = min(_BRACKET * scale, (_CURVATURE * scale * (fence[1] - fence[0])) ** 0.5)
        half = max(4.0 * error, narrow)
        first = tuple(self.at(end, _COARSE) for end in _around(lam, half, fence))
        with np.errstate(divide="ignore"):
            energy = self.log_weight - np.log(np.abs(first[1] - first[0]))
        energy[~np.isfinite(energy)] = -np.inf
        if np.all(energy == -np.inf):
            return np.nan, np.nan
        point = int(np.argmax(energy))

        def root(lam: float, half: float, accuracy: Accuracy) -> float:
            def value(trial: float) -> float:
                return float(self.at(trial, accuracy, point)[0])

            return _root(value, lam, half, narrow, fence)

        coarse = root(lam, half, _COARSE)
        fine = root(coarse, narrow, _FINE)
        return fine, abs(fine - coarse) + ROUND_OFF * abs(fine)


def _around(lam: float, half: float, fence: tuple[float, float]) -> tuple[float, float]:
    return max(lam - half, fence[0]), min(lam + half, fence[1])


def _root(
    value: Callable[[float], float],
    lam: float,
    half: float,
    narrow: float,
    fence: tuple[float, float],
) -> float:
    """Root of `value` nearest to `lam`, NaN where there is none in the fence.

    Brackets about `lam` are widened until the sign changes; in one as narrow as `narrow` the
    function is straight and the root is read off.
    """
    while np.isfinite(lam):
        a, b = _around(lam, half, fence)
        left, right = value(a), value(b)
        if left * right <= 0.0 and left != right:
            if half <= narrow:
                return a - left * (b - a) / (right - left)
            lam, half = float(brentq(value, a, b, xtol=0.1 * narrow)), narrow
        elif not np.isfinite(left * right) or (a, b) == fence:
            break
        else:
            half *= 8.0
    return np.nan


def _area(planes: np.ndarray) -> np.ndarray:
    """(k,) length of one column or area of two, of (k, n, m) planes."""
    gram = np.swapaxes(planes, 1, 2) @ planes
    return np.sqrt(np.linalg.det(gram))


def _listed_lam(star: StarModel, modes: ModeSet) -> tuple[np.ndarray, np.ndarray]:
    """lam and its error from the listed frequencies, which are what is on trial."""
    root = modes.nu / star.nu_dynamical
    error = modes.nu_error / star.nu_dynamical
    return np.copysign(root**2, root), 2.0 * np.abs(root) * error + error**2


def _fences(degree: np.ndarray, lam: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """Limits within which each mode is looked for: the middle to the next one of its degree."""
    low, high = lam - _FARTHEST * np.abs(lam), lam + _FARTHEST * np.abs(lam)
    same = degree[1:] == degree[:-1]
    middle = 0.5 * (lam[1:] + lam[:-1])
    low[1:] = np.where(same, np.maximum(low[1:], middle), low[1:])
    high[:-1] = np.where(same, np.minimum(high[:-1], middle), high[:-1])
    return low, high
