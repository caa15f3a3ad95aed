"""The figures that suit a mode list, with words to stand below them."""

from __future__ import annotations

import contextlib
from collections.abc import Callable, Iterator
from dataclasses import dataclass
from functools import partial
from typing import Any, NamedTuple

import numpy as np
from matplotlib.axes import Axes
from matplotlib.figure import Figure

from oscsolve.errors import InputError
from oscsolve.plots.choose import contrasting_rows, lightest_row
from oscsolve.plots.echelle import frequency_echelle, period_echelle
from oscsolve.plots.eigenfunction import displacement_plot, energy_plot
from oscsolve.plots.figure import make_figure, picture
from oscsolve.plots.inertia import inertia_plot
from oscsolve.plots.kernel import rotation_kernel_plot, running_kernel_plot
from oscsolve.plots.propagation import propagation_diagram
from oscsolve.plots.spacing import spacing_plot
from oscsolve.pulsation.modeset import ModeSet

#: g modes of one degree from which folding periods shows something.
_G_MODES = 6


class _Plan(NamedTuple):
    """A figure to be tried: title and caption, its panels from top to bottom, their height."""

    title: str
    caption: str
    panels: tuple[Callable[[Axes], Any], ...]
    height: float = 1.0


@dataclass(frozen=True)
class Plate:
    """One figure of a gallery.

    Attributes
    ----------
    title, caption : what it shows, and how to read it
    figure : the drawing
    """

    title: str
    caption: str
    figure: Figure

    def svg(self) -> bytes:
        """The figure as an SVG file."""
        return picture(self.figure, "svg")


def gallery(modes: ModeSet) -> list[Plate]:
    """The figures that this list has something to show in.

    A figure that cannot be made of the list (no neighbouring p modes to fold with, no g modes) is
    left out.

    Examples
    --------
    >>> import oscsolve
    >>> from oscsolve import plots
    >>> modes = oscsolve.solve_modes(oscsolve.polytrope(3), [0], (20, 300), unit="sigma2")
    >>> [plate.title for plate in plots.gallery(modes)][:3]
    ['Where waves propagate', 'Frequencies folded', 'Inertia']
    """
    plates = []
    for plan in _candidates(modes):
        with contextlib.suppress(InputError):
            figure = make_figure(plan.panels, height=plan.height)
            plates.append(Plate(plan.title, plan.caption, figure))
    return plates


def _candidates(modes: ModeSet) -> Iterator[_Plan]:
    nonradial = [int(degree) for degree in modes.census.degree if degree > 0]
    yield _Plan(
        "Where waves propagate",
        "Sound waves run where the frequency exceeds both N and S_l, gravity waves where it lies "
        "below both. Lines are modes, strong where they travel, dots their nodes; the bar at the "
        "right is the band.",
        (lambda axes: propagation_diagram(axes, modes.star, modes),),
    )
    yield _Plan(
        "Frequencies folded",
        "p modes of one degree stand in a ridge; markers shrink with the inertia of a mode.",
        (lambda axes: frequency_echelle(axes, modes),),
        1.35,
    )
    lowest = min(nonradial, default=1)
    if np.count_nonzero((modes.degree == lowest) & (modes.n_g > 0)) >= _G_MODES:
        yield _Plan(
            f"Periods folded, l = {lowest}",
            "g modes of one degree stand in a ridge; sharp layers and p modes bend it.",
            (lambda axes: period_echelle(axes, modes, [lowest]),),
            1.35,
        )
    if np.count_nonzero(modes.n_g > 0) >= _G_MODES:
        yield _Plan(
            "Period spacing",
            "Steps between periods of consecutive orders; straight lines: the asymptotic values.",
            (lambda axes: spacing_plot(axes, modes),),
        )
    yield _Plan(
        "Inertia",
        "Modes of little inertia move the surface most for a given energy.",
        (lambda axes: inertia_plot(axes, modes),),
    )
    if modes.eigenfunctions is not None:
        yield from _of_single_modes(modes)


def _of_single_modes(modes: ModeSet) -> Iterator[_Plan]:
    """Eigenfunctions and kernels of the lightest and the heaviest mode among some neighbours."""
    nonradial = bool(np.any((modes.degree > 0) & (modes.sigma2 > 0.0)))
    if not np.any(modes.sigma2 > 0.0):
        return
    rows = contrasting_rows(modes) if nonradial else [lightest_row(modes)]
    for row, which in zip(rows, ("little", "much"), strict=False):
        name = f"l = {modes.degree[row]}, n = {modes.order[row]}, {modes.nu[row]:.6g} uHz"
        yield _Plan(
            f"A mode of {which} inertia",
            f"{name}: displacements times r sqrt(rho), and where the energy is; the dashed line is "
            "the share of it inside.",
            (partial(displacement_plot, modes=modes, index=row),)
            + (partial(energy_plot, modes=modes, index=row),),
            0.75,
        )
    if nonradial:
        yield _Plan(
            "What rotational splittings sense",
            "Rotation kernels of both modes, and the share of each that lies inside: a splitting "
            "is beta times the mean of the rotation rate weighted by the kernel.",
            (partial(rotation_kernel_plot, modes=modes, rows=rows),)
            + (partial(running_kernel_plot, modes=modes, rows=rows),),
            0.75,
        )
