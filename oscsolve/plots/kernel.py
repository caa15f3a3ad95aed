"""Kernels: what a splitting says of rotation, and a frequency of the structure."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from typing import Any

import numpy as np
from matplotlib.axes import Axes

from oscsolve.errors import InputError
from oscsolve.plots.coordinate import coordinate_of, dress_coordinate
from oscsolve.plots.style import frequency_text, key_above, line, looking, mark_zero, shade
from oscsolve.pulsation.modeset import ModeSet
from oscsolve.seismology.integrals import point_structure
from oscsolve.seismology.kernels import structure_kernel
from oscsolve.seismology.rotation import rotation_kernel

_MOST = 8
_NAMES = {"c2": "$c^2$", "rho": r"$\rho$", "gamma1": r"$\Gamma_1$"}


@looking
def rotation_kernel_plot(
    axes: Axes, modes: ModeSet, rows: Sequence[int], *, coordinate: str = "auto"
) -> Axes:
    """Rotation kernels of some modes per step of the horizontal axis: the area under each is one.

    Parameters
    ----------
    axes : to draw on
    modes : mode list with eigenfunctions
    rows : of nonradial modes, at most eight
    coordinate : one of `oscsolve.plots.COORDINATES`

    Raises
    ------
    InputError
        The list holds no eigenfunctions; no or too many modes; a mode is radial.

    Examples
    --------
    >>> import oscsolve
    >>> from oscsolve import plots
    >>> modes = oscsolve.solve_modes(oscsolve.polytrope(3), [1], (20, 60), unit="sigma2")
    >>> figure = plots.make_figure(lambda axes: plots.rotation_kernel_plot(axes, modes, [0, 1]))
    >>> figure.axes[0].get_ylabel()
    'rotation kernel per $r/R$'
    """
    return _draw(
        axes, modes, rows, coordinate, "rotation kernel", lambda row: rotation_kernel(modes, row)
    )


@looking
def running_kernel_plot(
    axes: Axes, modes: ModeSet, rows: Sequence[int], *, coordinate: str = "auto"
) -> Axes:
    """Share of each rotation kernel that lies inside a radius: how far in a mode senses rotation.

    Parameters and errors are those of `rotation_kernel_plot`.

    Examples
    --------
    >>> import oscsolve
    >>> from oscsolve import plots
    >>> modes = oscsolve.solve_modes(oscsolve.polytrope(3), [1], (20, 60), unit="sigma2")
    >>> figure = plots.make_figure(lambda axes: plots.running_kernel_plot(axes, modes, [0]))
    >>> round(float(figure.axes[0].lines[0].get_ydata()[-1]), 3)
    1.0
    """
    _check(rows)
    along, at = coordinate_of(modes.star, coordinate), point_structure(modes.star)
    dress_coordinate(axes, modes.star, along)
    place = along.place(at)
    for row, style in zip(rows, _styles(modes, rows), strict=True):
        kernel = rotation_kernel(modes, int(row))
        steps = 0.5 * (kernel[1:] + kernel[:-1]) * np.diff(at.x)
        inside = np.concatenate(([0.0], np.cumsum(steps)))
        axes.plot(place, inside / inside[-1], **style)
    axes.set_ylim(-0.02, 1.02)
    axes.set_ylabel("share inside")
    return axes


@looking
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
    `oscsolve.seismology.kernels.structure_kernel`. Radial modes have them too.

    Examples
    --------
    >>> import oscsolve
    >>> from oscsolve import plots
    >>> modes = oscsolve.solve_modes(oscsolve.polytrope(3), [0], (20, 60), unit="sigma2")
    >>> figure = plots.make_figure(lambda axes: plots.structure_kernel_plot(axes, modes, [0]))
    >>> figure.axes[0].get_ylabel()
    'kernel of $c^2$ at fixed $\\\\rho$ per $r/R$'
    """
    if quantity not in _NAMES or held not in _NAMES:
        raise InputError(f"kernels are those of {', '.join(_NAMES)}; got {quantity!r}, {held!r}")
    return _draw(
        axes,
        modes,
        rows,
        coordinate,
        f"kernel of {_NAMES[quantity]} at fixed {_NAMES[held]}",
        lambda row: structure_kernel(modes, row, quantity, held),
    )


def _draw(
    axes: Axes,
    modes: ModeSet,
    rows: Sequence[int],
    coordinate: str,
    what: str,
    kernel: Callable[[int], np.ndarray],
) -> Axes:
    _check(rows)
    along, at = coordinate_of(modes.star, coordinate), point_structure(modes.star)
    place, stretch = along.place(at), along.stretch(at)
    dress_coordinate(axes, modes.star, along)
    mark_zero(axes)
    handles: list[Any] = []
    for row, style in zip(rows, _styles(modes, rows), strict=True):
        handles += axes.plot(place, kernel(int(row)) * stretch, **style)
    axes.set_ylabel(f"{what} per ${along.per}$")
    key_above(axes, handles)
    return axes


def _check(rows: Sequence[int]) -> None:
    if not 1 <= len(rows) <= _MOST:
        raise InputError(f"a figure shows the kernels of 1 to {_MOST} modes; got {len(rows)}")


def _styles(modes: ModeSet, rows: Sequence[int]) -> list[dict[str, Any]]:
    """A degree gives the colour, the place among the modes of that degree its shade and line."""
    styles: list[dict[str, Any]] = []
    seen: dict[int, int] = {}
    for row in rows:
        modes.eigenfunction(int(row))
        degree = int(modes.degree[row])
        number = seen.get(degree, 0)
        seen[degree] = number + 1
        nu = rf"{frequency_text(modes.nu[row])} $\mu$Hz"
        styles.append(
            {
                "color": shade(degree, number),
                "ls": line(number // 3),
                "lw": 1.1,
                "label": rf"$\ell={degree}$, $n={modes.order[row]}$, {nu}",
                "zorder": 3.0 - 0.1 * number,
            }
        )
    return styles
