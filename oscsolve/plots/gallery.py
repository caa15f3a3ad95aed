"""The figures that suit a mode list, with words to stand below them."""

from __future__ import annotations

from collections.abc import Callable, Iterator
from dataclasses import dataclass
from functools import partial
from typing import Any

import numpy as np
from matplotlib.axes import Axes

from oscsolve.errors import InputError
from oscsolve.plots.echelle import frequency_echelle, period_echelle
from oscsolve.plots.eigenfunction import displacement_plot, energy_plot
from oscsolve.plots.figure import make_figure, picture
from oscsolve.plots.inertia import inertia_plot
from oscsolve.plots.kernel import rotation_kernel_plot
from oscsolve.plots.propagation import propagation_diagram
from oscsolve.plots.spacing import spacing_plot
from oscsolve.pulsation.modeset import ModeSet

#: g modes of one degree from which folding periods shows something.
_G_MODES = 6


@dataclass(frozen=True)
class Plate:
    """One figure of a gallery.

    Attributes
    ----------
    title, caption : what it shows, and how to read it
    panels : functions that draw on an Axes, from top to bottom
    height : of each panel, see `oscsolve.plots.figure.make_figure`
    """

    title: str
    caption: str
    panels: tuple[Callable[[Axes], Any], ...]
    height: float = 1.0

    def svg(self) -> bytes:
        """The figure as an SVG file."""
        return picture(make_figure(self.panels, height=self.height), "svg")


def gallery(modes: ModeSet) -> list[Plate]:
    """The figures that this list has something to show in; drawn when asked for.

    A figure that cannot be made of the list (no neighbouring p modes to fold with, no g modes) is
    left out.
    """
    return [plate for plate in _candidates(modes) if _can_be_drawn(plate)]


def _can_be_drawn(plate: Plate) -> bool:
    try:
        make_figure(plate.panels, height=plate.height)
    except InputError:
        return False
    return True


def _candidates(modes: ModeSet) -> Iterator[Plate]:
    nonradial = [int(degree) for degree in modes.census.degree if degree > 0]
    shown = tuple(nonradial[:2]) or (1,)
    yield Plate(
        "Where waves propagate",
        "Sound waves run where the frequency exceeds both N and S_l, gravity waves where it lies "
        "below both. Lines are modes, dots their nodes, dashes the ends of the band.",
        (lambda axes: propagation_diagram(axes, modes.star, modes, degrees=shown),),
    )
    yield Plate(
        "Frequencies folded",
        "p modes of one degree stand in a ridge; markers shrink with the inertia of a mode.",
        (lambda axes: frequency_echelle(axes, modes),),
        1.35,
    )
    lowest = min(nonradial, default=1)
    if np.count_nonzero((modes.degree == lowest) & (modes.n_g > 0)) >= _G_MODES:
        yield Plate(
            f"Periods folded, l = {lowest}",
            "g modes of one degree stand in a ridge; sharp layers and p modes bend it.",
            (lambda axes: period_echelle(axes, modes, lowest),),
            1.35,
        )
    if np.count_nonzero(modes.n_g > 0) >= _G_MODES:
        yield Plate(
            "Period spacing",
            "Steps between periods of consecutive orders; straight lines: the asymptotic values.",
            (lambda axes: spacing_plot(axes, modes),),
        )
    yield Plate(
        "Inertia",
        "Modes of little inertia move the surface most for a given energy.",
        (lambda axes: inertia_plot(axes, modes),),
    )
    if modes.eigenfunctions is not None:
        yield from _of_single_modes(modes)


def _of_single_modes(modes: ModeSet) -> Iterator[Plate]:
    """Eigenfunctions of the lightest and the heaviest mode, kernels of four."""
    positive = np.flatnonzero(modes.nu > 0.0)
    nonradial = positive[modes.degree[positive] > 0]
    pool = nonradial if nonradial.size else positive
    if pool.size == 0:
        return
    light = int(pool[np.argmin(modes.inertia[pool])])
    heavy = int(pool[np.argmax(modes.inertia[pool])])
    for row, which in ((light, "least"), (heavy, "greatest")):
        name = f"l = {modes.degree[row]}, n = {modes.order[row]}, {modes.nu[row]:.6g} uHz"
        yield Plate(
            f"The mode of {which} inertia",
            f"{name}: displacements times r sqrt(rho), and where the energy is.",
            (partial(displacement_plot, modes=modes, index=row),)
            + (partial(energy_plot, modes=modes, index=row),),
            0.75,
        )
        if light == heavy:
            break
    if nonradial.size:
        at = np.unique(np.linspace(0, nonradial.size - 1, 4).astype(int))
        rows = [int(row) for row in nonradial[at]]
        yield Plate(
            "What rotational splittings sense",
            "Rotation kernels of some modes: the splitting is beta times the mean of the rotation "
            "rate weighted by the kernel.",
            (lambda axes: rotation_kernel_plot(axes, modes, rows),),
        )
