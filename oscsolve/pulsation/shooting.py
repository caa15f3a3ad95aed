"""A second opinion on listed modes, by shooting: it shares only the profile with the first.

Each listed mode is looked for anew with the equations of `oscsolve.pulsation.dziembowski`: regular
solutions from the centre and solutions that meet the surface conditions are integrated towards
each other. At a mode they have one in common: the planes that they span meet at angle zero, where
the determinant of all of them changes sign. Only these planes matter, so that solutions may be
made orthogonal on the way. The root is sought in the sine of the smallest angle between them.

How fast that sine changes with the trial value is inverse to the share that the fitting point has
in the energy of the mode. A pair of full integrations therefore shows where the mode lives: where
the sine is smallest. Elsewhere, deep in an evanescent zone, it is a step and not a line.
"""

from __future__ import annotations

import os
from collections.abc import Callable
from concurrent.futures import ThreadPoolExecutor
from dataclasses import dataclass, replace

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
from oscsolve.pulsation.modeset import ModeSet, agree, signed_square
from oscsolve.star.findings import Finding
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
#: Modes that a finding names one by one.
_MOST_NAMED = 10


@dataclass(frozen=True, eq=False)
class SecondOpinion:
    """Frequencies found by shooting beside those of a mode list, one entry a mode.

    Attributes
    ----------
    nu : (m,) uHz; NaN where no mode was found near the listed one
    nu_error : (m,) uHz, numerical error estimate
    difference : (m,) uHz, `nu` minus the listed frequency
    allowed : (m,) uHz, the sum of both error estimates, round-off included
    agrees : (m,) bool, True where the squares of the frequencies differ by no more than allowed
    """

    nu: np.ndarray
    nu_error: np.ndarray
    difference: np.ndarray
    allowed: np.ndarray
    agrees: np.ndarray


def second_opinion(
    star: StarModel,
    modes: ModeSet,
    progress: Callable[[int, int, str], None] | None = None,
    threads: int | None = None,
) -> SecondOpinion:
    """Every listed mode found again by an independent method.

    Parameters
    ----------
    star : the model that the modes are said to be of
    modes : the list; its options say which gravity and which surface
    progress : called as ``progress(done, total, what)`` between modes
    threads : modes looked for side by side; None: one for each core

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
    with ThreadPoolExecutor(max_workers=threads or os.cpu_count() or 1) as pool:
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
        agrees=agree(modes.nu, modes.nu_error, nu, nu_error),
    )


def with_second_opinion(
    modes: ModeSet,
    progress: Callable[[int, int, str], None] | None = None,
    threads: int | None = None,
) -> ModeSet:
    """The list with the columns of a second opinion, and a finding where they differ."""
    second = second_opinion(modes.star, modes, progress, threads)
    findings = modes.findings
    astray = np.flatnonzero(~second.agrees)
    if astray.size:
        findings = (*findings, _disagreement(modes, second, astray))
    return replace(modes, nu_second=second.nu, nu_second_error=second.nu_error, findings=findings)


def _disagreement(modes: ModeSet, second: SecondOpinion, astray: np.ndarray) -> Finding:
    names = [f"l = {modes.degree[i]}, n = {modes.order[i]}" for i in astray[:_MOST_NAMED]]
    if astray.size > _MOST_NAMED:
        names.append(f"and {astray.size - _MOST_NAMED} more")
    relative = np.abs(second.difference[astray] / modes.nu[astray])
    size = float(np.max(relative)) if np.all(np.isfinite(relative)) else None
    lost = int(np.sum(np.isnan(relative)))
    how = f"by up to {np.nanmax(relative):.1e}" if lost < astray.size else ""
    if lost:
        how += f"{', ' if how else ''}{lost} not found"
    return Finding(
        "defect",
        "second-opinion-differs",
        f"the second opinion differs in {astray.size} of {len(modes)} modes by more than both "
        f"error estimates allow ({how}): {'; '.join(names)}",
        "do not use these frequencies; report the model and the options to the developers",
        size=size,
    )


class Matching:
    """How badly the two sides of one degree match as a function of lam, and the roots of that."""

    def __init__(
        self, profile: Profile, layers: Layers, degree: int, cowling: bool, isothermal: bool
    ) -> None:
        self.layers, self.degree, self.cowling = layers, degree, cowling
        self.isothermal, self.has_edge = isothermal, profile.has_edge
        self.last = layers.polynomials.left.size - 1

    def at(self, lam: float, accuracy: Accuracy, point: int | None = None) -> np.ndarray:
        """The mismatch at the right ends of all intervals, or at that of interval `point` alone.

        Returns
        -------
        (i,) array, or (1,) where a point was given; NaN at the end of the first interval in the
        former case, and where integration failed
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
        else:
            inner, outer = inner[1:], outer[1:]
        mismatch = _smallest_sine(inner, outer)
        return mismatch if point is not None else np.append(np.nan, mismatch)

    def find(self, lam: float, error: float, fence: tuple[float, float]) -> tuple[float, float]:
        """The mode next to `lam` and its error estimate; NaN where there is none in the fence."""
        scale = self._scale(lam, error)
        narrow = min(_BRACKET * scale, (_CURVATURE * scale * (fence[1] - fence[0])) ** 0.5)
        half = max(4.0 * error, narrow)
        first = [self.at(end, _COARSE) for end in _around(lam, half, fence)]
        largest = np.max(np.abs(first), axis=0)
        if np.all(np.isnan(largest)):
            return np.nan, np.nan
        point = int(np.nanargmin(largest))

        def root(lam: float, half: float, accuracy: Accuracy) -> float:
            def value(trial: float) -> float:
                return float(self.at(trial, accuracy, point)[0])

            return _root(value, lam, half, narrow, fence)

        coarse = root(lam, half, _COARSE)
        fine = root(coarse, narrow, _FINE)
        return fine, abs(fine - coarse) + ROUND_OFF * self._scale(fine, 0.0)

    def _scale(self, lam: float, error: float) -> float:
        """What round-off of lam is relative to: radial modes can be neutral, lam = 0, where terms
        of the size of the squared dynamical frequency cancel."""
        return max(abs(lam), error, 1.0 if self.degree == 0 else 0.0)


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


def _smallest_sine(inner: np.ndarray, outer: np.ndarray) -> np.ndarray:
    """(k,) sine of the smallest angle between planes, with the sign of their determinant.

    The determinant of two orthonormal pairs of columns is the product of the sines of the two
    angles between the planes; the sum of the squared cosines is the trace of a product of Gram
    matrices, and both angles follow.
    """
    turned = np.swapaxes(inner, 1, 2)
    own, other, cross = turned @ inner, np.swapaxes(outer, 1, 2) @ outer, turned @ outer
    determinant = np.linalg.det(np.concatenate((inner, outer), axis=2))
    determinant /= np.sqrt(np.linalg.det(own) * np.linalg.det(other))
    if inner.shape[2] == 1:
        return determinant
    product = np.linalg.solve(own, cross) @ np.linalg.solve(other, np.swapaxes(cross, 1, 2))
    total = 2.0 - np.trace(product, axis1=1, axis2=2)
    total = np.maximum(total, 2.0 * np.abs(determinant))
    # The squared sines are the roots of z^2 - total z + determinant^2.
    larger = 0.5 * (total + np.sqrt(total**2 - 4.0 * determinant**2))
    return determinant / np.sqrt(np.maximum(larger, 1e-300))


def _listed_lam(star: StarModel, modes: ModeSet) -> tuple[np.ndarray, np.ndarray]:
    """lam and its error from the listed frequencies, which are what is on trial."""
    return signed_square(modes.nu / star.nu_dynamical, modes.nu_error / star.nu_dynamical)


def _fences(degree: np.ndarray, lam: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """Limits within which each mode is looked for: the middle to the next one of its degree."""
    reach = _FARTHEST * np.maximum(np.abs(lam), degree == 0)
    low, high = lam - reach, lam + reach
    same = degree[1:] == degree[:-1]
    middle = 0.5 * (lam[1:] + lam[:-1])
    low[1:] = np.where(same, np.maximum(low[1:], middle), low[1:])
    high[:-1] = np.where(same, np.minimum(high[:-1], middle), high[:-1])
    return low, high
