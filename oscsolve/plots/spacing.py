"""Period spacing against period, by degree."""

from __future__ import annotations

from typing import Any

import numpy as np
from matplotlib.axes import Axes
from matplotlib.lines import Line2D

from oscsolve.errors import InputError
from oscsolve.plots.style import (
    SOFT,
    colour,
    degree_key,
    key_above,
    looking,
    marker,
    marker_size,
)
from oscsolve.pulsation.modeset import ModeSet
from oscsolve.seismology.period_spacing import period_spacings
from oscsolve.star.integrals import period_spacing

#: Periods above this are given in days, s.
_DAYS_FROM = 2e5
_DASHES = (0, (5, 3))


@looking
def spacing_plot(axes: Axes, modes: ModeSet, *, asymptotic: bool = True) -> Axes:
    """Steps between periods of consecutive orders, and the asymptotic value of each degree.

    Parameters
    ----------
    axes : to draw on
    modes : mode list
    asymptotic : draw the value that the integral of N over the star gives (Tassoul 1980)

    Raises
    ------
    InputError
        The list holds no g modes of consecutive order.

    Examples
    --------
    >>> import oscsolve
    >>> from oscsolve import plots
    >>> modes = oscsolve.solve_modes(oscsolve.polytrope(3), [1], (0.1, 3), unit="sigma2")
    >>> figure = plots.make_figure(lambda axes: plots.spacing_plot(axes, modes))
    >>> figure.axes[0].get_ylabel()
    'period spacing (s)'
    """
    found = [part for part in period_spacings(modes) if len(part) > 0]
    if not found:
        raise InputError("the list holds no g modes of consecutive order; solve a lower band")
    longest = max(float(part.period.max()) for part in found)
    unit, scale = ("d", 86400.0) if longest > _DAYS_FROM else ("s", 1.0)
    count = sum(len(part) for part in found)
    highest = max(float(part.spacing.max()) for part in found)
    handles: list[Any] = []
    drawn = False
    for part in found:
        # Steps that a missing order parts are no neighbours.
        cut = np.flatnonzero(np.abs(np.diff(part.order)) != 1) + 1
        axes.plot(
            np.insert(part.period / scale, cut, np.nan),
            np.insert(part.spacing, cut, np.nan),
            color=colour(part.degree),
            marker=marker(part.degree),
            ms=marker_size(part.degree, count),
            mew=0.0,
            lw=0.6,
            zorder=3,
            label=rf"$\ell={part.degree}$",
        )
        handles.append(degree_key(part.degree))
        value = period_spacing(modes.star, part.degree)
        if asymptotic and 0.0 < value < 2.0 * highest:
            axes.axhline(value, color=colour(part.degree), lw=0.8, ls=_DASHES, zorder=1)
            highest, drawn = max(highest, value), True
    if drawn:
        handles.append(Line2D([], [], color=SOFT, lw=0.8, ls=_DASHES, label="asymptotic"))
    axes.set_ylim(0.0, 1.06 * highest)
    axes.set_xlabel(f"period ({unit})")
    axes.set_ylabel("period spacing (s)")
    key_above(axes, handles)
    return axes
