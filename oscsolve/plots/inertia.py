"""Inertia against frequency, by degree."""

from __future__ import annotations

from typing import Any

import numpy as np
from matplotlib.axes import Axes

from oscsolve.errors import InputError
from oscsolve.plots.style import (
    colour,
    degree_key,
    key_above,
    looking,
    marker,
    marker_size,
    plain_ticks,
)
from oscsolve.pulsation.modeset import ModeSet

#: Lists whose frequencies span more than this factor get a logarithmic axis.
_WIDE = 25.0


@looking
def inertia_plot(axes: Axes, modes: ModeSet) -> Axes:
    """Normalised inertia of every mode; low means easy to see.

    Parameters
    ----------
    axes : to draw on
    modes : mode list; the inertia is relative to the mass and to the total displacement at the
        photosphere, see `oscsolve.ModeSet`

    Raises
    ------
    InputError
        The list holds no oscillating modes.

    Examples
    --------
    >>> import oscsolve
    >>> from oscsolve import plots
    >>> modes = oscsolve.solve_modes(oscsolve.polytrope(3), [0], (20, 300), unit="sigma2")
    >>> figure = plots.make_figure(lambda axes: plots.inertia_plot(axes, modes))
    >>> figure.axes[0].get_yscale()
    'log'
    """
    use = modes.nu > 0.0
    if not np.any(use):
        raise InputError("the list holds no oscillating modes")
    handles: list[Any] = []
    for degree in np.unique(modes.degree[use]):
        own = np.flatnonzero(use & (modes.degree == degree))
        axes.plot(
            modes.nu[own],
            modes.inertia[own],
            color=colour(degree),
            marker=marker(degree),
            ms=marker_size(degree, int(np.count_nonzero(use))),
            mew=0.0,
            lw=0.6,
            label=rf"$\ell={degree}$",
            # Few radial modes among many others stay on top.
            zorder=3.0 - 0.01 * degree,
        )
        handles.append(degree_key(degree))
    axes.set_yscale("log")
    nu = modes.nu[use]
    if nu.max() > _WIDE * nu.min():
        axes.set_xscale("log")
        plain_ticks(axes.xaxis)
    axes.set_xlabel(r"frequency ($\mu$Hz)")
    axes.set_ylabel("normalised inertia")
    key_above(axes, handles)
    return axes
