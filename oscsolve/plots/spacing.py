"""Period spacing against period, by degree."""

from __future__ import annotations

from matplotlib.axes import Axes

from oscsolve.errors import InputError
from oscsolve.plots.style import colour, line, marker
from oscsolve.pulsation.modeset import ModeSet
from oscsolve.seismology.period_spacing import period_spacings
from oscsolve.star.integrals import period_spacing


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
    """
    found = [part for part in period_spacings(modes) if len(part) > 0]
    if not found:
        raise InputError("the list holds no g modes of consecutive order; solve a lower band")
    longest = max(float(part.period.max()) for part in found)
    unit, scale = ("d", 86400.0) if longest > 2e5 else ("s", 1.0)
    for part in found:
        few = len(part) <= 120
        axes.plot(
            part.period / scale,
            part.spacing,
            color=colour(part.degree),
            marker=marker(part.degree) if few else "",
            ls="-",
            lw=0.8,
            ms=3.5,
            label=f"l = {part.degree}",
        )
        value = period_spacing(modes.star, part.degree)
        if asymptotic and 0.0 < value < 10.0 * float(part.spacing.max()):
            axes.axhline(value, color=colour(part.degree), lw=0.8, ls=line(part.degree), alpha=0.7)
    axes.set_ylim(bottom=0.0)
    axes.set_xlabel(f"period / {unit}")
    axes.set_ylabel("period spacing / s")
    axes.legend(loc="upper left", bbox_to_anchor=(1.0, 1.0), handletextpad=0.4)
    return axes
