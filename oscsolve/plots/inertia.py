"""Inertia against frequency, by degree."""

from __future__ import annotations

import numpy as np
from matplotlib.axes import Axes

from oscsolve.errors import InputError
from oscsolve.plots.style import colour, marker
from oscsolve.pulsation.modeset import ModeSet


def inertia_plot(axes: Axes, modes: ModeSet) -> Axes:
    """Normalised inertia of every mode; low means easy to see.

    Raises
    ------
    InputError
        The list holds no oscillating modes.
    """
    use = modes.nu > 0.0
    if not np.any(use):
        raise InputError("the list holds no oscillating modes")
    for degree in np.unique(modes.degree[use]):
        own = np.flatnonzero(use & (modes.degree == degree))
        many = own.size > 60
        axes.plot(
            modes.nu[own],
            modes.inertia[own],
            color=colour(int(degree)),
            marker=marker(int(degree)),
            ms=2.4 if many else 4.0,
            lw=0.6,
            label=f"l = {degree}",
        )
    axes.set_yscale("log")
    axes.set_xlabel("frequency / uHz")
    axes.set_ylabel("inertia / (M |displacement at R|$^2$)")
    axes.legend(loc="upper left", bbox_to_anchor=(1.0, 1.0), handletextpad=0.4)
    return axes
