"""Observed and corrected frequencies, folded with the large separation."""

from __future__ import annotations

import numpy as np
from matplotlib.axes import Axes

from oscsolve.plots.echelle import draw_observed, dress_echelle, typical_separation
from oscsolve.plots.style import FAINT, colour, marker
from oscsolve.seismology.acoustic import ModeColumns
from oscsolve.seismology.match import Match


def match_plot(axes: Axes, modes: ModeColumns, found: Match) -> Axes:
    """An echelle of a match: observed modes open, corrected ones filled, uncorrected faint.

    Parameters
    ----------
    axes : to draw on
    modes : the mode list
    found : what `match_observed` made of it
    """
    width = typical_separation(modes)
    radial = found.observed.nu[found.observed.degree == found.observed.degree.min()]
    ridge = np.angle(np.mean(np.exp(2j * np.pi * radial / width))) / (2.0 * np.pi) * width
    offset = float(np.mod(ridge - 0.3 * width, width))
    degree = modes.degree[found.row]
    axes.plot(
        np.mod(found.computed - offset, width),
        found.computed,
        "x",
        color=FAINT,
        ms=4.0,
        label="computed",
    )
    for each in np.unique(degree):
        own = degree == each
        axes.plot(
            np.mod(found.corrected[own] - offset, width),
            found.corrected[own],
            marker(int(each)),
            color=colour(int(each)),
            mew=0,
            ms=4.2,
            label=f"l = {each}, corrected",
        )
    draw_observed(axes, found.observed, width, offset)
    dress_echelle(axes, width, offset)
    return axes
