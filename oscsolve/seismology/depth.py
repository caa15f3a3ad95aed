"""Acoustic depth: how long sound takes from the surface down."""

from __future__ import annotations

import math

import numpy as np
from numpy.polynomial import legendre

from oscsolve.star.model import StarModel
from oscsolve.star.profile import Profile

#: Gauss points between two points of the model.
_GAUSS = 4


def acoustic_depth(star: StarModel) -> np.ndarray:
    """(n,) time in s that sound takes from the outermost point down to each point of the model.

    Gauss quadrature of dr/c between the points. Where pressure vanishes at the outermost point
    the last interval takes 2 h/c of the point h inside it, for c^2 falls linearly there. The
    depth of the innermost point is the acoustic radius where that point is the centre.

    Examples
    --------
    >>> import oscsolve
    >>> star = oscsolve.polytrope(3)
    >>> print(f"{oscsolve.acoustic_depth(star)[0]:.1f} s")
    4043.4 s
    """
    profile = Profile(star)
    x, interval = profile.x, profile.interval
    points, weights = legendre.leggauss(_GAUSS)
    h = np.diff(x)[interval]
    place = x[interval][:, None] + 0.5 * (1.0 + points) * h[:, None]
    at = profile.at(place, np.broadcast_to(interval[:, None], place.shape))
    steps = np.zeros(x.size - 1)
    steps[interval] = 0.5 * h * np.sum(weights / np.sqrt(at.c2), axis=1)
    if profile.has_edge:
        top, last = profile.outermost()
        sound = math.sqrt(float(profile.at(np.array(top), np.array(last)).c2))
        steps[-1] = 2.0 * (x[-1] - top) / sound
    depth = np.append(np.cumsum(steps[::-1])[::-1], 0.0)[x.size - star.radius.size :]
    return depth * 1e6 / (2.0 * math.pi * star.nu_dynamical)
