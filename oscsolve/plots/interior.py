"""What a mode does inside its star, as figures draw it: displacements, nodes, cavities."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass, fields

import numpy as np
from matplotlib.axes import Axes

from oscsolve.plots.coordinate import Coordinate
from oscsolve.plots.style import FILLS
from oscsolve.seismology.integrals import PointStructure, Quadrature
from oscsolve.seismology.motion import Motion
from oscsolve.star.profile import Structure

#: Amplitudes below this share of the largest are round-off, and so are their zeros.
_NOISE = 1e-9
#: 1 - rho over the mean density inside: stars below this everywhere are of one density.
_UNIFORM = 1e-6
#: Places at which the ends of cavities are looked for, per point of the model.
_FINER = 8


@dataclass(frozen=True, eq=False)
class Trace:
    """A mode along its star, finer than the points of the model.

    Attributes
    ----------
    at : structure at k radii
    xi_r, xi_h : (k,) displacements there, as in `ModeSet`
    """

    at: Structure
    xi_r: np.ndarray
    xi_h: np.ndarray


def trace(quadrature: Quadrature, index: int) -> Trace:
    """Mode `index` at the Gauss points of a star, five between two points of its model."""
    return _trace_of(quadrature, quadrature.motion(index))


def _trace_of(quadrature: Quadrature, motion: Motion) -> Trace:
    return Trace(_layers(quadrature), motion.xi_r.ravel(), motion.xi_h.ravel())


def _layers(quadrature: Quadrature) -> Structure:
    names = [item.name for item in fields(Structure)]
    return Structure(*(getattr(quadrature.at, name).ravel() for name in names))


@dataclass(frozen=True, eq=False)
class Nodes:
    """Zeros of a displacement.

    Attributes
    ----------
    place : (k,) where they are on an axis
    acoustic : (k,) bool, True where the mode turns p-wise there
    """

    place: np.ndarray
    acoustic: np.ndarray


def nodes_of(mode: Trace, degree: int, along: Coordinate) -> Nodes:
    """Where the radial displacement of a mode vanishes.

    p-wise where d(xi_r)/dr xi_h < 0 (Scuflaire 1974, Osaki 1975); in radial modes always.
    """
    use = np.flatnonzero(np.abs(mode.xi_r) > _NOISE * np.max(np.abs(mode.xi_r)))
    a, b = mode.xi_r[use], mode.xi_h[use]
    at, share = _crossings(a)
    place = along.place(mode.at)[use]
    horizontal = b[at] + share * (b[at + 1] - b[at])
    acoustic = (degree == 0) | ((a[at + 1] - a[at]) * horizontal < 0.0)
    return Nodes(place[at] + share * (place[at + 1] - place[at]), acoustic)


def counted_nodes(quadrature: Quadrature, index: int, along: Coordinate) -> Nodes:
    """The nodes that n_p and n_g of a mode count, p-wise and g-wise.

    Those of xi_r, except for l = 1 in full gravity. There the mass inside a radius is displaced as
    a whole, which hides zeros: they are those of xi_r less the mean displacement of that mass
    (Takata 2006), p-wise where sigma2 r^2/c^2 > 2 J^2, J = 1 - 4 pi rho r^3/(3 m). p modes of
    l = 1 have one of them less than n_p.
    """
    wave, motion = quadrature.wave(index), quadrature.motion(index)
    mode = _trace_of(quadrature, motion)
    at = mode.at
    # The mass that Phi' comes from, which that of a file fits to some digits only.
    mass = quadrature.running(4.0 * np.pi * quadrature.at.rho * quadrature.x**2).ravel()
    condensed = 1.0 - 4.0 * np.pi * at.rho * at.x**3 / (3.0 * mass)
    if wave.degree != 1 or not wave.full_gravity or np.all(condensed < _UNIFORM):
        return nodes_of(mode, wave.degree, along)
    dphi, phi = motion.dphi.ravel(), motion.phi.ravel()
    gathered = at.x * (dphi + 4.0 * np.pi * at.rho * mode.xi_r) - phi
    relative = mode.xi_r - at.x**2 * gathered / (3.0 * mass)
    # Between the innermost points the difference is lost in round-off.
    first = quadrature.x.shape[1]
    crossed, share = _crossings(relative[first:])
    crossed += first
    place = along.place(at)
    acoustic = wave.lam * at.x**2 / at.c2 > 2.0 * condensed**2
    where = place[crossed] + share * (place[crossed + 1] - place[crossed])
    return Nodes(where, acoustic[crossed])


def _crossings(values: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """Index below each change of sign, and how far from there to the next one it is."""
    at = np.flatnonzero(np.signbit(values[1:]) != np.signbit(values[:-1]))
    return at, values[at] / (values[at] - values[at + 1])


def cavities(
    at: PointStructure, place: np.ndarray, degree: int, sigma2: float
) -> Iterator[tuple[str, float, float]]:
    """Where a mode travels as a wave, centre outward: kind and both ends of every cavity.

    Parameters
    ----------
    at : structure on the points of a model
    place : (n,) the points on some axis
    degree, sigma2 : of the mode

    Yields
    ------
    (str, float, float)
        "g" where sigma2 is below both N^2 and S_l^2, "p" where it is above both.
    """
    points = np.arange(at.x.size)
    fine = np.linspace(0.0, at.x.size - 1.0, _FINER * (at.x.size - 1) + 1)
    lamb2 = at.lamb2(degree)
    # 1/S^2 is smooth through the centre, where S is infinite.
    inverse = np.divide(1.0, lamb2, out=np.full(at.x.shape, 1e300), where=lamb2 > 0.0)
    n2 = np.interp(fine, points, at.n2)
    slow = np.interp(fine, points, inverse) > 1.0 / sigma2
    kind = np.where((n2 < sigma2) & slow, "p", np.where((n2 > sigma2) & ~slow, "g", ""))
    ends = np.flatnonzero(kind[1:] != kind[:-1])
    starts = np.concatenate(([0], ends + 1))
    stops = np.append(ends, kind.size - 1)
    on_axis = np.interp(fine, points, place)
    for first, last in zip(starts, stops, strict=True):
        if kind[first] and last > first:
            yield str(kind[first]), float(on_axis[first]), float(on_axis[last])


def fill_cavities(
    axes: Axes, at: PointStructure, along: Coordinate, degree: int, sigma2: float
) -> list[str]:
    """Fill the cavities of one mode over the height of the frame; the kinds that there are."""
    kinds = []
    for kind, first, last in cavities(at, along.place(at), degree, sigma2):
        axes.axvspan(first, last, color=FILLS[kind], lw=0.0, zorder=0)
        kinds.append(kind)
    return [kind for kind in FILLS if kind in kinds]
