"""Eigenfunctions: displacements and energy through the star."""

from __future__ import annotations

from typing import Any

import numpy as np
from matplotlib.axes import Axes
from matplotlib.patches import Patch

from oscsolve.plots.coordinate import coordinate_of, dress_coordinate
from oscsolve.plots.interior import Trace, fill_cavities, nodes_of, trace
from oscsolve.plots.propagation import node_key
from oscsolve.plots.style import FILLS, SOFT, colour, key_above, line, looking, mark_zero, thinned
from oscsolve.pulsation.modeset import ModeSet
from oscsolve.seismology.integrals import Quadrature


@looking
def displacement_plot(axes: Axes, modes: ModeSet, index: int, *, coordinate: str = "auto") -> Axes:
    """xi_r and sqrt(l(l+1)) xi_h of a mode, with the nodes of xi_r and filled cavities.

    Both are times r sqrt(rho), which makes their squares add up to the energy per radius: without
    it nothing but the surface is seen. They are scaled by the largest value.

    Parameters
    ----------
    axes : to draw on
    modes : mode list with eigenfunctions
    index : row of the mode
    coordinate : one of `oscsolve.plots.COORDINATES`

    Raises
    ------
    InputError
        The list holds no eigenfunctions, or no such mode.

    Examples
    --------
    >>> import oscsolve
    >>> from oscsolve import plots
    >>> modes = oscsolve.solve_modes(oscsolve.polytrope(3), [1], (20, 60), unit="sigma2")
    >>> figure = plots.make_figure(lambda axes: plots.displacement_plot(axes, modes, 0))
    >>> figure.axes[0].get_xlabel()
    '$r/R$'
    """
    quadrature, mode, degree = _mode(modes, index)
    along = coordinate_of(modes.star, coordinate)
    place = along.place(mode.at)
    radial, horizontal = _amplitudes(mode, degree)
    largest = max(float(np.abs(radial).max()), float(np.abs(horizontal).max())) or 1.0
    dress_coordinate(axes, modes.star, along)
    kinds = fill_cavities(axes, quadrature.points, along, degree, float(modes.sigma2[index]))
    mark_zero(axes)
    handles: list[Any] = []
    if degree > 0:
        text = r"$\sqrt{\ell(\ell+1)}\,\xi_h$"
        handles += axes.plot(place, horizontal / largest, color=SOFT, lw=0.8, label=text)
    handles[:0] = axes.plot(
        place, radial / largest, color=colour(degree), lw=1.2, label=r"$\xi_r$", zorder=3
    )
    nodes = nodes_of(mode, degree, along)
    for acoustic in (True, False):
        x = nodes.place[nodes.acoustic == acoustic]
        own = colour(degree)
        dots: dict[str, Any] = {"mfc": own if acoustic else "white", "mec": own, "mew": 0.6}
        axes.plot(x, np.zeros(x.size), "o", ms=3.0, ls="none", zorder=4, **dots)
        if x.size:
            handles.append(node_key(acoustic))
    axes.set_ylim(-1.08, 1.08)
    axes.set_ylabel(r"displacement $\times\;r\sqrt{\rho}$")
    key_above(axes, handles + [Patch(color=FILLS[kind], label=f"{kind} cavity") for kind in kinds])
    return axes


@looking
def energy_plot(axes: Axes, modes: ModeSet, index: int, *, coordinate: str = "auto") -> Axes:
    """Kinetic energy of a mode per step of the horizontal axis, and the share of it inside.

    Parameters
    ----------
    axes : to draw on
    modes : mode list with eigenfunctions
    index : row of the mode
    coordinate : one of `oscsolve.plots.COORDINATES`

    Raises
    ------
    InputError
        The list holds no eigenfunctions, or no such mode.

    Examples
    --------
    >>> import oscsolve
    >>> from oscsolve import plots
    >>> modes = oscsolve.solve_modes(oscsolve.polytrope(3), [1], (20, 60), unit="sigma2")
    >>> figure = plots.make_figure(lambda axes: plots.energy_plot(axes, modes, 0))
    >>> figure.axes[0].get_ylabel()
    'energy per $r/R$'
    """
    quadrature, mode, degree = _mode(modes, index)
    along = coordinate_of(modes.star, coordinate)
    place = along.place(mode.at)
    radial, horizontal = _amplitudes(mode, degree)
    energy = (radial**2 + horizontal**2).reshape(quadrature.x.shape)
    total = quadrature.integral(energy)
    density = energy.ravel() * along.stretch(mode.at) / total
    dress_coordinate(axes, modes.star, along)
    fill_cavities(axes, quadrature.points, along, degree, float(modes.sigma2[index]))
    own = colour(degree)
    across = np.log(place) if along.logarithmic else place
    keep = thinned(across / np.ptp(across), density / density.max())
    axes.fill_between(place[keep], density[keep], color=own, alpha=0.25, lw=0.0, zorder=2)
    axes.plot(place, density, color=own, lw=0.9, zorder=3)
    axes.set_ylim(0.0, 1.06 * float(density.max()))
    axes.set_ylabel(f"energy per ${along.per}$")
    draw_share(axes, place, quadrature.running(energy).ravel() / total)
    return axes


def draw_share(axes: Axes, place: np.ndarray, inside: np.ndarray) -> Axes:
    """The share of something that is inside a place, against an axis of its own at the right."""
    beside = axes.twinx()
    beside.plot(place, inside, color=SOFT, lw=0.9, ls=line(1), label="_share")
    beside.set_ylim(0.0, 1.06)
    beside.set_ylabel("share inside (dashed)", color=SOFT)
    beside.spines["right"].set_visible(True)
    beside.tick_params(axis="y", which="both", colors=SOFT)
    return beside


def _mode(modes: ModeSet, index: int) -> tuple[Quadrature, Trace, int]:
    # Asked first, for it knows what is wrong with an index.
    modes.eigenfunction(index)
    quadrature = Quadrature(modes)
    return quadrature, trace(quadrature, index), int(modes.degree[index])


def _amplitudes(mode: Trace, degree: int) -> tuple[np.ndarray, np.ndarray]:
    """Displacements whose squares are energy per radius."""
    factor = mode.at.x * np.sqrt(mode.at.rho)
    return factor * mode.xi_r, factor * np.sqrt(degree * (degree + 1.0)) * mode.xi_h
