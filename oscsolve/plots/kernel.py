"""Kernels: what a splitting says of rotation, and a frequency of the structure."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from matplotlib.axes import Axes

from oscsolve.errors import InputError
from oscsolve.plots.coordinate import Coordinate
from oscsolve.plots.style import FAINT, colour
from oscsolve.pulsation.modeset import ModeSet
from oscsolve.seismology.kernels import structure_kernel
from oscsolve.seismology.rotation import rotation_kernel

#: Lines are told apart by these, whatever their colour.
_LINES = ("-", "--", "-.", ":")
_MOST = 8
_NAMES = {"c2": "$c^2$", "rho": r"$\rho$", "gamma1": r"$\Gamma_1$"}


def rotation_kernel_plot(
    axes: Axes, modes: ModeSet, rows: Sequence[int], *, coordinate: str = "auto"
) -> Axes:
    """Rotation kernels of some modes: the area under each is one.

    Parameters
    ----------
    axes : to draw on
    modes : mode list with eigenfunctions
    rows : of nonradial modes, at most eight
    coordinate : "radius", "log-radius" (kernels times r/R, which keeps areas) or "auto"

    Raises
    ------
    InputError
        The list holds no eigenfunctions; no or too many modes; a mode is radial.
    """
    _check(rows)
    across = _axis(modes, coordinate)
    for place, row in enumerate(rows):
        _line(axes, modes, row, place, across, rotation_kernel(modes, int(row)))
    return _dress(axes, across, "rotation kernel")


def structure_kernel_plot(
    axes: Axes,
    modes: ModeSet,
    rows: Sequence[int],
    *,
    quantity: str = "c2",
    held: str = "rho",
    coordinate: str = "auto",
) -> Axes:
    """Structure kernels of some modes for a change of one quantity at fixed other one.

    Parameters and errors as of `rotation_kernel_plot`; quantities as in
    `oscsolve.seismology.kernels.structure_kernel`.
    """
    _check(rows)
    across = _axis(modes, coordinate)
    for place, row in enumerate(rows):
        kernel = structure_kernel(modes, int(row), quantity, held)
        _line(axes, modes, row, place, across, kernel)
    return _dress(axes, across, f"kernel of {_NAMES[quantity]} at fixed {_NAMES[held]}")


def _check(rows: Sequence[int]) -> None:
    if not 1 <= len(rows) <= _MOST:
        raise InputError(f"a figure shows the kernels of 1 to {_MOST} modes; got {len(rows)}")


def _axis(modes: ModeSet, coordinate: str) -> Coordinate:
    across = Coordinate(modes.star, coordinate)
    return Coordinate(modes.star, "radius") if across.name == "pressure" else across


def _line(
    axes: Axes, modes: ModeSet, row: int, place: int, across: Coordinate, kernel: np.ndarray
) -> None:
    degree = int(modes.degree[row])
    x = modes.star.fractional_radius
    axes.plot(
        across.values,
        kernel * x if across.name == "log-radius" else kernel,
        color=colour(place),
        ls=_LINES[place % len(_LINES)],
        lw=1.0,
        label=f"l = {degree}, n = {modes.order[row]}, {modes.nu[row]:.5g} uHz",
    )


def _dress(axes: Axes, across: Coordinate, what: str) -> Axes:
    axes.axhline(0.0, color=FAINT, lw=0.7, zorder=0)
    across.dress(axes)
    per = r"$\ln r$" if across.name == "log-radius" else "r/R"
    axes.set_ylabel(f"{what}, per {per}")
    axes.legend(loc="upper left", bbox_to_anchor=(1.0, 1.0), handletextpad=0.4)
    return axes
