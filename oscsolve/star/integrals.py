"""Integrals over the whole star, and the asymptotic spacings of modes that follow from them."""

from __future__ import annotations

import math
from collections.abc import Callable

import numpy as np
from numpy.polynomial import legendre

from oscsolve.star.model import StarModel
from oscsolve.star.profile import Profile, Structure

#: Gauss points in each interval between two points of the model.
_GAUSS = 4
#: dln rho/dlnP - 1/Gamma1 below this is round-off of a neutral stratification.
_NEUTRAL = 1e-13


def acoustic_radius(profile: Profile) -> float:
    """Time that sound takes from the centre to the outermost point, sqrt(R^3/(G M)).

    NaN if the columns contradict each other so much that no sound speed lies between two points.

    Notes
    -----
    int dr/c. Where pressure vanishes at the outermost point, c^2 falls linearly towards it, and
    the last interval, which the profile does not hold, takes 2 h/c of the point h inside it.
    """
    total = _integral(profile, lambda at: 1.0 / np.sqrt(at.c2))
    if profile.has_edge:
        at, h = _before_edge(profile)
        total += 2.0 * h / math.sqrt(float(at.c2))
    return total


def buoyancy_integral(profile: Profile, outer: float = 1.0) -> float:
    """int N dr/r over the layers inside x = `outer` where N^2 > 0, sqrt(G M/R^3).

    Notes
    -----
    N^2 grows like 1/h towards an edge, so the last interval holds 2 h N/r. All stable layers
    count, whether convective ones part them or not. Where derived buoyancy scatters about zero,
    as in convective zones of poor files, that scatter counts too.
    """
    total = _integral(profile, lambda at: _buoyancy(at) / at.x * (at.x <= outer))
    if profile.has_edge and outer >= 1.0:
        at, h = _before_edge(profile)
        total += 2.0 * h * float(_buoyancy(at) / at.x)
    return total


def _buoyancy(at: Structure) -> np.ndarray:
    """N where the stratification is stable, else 0."""
    return np.sqrt(np.where(at.n2 > _NEUTRAL * at.g**2 / at.w, at.n2, 0.0))


def large_separation(star: StarModel, profile: Profile | None = None) -> float:
    """Asymptotic large separation of p modes in uHz, [2 int dr/c]^-1 (Tassoul 1980).

    The integral runs to the outermost point: sound is turned back where the pressure scale
    height falls below its wavelength, which for high orders is in the atmosphere. Leaving the
    atmosphere of a solar model out makes the separation 2 percent larger.
    """
    radius = acoustic_radius(profile or Profile(star))
    return 2.0 * math.pi * star.nu_dynamical / (2.0 * radius)


def period_spacing(star: StarModel, degree: int, profile: Profile | None = None) -> float:
    """Asymptotic period spacing of g modes in s; infinite where nothing is stably stratified.

    Notes
    -----
    2 pi^2 / (sqrt(l(l+1)) int N dr/r) (Tassoul 1980), see `buoyancy_integral`.
    """
    buoyancy = buoyancy_integral(profile or Profile(star))
    if buoyancy == 0.0 or degree == 0:
        return math.inf
    dynamical = 2.0 * math.pi * star.nu_dynamical * 1e-6
    return 2.0 * math.pi**2 / (math.sqrt(degree * (degree + 1)) * buoyancy * dynamical)


def acoustic_cutoff(profile: Profile) -> float:
    """Acoustic cut-off c/(2 H) of the outermost layer, sqrt(G M/R^3); H is its scale height.

    Sound above it escapes through an isothermal layer (Lamb 1909).
    """
    x, interval = profile.outermost()
    at = profile.at(np.array(x), np.array(interval))
    return float(np.sqrt(at.c2) * at.g / (2.0 * at.w))


def _integral(profile: Profile, integrand: Callable[[Structure], np.ndarray]) -> float:
    """Gauss quadrature in every interval of the profile."""
    points, weights = legendre.leggauss(_GAUSS)
    left, h = profile.x[profile.interval], np.diff(profile.x)[profile.interval]
    x = left + 0.5 * (1.0 + points)[:, None] * h
    at = profile.at(x, np.broadcast_to(profile.interval, x.shape))
    with np.errstate(invalid="ignore", divide="ignore"):
        return float(np.sum(0.5 * weights[:, None] * h * integrand(at)))


def _before_edge(profile: Profile) -> tuple[Structure, float]:
    """Structure at the last point inside the edge, and its distance from the edge."""
    x, interval = profile.outermost()
    return profile.at(np.array(x), np.array(interval)), float(profile.x[-1]) - x
