"""Eigenfunctions: displacements and energy through the star."""

from __future__ import annotations

import numpy as np
from matplotlib.axes import Axes

from oscsolve.plots.coordinate import Coordinate
from oscsolve.plots.propagation import mode_nodes
from oscsolve.plots.style import BUOYANCY, FAINT, G_SHADE, OBSERVED, P_SHADE, SOUND
from oscsolve.pulsation.modeset import ModeSet
from oscsolve.seismology.energy import energy_density
from oscsolve.seismology.integrals import point_structure


def displacement_plot(axes: Axes, modes: ModeSet, index: int, *, coordinate: str = "auto") -> Axes:
    """xi_r and xi_h of a mode, times r sqrt(rho), with the nodes of xi_r and shaded cavities.

    The factor makes squares into energy per radius: without it nothing but the surface is seen.
    Both are scaled by the largest of them.

    Parameters
    ----------
    axes : to draw on
    modes : mode list with eigenfunctions
    index : row of the mode
    coordinate : one of `oscsolve.plots.coordinate.COORDINATES`

    Raises
    ------
    InputError
        The list holds no eigenfunctions, or no such mode.
    """
    eigen, star = modes.eigenfunction(index), modes.star
    across = Coordinate(star, coordinate)
    degree = int(modes.degree[index])
    factor = eigen.radius * np.sqrt(star.density)
    radial = eigen.xi_r * factor
    horizontal = np.sqrt(degree * (degree + 1.0)) * eigen.xi_h * factor
    largest = max(float(np.abs(radial).max()), float(np.abs(horizontal).max())) or 1.0
    _shade(axes, modes, index, across)
    axes.axhline(0.0, color=FAINT, lw=0.7)
    axes.plot(across.values, radial / largest, color=SOUND, label=r"$\xi_r$")
    if degree > 0:
        axes.plot(
            across.values,
            horizontal / largest,
            color=BUOYANCY,
            ls="--",
            label=r"$\sqrt{l(l+1)}\,\xi_h$",
        )
    nodes = mode_nodes(modes, index)
    axes.plot(
        across.at(nodes, star),
        np.zeros(nodes.size),
        "|",
        color=OBSERVED,
        ms=6.0,
        label=r"nodes of $\xi_r$",
    )
    across.dress(axes)
    axes.set_ylabel(r"displacement $\times\; r\sqrt{\rho}$, scaled")
    axes.legend(loc="upper left", bbox_to_anchor=(1.0, 1.0), handletextpad=0.4)
    return axes


def energy_plot(axes: Axes, modes: ModeSet, index: int, *, coordinate: str = "auto") -> Axes:
    """Kinetic energy of a mode per step of the horizontal axis, scaled to an area of one.

    Parameters and errors as of `displacement_plot`.
    """
    across = Coordinate(modes.star, coordinate)
    density = energy_density(modes, index)
    x = modes.star.fractional_radius
    if across.name == "log-radius":
        density, what = density * x, r"$dE/d\ln r$"
    elif across.name == "pressure":
        lnp = np.log(np.where(across.use, modes.star.pressure, np.nan))
        with np.errstate(invalid="ignore", divide="ignore"):
            density = density / np.maximum(-np.gradient(lnp, x), 1e-300)
        what = r"$dE/d\ln P$"
    else:
        what = r"$dE/d(r/R)$"
    _shade(axes, modes, index, across)
    axes.fill_between(across.values, density, color=SOUND, alpha=0.35, lw=0)
    axes.plot(across.values, density, color=SOUND, lw=0.9)
    across.dress(axes)
    axes.set_ylim(bottom=0.0)
    axes.set_ylabel(f"energy, {what}")
    return axes


def _shade(axes: Axes, modes: ModeSet, index: int, across: Coordinate) -> None:
    """Where the mode is a gravity wave, and where a sound wave."""
    at, lam = point_structure(modes.star), float(modes.sigma2[index])
    lamb = at.lamb2(int(modes.degree[index]))
    for inside, shade, name in (
        ((lam < at.n2) & (lam < lamb), G_SHADE, "g cavity"),
        ((lam > at.n2) & (lam > lamb), P_SHADE, "p cavity"),
    ):
        if np.any(inside & across.use):
            axes.fill_between(
                across.values,
                0.0,
                1.0,
                where=inside & across.use,
                transform=axes.get_xaxis_transform(),
                color=shade,
                lw=0,
                zorder=0,
                label=name,
            )
