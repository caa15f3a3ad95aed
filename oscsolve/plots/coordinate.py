"""Horizontal axes on which the whole of a star can be seen, the centre at the left."""

from __future__ import annotations

from collections.abc import Callable
from typing import NamedTuple

import numpy as np
from matplotlib.axes import Axes

from oscsolve.errors import InputError
from oscsolve.plots.style import plain_ticks
from oscsolve.seismology.integrals import PointStructure, point_structure
from oscsolve.star.model import StarModel
from oscsolve.star.profile import Structure

COORDINATES = ("auto", "radius", "log-radius", "mass", "pressure")
#: Where half of int N dr/r lies inside the first radius the core needs room; where it lies outside
#: the second, the layers below the surface do.
_CORE, _RIND = 0.05, 0.8
#: Logarithmic axes of radius begin half a decade below where this share of int N dr/r is inside.
_FIRST_SHARE, _FIRST_FACTOR = 0.01, 0.3
#: Axes of pressure end at this share of the central one where the star has a true edge.
_EDGE_PRESSURE = 1e-12

Layers = PointStructure | Structure


class Coordinate(NamedTuple):
    """A coordinate of the layers of a star.

    Attributes
    ----------
    name : one of `COORDINATES` but auto
    label : of the axis, with its unit
    per : what densities along it are given per, so that the area under them is a share
    logarithmic : the axis is
    place : layers to values on the axis
    stretch : layers to dx/d(coordinate), without sign; of its logarithm where the axis is
        logarithmic
    """

    name: str
    label: str
    per: str
    logarithmic: bool
    place: Callable[[Layers], np.ndarray]
    stretch: Callable[[Layers], np.ndarray]


def _pressure(at: Layers) -> np.ndarray:
    return at.pressure if isinstance(at, PointStructure) else at.rho * at.w


def _scale_height(at: Layers) -> np.ndarray:
    weight = at.rho * at.g
    return np.divide(_pressure(at), weight, out=np.zeros_like(at.x), where=weight > 0.0)


def _per_mass(at: Layers) -> np.ndarray:
    shell = 4.0 * np.pi * at.rho * at.x**2
    return np.divide(1.0, shell, out=np.zeros_like(at.x), where=shell > 0.0)


_RADIUS = Coordinate(
    "radius", "$r/R$", "r/R", False, lambda at: at.x, lambda at: np.ones_like(at.x)
)
_LOG_RADIUS = Coordinate("log-radius", "$r/R$", r"\ln r", True, lambda at: at.x, lambda at: at.x)
_MASS = Coordinate("mass", "$m/M$", "m/M", False, lambda at: at.g * at.x**2, _per_mass)


def coordinate_of(star: StarModel, name: str = "auto") -> Coordinate:
    """The coordinate of some name, or the one that shows most of a star.

    Parameters
    ----------
    star : to be drawn
    name : one of `COORDINATES`. auto takes log-radius where half of int N dr/r lies inside
        0.05 R, as in giants, pressure where it lies outside 0.8 R, as in white dwarfs, else radius.

    Raises
    ------
    InputError
        The name is unknown.
    """
    if name not in COORDINATES:
        raise InputError(f"the axis must be one of {', '.join(COORDINATES)}; got {name!r}")
    if name == "auto":
        name = _suited(star)
    for item in (_RADIUS, _LOG_RADIUS, _MASS):
        if item.name == name:
            return item
    mass, radius = star.total_mass, star.photospheric_radius
    unit = star.gravitational_constant * mass**2 / radius**4
    label, per = r"$P$ (dyn cm$^{-2}$)", r"\ln P"
    return Coordinate("pressure", label, per, True, lambda at: _pressure(at) * unit, _scale_height)


def _suited(star: StarModel) -> str:
    x, phase = _buoyant_phase(star)
    if x.size < 2 or phase[-1] <= 0.0:
        return "radius"
    half = float(np.interp(0.5, phase / phase[-1], x))
    return "log-radius" if half < _CORE else "pressure" if half > _RIND else "radius"


def _buoyant_phase(star: StarModel) -> tuple[np.ndarray, np.ndarray]:
    """Radii above the centre, up to the photosphere, and int N dr/r up to there."""
    at = point_structure(star)
    use = (at.x > 0.0) & (at.x <= 1.0)
    x, buoyancy = at.x[use], np.sqrt(np.maximum(at.n2[use], 0.0))
    steps = 0.5 * (buoyancy[1:] + buoyancy[:-1]) * np.diff(np.log(x))
    return x, np.concatenate(([0.0], np.cumsum(steps)))


def dress_coordinate(axes: Axes, star: StarModel, along: Coordinate) -> None:
    """Label, scale and limits of the horizontal axis."""
    axes.set_xlabel(along.label)
    place = along.place(point_structure(star))
    if not along.logarithmic:
        axes.set_xlim(0.0, float(place.max()))
        return
    axes.set_xscale("log")
    top = float(place.max())
    if along.name == "pressure":
        axes.set_xlim(top, max(float(place[-1]), _EDGE_PRESSURE * top))
    else:
        axes.set_xlim(_innermost(star), top)
    plain_ticks(axes.xaxis)


def _innermost(star: StarModel) -> float:
    """Where an axis of log radius begins: below the layers that hold gravity waves."""
    x, phase = _buoyant_phase(star)
    start = float(np.interp(_FIRST_SHARE * phase[-1], phase, x)) if phase[-1] > 0.0 else 0.01
    return max(_FIRST_FACTOR * start, float(x[0]))
