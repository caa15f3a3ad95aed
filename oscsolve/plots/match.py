"""Observed and corrected frequencies, folded with the large separation."""

from __future__ import annotations

from typing import Any

import numpy as np
from matplotlib.axes import Axes
from matplotlib.lines import Line2D

from oscsolve.plots.echelle import (
    draw_observed,
    dress_echelle,
    observed_key,
    ridge_start,
    typical_separation,
)
from oscsolve.plots.style import SOFT, colour, degree_key, key_above, looking, marker, marker_size
from oscsolve.seismology.acoustic import ModeColumns
from oscsolve.seismology.match import Match


@looking
def match_plot(axes: Axes, modes: ModeColumns, found: Match) -> Axes:
    """An echelle of a match: observed modes open, corrected ones filled, uncorrected crosses.

    Parameters
    ----------
    axes : to draw on
    modes : the mode list
    found : what `match_observed` made of it

    Examples
    --------
    >>> import numpy as np
    >>> import oscsolve
    >>> from oscsolve import plots
    >>> modes = oscsolve.solve_modes(oscsolve.polytrope(3), [0], (20, 300), unit="sigma2")
    >>> seen = oscsolve.ObservedModes(modes.degree, modes.nu + 1.0, np.full(len(modes), 0.5))
    >>> found = oscsolve.match_observed(modes, seen, surface="none")
    >>> figure = plots.make_figure(lambda axes: plots.match_plot(axes, modes, found))
    >>> figure.axes[0].get_ylabel()
    'frequency ($\\\\mu$Hz)'
    """
    width = typical_separation(modes)
    radial = found.observed.nu[found.observed.degree == found.observed.degree.min()]
    offset = ridge_start(radial, width)
    degree = modes.degree[found.row]
    cross: dict[str, Any] = {"marker": "x", "ms": 3.6, "mew": 0.7, "color": SOFT, "ls": "none"}
    x = np.mod(found.computed - offset, width)
    axes.plot(x, found.computed, label="computed", **cross)
    handles: list[Any] = []
    for each in np.unique(degree):
        own = degree == each
        axes.plot(
            np.mod(found.corrected[own] - offset, width),
            found.corrected[own],
            marker=marker(each),
            ms=marker_size(each),
            color=colour(each),
            mew=0,
            ls="none",
            label="_corrected",
            zorder=3,
        )
        handles.append(degree_key(each, label=rf"$\ell={each}$, corrected"))
    draw_observed(axes, found.observed, width, offset)
    dress_echelle(axes, width, offset)
    key_above(axes, [*handles, Line2D([], [], label="computed", **cross), observed_key()])
    return axes
