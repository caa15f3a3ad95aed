"""Horizontal axes on which the whole of a star can be seen."""

from __future__ import annotations

import numpy as np
from matplotlib.axes import Axes

from oscsolve.errors import InputError
from oscsolve.star.model import StarModel
from oscsolve.units import SOLAR_RADIUS

COORDINATES = ("auto", "radius", "log-radius", "pressure")
#: Central over mean density beyond which a core is lost on a linear axis.
_CONDENSED = 1e4
#: Stars smaller than this are seen best from outside, where their layers are.
_SMALL = 0.05 * SOLAR_RADIUS


class Coordinate:
    """A horizontal axis for functions of radius.

    Parameters
    ----------
    star : the model
    name : one of `COORDINATES`; auto takes log-radius for condensed stars, pressure for white
        dwarfs and the like, and radius otherwise
    """

    def __init__(self, star: StarModel, name: str = "auto") -> None:
        if name not in COORDINATES:
            raise InputError(f"the axis must be one of {', '.join(COORDINATES)}; got {name!r}")
        if name == "auto":
            mean = star.total_mass / (4.0 / 3.0 * np.pi * star.photospheric_radius**3)
            condensed = float(star.density[0]) > _CONDENSED * mean
            small = star.photospheric_radius < _SMALL
            name = "pressure" if small else "log-radius" if condensed else "radius"
        self.name = name
        x, pressure = star.fractional_radius, star.pressure
        self.use = x > 0.0
        if name == "radius" or name == "log-radius":
            values, self.label = x, "r/R"
        else:
            values, self.label = pressure, "P / dyn cm$^{-2}$"
            self.use &= pressure > 0.0
        self.values = np.where(self.use, values, np.nan)

    def at(self, x: np.ndarray, star: StarModel) -> np.ndarray:
        """The coordinate at any fractional radii."""
        known = np.isfinite(self.values)
        r = star.fractional_radius[known]
        if self.name == "pressure":
            return np.exp(np.interp(x, r, np.log(self.values[known])))
        return np.asarray(x, float)

    def dress(self, axes: Axes) -> None:
        """Scale, direction, limits and label of the axis: the centre is always on the left."""
        if self.name != "radius":
            axes.set_xscale("log")
        low, high = np.nanmin(self.values), np.nanmax(self.values)
        if self.name == "radius":
            low = 0.0
        axes.set_xlim((high, low) if self.name == "pressure" else (low, high))
        axes.set_xlabel(self.label)
